"""A ruling too fine for the imager."""

from __future__ import annotations

import math
from collections.abc import Iterator

from patterngen.model.evidence import Evidence
from patterngen.model.verdict import Measurement
from patterngen.rules._examples import dots, preset
from patterngen.rules._measuring import against, idle
from patterngen.rules._words import rounded, ruling
from patterngen.units import RESOLUTION, RULING

SUMMARY = "the imager's pixels are too coarse for the ruling: too few tones"
REASON = """A cell of one screen holds (imager / ruling)^2 pixels of the imager and so that many tones
and the paper. With fewer than about 150 a smooth blend breaks into steps. Several cells laid out
together can reach more, so this fails only where the process asks for it."""
MEASURES = "(imager / ruling)^2 + 1 for each screen with a lattice."
SOURCES = ("tone-steps-formula", "grey-levels", "trade-tone-steps", "iso-12647-9-2021")
LIMITS = ("tone_steps",)
IDLE = "No screen has a lattice."

EXAMPLE_PASS = preset(dots("Cyan", angle="45 deg"), press={"imager": "2400 dpi"})
EXAMPLE_FAIL = preset(
    dots("Cyan", angle="45 deg", ruling="69 /cm"), press={"process": "metal-decoration", "imager": "1200 dpi"}
)


def measure(evidence: Evidence) -> Iterator[Measurement]:
    """Tone steps of every screen with a lattice."""
    imager = evidence.design.job.press.imager_per_mm
    screens = [screen for screen in evidence.design.base.screens if len(screen.frequencies_per_mm)]
    if imager is None and screens:
        yield idle("No imager is stated: name it in [press] to learn how many tones its pixels allow.")
        return
    limit = evidence.limits["tone_steps"]
    for screen in screens:
        if imager is None:
            continue
        steps = (imager / screen.ruling_per_mm) ** 2 + 1
        finest_lpi = imager / math.sqrt(limit.value - 1) / RULING.units["lpi"]
        dpi = rounded(imager / RESOLUTION.units["dpi"], digits=5)
        count = rounded(steps, digits=4)
        text = f"{screen.name}: {dpi} dpi at {ruling(screen.ruling_per_mm)} leaves {count} tone steps"
        if steps < limit.value:
            text += f"; up to {math.floor(finest_lpi)} lpi it would be {rounded(limit.value, digits=4)}"
        yield against(limit, steps, where=screen.name, message=f"{text}.", bad_when="below")
