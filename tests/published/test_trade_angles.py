"""published: angles of screens as trade books, teaching pages and standards print them.

Each test names the key of its source in `patterngen/sources.toml`; most were read as excerpts.
"""

from __future__ import annotations

from collections.abc import Mapping
from itertools import combinations
from typing import Any

import numpy as np
import pytest

import patterngen
from patterngen.rules import _engine
from patterngen.rules._angles import apart_deg

# process solids: ink-solids-from-memory; the red is invented
SOLIDS = {
    "Cyan": [55, -37, -50],
    "Magenta": [48, 74, -3],
    "Yellow": [89, -5, 93],
    "Black": [16, 0, 0],
    "Barn Red": [44, 58, 38],
}


def preset(tones: Mapping[str, str], **angles: str) -> dict[str, Any]:
    """Dot screens of those inks at 60 /cm on a small sheet; angles by the ink's first word, in lower case."""
    screens = []
    for ink, tone in tones.items():
        name = ink.split()[0].lower()
        screen = {
            "name": name, "ink": ink, "kind": "dots", "shape": "simpledot", "ruling": "60 /cm", "tone": tone,
        }  # fmt: skip
        screens.append({**screen, "angle": angles[name]} if name in angles else screen)
    return {
        "patterngen": 1,
        "title": "Marrowfield butter wrapper",
        "sheet": {"size": ["40 mm", "30 mm"]},
        "ink": [{"name": ink, "lab": SOLIDS[ink]} for ink in tones],
        "screen": screens,
    }


def derived(tones: Mapping[str, str]) -> dict[str, float]:
    """The angle that the rules choose for each ink's screen."""
    job = _engine.derive(patterngen.load(preset(tones)))
    return {screen.ink: float(screen.angle_deg or 0.0) for screen in job.screens}


def dots_apart(a: float, b: float) -> float:
    return apart_deg(a, b, repeat_deg=90.0)


FOUR = {"Cyan": "40 %", "Magenta": "40 %", "Yellow": "40 %", "Black": "40 %"}


def test_the_classic_set_of_four() -> None:
    """trade-classic-angles: black at 45, yellow at 0, the others at 15 and 75."""
    found = derived(FOUR)
    assert (found["Black"], found["Yellow"]) == (45.0, 0.0)
    assert {found["Cyan"], found["Magenta"]} == {15.0, 75.0}


@pytest.mark.parametrize(
    ("tones", "dominant"),
    [
        ({"Cyan": "5 %", "Magenta": "70 %", "Yellow": "60 %", "Black": "3 %"}, "Magenta"),
        ({"Cyan": "70 %", "Magenta": "5 %", "Yellow": "60 %", "Black": "3 %"}, "Cyan"),
        (FOUR, "Black"),
    ],
    ids=["skin", "green", "others"],
)
def test_the_dominant_ink_takes_45(tones: dict[str, str], dominant: str) -> None:
    """din-16547 as teaching pages report it: magenta in skin, cyan in greens, else black; yellow at 0.

    Which of the two remaining inks has 15 and which 75 differs from house to house.
    """
    found = derived(tones)
    assert found[dominant] in (45.0, 135.0)
    assert found["Yellow"] == 0.0
    assert sorted(found[ink] for ink in tones if ink not in (dominant, "Yellow")) == [15.0, 75.0]


def test_drawing_inks_keep_30_degrees_and_yellow_15() -> None:
    """trade-thirty-degrees."""
    found = derived(FOUR)
    drawing = [found[ink] for ink in ("Cyan", "Magenta", "Black")]
    assert [dots_apart(a, b) for a, b in combinations(drawing, 2)] == [30.0, 30.0, 30.0]
    assert min(dots_apart(found["Yellow"], angle) for angle in drawing) == 15.0


def test_only_three_screens_fit_at_30_degrees() -> None:
    """trade-thirty-degrees: the room for a fourth within 90 degrees is 15, wherever it goes."""
    found = derived(dict.fromkeys(("Cyan", "Magenta", "Black"), "40 %"))
    room = [min(dots_apart(a, b) for b in found.values()) for a in np.arange(0, 90, 0.25)]
    assert max(room) == 15.0


def test_one_ink_stands_at_45() -> None:
    """trade-one-colour-forty-five: the direction that the eye notices least."""
    assert derived({"Black": "50 %"}) == {"Black": 45.0}


def pair(angle: str, tone: str = "40 %", other: str = "40 %") -> patterngen.Verdict:
    """Cyan at 15 and black at `angle`, verified."""
    return patterngen.verify(
        patterngen.load(preset({"Cyan": tone, "Black": other}, cyan="15 deg", black=angle))
    )


