"""Presets to jobs."""

from __future__ import annotations

import copy
from pathlib import Path
from typing import Any

import pytest

from patterngen.errors import Fault, InputError
from patterngen.job.read import load

PRESET: dict[str, Any] = {
    "patterngen": 1,
    "title": "Fennick & Oake, cream lid",
    "sheet": {"size": ["60 mm", "40 mm"], "bleed": "2 mm"},
    "press": {"process": "sheetfed-offset", "imager": "2400 dpi", "register": "0.05 mm"},
    "ink": [
        {"name": "Clover", "lab": [55, -37, -50]},
        {"name": "Barn Red", "lab": [48, 74, -3]},
    ],
    "screen": [
        {
            "name": "clover",
            "ink": "Clover",
            "kind": "dots",
            "ruling": "150 lpi",
            "angle": "15 deg",
            "tone": "40 %",
        },
        {
            "name": "barn",
            "ink": "Barn Red",
            "kind": "lines",
            "ruling": "60 /cm",
            "angle": "-45 deg",
            "tone": "25 %",
        },
    ],
}

TEXT = """\
#:schema ./preset.schema.json
# cream lid, trial print
patterngen = 1
title = "Fennick & Oake, cream lid"

[sheet]
size = ["60 mm", "40 mm"]   # trimmed

[[ink]]
name = "Clover"
lab = [55, -37, -50]

[[screen]]
name = "clover"
ink = "Clover"
kind = "dots"
ruling = "150 lpi"
angle = "15 deg"   # by hand
tone = "40 %"
"""


def preset(**changes: Any) -> dict[str, Any]:
    """The preset with "screen.0.angle"-like paths changed (None takes the key out)."""
    data = copy.deepcopy(PRESET)
    for path, value in changes.items():
        here: Any = data
        *way, last = path.split("__")
        for step in way:
            here = here[int(step)] if isinstance(here, list) else here.setdefault(step, {})
        if value is None:
            del here[int(last) if isinstance(here, list) else last]
        elif isinstance(here, list) and int(last) == len(here):
            here.append(value)
        else:
            here[int(last) if isinstance(here, list) else last] = value
    return data


def faults(data: Any, overrides: tuple[str, ...] = ()) -> list[Fault]:
    with pytest.raises(InputError) as caught:
        load(data, overrides)
    return list(caught.value.faults)


def test_plain_numbers() -> None:
    """invariant: the job holds mm, cycles per mm, degrees and shares, whatever the preset's units."""
    job = load(PRESET)
    assert (job.sheet.width_mm, job.sheet.height_mm, job.sheet.bleed_mm) == (60.0, 40.0, 2.0)
    clover, barn = job.screens
    assert clover.ruling_per_mm == pytest.approx(150 / 25.4, rel=1e-15)
    assert barn.ruling_per_mm == pytest.approx(6.0, rel=1e-15)
    assert (clover.angle_deg, barn.angle_deg) == (15.0, -45.0)
    assert (clover.tone.constant, barn.tone.constant) == (0.4, 0.25)
    assert job.press.imager_per_mm == pytest.approx(2400 / 25.4, rel=1e-15)
    assert clover.area.box_mm == (-2.0, -2.0, 62.0, 42.0)
    assert job.name == "fennick-oake-cream-lid"


def test_defaults() -> None:
    """invariant: what the surface promises for keys that are left out."""
    job = load(PRESET)
    assert job.paper_lab == (95.0, 0.0, -2.0)
    viewing = job.viewing
    assert (viewing.distance_mm, viewing.far_mm, viewing.limit, viewing.limit_coarse) == (
        350.0,
        700.0,
        4.0,
        1.0,
    )
    assert (viewing.light_lx, viewing.eye) == (500.0, "barten1999")
    assert load(preset(viewing__distance="500 mm")).viewing.far_mm == 1000.0
    assert job.press.yule_nielsen == 1.0
    assert job.screens[0].origin_mm == (0.0, 0.0)


