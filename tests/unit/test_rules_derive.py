"""common practice, no source: angle, ruling and shape of what is left open; trade pages cited per test."""

from __future__ import annotations

from itertools import combinations

import pytest

from patterngen import registry
from patterngen.model.area import Area, ToneField
from patterngen.model.job import Gain, Ink, Job, Overprint, Press, ScreenRequest, SheetSize, Viewing
from patterngen.rules import _engine, _examples
from patterngen.rules._angles import apart_deg
from patterngen.rules._shapes import AXIS_SHAPES
from patterngen.screens import _spot
from patterngen.units import ANGLE, LENGTH, RESOLUTION, RULING, SHARE, parse


def job_of(preset: dict, **changes: object) -> Job:  # type: ignore[type-arg]
    """A job straight from an example's tables, without the checks of the reader."""
    press = preset.get("press", {})
    area = Area((0.0, 0.0, 30.0, 20.0))

    def value(table: dict, key: str, quantity) -> float | None:  # type: ignore[no-untyped-def, type-arg]
        return parse(table[key], quantity) if key in table else None

    screens = tuple(
        ScreenRequest(
            name=table["name"],
            ink=table["ink"],
            kind=table["kind"],
            shape=table.get("shape"),
            ruling_per_mm=value(table, "ruling", RULING),
            angle_deg=value(table, "angle", ANGLE),
            tone=ToneField(constant=parse(table["tone"], SHARE)),
            area=area,
            origin_mm=(0.0, 0.0),
            gain=Gain(),
            params={"choose": table["choose"]} if "choose" in table else {},
        )
        for table in preset["screen"]
    )
    base = {
        "name": "tile",
        "title": preset["title"],
        "text": "",
        "folder": None,
        "sheet": SheetSize(parse("30 mm", LENGTH), 20.0),
        "viewing": Viewing(),
        "press": Press(process=press.get("process"), imager_per_mm=value(press, "imager", RESOLUTION)),
        "paper_lab": (95.0, 0.0, -2.0),
        "inks": tuple(Ink(table["name"], tuple(table["lab"])) for table in preset["ink"]),
        "overprints": (),
        "screens": screens,
        **changes,
    }
    return Job(**base)  # type: ignore[arg-type]


def angles(job: Job) -> dict[str, float | None]:
    return {screen.name: screen.angle_deg for screen in job.screens}


def left_open(*inks: str, **keys: object) -> dict:  # type: ignore[type-arg]
    return _examples.preset(*(_examples.dots(ink, angle=None, **keys) for ink in inks))


EXAMPLES = [
    pytest.param(name, preset, wanted, id=f"{name}-{i}")
    for name in _engine.deriving()
    for i, (preset, wanted) in enumerate(registry.load(_engine.PACKAGE, name).EXAMPLES)
]


@pytest.mark.parametrize(("name", "preset", "wanted"), EXAMPLES)
def test_examples_of_deriving_rules(name: str, preset: dict, wanted: dict) -> None:  # type: ignore[type-arg]
    job = registry.load(_engine.PACKAGE, name).derive(job_of(preset))
    assert {d.value: d.chosen for d in job.derived} == wanted
    assert all(d.by == name and d.because.endswith(".") for d in job.derived)
    assert dict.fromkeys(wanted, f"rule {name}") == dict(job.origin)


def test_the_classic_set_of_four() -> None:
    """published (printwiki.org, Screen Angles; mediencommunity.de, Rasterwinkel): 0/15/45/75, yellow at 0."""
    found = angles(_engine.derive(job_of(left_open("Cyan", "Magenta", "Yellow", "Black"))))
    assert found == {"cyan": 15.0, "magenta": 75.0, "yellow": 0.0, "black": 45.0}


