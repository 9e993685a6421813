"""invariant: exit codes, clean standard output, and messages a stranger can act on (the contract of the commands)."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

import patterngen

SHIPPED = {preset.name: preset.path for preset in patterngen.presets()}
EXPECTED = {"carton-wrong-angle": 1}


def run(*arguments: object, cwd: Path | None = None, **environment: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "patterngen", *map(str, arguments)],
        capture_output=True,
        text=True,
        cwd=cwd,
        env={**os.environ, **environment},
        timeout=120,
        check=False,
    )


@pytest.mark.parametrize("name", sorted(SHIPPED))
def test_shipped_presets_build_with_the_verdict_their_comment_promises(name: str, tmp_path: Path) -> None:
    done = run("build", SHIPPED[name], "--out", tmp_path)
    assert done.returncode == EXPECTED.get(name, 0), done.stderr
    files = {path.name for path in (tmp_path / name).iterdir()}
    drawing = {"base.pdf", "base.svg"}
    assert {"verdict.json", "manifest.json"} <= files
    assert (drawing <= files) == (done.returncode == 0)
    assert not any(path.endswith(".part") for path in files)


def test_json_is_alone_on_standard_output(tmp_path: Path) -> None:
    done = run("build", SHIPPED["carton"], "--out", tmp_path, "--json")
    verdict = json.loads(done.stdout)
    assert verdict == json.loads((tmp_path / "carton" / "verdict.json").read_text(encoding="utf-8"))
    assert verdict["verdict"] in ("pass", "warn")


def test_the_same_preset_gives_the_same_bytes(tmp_path: Path) -> None:
    for out, seed, zone in (("a", "1", "UTC"), ("b", "2", "Asia/Tokyo")):
        done = run("build", SHIPPED["cheese-label"], "--out", tmp_path / out, PYTHONHASHSEED=seed, TZ=zone)
        assert done.returncode == 0, done.stderr
    for path in sorted((tmp_path / "a" / "cheese-label").iterdir()):
        assert path.read_bytes() == (tmp_path / "b" / "cheese-label" / path.name).read_bytes(), path.name


def test_set_overrides_one_value() -> None:
    done = run("verify", SHIPPED["carton-wrong-angle"], "--json", "--set", 'screen.magenta.angle="75 deg"')
    screens = {screen["name"]: screen for screen in json.loads(done.stdout)["screens"]}
    assert screens["magenta"]["angle_deg"] == pytest.approx(75.0)
    assert done.returncode == 0


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["verify", "nowhere.toml"], "nowhere.toml"),
        (["veryfy", "x.toml"], "verify"),
        (["new", "carten"], "carton"),
        (["why", "balance-drif"], "balance-drift"),
        (["verify"], "PRESET"),
    ],
)
def test_wrong_calls_exit_two_with_the_nearest_legal_word(arguments: list[str], words: str, tmp_path: Path) -> None:
    done = run(*arguments, cwd=tmp_path)
    assert done.returncode == 2
    assert words in done.stderr
    assert "Traceback" not in done.stderr
    assert done.stdout == ""
    assert list(tmp_path.iterdir()) == []


def test_every_fault_of_a_preset_is_told_at_once(tmp_path: Path) -> None:
    text = SHIPPED["carton"].read_text(encoding="utf-8")
    text = text.replace('ruling = "150 lpi"', "ruling = 150", 1).replace('ink = "Yellow"', 'ink = "Yelow"')
    preset = tmp_path / "bad.toml"
    preset.write_text(text, encoding="utf-8")
    done = run("build", preset, cwd=tmp_path)
    assert done.returncode == 2
    assert '"150 lpi"' in done.stderr
    assert "Yellow" in done.stderr
    assert len(done.stderr.strip().splitlines()) == 2
    assert sorted(path.name for path in tmp_path.iterdir()) == ["bad.toml"]


def test_help_of_every_command_is_a_page() -> None:
    for command in ("build", "verify", "new", "presets", "schema", "why"):
        done = run(command, "--help")
        assert done.returncode == 0
        assert len(done.stdout.splitlines()) >= 6, command


def test_no_colour_codes_without_a_terminal() -> None:
    assert "\x1b" not in run("verify", SHIPPED["carton"], "--all").stdout


def test_new_prints_a_preset_that_loads(tmp_path: Path) -> None:
    done = run("new", "carton")
    (tmp_path / "mine.toml").write_text(done.stdout, encoding="utf-8")
    assert patterngen.load(tmp_path / "mine.toml").title.startswith("Fennick")


def test_a_reader_that_goes_away_is_no_verdict() -> None:
    with subprocess.Popen(
        [sys.executable, "-m", "patterngen", "schema"], stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True
    ) as process:
        assert process.stdout is not None
        process.stdout.close()
        assert process.stderr is not None
        assert process.stderr.read() == ""
    assert process.returncode == 0


def test_a_full_device_is_the_machines_fault() -> None:
    with Path("/dev/full").open("w") as full:
        done = subprocess.run(
            [sys.executable, "-m", "patterngen", "schema"], stdout=full, stderr=subprocess.PIPE, text=True, check=False
        )
    assert done.returncode == 3
    assert "Traceback" not in done.stderr
