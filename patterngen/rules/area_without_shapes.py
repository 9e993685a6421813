"""An area that nothing is drawn in."""

from __future__ import annotations

from collections.abc import Iterator

from patterngen.model.evidence import Evidence
from patterngen.model.screen import Screen
from patterngen.model.verdict import Measurement
from patterngen.rules._examples import dots, preset
from patterngen.rules._words import rounded
from patterngen.sources import source

SUMMARY = "a screen draws nothing: its area holds no shape"
REASON = """An area that is empty, outside the sheet, smaller than one cell or blank in its picture gives
a plate without anything on it. That is a mistake in the artwork, and it is found here and not on press."""
MEASURES = """How many shapes each screen draws; where they were not counted, how many cells of its
ruling its area holds."""
SOURCES = ("own-rule",)
LIMITS: tuple[str, ...] = ()
IDLE = "There are no screens."

EXAMPLE_PASS = preset(dots("Cyan", angle="45 deg"))
EXAMPLE_FAIL = preset(dots("Cyan", angle="45 deg"), dots("Black", angle="75 deg", tone="0 %"))


def measure(evidence: Evidence) -> Iterator[Measurement]:
    """Shapes, or cells, of every screen."""
    for screen in evidence.design.base.screens:
        drawn = evidence.shapes_drawn.get(screen.name)
        if drawn is None:
            yield _cells(screen)
            continue
        yield Measurement(
            float(drawn),
            1.0,
            "shapes",
            screen.name,
            f"{screen.name} draws {drawn or 'no'} shape{'' if drawn == 1 else 's'} in {screen.area.label}.",
            source("own-rule"),
            bad_when="below",
        )


def _cells(screen: Screen) -> Measurement:
    """An area smaller than one cell may miss every dot; it warns, for a part of a dot may be enough."""
    cells = screen.area.area_mm2() * screen.ruling_per_mm**2
    return Measurement(
        cells,
        1.0,
        "cells",
        screen.name,
        f"{screen.name} has about {rounded(cells)} cells in {screen.area.label}.",
        source("own-rule"),
        bad_when="below",
        worst="warn",
    )
