"""Directions of screens, and how far apart they stand."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import combinations

import numpy as np

from patterngen.model.evidence import Evidence
from patterngen.model.job import Job
from patterngen.model.lattice import FloatArray
from patterngen.model.screen import Screen

LIKE_RULING = 0.26
"""Two rulings further apart than this share of their mean beat as finely at any angle as equal
ones do 15 degrees apart (2 sin 7.5 degrees = 0.261): there no angle rule has anything to say."""


def apart_deg(a_deg: float, b_deg: float, *, repeat_deg: float) -> float:
    """Distance of two directions that repeat every `repeat_deg`, 0 to half of it.

    >>> apart_deg(15.0, 165.0, repeat_deg=180.0), apart_deg(0.0, 75.0, repeat_deg=90.0)
    (30.0, 15.0)
    """
    off = abs(a_deg - b_deg) % repeat_deg
    return min(off, repeat_deg - off)


def screens_apart_deg(a: Screen, b: Screen) -> float:
    """Least distance between any direction of one screen and any of the other, in degrees."""
    one, other = _directions_deg(a.frequencies_per_mm), _directions_deg(b.frequencies_per_mm)
    return min(apart_deg(float(p), float(q), repeat_deg=180.0) for p in one for q in other)


def _directions_deg(frequencies_per_mm: FloatArray) -> FloatArray:
    return np.rad2deg(np.arctan2(frequencies_per_mm[:, 1], frequencies_per_mm[:, 0])) % 180.0


def like_rulings(a_per_mm: float, b_per_mm: float) -> bool:
    """Whether two rulings are near enough for their angles to matter."""
    return abs(a_per_mm - b_per_mm) <= LIKE_RULING * 0.5 * (a_per_mm + b_per_mm)


def lightest_ink(job: Job) -> str | None:
    """The screened ink of highest lightness (so of highest Y), None where there is but one ink."""
    used = [ink for ink in job.inks if any(screen.ink == ink.name for screen in job.screens)]
    if len(used) < 2:
        return None
    return max(used, key=lambda ink: ink.lab[0]).name


def meeting(evidence: Evidence) -> Iterator[tuple[Screen, Screen]]:
    """Pairs of screens with a lattice and of different inks that are both screened in one place.

    A solid (tone 1) makes no beat and does not count.
    """
    screens = evidence.design.base.screens
    tones = evidence.tones_together
    screened = (tones > 0) & (tones < 1)
    for i, j in combinations(range(len(screens)), 2):
        a, b = screens[i], screens[j]
        lattices = len(a.frequencies_per_mm) and len(b.frequencies_per_mm)
        if a.ink != b.ink and lattices and bool((screened[:, i] & screened[:, j]).any()):
            yield a, b
