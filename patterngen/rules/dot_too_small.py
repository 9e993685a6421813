"""Dots that do not hold, and gaps that fill in."""

from __future__ import annotations

from collections.abc import Iterator

from patterngen.model.evidence import Evidence
from patterngen.model.screen import Screen
from patterngen.model.verdict import Measurement
from patterngen.rules._examples import dots, preset
from patterngen.rules._measuring import against, extremes, no_limit
from patterngen.rules._words import percent, width

SUMMARY = "highlight dots too small to hold, or gaps in the shadows too small to stay open"
REASON = """Plate and press hold a dot down to a certain size; below it dots come and go and the tone
breaks off. In the shadows it is the gap between dots that fills in. The same tone has smaller dots at a
finer ruling."""
MEASURES = """The least width of a dot, as drawn on the plate, at the lightest tone of each dot screen,
and the least width of the gap at its darkest tone short of the solid."""
SOURCES = ("trade-smallest-dot",)
LIMITS = ("smallest_dot", "smallest_gap")
IDLE = "No dot screen has a tone between paper and solid."

EXAMPLE_PASS = preset(dots("Cyan", angle="45 deg"), press={"process": "sheetfed-offset"})
EXAMPLE_FAIL = preset(
    dots("Cyan", angle="45 deg", ruling="200 lpi", tone="1 %"), press={"process": "sheetfed-offset"}
)


def measure(evidence: Evidence) -> Iterator[Measurement]:
    """Smallest dot and smallest gap of every dot screen."""
    screens = [screen for screen in evidence.design.base.screens if len(screen.frequencies_per_mm) != 1]
    for screen in screens:
        low, high = extremes(evidence, screen)
        if 0 < low < 1:
            yield _judged(evidence, screen, low, "smallest_dot", screen.smallest_mm(low)[0])
        if 0 < high < 1:
            yield _judged(evidence, screen, high, "smallest_gap", screen.smallest_mm(high)[1])


def _judged(evidence: Evidence, screen: Screen, tone: float, name: str, width_mm: float) -> Measurement:
    limit = evidence.limits.get(name)
    if limit is None:
        return no_limit(evidence, name)
    if width_mm == float("inf"):
        # joined dots have no width of their own, and a screen without open gaps has none to fill
        width_mm = 1.0 / screen.ruling_per_mm
    thing = "dots" if name == "smallest_dot" else "gaps"
    verb = "hold" if name == "smallest_dot" else "stay open"
    return against(
        limit,
        width_mm,
        where=screen.name,
        message=(
            f"{screen.name}: at {percent(tone)} its {thing} are {width(width_mm)} wide; "
            f"{thing} {verb} from {width(limit.value)}."
        ),
        bad_when="below",
    )