@pytest.mark.parametrize(
    ("tones", "wanted"),
    [
        # yellow and magenta dominate (skin): magenta 45, black on the place that magenta left
        (
            {"Cyan": "10 %", "Magenta": "70 %", "Yellow": "70 %", "Black": "5 %"},
            {"magenta": 45.0, "black": 75.0, "cyan": 15.0},
        ),
        # yellow and cyan dominate (green): cyan 45, black on the place that cyan left
        (
            {"Cyan": "70 %", "Magenta": "10 %", "Yellow": "70 %", "Black": "5 %"},
            {"cyan": 45.0, "black": 75.0, "magenta": 15.0},
        ),
    ],
)
def test_the_dominant_ink_takes_forty_five(tones: dict[str, str], wanted: dict[str, float]) -> None:
    """published (DIN 16547, as reported by two teaching pages, excerpt): the dominant ink at 45, yellow at 0.

    The other two stand at 15 and 75; which of them where is house custom, here the order of the tables.
    """
    preset = _examples.preset(*(_examples.dots(ink, angle=None, tone=tone) for ink, tone in tones.items()))
    found = angles(_engine.derive(job_of(preset)))
    assert found.pop("yellow") == 0.0
    assert found == wanted


@pytest.mark.parametrize("count", range(1, 7))
@pytest.mark.parametrize("shape", ["simpledot", "ellipse"])
def test_one_to_six_inks_keep_their_distance(count: int, shape: str) -> None:
    """invariant: up to four inks all stand as far apart as wanted; from five on, each shares and says so."""
    inks = ["Cyan", "Magenta", "Yellow", "Black", "Orange", "Green"][:count]
    job = _engine.derive(job_of(left_open(*inks, shape=shape)))
    found = angles(job)
    repeat, apart = (90.0, 30.0) if shape == "simpledot" else (180.0, 60.0)
    first = inks[:4]
    for a, b in combinations(first, 2):
        light = count > 3 and "Yellow" in (a, b)
        off = apart_deg(found[a.lower()], found[b.lower()], repeat_deg=repeat)  # type: ignore[arg-type]
        assert off >= (15.0 if light else apart)
    for ink in inks[4:]:
        reason = next(d.because for d in job.derived if d.value == f"screen.{ink.lower()}.angle")
        assert "doubtful" in reason
        assert found[ink.lower()] in {found[other.lower()] for other in first}


def test_expanded_gamut_shares_with_complements() -> None:
    """common practice, no source: orange on cyan's angle, green on magenta's, dark violet on black's."""
    inks = ("Cyan", "Magenta", "Yellow", "Black", "Orange", "Green", "Violet")
    found = angles(_engine.derive(job_of(left_open(*inks))))
    shared = (found["orange"], found["green"], found["violet"])
    assert shared == (found["cyan"], found["magenta"], found["black"])


def test_a_light_violet_goes_to_yellow() -> None:
    """common practice, no source: violet on yellow's angle, unless it is dark."""
    preset = left_open("Cyan", "Magenta", "Yellow", "Black", "Violet")
    preset["ink"][-1]["lab"] = [60, 30, -45]
    assert angles(_engine.derive(job_of(preset)))["violet"] == 0.0


def test_two_greys_never_share() -> None:
    """published (a mesh weaver's public page, excerpt): never two grey-like inks on one angle."""
    found = angles(_engine.derive(job_of(left_open("Cyan", "Magenta", "Yellow", "Black", "Grey"))))
    assert found["grey"] != found["black"]


def test_an_ink_that_never_meets_another_takes_its_angle_without_doubt() -> None:
    """invariant: distances bind only inks that meet."""
    inks = ("Cyan", "Magenta", "Yellow", "Black", "Orange")
    never = tuple(Overprint(frozenset({"Orange", other}), never=True) for other in ("Cyan", "Magenta"))
    job = _engine.derive(job_of(left_open(*inks), overprints=never))
    reason = next(d.because for d in job.derived if d.value == "screen.orange.angle")
    assert "doubtful" not in reason
    assert angles(job)["orange"] == 15.0


