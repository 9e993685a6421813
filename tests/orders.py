"""Plain boxes and balls of orders through the program's own enumeration, for checks and timing."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from patterngen.beats._enumerate import Candidates, OrderArray, Tier, _leading_sign, combinations
from patterngen.model.lattice import FloatArray


def _orders_within(dimensions: int, reach: int) -> OrderArray:
    axis = np.arange(-reach, reach + 1, dtype=np.int32)
    grid = np.stack(np.meshgrid(*[axis] * dimensions, indexing="ij"), axis=-1).reshape(-1, dimensions)
    return grid[grid.any(axis=1)]


def combinations_in_box(frequencies_per_mm: Sequence[FloatArray], *, reach: int, f_max_per_mm: float) -> OrderArray:
    """Orders (h, total axes) of all combinations with |k| <= reach on each axis and |F| <= f_max.

    `frequencies_per_mm` holds one (d, 2) array a screen.  k and -k are one (the first
    order that is not zero is positive); zero itself and single screens are included,
    but not k = 0.
    """
    return _plain(frequencies_per_mm, reach, f_max_per_mm, ball=False)


def combinations_by_order(frequencies_per_mm: Sequence[FloatArray], *, total: int, f_max_per_mm: float) -> OrderArray:
    """The same for all combinations whose orders' moduli add up to at most `total`."""
    return _plain(frequencies_per_mm, total, f_max_per_mm, ball=True)


def _plain(frequencies_per_mm: Sequence[FloatArray], reach: int, f_max_per_mm: float, *, ball: bool) -> OrderArray:
    participants = []
    for vectors in frequencies_per_mm:
        orders = _orders_within(len(vectors), reach)
        if ball:
            orders = orders[np.abs(orders).sum(axis=1) <= reach]
        size = np.abs(orders).sum(axis=1) if ball else np.zeros(len(orders))
        participants.append(Candidates(orders, orders @ vectors, 0.5**size, np.zeros((0, 2))))
    tier = Tier(-1.0, f_max_per_mm, 0.5**reach if ball else 1.0)
    found = combinations(participants, [tier], budget=1 << 26, least=1)
    columns = []
    for i, candidates in enumerate(participants):
        padded = np.concatenate([candidates.orders, np.zeros((1, candidates.orders.shape[1]), dtype=np.int32)])
        columns.append(padded[found.choice[:, i]])
    orders = np.concatenate(columns, axis=1)
    return orders * _leading_sign(orders)[:, None]
