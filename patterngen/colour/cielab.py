"""CIELAB and XYZ under D50 for the 2 degree observer, CIEDE2000, and sRGB for screens.

XYZ is relative: the perfect diffuser has Y = 1 (not 100, the trap of this field).  Every
function takes arrays whose last axis holds the three components.

Sources by their keys: iso-11664-4 for CIELAB, cie-15-2018 for its white, sharma-2005 for
CIEDE2000 as it is computed, iec-61966-2-1 for sRGB, icc-1 for the Bradford adaptation.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from patterngen.model.lattice import FloatArray


def _white(x: float, y: float) -> FloatArray:
    """XYZ of a white of that chromaticity with Y = 1."""
    return np.array([x / y, 1.0, (1.0 - x - y) / y])


D50 = _white(0.3457, 0.3585)
"""White of print: CIE illuminant D50, 2 degrees."""
D65 = _white(0.3127, 0.3290)
"""White of sRGB."""

_EDGE = 24.0 / 116.0
"""Below the cube of this, CIELAB is a straight line instead of a cube root."""
_SLOPE = 841.0 / 108.0

_BRADFORD = np.array([[0.8951, 0.2664, -0.1614], [-0.7502, 1.7135, 0.0367], [0.0389, -0.0685, 1.0296]])
_D50_TO_D65 = np.linalg.inv(_BRADFORD) @ np.diag((_BRADFORD @ D65) / (_BRADFORD @ D50)) @ _BRADFORD
_XYZ_TO_RGB = np.array([[3.2406, -1.5372, -0.4986], [-0.9689, 1.8758, 0.0415], [0.0557, -0.2040, 1.0570]])


def lab_to_xyz(lab: ArrayLike) -> FloatArray:
    """CIELAB (..., 3) to XYZ (..., 3), the perfect diffuser at Y = 1.

    >>> lab_to_xyz([100, 0, 0]).round(4).tolist()
    [0.9643, 1.0, 0.8251]
    """
    lightness, a, b = np.moveaxis(np.asarray(lab, dtype=float), -1, 0)
    y = (lightness + 16.0) / 116.0
    f = np.stack([y + a / 500.0, y, y - b / 200.0], axis=-1)
    return np.asarray(np.where(f > _EDGE, f**3, (f - 16.0 / 116.0) / _SLOPE) * D50)


def xyz_to_lab(xyz: ArrayLike) -> FloatArray:
    """XYZ (..., 3) to CIELAB (..., 3); the inverse of `lab_to_xyz`."""
    share = np.asarray(xyz, dtype=float) / D50
    f = np.where(share > _EDGE**3, np.cbrt(share), _SLOPE * share + 16.0 / 116.0)
    x, y, z = np.moveaxis(f, -1, 0)
    return np.stack([116.0 * y - 16.0, 500.0 * (x - y), 200.0 * (y - z)], axis=-1)


def ciede2000(lab_a: ArrayLike, lab_b: ArrayLike) -> FloatArray:
    """Colour difference CIEDE2000 (...) between CIELAB (..., 3) and (..., 3), all factors k = 1.

    The formula is jumpy where hues lie opposite each other and was made for differences
    below about 5; beyond, it still orders colours but its size should not be trusted.
    Source: Sharma, Wu & Dalal 2005, equations 2 to 22, whose letters are kept here.

    >>> float(ciede2000([50, 2.6772, -79.7751], [50, 0, -82.7485]).round(4))
    2.0425
    """
    L1, a1, b1 = np.moveaxis(np.asarray(lab_a, dtype=float), -1, 0)
    L2, a2, b2 = np.moveaxis(np.asarray(lab_b, dtype=float), -1, 0)
    C_mean7 = (0.5 * (np.hypot(a1, b1) + np.hypot(a2, b2))) ** 7
    G = 0.5 * (1.0 - np.sqrt(C_mean7 / (C_mean7 + 25.0**7)))
    a1, a2 = (1.0 + G) * a1, (1.0 + G) * a2
    C1, C2 = np.hypot(a1, b1), np.hypot(a2, b2)
    h1, h2 = np.rad2deg(np.arctan2(b1, a1)) % 360.0, np.rad2deg(np.arctan2(b2, a2)) % 360.0
    grey = C1 * C2 == 0.0  # a grey has no hue of its own: no hue difference, and the other's hue

    turn = h2 - h1
    dh = np.where(grey, 0.0, turn - 360.0 * (turn > 180.0) + 360.0 * (turn < -180.0))
    dL, dC = L2 - L1, C2 - C1
    dH = 2.0 * np.sqrt(C1 * C2) * np.sin(np.deg2rad(0.5 * dh))

    L, C = 0.5 * (L1 + L2), 0.5 * (C1 + C2)
    both = h1 + h2
    across = np.where(both < 360.0, both + 360.0, both - 360.0)
    h = np.where(grey, both, 0.5 * np.where(np.abs(turn) > 180.0, across, both))
    T = (
        1.0
        - 0.17 * np.cos(np.deg2rad(h - 30.0))
        + 0.24 * np.cos(np.deg2rad(2.0 * h))
        + 0.32 * np.cos(np.deg2rad(3.0 * h + 6.0))
        - 0.20 * np.cos(np.deg2rad(4.0 * h - 63.0))
    )
    R_C = 2.0 * np.sqrt(C**7 / (C**7 + 25.0**7))
    R_T = -R_C * np.sin(np.deg2rad(60.0 * np.exp(-(((h - 275.0) / 25.0) ** 2))))
    lightness = dL / (1.0 + 0.015 * (L - 50.0) ** 2 / np.sqrt(20.0 + (L - 50.0) ** 2))
    chroma = dC / (1.0 + 0.045 * C)
    hue = dH / (1.0 + 0.015 * C * T)
    square = lightness**2 + chroma**2 + hue**2 + R_T * chroma * hue
    return np.asarray(np.sqrt(np.maximum(square, 0.0)))


def lab_to_srgb(lab: ArrayLike) -> FloatArray:
    """CIELAB (..., 3) to coded sRGB (..., 3), each 0 to 1; what sRGB cannot show is clipped."""
    linear = np.clip(lab_to_xyz(lab) @ (_XYZ_TO_RGB @ _D50_TO_D65).T, 0.0, 1.0)
    return np.asarray(np.where(linear <= 0.0031308, 12.92 * linear, 1.055 * linear ** (1.0 / 2.4) - 0.055))


def lab_to_hex(lab: ArrayLike) -> str:
    """One CIELAB colour (3,) as "#rrggbb" for a screen.

    >>> lab_to_hex([100, 0, 0])
    '#ffffff'
    """
    return "#" + bytes(np.rint(255.0 * lab_to_srgb(lab)).astype(np.uint8)).hex()
