"""Tones that the process does not hold."""

from __future__ import annotations

from collections.abc import Iterator

from patterngen.model.evidence import Evidence
from patterngen.model.screen import Screen
from patterngen.model.verdict import Measurement
from patterngen.rules._examples import dots, preset
from patterngen.rules._measuring import against, extremes, no_limit
from patterngen.rules._words import percent

SUMMARY = "tones lighter or darker than the process holds"
REASON = """Every process has a first tone that prints and a last one that stays open. A flat tint
outside is blank paper or a solid; a picture that runs through it breaks off where it should fade."""
MEASURES = """The lightest tone above zero and the darkest below the solid that each screen carries on
the plate. A flat tint outside fails where the limit is published; a picture only warns, since its ends
are small places."""
SOURCES = ("trade-offset-gain", "trade-tone-range")
LIMITS = ("tone_minimum", "tone_maximum")
IDLE = "No screen has a tone between paper and solid."

EXAMPLE_PASS = preset(dots("Cyan", angle="45 deg"), press={"process": "sheetfed-offset"})
EXAMPLE_FAIL = preset(
    dots("Cyan", angle="45 deg", ruling="60 lpi", tone="0.5 %"), press={"process": "sheetfed-offset"}
)


def measure(evidence: Evidence) -> Iterator[Measurement]:
    """Both ends of every screen's tones."""
    for screen in evidence.design.base.screens:
        low, high = extremes(evidence, screen)
        if 0 < low < 1:
            yield _judged(evidence, screen, low, "tone_minimum")
        if 0 < high < 1:
            yield _judged(evidence, screen, high, "tone_maximum")


def _judged(evidence: Evidence, screen: Screen, tone: float, name: str) -> Measurement:
    limit = evidence.limits.get(name)
    if limit is None:
        return no_limit(evidence, name)
    light = name == "tone_minimum"
    flat = screen.tone.constant is not None
    what = "is a tint of" if flat else f"has its {'lightest' if light else 'darkest'} tone at"
    held = f"from {percent(limit.value)}" if light else f"up to {percent(limit.value)}"
    return against(
        limit,
        tone,
        where=screen.name,
        message=f"{screen.name} {what} {percent(tone)}; the process holds tones {held}.",
        bad_when="below" if light else "above",
        worst=None if flat else "warn",
    )
