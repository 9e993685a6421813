"""How bright the paper is in the light of the job."""

from __future__ import annotations

import math

from patterngen.model.job import Lab


def luminance_cd_m2(*, light_lx: float, paper_lab: Lab) -> float:
    """Luminance of paper in cd/m2, taken as a matt surface: light x luminance factor / pi.

    Only L* of the CIELAB colour counts.  Source: iso-11664-4 for the luminance factor of L*.

    >>> round(luminance_cd_m2(light_lx=500.0, paper_lab=(95.0, 0.0, -2.0)), 2)
    139.45
    """
    lightness = paper_lab[0]
    cube = ((lightness + 16.0) / 116.0) ** 3
    return light_lx * (cube if lightness > 8.0 else lightness * (3.0 / 29.0) ** 3) / math.pi
