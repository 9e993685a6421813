"""Barten 2003: the short form of his model, for typical eyes.

P. G. J. Barten, 2003, Formula for the contrast sensitivity of the human eye, Proc. SPIE 5294.
Read in part; the term 144 / X0^2 is recalled:

    S = 5200 exp(-0.0016 u^2 (1 + 100 / L)^0.08)
        / sqrt( (1 + 144 / X0^2 + 0.64 u^2) (63 / L^0.83 + 1 / (1 - exp(-0.02 u^2))) )

Within 10 % of Barten 1999 from 1 to 16 cycles per degree under office light, 12 % above it at 30.
Range: as Barten 1999 (recalled, not looked up), in daylight vision.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from patterngen.model.lattice import FloatArray

SUMMARY = "Barten 2003: the short form, depends on the light"
VALID_CPD = (0.2, 60.0)
TAKES_LIGHT = True
SOURCE_KEY = "barten-2003"

FIELD_DEG = 10.0
"""Field of view for which patterns are judged, in degrees a side."""


def sensitivity(cpd: ArrayLike, *, luminance_cd_m2: float, field_deg: float = FIELD_DEG) -> FloatArray:
    """Contrast sensitivity (...) at `cpd` (...) cycles per degree; `luminance_cd_m2` > 0.

    >>> round(float(sensitivity(4.0, luminance_cd_m2=100.0)), 2)
    633.74
    """
    u2 = np.square(np.asarray(cpd, dtype=float))
    L = luminance_cd_m2
    optics = np.exp(-0.0016 * u2 * (1.0 + 100.0 / L) ** 0.08)
    area = 1.0 + 144.0 / field_deg**2 + 0.64 * u2
    # expm1 keeps the digits of 1 - exp near zero frequency; at zero the noise is infinite and S = 0
    with np.errstate(divide="ignore"):
        noise = 63.0 / L**0.83 + 1.0 / -np.expm1(-0.02 * u2)
    return np.asarray(5200.0 * optics / np.sqrt(area * noise))
