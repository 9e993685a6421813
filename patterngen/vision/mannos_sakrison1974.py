"""Mannos & Sakrison 1974: the shape of the eye's response from judged image coding.

J. L. Mannos and D. J. Sakrison, 1974, The effects of a visual fidelity criterion on the
encoding of images, IEEE Trans. Inf. Theory 20(4), 525.  As printed in later theses and code:

    A(f) = 2.6 (0.0192 + 0.114 f) exp(-(0.114 f)^1.1)

A is relative, 0.981 at its peak of 7.9 cycles per degree, and says nothing about thresholds.
To be one here, it is scaled so that its peak is that of Barten 1999 under the default light;
the shape is theirs, the height is not.  It knows nothing of light.  Range: f up to about 60
cycles per degree is usual, below about 1 it is too insensitive (recalled, not looked up).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from patterngen.model.lattice import FloatArray

SUMMARY = "Mannos & Sakrison 1974: shape from image coding, scaled to Barten's peak"
VALID_CPD = (1.0, 60.0)
TAKES_LIGHT = False
SOURCE_KEY = "mannos-sakrison-1974"

_PEAK_CPD = 7.890914
"""Where A is greatest."""
PEAK_SENSITIVITY = 693.5212990920603
"""Greatest sensitivity of Barten 1999 at 500 lx on paper of L* 95, in a field of 10 degrees."""


def response(cpd: ArrayLike) -> FloatArray:
    """The published relative response A (...) at `cpd` (...) cycles per degree.

    >>> round(float(response(4.0)), 5)
    0.81053
    """
    f = np.minimum(np.abs(np.asarray(cpd, dtype=float)), 1e9)  # infinity would meet a zero below
    return np.asarray(2.6 * (0.0192 + 0.114 * f) * np.exp(-((0.114 * f) ** 1.1)))


def sensitivity(cpd: ArrayLike, *, luminance_cd_m2: float | None = None) -> FloatArray:
    """Contrast sensitivity (...) at `cpd` (...) cycles per degree; the luminance is ignored."""
    return np.asarray(PEAK_SENSITIVITY / response(_PEAK_CPD) * response(cpd))
