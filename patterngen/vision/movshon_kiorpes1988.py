"""Movshon & Kiorpes 1988: a plain curve of three constants for grown-up observers.

J. A. Movshon and L. Kiorpes, 1988, Analysis of the development of spatial contrast sensitivity
in monkey and human infants, J. Opt. Soc. Am. A 5(12).  The paper was not read; form and
constants are recalled from image-appearance work that cites it:

    S = 75 f^0.8 exp(-0.2 f)

Other constants go about under the same name, so a result always states these.  It knows nothing
of light.  Range: about 0.5 to 30 cycles per degree (recalled, not looked up).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from patterngen.model.lattice import FloatArray

SUMMARY = "Movshon & Kiorpes 1988: 75 f^0.8 exp(-0.2 f), constants from memory"
VALID_CPD = (0.5, 30.0)
TAKES_LIGHT = False
SOURCE_KEY = "movshon-kiorpes-1988"


def sensitivity(cpd: ArrayLike, *, luminance_cd_m2: float | None = None) -> FloatArray:
    """Contrast sensitivity (...) at `cpd` (...) cycles per degree; the luminance is ignored.

    >>> round(float(sensitivity(4.0)), 2)
    102.16
    """
    f = np.minimum(np.abs(np.asarray(cpd, dtype=float)), 1e9)  # infinity would meet a zero below
    return np.asarray(75.0 * f**0.8 * np.exp(-0.2 * f))
