"""An area that nothing is drawn in."""

from __future__ import annotations

from collections.abc import Iterator

from patterngen.model.evidence import Evidence
from patterngen.model.verdict import Measurement
from patterngen.rules._examples import dots, preset
from patterngen.rules._measuring import idle
from patterngen.sources import source

SUMMARY = "a screen draws nothing: its area holds no shape"
REASON = """An area that is empty, outside the sheet, smaller than one cell or blank in its picture gives
a plate without anything on it. That is a mistake in the artwork, and it is found here and not on press."""
MEASURES = "How many shapes each screen draws."
SOURCES = ("own-rule",)
LIMITS: tuple[str, ...] = ()
IDLE = "There are no screens."

EXAMPLE_PASS = preset(dots("Cyan", angle="45 deg"))
EXAMPLE_FAIL = preset(dots("Cyan", angle="45 deg"), dots("Black", angle="75 deg", tone="0 %"))


def measure(evidence: Evidence) -> Iterator[Measurement]:
    """Shapes of every screen that were counted."""
    for screen in evidence.design.base.screens:
        drawn = evidence.shapes_drawn.get(screen.name)
        if drawn is None:
            yield idle(f"The shapes of {screen.name} were not counted.")
            continue
        yield Measurement(
            float(drawn),
            1.0,
            "shapes",
            screen.name,
            f"{screen.name} draws {drawn if drawn else 'no'} shape{'' if drawn == 1 else 's'} in "
            f"{screen.area.label}.",
            source("own-rule"),
            bad_when="below",
        )
