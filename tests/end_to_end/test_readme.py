"""invariant: what README prints is what the program prints."""

from __future__ import annotations

import re
import subprocess
import sys
from pathlib import Path

import pytest

import patterngen

ROOT = Path(__file__).resolve().parents[2]
README = (ROOT / "README.md").read_text(encoding="utf-8")


def blocks() -> list[str]:
    return re.findall(r"^```\w*\n(.*?)^```", README, flags=re.DOTALL | re.MULTILINE)


def test_the_example_prints_what_readme_says() -> None:
    (block,) = [b for b in blocks() if b.startswith("$ patterngen")]
    call, _, wanted = block.partition("\n")
    done = subprocess.run(
        [sys.executable, "-m", *call.removeprefix("$ ").split()], cwd=ROOT, capture_output=True, text=True, check=False
    )
    assert done.stdout.strip() == wanted.strip()
    assert done.returncode == 1


@pytest.mark.parametrize(
    "call",
    [
        line.partition("#")[0].partition(">")[0].strip()
        for block in blocks()
        for line in block.splitlines()
        if line.startswith("patterngen ") and "mine.toml " not in line.partition(">")[0]
    ],
)
def test_every_call_in_readme_works(call: str, tmp_path: Path) -> None:
    (tmp_path / "mine.toml").write_text(patterngen.new("carton"), encoding="utf-8")
    words = [word.replace('"', "") for word in re.findall(r'(?:[^\s"]|"[^"]*")+', call)]
    words = [str(ROOT / word) if word.startswith("presets/") else word for word in words]
    done = subprocess.run([sys.executable, "-m", *words], cwd=tmp_path, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr


def test_every_shipped_preset_says_whom_it_is_for_and_what_to_expect() -> None:
    for preset in patterngen.presets():
        assert "Expect:" in preset.about, preset.name
        assert preset.about.startswith("For "), preset.name
        assert preset.path.read_text(encoding="utf-8").startswith("#:schema ./preset.schema.json\n"), preset.name
