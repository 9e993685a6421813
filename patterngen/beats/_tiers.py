"""Which contrast could matter at which frequency: bands of frequency with their least contrast."""

from __future__ import annotations

from itertools import pairwise

import numpy as np

from patterngen.beats._enumerate import Tier
from patterngen.model.lattice import FloatArray
from patterngen.model.seeing import Viewer

LISTED_NEAR = 0.5
LISTED_FAR = 0.1
"""A combination is listed from this visibility, or from this part of the far limit."""

JOINING = 0.4
"""Combinations are looked for down to this part of the least contrast: several may fall on one frequency."""

COARSE_PER_MM = 0.5
"""Up to here (periods of 2 mm and more) beats are also judged by colour."""

_RATIO = 1.25
_SAMPLES = 24


def least_contrast(viewer: Viewer, frequency_per_mm: FloatArray) -> FloatArray:
    """The contrast (n,) from which a combination at a frequency is listed."""
    near, far = viewer.sensitivity_near(frequency_per_mm), viewer.sensitivity_far(frequency_per_mm)
    with np.errstate(divide="ignore", over="ignore"):
        return np.minimum(LISTED_NEAR / near, LISTED_FAR * viewer.limit_at(frequency_per_mm) / far)


def bands(viewer: Viewer, *, start_per_mm: float, strongest: float) -> list[Tier]:
    """Tiers from `start_per_mm` up to where even the contrast `strongest` is not listed."""
    edges = [start_per_mm, *[e for e in (COARSE_PER_MM, 1.0) if e > start_per_mm]]
    probe = np.geomspace(start_per_mm, 4000.0, 1200)
    seen = np.flatnonzero(least_contrast(viewer, probe) * JOINING <= strongest)
    if not len(seen):
        return []
    end = float(probe[min(seen[-1] + 1, len(probe) - 1)])
    while edges[-1] < end:
        edges.append(edges[-1] * _RATIO)
    tiers = []
    for low, high in pairwise(edges):
        # the band that ends at 1 cycle/mm is judged by the coarse limit, 1 itself by the other
        inside = np.linspace(low, high, _SAMPLES)
        if high == 1.0:
            inside[-1] = np.nextafter(1.0, 0.0) - 1e-9
        floor = float(least_contrast(viewer, np.maximum(inside, 1e-9)).min())
        if np.isfinite(floor) and floor * JOINING <= strongest:
            tiers.append(Tier(low, high, 0.98 * JOINING * floor))
    return tiers


def octave(period_mm: FloatArray) -> FloatArray:
    """Number (n,) of the octave of windows in which tones must hold for a beat of that period.

    Octave o has windows of `window_mm(o)`, the next smaller one to the period, so that an
    area is never overlooked; below the first, tones of the first are taken.
    """
    with np.errstate(divide="ignore"):
        number = np.floor(np.log2(np.maximum(period_mm, 1e-9) / window_mm(0)) + 1e-9)
    return np.asarray(np.maximum(number, 0))


def window_mm(number: int) -> float:
    """Width of the windows of an octave."""
    return 0.25 * 2.0**number
