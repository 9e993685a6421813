"""Lines that do not hold, and gaps between them that fill in."""

from __future__ import annotations

from collections.abc import Iterator

from patterngen.model.evidence import Evidence
from patterngen.model.screen import Screen
from patterngen.model.verdict import Measurement
from patterngen.rules import _limits
from patterngen.rules._examples import lines, preset
from patterngen.rules._measuring import against, extremes, no_limit
from patterngen.rules._words import percent, width

SUMMARY = "lines of a line screen too fine to hold, or gaps between them too fine to stay open"
REASON = """A line screen carries its tone in the width of its lines. Fine lines break up or vanish in
light tones; in dark ones the gaps between them fill in, sooner than lines vanish because every edge
grows."""
MEASURES = """Width of the line, as drawn on the plate, at the lightest tone of each line screen, and of
the gap at its darkest tone short of the solid. Below line_minimum it fails, below line_advised it warns."""
SOURCES = ("trade-offset-lines", "trade-line-and-gap")
LIMITS = ("line_minimum", "line_advised", "gap_minimum")
IDLE = "No line screen has a tone between paper and solid."

EXAMPLE_PASS = preset(lines("Cyan", angle="45 deg"), press={"process": "sheetfed-offset"})
EXAMPLE_FAIL = preset(lines("Cyan", angle="45 deg", tone="8 %"), press={"process": "sheetfed-offset"})


def measure(evidence: Evidence) -> Iterator[Measurement]:
    """Line and gap of every line screen."""
    for screen in evidence.design.base.screens:
        if len(screen.frequencies_per_mm) != 1:
            continue
        low, high = extremes(evidence, screen)
        if 0 < low < 1:
            yield _line(evidence, screen, low)
        if 0 < high < 1:
            yield _gap(evidence, screen, high)


def _line(evidence: Evidence, screen: Screen, tone: float) -> Measurement:
    hard, advised = evidence.limits.get("line_minimum"), evidence.limits.get("line_advised")
    if hard is None:
        return no_limit(evidence, "line_minimum")
    width_mm = screen.smallest_mm(tone)[0]
    also = f", and {width(advised.value)} is advised" if advised else ""
    return Measurement(
        width_mm,
        hard.value,
        hard.unit,
        screen.name,
        f"{screen.name}: at {percent(tone)} its lines are {width(width_mm)} wide; lines hold from "
        f"{width(hard.value)}{also}.",
        hard.source,
        bad_when="below",
        warn_at=max(advised.value, hard.value) if advised else None,
        warn_source=advised.source if advised else None,
        worst=_limits.worst(hard) if screen.tone.constant is not None else "warn",
    )


def _gap(evidence: Evidence, screen: Screen, tone: float) -> Measurement:
    limit = evidence.limits.get("gap_minimum")
    if limit is None:
        return no_limit(evidence, "gap_minimum")
    width_mm = screen.smallest_mm(tone)[1]
    return against(
        limit,
        width_mm,
        where=screen.name,
        message=(
            f"{screen.name}: at {percent(tone)} the gaps between its lines are {width(width_mm)} wide; "
            f"gaps stay open from {width(limit.value)}."
        ),
        bad_when="below",
    )
