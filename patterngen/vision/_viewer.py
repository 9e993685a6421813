"""From the viewing conditions of a job to somebody who looks."""

from __future__ import annotations

import math
from functools import partial

from patterngen import registry
from patterngen.model.job import Viewing
from patterngen.model.seeing import Viewer


def luminance_cd_m2(*, light_lx: float, paper_y: float) -> float:
    """Luminance of paper, taken as a matt surface, of luminance factor `paper_y` (0 to 1).

    >>> round(luminance_cd_m2(light_lx=500.0, paper_y=0.876183), 2)
    139.45
    """
    return light_lx * paper_y / math.pi


def viewer(viewing: Viewing, *, paper_y: float) -> Viewer:
    """The eye, distances and limits of `viewing`, on paper of luminance factor `paper_y` (0 to 1).

    Raises `InputError` when no eye model has that name.
    """
    model = registry.load("patterngen.vision", viewing.eye)
    luminance = luminance_cd_m2(light_lx=viewing.light_lx, paper_y=paper_y)
    return Viewer(
        distance_mm=viewing.distance_mm,
        far_mm=viewing.far_mm,
        limit=viewing.limit,
        limit_coarse=viewing.limit_coarse,
        sensitivity=partial(model.sensitivity, luminance_cd_m2=luminance),
    )
