"""Barten 1999: contrast sensitivity from photon noise, neural noise and the eye's optics.

P. G. J. Barten, 1999, Contrast Sensitivity of the Human Eye and Its Effects on Image
Quality.  The formula and its constants as documented in colour-science:

    S = (M_opt / k) / sqrt( (2 / T) (1 / X0^2 + 1 / Xmax^2 + u^2 / Nmax^2)
                            (1 / (eta p E) + Phi0 / (1 - exp(-(u / u0)^2))) )
    M_opt = exp(-2 pi^2 sigma^2 u^2)            sigma = hypot(sigma0, C_ab d)
    E = (pi d^2 / 4) L (1 - (d / 9.7)^2 + (d / 12.4)^4)
    d = 5 - 3 tanh(0.4 log10(L X0^2 / 40^2))

The unit trap: sigma0 and C_ab are published in minutes of arc, u is in cycles per degree.
The field is square, X0 degrees wide; both eyes look; the constants are those of a standard
observer of 20 to 30 years with good sight.

Range: Barten compared it with measurements of about 0.2 to 60 cycles per degree in daylight
vision (recalled, not looked up).  Outside, it goes to 0 smoothly at both ends.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike

from patterngen.model.lattice import FloatArray

SUMMARY = "Barten 1999: noise and optics of the eye, depends on the light; the default"
VALID_CPD = (0.2, 60.0)
TAKES_LIGHT = True
SOURCE_KEY = "barten-1999"

FIELD_DEG = 10.0
"""Field of view for which patterns are judged, in degrees a side."""

_SIGNAL_TO_NOISE = 3.0
_INTEGRATION_S = 0.1
_LARGEST_FIELD_DEG = 12.0
_LARGEST_CYCLES = 15.0
_QUANTUM_EFFICIENCY = 0.03
_PHOTONS_PER_TROLAND = 1.2274e6
_NEURAL_NOISE = 3e-8
_INHIBITION_CPD = 7.0
_BLUR_DEG = 0.5 / 60.0
_BLUR_DEG_PER_PUPIL_MM = 0.08 / 60.0


def pupil_mm(*, luminance_cd_m2: float, field_deg: float = FIELD_DEG) -> float:
    """Diameter of the pupil in mm for a square field of that luminance."""
    return 5.0 - 3.0 * math.tanh(0.4 * math.log10(luminance_cd_m2 * field_deg**2 / 40.0**2))


def retinal_illuminance_td(*, luminance_cd_m2: float, diameter_mm: float) -> float:
    """Light on the retina in trolands; light near the pupil's edge counts less (Stiles-Crawford)."""
    edge = 1.0 - (diameter_mm / 9.7) ** 2 + (diameter_mm / 12.4) ** 4
    return 0.25 * math.pi * diameter_mm**2 * luminance_cd_m2 * edge


def sensitivity(
    cpd: ArrayLike, *, luminance_cd_m2: float, field_deg: float = FIELD_DEG, diameter_mm: float | None = None
) -> FloatArray:
    """Contrast sensitivity (...) at `cpd` (...) cycles per degree.

    `luminance_cd_m2` > 0; `diameter_mm` of the pupil follows from the light unless given.
    Returns the inverse of the Michelson contrast that is seen in half of all cases.

    >>> round(float(sensitivity(4.0, luminance_cd_m2=100.0)), 2)
    668.52
    """
    u2 = np.square(np.asarray(cpd, dtype=float))
    d = pupil_mm(luminance_cd_m2=luminance_cd_m2, field_deg=field_deg) if diameter_mm is None else diameter_mm
    sigma = math.hypot(_BLUR_DEG, _BLUR_DEG_PER_PUPIL_MM * d)
    E = retinal_illuminance_td(luminance_cd_m2=luminance_cd_m2, diameter_mm=d)
    M_opt = np.exp(-2.0 * math.pi**2 * sigma**2 * u2)
    area = 1.0 / field_deg**2 + 1.0 / _LARGEST_FIELD_DEG**2 + u2 / _LARGEST_CYCLES**2
    photon_noise = 1.0 / (_QUANTUM_EFFICIENCY * _PHOTONS_PER_TROLAND * E)
    # expm1 keeps the digits of 1 - exp near zero frequency; at zero the noise is infinite and S = 0
    with np.errstate(divide="ignore"):
        neural_noise = _NEURAL_NOISE / -np.expm1(-u2 / _INHIBITION_CPD**2)
    noise = (2.0 / _INTEGRATION_S) * area * (photon_noise + neural_noise)
    return np.asarray(M_opt / (_SIGNAL_TO_NOISE * np.sqrt(noise)))
