"""What a rule may look at: the design and everything computed about it.  Nothing here draws."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from patterngen.model.design import Design
from patterngen.model.lattice import FloatArray
from patterngen.model.verdict import Balance, BeatTable, Limit


@dataclass(frozen=True, slots=True, eq=False)
class Evidence:
    """Inputs of every rule.

    `limits` are those in force (process and overrides) by name.  `tones_together` (m, screens)
    lists plate tones that occur together somewhere on the sheet.  `luminance` maps an ink's
    name to Y of its solid (paper = 1).
    """

    design: Design
    beats: BeatTable
    balance: tuple[Balance, ...]
    limits: Mapping[str, Limit]
    tones_together: FloatArray
    luminance: Mapping[str, float]
    tone_extremes: Mapping[str, tuple[float, float]]
    """Per screen: (smallest non-zero, largest) plate tone that occurs."""
    shapes_drawn: Mapping[str, int | None]
    """Per screen: how many shapes it draws, None where that was not counted."""
    most_ink: float
    """The largest sum of printed tones in one place (1 = 100 %); screens of one ink do not add up."""
    heaviest: FloatArray
    """Printed tones (screens,) in that place."""
    paper_y: float
    """Y of the paper (perfect diffuser = 1)."""
    eye_valid_cpd: tuple[float, float] | None = None
    """Cycles per degree between which the eye model is published, None where that is not known."""
    eye_takes_light: bool = True
    """False for an eye model that knows no luminance."""
