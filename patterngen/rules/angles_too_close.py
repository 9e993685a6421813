"""Two inks whose screens stand too close in angle."""

from __future__ import annotations

from collections.abc import Iterator

from patterngen.model.evidence import Evidence
from patterngen.model.verdict import Measurement
from patterngen.rules._angles import lightest_ink, like_rulings, meeting, screens_apart_deg
from patterngen.rules._examples import dots, preset, usual_set
from patterngen.rules._measuring import against
from patterngen.rules._words import degrees, rounded

SUMMARY = "two inks that print in one place stand closer in angle than the trade allows"
REASON = """The closer two screens of like ruling stand, the longer and the more visible their bands,
down to one angle, where the colour moves with every slip of register. Drawing inks keep 30 degrees; the
lightest ink may stand at 15 because its beats have little contrast. This is a rule of thumb: it warns
and never fails, for the beats themselves are computed and judged, and a searched set may well break it."""
MEASURES = """The least angle between any direction of one screen and any direction of the other (so dots
repeat after 90 degrees, lines after 180), for every two inks that are both screened in one place and
whose rulings differ by less than a quarter."""
SOURCES = ("trade-thirty-degrees", "trade-forty-five-safest", "trade-same-angle")
LIMITS = ("angle_apart", "angle_apart_light")
IDLE = "No two inks of like ruling are screened in one place."

EXAMPLE_PASS = preset(*usual_set())
EXAMPLE_FAIL = preset(
    dots("Cyan", angle="15 deg"), dots("Yellow", angle="75 deg"), dots("Black", angle="30 deg")
)


def measure(evidence: Evidence) -> Iterator[Measurement]:
    """One measurement for each pair of inks that meet."""
    light = lightest_ink(evidence.design.job)
    for a, b in meeting(evidence):
        if not like_rulings(a.ruling_per_mm, b.ruling_per_mm):
            continue
        limit = evidence.limits["angle_apart_light" if light in (a.ink, b.ink) else "angle_apart"]
        off = screens_apart_deg(a, b)
        stand = f"stand {degrees(off)} apart" if off >= 0.05 else "stand at one angle"
        paler = a if a.ink == light else b
        inks = f"{paler.name} is the lightest ink and keeps" if light in (a.ink, b.ink) else "drawing inks keep"
        yield against(
            limit,
            round(off, 2),
            where=f"{a.name} and {b.name}",
            message=f"{a.name} and {b.name} {stand}; {inks} {rounded(limit.value)} degrees.",
            bad_when="below",
            worst="warn",
        )
