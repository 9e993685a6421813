"""The JSON Schema of presets."""

from __future__ import annotations

import json
import re
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from patterngen import registry
from patterngen.job.schema import DIALECT, schema
from patterngen.job.shipped import folder, presets

BESIDE = Path(sys.executable).with_name("taplo")


def test_committed_schema_is_up_to_date() -> None:
    """regression: the file beside the presets is what `patterngen schema` prints."""
    committed = json.loads((folder() / "preset.schema.json").read_text(encoding="utf-8"))
    assert committed == schema(), "run: python -m patterngen schema > presets/preset.schema.json"


def test_every_kind_is_in_it() -> None:
    """invariant: kinds, eyes, processes and limits are enumerated from where they live."""
    from patterngen.rules import _limits

    text = json.dumps(schema())
    made = schema()
    assert made["$schema"] == DIALECT
    for package in ("screens", "grids"):
        for name in registry.names(f"patterngen.{package}"):
            assert f'"const": "{name}"' in text
    viewing = made["$defs"]["ViewingTable"]["properties"]
    assert viewing["eye"]["enum"] == list(registry.names("patterngen.vision"))
    assert viewing["distance"]["default"] == "350 mm"
    press = made["$defs"]["PressTable"]["properties"]
    assert press["process"]["enum"] == list(_limits.processes())
    assert set(_limits.quantities()) <= set(press)
    assert "null" not in text


def test_it_is_a_schema() -> None:
    """second way: the dialect's own check, where that library is installed; else its plain rules by hand."""
    made = schema()
    references = {part.split("/")[-1] for part in _references(made)}
    assert references <= set(made["$defs"])
    assert made["additionalProperties"] is False
    assert set(made["required"]) == {"patterngen", "title", "sheet", "ink", "screen"}


def _references(part: object) -> list[str]:
    if isinstance(part, dict):
        own = [part["$ref"]] if isinstance(part.get("$ref"), str) else []
        return own + [r for value in part.values() for r in _references(value)]
    return [r for value in part for r in _references(value)] if isinstance(part, list) else []


taplo = pytest.mark.skipif(not BESIDE.exists() and not shutil.which("taplo"), reason="taplo is not installed")


def check(path: Path) -> subprocess.CompletedProcess[str]:
    program = str(BESIDE) if BESIDE.exists() else "taplo"
    return subprocess.run([program, "check", path.name], cwd=path.parent, capture_output=True, text=True, check=False)


@taplo
def test_editors_pass_the_shipped_presets(tmp_path: Path) -> None:
    """second way: an outside checker of TOML against JSON Schema passes every shipped preset."""
    (tmp_path / "preset.schema.json").write_text(json.dumps(schema()), encoding="utf-8")
    for preset in presets():
        copy = tmp_path / preset.path.name
        shutil.copyfile(preset.path, copy)
        done = check(copy)
        assert done.returncode == 0, done.stderr


@taplo
@pytest.mark.parametrize(
    ("old", "new"),
    [
        ('tone = "40 %"', "tone = 0.4"),
        ('ruling = "150 lpi"', 'ruling = "150"'),
        ('kind = "dots"', 'kind = "dost"'),
        ("patterngen = 1", "patterngen = 2"),
        ("[sheet]", "[shet]"),
        ('shape = "simpledot"', 'shape = "SimpelDot"'),
        ('name = "cyan"', 'name = "cyan"\nanlge = "15 deg"'),
        ("lab = [95, 0, -2]", "lab = [95, 0]"),
    ],
)
def test_editors_refuse(old: str, new: str, tmp_path: Path) -> None:
    """second way: the outside checker refuses what `load` refuses."""
    (tmp_path / "preset.schema.json").write_text(json.dumps(schema()), encoding="utf-8")
    text = next(p for p in presets() if p.name == "carton").path.read_text(encoding="utf-8")
    assert old in text
    path = tmp_path / "carton.toml"
    path.write_text(text.replace(old, new, 1), encoding="utf-8")
    assert check(path).returncode == 1


def test_spot_functions_in_any_case() -> None:
    """invariant: editors complete the lower-case names and let the standard's own spelling stand."""
    words, spelt = schema()["$defs"]["DotsScreen"]["properties"]["shape"]["anyOf"]
    assert "inverteddoubledot" in words["enum"]
    for name in ("InvertedDoubleDot", "SimpleDot", "Round", "ROUND", *words["enum"]):
        assert re.search(spelt["pattern"], name)
    for name in ("SimpelDot", "Round ", "dot", "simpledots"):
        assert not re.search(spelt["pattern"], name)


def test_choose_is_told_to_be_of_a_later_version() -> None:
    """invariant: an editor shows that the word is for a command that is not there yet."""
    angle = schema()["$defs"]["DotsScreen"]["properties"]["angle"]["anyOf"]
    (word,) = [branch for branch in angle if branch.get("const") == "choose"]
    assert "search command" in word["description"]
    assert "does not have yet" in word["description"]


@taplo
def test_editors_pass_the_standards_spelling(tmp_path: Path) -> None:
    """second way: the outside checker passes a spot function as the standard spells it."""
    (tmp_path / "preset.schema.json").write_text(json.dumps(schema()), encoding="utf-8")
    text = next(p for p in presets() if p.name == "carton").path.read_text(encoding="utf-8")
    path = tmp_path / "carton.toml"
    path.write_text(text.replace('shape = "simpledot"', 'shape = "SimpleDot"', 1), encoding="utf-8")
    done = check(path)
    assert done.returncode == 0, done.stderr
