"""published: rulings, imagers and tones as standards and trade books print them.

Each test names the key of its source in `patterngen/sources.toml`; most were read as excerpts.
"""

from __future__ import annotations

from typing import Any

import pytest

import patterngen
from patterngen.model.job import Viewing
from patterngen.model.verdict import Finding
from patterngen.rules import _engine, _limits
from patterngen.sources import source
from patterngen.units import LENGTH, RULING, SHARE, parse


def preset(*, press: dict[str, str], rulings: dict[str, str | None], tone: str = "40 %") -> dict[str, Any]:
    """The usual set of angles, inks of `rulings` only."""
    inks = {
        "Cyan": ([55, -37, -50], "15 deg"),
        "Magenta": ([48, 74, -3], "75 deg"),
        "Yellow": ([89, -5, 93], "0 deg"),
        "Black": ([16, 0, 0], "45 deg"),
    }
    screens = []
    for ink, ruling in rulings.items():
        screen = {
            "name": ink.lower(), "ink": ink, "kind": "dots", "shape": "simpledot",
            "angle": inks[ink][1], "tone": tone,
        }  # fmt: skip
        screens.append(screen if ruling is None else {**screen, "ruling": ruling})
    return {
        "patterngen": 1,
        "title": "Fennick & Oake, tin of churned butter",
        "sheet": {"size": ["40 mm", "30 mm"]},
        "press": press,
        "ink": [{"name": ink, "lab": inks[ink][0]} for ink in rulings],
        "screen": screens,
    }


def finding(data: dict[str, Any], rule: str) -> Finding:
    """The one finding of a rule."""
    verdict = patterngen.verify(patterngen.load(data))
    (found,) = [f for f in verdict.findings if f.rule == rule]
    return found


@pytest.mark.parametrize(
    ("imager", "ruling", "printed"),
    [
        ("2400 dpi", "150 lpi", 257),
        ("2540 dpi", "175 lpi", 212),
        ("4000 dpi", "150 lpi", 712),
        ("1200 dpi", "150 lpi", 65),
    ],
)
def test_grey_levels(imager: str, ruling: str, printed: int) -> None:
    """grey-levels: whole numbers, rounded."""
    found = finding(preset(press={"imager": imager}, rulings={"Black": ruling}), "tone-steps-too-few")
    assert round(found.measured) == printed


@pytest.mark.parametrize(("imager", "status"), [("1000 /cm", "pass"), ("960 /cm", "fail")])
def test_80_per_cm_needs_an_imager_of_1000_per_cm(imager: str, status: str) -> None:
    """iso-12647-9-2021, 4.2.2: at least 150 tone steps, so at 80 /cm at least 1000 /cm."""
    data = preset(press={"process": "metal-decoration", "imager": imager}, rulings={"Black": "80 /cm"})
    assert finding(data, "tone-steps-too-few").status == status


def test_offset_on_metal_has_69_per_cm_unless_asked_otherwise() -> None:
    """iso-12647-9-2021, 4.2.3: 69 /cm (175 lpi) is the commonest."""
    data = preset(press={"process": "metal-decoration"}, rulings={"Black": None})
    (screen,) = _engine.derive(patterngen.load(data)).screens
    assert screen.ruling_per_mm == pytest.approx(parse("175 lpi", RULING), rel=1e-12)
    assert round(10 * screen.ruling_per_mm) == 69


@pytest.mark.parametrize(
    ("ruling", "status"), [("47 /cm", "warn"), ("48 /cm", "pass"), ("80 /cm", "pass"), ("81 /cm", "warn")]
)
def test_rulings_of_offset_on_metal(ruling: str, status: str) -> None:
    """iso-12647-9-2021, 4.2.3: four-colour rulings of 48 to 80 /cm."""
    data = preset(press={"process": "metal-decoration"}, rulings={"Black": ruling})
    assert finding(data, "ruling-out-of-range").status == status


LIMITS = [
    ("metal-decoration", "ruling_lowest", "48 /cm", RULING, "iso-12647-9-2021"),
    ("metal-decoration", "ruling_highest", "80 /cm", RULING, "iso-12647-9-2021"),
    ("sheetfed-offset", "line_minimum", "20 um", LENGTH, "trade-offset-lines"),
    ("sheetfed-offset", "tone_minimum", "1 %", SHARE, "trade-offset-gain"),
    ("sheetfed-offset", "tone_maximum", "99 %", SHARE, "trade-offset-gain"),
    ("sheetfed-offset", "ruling_lowest", "40 /cm", RULING, "trade-rulings-by-paper"),
    ("sheetfed-offset", "ruling_highest", "120 /cm", RULING, "trade-rulings-by-paper"),
    ("web-offset", "ruling_lowest", "20 /cm", RULING, "trade-rulings-by-paper"),
    ("web-offset", "ruling_highest", "200 lpi", RULING, "trade-newsprint-rulings"),
]


@pytest.mark.parametrize(
    ("process", "name", "printed", "quantity", "key"), LIMITS, ids=[f"{row[0]}-{row[1]}" for row in LIMITS]
)
def test_limits_are_what_their_sources_print(
    process: str, name: str, printed: str, quantity: Any, key: str
) -> None:
    """The source of each is the key in its row."""
    limit = _limits.limits(process)[name]
    assert limit.value == pytest.approx(parse(printed, quantity), rel=1e-12)
    assert limit.source == source(key)
    assert limit.source.standing == "published"


def test_the_default_light_is_that_of_practical_appraisal() -> None:
    """iso-3664, summed up by an instrument maker: P2 500 lx to appraise, P1 2000 lx to match."""
    job = patterngen.load(preset(press={}, rulings={"Black": "150 lpi"}))
    assert job.viewing.light_lx == Viewing().light_lx == 500.0
