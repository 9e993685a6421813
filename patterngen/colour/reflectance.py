"""What a half-tone reflects: shares of overlaps, Murray-Davies, Yule-Nielsen, and back again.

Reflectances may be any linear quantity (a band of the spectrum, or each of X, Y, Z) in any
common unit.  A coverage that is measured depends on the model that it was read with: at one
half-tone n = 1 and n = 1.7 differ by 13 % of area, so n is always named beside it.

Sources by their keys: demichel-1924, neugebauer-1937, murray-davies-1936, yule-nielsen-1951;
wyble-berns-2000 reviews them.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from patterngen.model.lattice import FloatArray


def overlap_shares(tones: ArrayLike) -> FloatArray:
    """Share of the area that every combination of n screens covers, (2,) * n, sum 1.

    `tones` (n,) 0 to 1; index 1 on an axis means that this screen inks the point.  Holds for
    screens that meet by chance, that is, averaged over register: not in a balanced set.
    Source: Demichel 1924.

    >>> overlap_shares([0.3, 0.5]).round(2).tolist()
    [[0.35, 0.35], [0.15, 0.15]]
    """
    shares = np.ones(())
    for tone in np.asarray(tones, dtype=float):
        shares = np.multiply.outer(shares, np.array([1.0 - tone, tone]))
    return shares


def mixed(shares: ArrayLike, reflectances: ArrayLike, *, yule_nielsen: float = 1.0) -> FloatArray:
    """Reflectance (...) of a mixture: `shares` (m,) of `reflectances` (m, ...).

    Neugebauer 1937 for n = 1 (Murray-Davies 1936 when there are two), with the root of
    Yule & Nielsen 1951 for n > 1, which stands for light that spreads inside the paper.

    >>> float(mixed([0.5, 0.5], [0.85, 0.05], yule_nielsen=2).round(7))
    0.3280776
    """
    roots = np.asarray(reflectances, dtype=float) ** (1.0 / yule_nielsen)
    return np.asarray(np.tensordot(np.asarray(shares, dtype=float), roots, axes=1) ** yule_nielsen)


def coverage_from_densities(tint: ArrayLike, *, solid: float, yule_nielsen: float = 1.0) -> FloatArray:
    """Coverage (...) from the density of a tint and of the solid, both above the paper.

    Source: Murray & Davies 1936; Yule & Nielsen 1951 for n > 1.

    >>> float(coverage_from_densities(0.30, solid=1.50).round(7))
    0.5151017
    """
    # 1 - 10^-d without the loss of digits that small densities would bring
    to_share = np.log(10.0) / yule_nielsen
    return np.asarray(np.expm1(-np.asarray(tint, dtype=float) * to_share) / np.expm1(-solid * to_share))
