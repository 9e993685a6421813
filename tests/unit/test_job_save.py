"""Jobs back to preset files."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest

from patterngen.errors import InputError
from patterngen.job.read import load
from patterngen.job.save import preset_text, save
from patterngen.model.verdict import Derived

TEXT = """\
#:schema ./preset.schema.json
# For the creamery: one lid, two inks.

patterngen = 1
title = "Fennick & Oake, cream lid"

[sheet]
size = ["60 mm", "40 mm"]   # trimmed

[[ink]]
name = "Clover"
lab = [55, -37, -50]

[[ink]]
name = "Barn Red"
lab = [48, 74, -3]

# the ground
[[screen]]
name = "clover"
ink = "Clover"
kind = "dots"
ruling = "150 lpi"   # as last year
angle = "15 deg"     # by hand
tone = "40 %"

[[screen]]
name = "barn.red"
ink = "Barn Red"
kind = "dots"
tone = "25 %"
# end
"""


@pytest.fixture
def preset(tmp_path: Path) -> Path:
    path = tmp_path / "cream-lid.toml"
    path.write_text(TEXT, encoding="utf-8")
    return path


def test_saved_as_it_was(preset: Path, tmp_path: Path) -> None:
    """invariant: a job that nothing was done to goes back byte for byte."""
    copy = save(load(preset), tmp_path / "copy.toml")
    assert copy.read_bytes() == TEXT.encode()


def test_overrides_are_written_in(preset: Path, tmp_path: Path) -> None:
    """invariant: only the values set change, comments stay, and the copy makes the same job."""
    overrides = [
        "screen.clover.angle=22.5 deg",
        "screen.barn.red.ruling=60 /cm",
        "sheet.size[0]=70 mm",
        "press.imager=2400 dpi",
        'ink."Barn Red".lab=[40, 60, 10]',
        "title=Cream lid, second trial",
    ]
    job = load(preset, overrides)
    text = save(job, tmp_path / "copy.toml").read_text(encoding="utf-8")
    for kept in (
        "# as last year",
        "# by hand",
        "# the ground",
        "# trimmed",
        "# end",
        "#:schema ./preset.schema.json",
    ):
        assert kept in text
    assert 'angle = "22.5 deg"     # by hand' in text
    again = load(tmp_path / "copy.toml")
    for made in (job, again):
        assert made.screens[0].angle_deg == 22.5
        assert made.screens[1].ruling_per_mm == pytest.approx(6.0)
        assert made.sheet.width_mm == 70.0
        assert made.inks[1].lab == (40.0, 60.0, 10.0)
        assert made.press.imager_per_mm == pytest.approx(2400 / 25.4)
        assert made.title == "Cream lid, second trial"
    assert again.text == job.text
    # no line is lost, and but for the new [press] and the second screen's ruling none is new
    assert len(set(TEXT.splitlines()) - set(text.splitlines())) == 4


def test_derived_values_are_written_in(preset: Path, tmp_path: Path) -> None:
    """invariant: with them the preset stands on its own and reads back to the same numbers."""
    job = load(preset)
    job = replace(
        job,
        derived=(
            Derived("screen.barn.red.angle", 75.0, "angles", "the usual set"),
            Derived("screen.barn.red.ruling", 150 / 25.4, "ruling", "as the imager allows"),
            Derived("screen.barn.red.shape", "round", "shape", "the process's own"),
        ),
    )
    assert preset_text(job) == TEXT
    again = load(save(job, tmp_path / "copy.toml", derived=True))
    screen = again.screens[1]
    assert (screen.angle_deg, screen.shape) == (75.0, "round")
    assert screen.ruling_per_mm == pytest.approx(150 / 25.4, rel=1e-15)
    assert 'ruling = "150 lpi"' in again.text.split("barn.red")[1]
    assert "# end" in again.text


def test_data_from_python_is_saved_too(tmp_path: Path) -> None:
    """invariant: a job made from a dict is saved as a preset that makes the same job."""
    import tomllib

    job = load(tomllib.loads(TEXT))
    again = load(save(job, tmp_path / "made.toml"))
    assert [s.angle_deg for s in again.screens] == [s.angle_deg for s in job.screens]
    assert again.title == job.title


def test_a_link_is_not_written_through(preset: Path, tmp_path: Path) -> None:
    """invariant: what stands at the target and is no plain file is left alone."""
    link = tmp_path / "link.toml"
    link.symlink_to(preset)
    with pytest.raises(InputError, match="a link stands"):
        save(load(preset), link)
    assert preset.read_text(encoding="utf-8") == TEXT