def test_origins() -> None:
    """invariant: each value remembers where it came from."""
    job = load(PRESET, ["screen.clover.angle=22.5 deg", "press.smallest_dot=30 um"])
    assert job.origin["screen.clover.angle"] == "--set"
    assert job.origin["screen.barn.angle"] == "preset"
    assert job.origin["viewing.light"] == "default"
    assert job.origin["sheet.size"] == "preset"
    assert job.origin["press.smallest_dot"] == "--set"
    assert job.origin["press.tone_minimum"] == "process sheetfed-offset"
    assert job.press.limits["smallest_dot"].value == pytest.approx(0.03)
    assert job.press.limits["smallest_dot"].origin == "--set"
    assert "screen.clover.shape" not in job.origin  # left open for a rule


def test_limit_in_the_preset() -> None:
    """invariant: a shop's own limit stands over that of the process, in its own unit."""
    limit = load(preset(press__total_ink="320 %")).press.limits["total_ink"]
    assert (limit.value, limit.origin) == (pytest.approx(3.2), "preset")


def test_gain_of_press_and_screen() -> None:
    """invariant: a screen's own gain stands over that of the press."""
    job = load(preset(press__gain="16 %", screen__1__edge_gain="5 um"))
    assert job.screens[0].gain.half_tone == pytest.approx(0.16)
    assert (job.screens[1].gain.half_tone, job.screens[1].gain.edge_mm) == (0.0, pytest.approx(0.005))


def test_choose_is_flagged() -> None:
    """invariant: what is left to the search arrives open and marked, not as a number."""
    screen = load(preset(screen__0__angle="choose", screen__0__ruling="choose")).screens[0]
    assert (screen.ruling_per_mm, screen.angle_deg) == (None, None)
    assert screen.params["choose"] == ("ruling", "angle")


def test_overprints_and_paper() -> None:
    """invariant: tables that may repeat arrive in order."""
    job = load(
        preset(
            overprint=[{"inks": ["Clover", "Barn Red"], "lab": [30, 10, -20]}],
            paper={"lab": [90, 1, 5]},
        )
    )
    assert job.overprints[0].lab == (30.0, 10.0, -20.0)
    assert job.paper_lab == (90.0, 1.0, 5.0)
    never = load(preset(overprint=[{"inks": ["Clover", "Barn Red"], "never": True}])).overprints[0]
    assert never.never
    assert never.lab is None


def test_waiver_of_a_real_rule() -> None:
    """invariant: any rule there is can be waived, with its reason kept."""
    from patterngen import registry

    rule = registry.names("patterngen.rules")[0]
    job = load(preset(waive=[{"rule": rule, "reason": "agreed with the customer"}]))
    assert (job.waivers[0].rule, job.waivers[0].reason) == (rule, "agreed with the customer")


def test_grid() -> None:
    """invariant: a grid is read by its kind."""
    job = load(preset(grid=[{"name": "plate", "kind": "pixels", "ruling": "2400 dpi", "angle": "7.5 deg"}]))
    assert job.grids[0].ruling_per_mm == pytest.approx(2400 / 25.4)
    assert job.grids[0].angle_deg == 7.5


def test_every_fault_at_once() -> None:
    """invariant: one run tells all that is wrong, field faults and clashes alike."""
    data = preset(
        sheet__size=["60 mm", "40"],
        press__imager=2400,
        screen__0__anlge="15 deg",
        screen__0__tone=0.4,
        screen__1__kind="linse",
        screen__1__ink="Barn Rde",
        ink__1__lab=[148, 74],
    )
    found = {fault.key: fault for fault in faults(data)}
    assert set(found) == {
        "sheet.size", "press.imager", "screen.clover.anlge", "screen.clover.tone",
        "screen.barn.kind", "screen.barn.ink", "ink.Barn Red.lab",
    }  # fmt: skip
    assert found["screen.clover.anlge"].nearest == "angle"
    assert found["screen.clover.tone"].nearest == '"40 %"'
    assert found["screen.barn.kind"].nearest == '"lines"'
    assert found["screen.barn.ink"].nearest == '"Barn Red"'
    assert found["press.imager"].nearest == '"2400 dpi"'


