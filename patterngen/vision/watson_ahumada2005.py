"""Watson & Ahumada 2005: the contrast sensitivity of their standard observer.

A. B. Watson and A. J. Ahumada, 2005, A standard model for foveal detection of spatial
contrast, J. Vision 5(9), 717.  The abstract was read, the constants were taken from public
code that quotes the paper:

    S = 373.08 [ sech((f / 4.1726)^0.7786) - 0.8493 sech(f / 1.3625) ]

Fitted to thresholds of small patches seen foveally on a display of one luminance, so it knows
nothing of light or field.  Range: the patches ran from 1.12 to 30 cycles per degree (recalled,
not looked up).  Below, it levels off at 56 instead of going to 0.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from patterngen.model.lattice import FloatArray

SUMMARY = "Watson & Ahumada 2005: thresholds of small patches, one luminance"
VALID_CPD = (1.12, 30.0)
TAKES_LIGHT = False
SOURCE_KEY = "watson-ahumada-2005"


def sensitivity(cpd: ArrayLike, *, luminance_cd_m2: float | None = None) -> FloatArray:
    """Contrast sensitivity (...) at `cpd` (...) cycles per degree; the luminance is ignored.

    >>> round(float(sensitivity(4.0)), 2)
    214.2
    """
    f = np.abs(np.asarray(cpd, dtype=float))
    return np.asarray(373.08 * (_sech((f / 4.1726) ** 0.7786) - 0.8493 * _sech(f / 1.3625)))


def _sech(x: FloatArray) -> FloatArray:
    """1 / cosh for x >= 0, without the overflow of cosh."""
    fall = np.exp(-x)
    return 2.0 * fall / (1.0 + fall * fall)