@pytest.mark.parametrize(
    ("given", "wanted"),
    [
        ({"Cyan": 15.0}, {"magenta": 75.0, "yellow": 0.0, "black": 45.0}),
        ({"Black": 75.0}, {"cyan": 15.0, "magenta": 45.0, "yellow": 0.0}),
        ({"Cyan": 22.5, "Yellow": 7.5}, {"magenta": 82.5, "black": 52.5}),
        ({"Cyan": 105.0}, {"magenta": 75.0, "yellow": 0.0, "black": 45.0}),
    ],
)
def test_given_angles_are_kept_and_the_rest_fits_them(
    given: dict[str, float], wanted: dict[str, float]
) -> None:
    """invariant: what the preset says stays, open inks keep 30 degrees (the lightest 15) from it."""
    inks = ("Cyan", "Magenta", "Yellow", "Black")
    screens = [_examples.dots(ink, angle=f"{given[ink]} deg" if ink in given else None) for ink in inks]
    found = angles(_engine.derive(job_of(_examples.preset(*screens))))
    for ink, angle in given.items():
        assert found.pop(ink.lower()) == angle
    assert found == wanted


def test_where_nothing_fits_the_widest_gap_is_taken_and_said() -> None:
    """invariant: where given inks leave too little room the third takes the widest gap, and says so."""
    screens = [
        _examples.dots("Cyan", angle="10 deg"),
        _examples.dots("Magenta", angle="40 deg"),
        _examples.dots("Black", angle=None),
    ]
    job = _engine.derive(job_of(_examples.preset(*screens)))
    assert angles(job)["black"] == 70.0
    screens[1] = _examples.dots("Magenta", angle="55 deg")
    job = _engine.derive(job_of(_examples.preset(*screens)))
    assert angles(job)["black"] == 32.5
    assert "less than wanted" in job.derived[-1].because


def test_screens_of_one_ink_stand_at_one_angle() -> None:
    """invariant: an ink has one angle, also when it prints in several screens."""
    screens = [
        _examples.dots("Cyan", angle="22.5 deg"),
        _examples.dots("Cyan", name="sky", angle=None),
        _examples.dots("Black", angle=None),
        _examples.dots("Black", name="type", angle=None),
    ]
    found = angles(_engine.derive(job_of(_examples.preset(*screens))))
    assert found["sky"] == 22.5
    assert found["black"] == found["type"]


def test_what_is_left_to_the_search_is_not_derived() -> None:
    """invariant: "choose" belongs to another command."""
    preset = left_open("Cyan", "Black")
    preset["screen"][0]["choose"] = ("angle", "ruling")
    del preset["screen"][0]["ruling"]
    job = _engine.derive(job_of(preset))
    assert job.screens[0].angle_deg is None
    assert job.screens[0].ruling_per_mm is None
    assert job.screens[1].angle_deg is not None


def test_a_job_without_open_values_comes_back_unchanged() -> None:
    """invariant."""
    job = job_of(_examples.preset(*_examples.usual_set()))
    assert _engine.derive(job) is job


@pytest.mark.parametrize(
    ("imager", "lpi"), [("2400 dpi", 150.0), ("2540 dpi", 150.0), ("1200 dpi", 98.0), ("600 dpi", 49.0)]
)
def test_rulings_follow_the_imager(imager: str, lpi: float) -> None:
    """second way: 150 steps hold for the ruling and fail one line per inch above it."""
    preset = _examples.preset(_examples.dots("Black", ruling=None, angle="45 deg"), press={"imager": imager})
    ruling = _engine.derive(job_of(preset)).screens[0].ruling_per_mm
    assert ruling is not None
    assert ruling * 25.4 == pytest.approx(lpi)
    dpi = parse(imager, RESOLUTION) * 25.4
    assert (dpi / lpi) ** 2 + 1 >= 150
    assert lpi == 150.0 or (dpi / (lpi + 1)) ** 2 + 1 < 150


def test_shapes_with_an_axis_are_those_whose_cell_changes_when_turned() -> None:
    """second way: the spot functions themselves, x against y."""
    assert {name for name in _spot.FUNCTIONS if _spot.has_axis(name)} == AXIS_SHAPES