def over_limit(verdict: patterngen.Verdict) -> float:
    """The strongest beat at the far distance as a share of what is allowed for its period."""
    beats = verdict.beats
    return float(np.max(beats.visibility_far / np.where(beats.period_mm <= 1.0, 4.0, 1.0), initial=0.0))


def test_two_screens_are_safest_45_degrees_apart() -> None:
    """trade-forty-five-safest: 45 is safest, about 5 to 10 is worst, as read at arm's length."""
    seen = {
        off: float(pair(f"{15 + off} deg").beats.visibility.max())
        for off in (1, 2.5, 5, 7.5, 10, 15, 22.5, 30, 45)
    }
    assert min(seen, key=lambda off: seen[off]) == 45
    assert max(seen, key=lambda off: seen[off]) in (5, 7.5, 10)


def test_45_degrees_forgives_most_error() -> None:
    """trade-forty-five-safest: 45 is called the most forgiving of error: here of three degrees."""
    worst = {
        off: max(over_limit(pair(f"{15 + off + error} deg")) for error in range(-3, 4))
        for off in (15, 30, 45)
    }
    assert worst[45] < 1.0 < worst[30] < worst[15]


@pytest.mark.parametrize("off", [5, 10])
def test_5_to_10_degrees_apart_fails(off: float) -> None:
    """trade-forty-five-safest: the distance not to use."""
    assert pair(f"{15 + off} deg").status == "fail"


def test_beats_are_strongest_in_the_middle_tones() -> None:
    """trade-textbook-midtones: contrast is greatest in mid-tones and fades to highlight and shadow.

    Highlight against middle is meant of the beat's amplitude in Y, which is what a print shows; relative
    to a dark mean a shadow may still come out strong.
    """
    found = {}
    for tone in ("5 %", "50 %", "95 %"):
        beats = pair("22.5 deg", tone, tone).beats
        found[tone] = float(np.max(np.abs(beats.amplitude[:, 1]), initial=0.0))
    assert found["50 %"] > 2 * max(found["5 %"], found["95 %"])


def test_two_inks_on_one_angle_change_colour_with_register() -> None:
    """trade-same-angle: dot on dot turns to dot beside dot at the smallest misregister."""
    verdict = pair("15 deg")
    assert verdict.status == "fail"
    assert {f.rule for f in verdict.findings if f.status == "fail"} >= {"balance-drift"}
    assert max(row.colour_swing for row in verdict.balance) > 6.0


def usual_set() -> patterngen.Verdict:
    """Four inks at the usual angles, verified."""
    angles = {"cyan": "15 deg", "magenta": "75 deg", "yellow": "0 deg", "black": "45 deg"}
    return patterngen.verify(patterngen.load(preset(FOUR, **angles)))


def test_three_screens_balance_where_two_vectors_add_up_to_the_third() -> None:
    """delabastita-1992: the vector sum of two screens equals a component of the third."""
    trio = {"cyan", "magenta", "black"}
    (row,) = [row for row in usual_set().balance if set(row.names) == trio]
    assert row.exact
    assert all(sorted(map(abs, orders)) == [0, 1] for orders in row.orders.values())


def test_yellow_makes_the_coarsest_beat_of_two_inks() -> None:
    """ishii-2003: 15 degrees from a neighbour, yellow makes a low beat (of first orders)."""
    beats = usual_set().beats
    pairs = {}
    for i in range(len(beats)):
        orders = beats.participants(i)
        if len(orders) == 2 and all(sum(map(abs, k)) == 1 for k in orders.values()):
            pairs[frozenset(orders)] = max(beats.period_mm[i], pairs.get(frozenset(orders), 0.0))
    coarsest = sorted(pairs, key=lambda pair: -pairs[pair])[:2]
    assert all("yellow" in pair for pair in coarsest)
    assert pairs[coarsest[0]] == pytest.approx(0.64, abs=0.005)  # at 60 /cm and 15 degrees


def test_a_spot_tint_left_at_45_is_reported() -> None:
    """trade-spot-tint: not at 45, where black already stands, but 30 degrees away or more."""

    def status(angle: str) -> set[str]:
        job = preset({"Black": "40 %", "Barn Red": "20 %"}, black="45 deg", barn=angle)
        return {f.status for f in patterngen.verify(patterngen.load(job)).findings if f.rule == rule}

    rule = "angle-already-taken"
    assert status("45 deg") == {"warn"}
    assert status("75 deg") == {"pass"}