def test_messages_are_plain() -> None:
    """invariant: no word of the validation library reaches the user."""
    data = preset(
        sheet__marks="yes",
        ink__0__opaque=1,
        screen__0__area=5,
        overprint=[{"inks": "Clover"}],
        screen__0__name=7,
    )
    lines = [fault.line() for fault in faults(data)]
    assert len(lines) == 6
    for line in lines:
        assert not any(
            word in line.lower() for word in ("pydantic", "input should", "validation", "literal", "type=")
        ), line
        assert line.startswith("preset: ")


def test_angle_beyond_a_turn() -> None:
    """invariant: an angle beyond a turn is read within it, and that is told."""
    job = load(preset(screen__0__angle="405 deg", screen__1__angle="-200 deg"))
    assert [screen.angle_deg for screen in job.screens] == [45.0, 160.0]
    assert [remark for remark in job.remarks if "405 deg is read as 45 deg" in remark]
    assert load(preset(screen__0__angle="-15 deg")).screens[0].angle_deg == -15.0


def test_ruling_in_the_other_unit() -> None:
    """common practice, no source: halftones are met from 20 to 120 lines/cm; 150 /cm surely means 150 lpi."""
    job = load(preset(screen__0__ruling="150 /cm", press__imager="5080 dpi"))
    assert job.screens[0].ruling_per_mm == pytest.approx(15.0)
    assert any("150 lpi" in remark for remark in job.remarks)
    assert not load(preset(screen__0__ruling="80 /cm")).remarks


def test_ruling_beyond_the_imager() -> None:
    """invariant: a cell needs two pixels of the imager."""
    (fault,) = faults(preset(screen__0__ruling="1201 lpi"))
    assert (fault.key, fault.nearest) == ("screen.clover.ruling", '"1200 lpi"')
    assert load(preset(screen__0__ruling="1200 lpi"))


def test_too_many_shapes() -> None:
    """invariant: the number of shapes is told before any work, with a ruling that would do."""
    (fault,) = faults(preset(sheet__size=["3 m", "2 m"], screen__0__ruling="400 lpi", press=None))
    assert fault.key == "screen.clover.ruling"
    assert "1.49e+09" in fault.problem
    # the ruling at which the job would be allowed: a tenth under it is below the cap
    nearest = float(fault.nearest.split('"')[1].split()[0])
    load(preset(sheet__size=["3 m", "2 m"], screen__0__ruling=f"{nearest * 0.9:.4g} lpi", press=None))


def test_file_goes_the_same_way(tmp_path: Path) -> None:
    """invariant: a file and the same data from Python make the same job; the file names it."""
    path = tmp_path / "cream-lid.toml"
    path.write_text(TEXT, encoding="utf-8")
    job = load(path)
    assert (job.name, job.folder, job.text) == ("cream-lid", tmp_path.resolve(), TEXT)
    assert job.remarks == ()
    assert load(str(path)).screens[0].angle_deg == 15.0


def test_normalised_bytes(tmp_path: Path) -> None:
    """invariant: byte order mark and CR LF change nothing but a remark each."""
    path = tmp_path / "lid.toml"
    path.write_bytes(b"\xef\xbb\xbf" + TEXT.replace("\n", "\r\n").encode())
    job = load(path)
    assert job.text == TEXT
    assert len(job.remarks) == 2


def test_syntax_error_has_its_place(tmp_path: Path) -> None:
    """invariant: line and column of the first thing that is no TOML."""
    path = tmp_path / "lid.toml"
    path.write_text(TEXT.replace('tone = "40 %"', "tone = 40 %"), encoding="utf-8")
    (fault,) = faults(path)
    assert fault.problem.startswith("line 19, column 11: ")
    assert fault.value == "tone = 40 %"


def test_unsuitable_data_from_python() -> None:
    """invariant: what no preset can hold is told by its place."""
    found = faults(preset(screen__0__tone=float("nan"), ink__0__lab=[55, 2**70, object()]))
    assert {fault.key for fault in found} == {"screen[0].tone", "ink[0].lab[1]", "ink[0].lab[2]"}
    assert faults(42)[0].allowed == "a path or a dict"


def test_duplicate_screen_names_are_told_apart() -> None:
    """invariant: two tables of one name are addressed by number, as the name says nothing."""
    (fault,) = faults(preset(screen__1__name="Clover"))
    assert (fault.key, fault.nearest) == ("screen.Clover.name", '"Clover-2"')
    (fault,) = faults(preset(screen__1__name="clover"))
    assert fault.key == "screen[1].name"


def test_later_tables() -> None:
    """invariant: tables of later versions are known by name, and that is said."""
    (fault,) = faults(preset(key=[{"name": "seal"}]))
    assert fault.problem == "this version does not make keys yet"


@pytest.mark.parametrize(
    ("spelt", "name"),
    [
        ("SimpleDot", "simpledot"),
        ("Round", "round"),
        ("InvertedDoubleDot", "inverteddoubledot"),
        ("LineX", "linex"),
        ("round", "round"),
    ],
)
def test_spot_functions_by_the_standards_spelling(spelt: str, name: str) -> None:
    """published: ISO 32000-1 (2008), Table 130: its names mix capitals in; the job holds them in lower case."""
    job = load(preset(screen__0__shape=spelt))
    assert job.screens[0].shape == name
    assert load(PRESET, (f"screen.clover.shape={spelt}",)).screens[0].shape == name


def test_spot_function_misspelt() -> None:
    """invariant: case is forgiven, letters are not; the nearest name is told."""
    (fault,) = faults(preset(screen__0__shape="SimpelDot"))
    assert (fault.key, fault.nearest) == ("screen.clover.shape", '"simpledot"')
    (fault,) = faults(preset(screen__0__kind="Dots"))
    assert fault.nearest == '"dots"'


@pytest.mark.parametrize(
    ("changes", "key", "half_um", "nearest"),
    [
        # 150 lpi: a pitch of 25.4 mm / 150 = 169.33 um
        ({"screen__0__edge_gain": "1 mm"}, "screen.clover.edge_gain", "84.67", '"84 um"'),
        ({"screen__0__edge_gain": "84.667 um"}, "screen.clover.edge_gain", "84.67", '"84 um"'),
        # lines of 60 /cm: 166.67 um, the finer of the two
        ({"press__edge_gain": "84 um"}, "press.edge_gain", "83.33", '"83 um"'),
        ({"press__edge_gain": "84 um", "screen__1__ruling": "50 /cm", "screen__0__ruling": "50.8 /cm",
          "screen__0__gain": "16 %"}, "", "", ""),
        ({"press__edge_gain": "200 um", "screen__1__ruling": "50 /cm", "screen__0__edge_gain": "5 um"},
         "press.edge_gain", "100", '"99 um"'),
        ({"screen__0__edge_gain": "84 um"}, "", "", ""),
        ({"screen__0__ruling": None, "screen__0__edge_gain": "84.667 um"}, "", "", ""),
    ],
)  # fmt: skip
def test_edges_that_close_everything(changes: dict[str, Any], key: str, half_um: str, nearest: str) -> None:
    """second way: half the pitch by hand from the ruling; a screen's own gain counts, else the press's."""
    if not key:
        load(preset(**changes))
        return
    (fault,) = faults(preset(**changes))
    assert (fault.key, fault.nearest) == (key, nearest)
    assert f"less than half its pitch, {half_um} um" in fault.allowed
    assert fault.value.endswith(" um")


def test_a_job_without_artwork_lists_none() -> None:
    """invariant: no files, no digests."""
    assert load(PRESET).artwork == {}


def test_choose_is_not_offered() -> None:
    """invariant: a message offers only what can be built; "choose" is read, but belongs to the search."""
    for ruling in ("150", "0 lpi"):
        (fault,) = faults(preset(screen__0__ruling=ruling))
        assert fault.allowed
        assert "choose" not in fault.allowed
