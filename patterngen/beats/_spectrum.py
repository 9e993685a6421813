"""What each participant can contribute at the tones that occur: tables of Fourier coefficients."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from patterngen.beats._enumerate import Candidates, IndexArray, OrderArray
from patterngen.model.lattice import FloatArray
from patterngen.model.screen import ComplexArray, Grid, Screen

_TAIL_RADII = 2.0 ** np.arange(0.0, 6.5, 0.5)


class Spectrum:
    """Coefficients of one screen or grid, for every row of tones, up to a reach that can grow.

    Flat positions index all orders of the box |k| <= reach; `nothing` is the position that
    stands for not taking part (factor 1).
    """

    def __init__(
        self, name: str, frequencies_per_mm: FloatArray, coefficients: Callable[[float, int], ComplexArray],
        tail: Callable[[float, float], float], tones: FloatArray, *, reach: int,
    ) -> None:  # fmt: skip
        self.name = name
        self.frequencies_per_mm = np.asarray(frequencies_per_mm, dtype=float)
        self.axes = len(self.frequencies_per_mm)
        self._coefficients, self._tail = coefficients, tail
        self.levels, self._level_of_row = np.unique(tones, return_inverse=True)
        stretch = np.linalg.svd(self.frequencies_per_mm, compute_uv=False)
        self.shortest_per_mm, self.longest_per_mm = float(stretch[-1]), float(stretch[0])
        self._bounds: dict[float, float] = {}
        self.widen(reach)

    @classmethod
    def of_screen(cls, screen: Screen, tones: FloatArray, *, reach: int) -> Spectrum:
        """The spectrum of a screen at the printed tones (rows,)."""
        return cls(
            screen.name, screen.frequencies_per_mm,
            lambda tone, reach: screen.coefficients(tone, reach=reach),
            lambda tone, radius: screen.tail(tone, radius=radius),
            np.asarray(tones, dtype=float), reach=reach,
        )  # fmt: skip

    @classmethod
    def of_grid(cls, grid: Grid, rows: int, *, reach: int) -> Spectrum:
        """The spectrum of a grid that does not sample, the same in all rows."""
        return cls(
            grid.name, grid.frequencies_per_mm,
            lambda _tone, reach: grid.coefficients(reach=reach),
            lambda _tone, radius: grid.tail(radius=radius),
            np.full(rows, 0.5), reach=reach,
        )  # fmt: skip

    def widen(self, reach: int) -> None:
        """Work out all orders up to `reach` on each axis."""
        self.reach = reach
        axis = np.arange(-reach, reach + 1, dtype=np.int32)
        grids = np.meshgrid(*[axis] * self.axes, indexing="ij")
        self.orders: OrderArray = np.stack(grids, axis=-1).reshape(-1, self.axes)
        self.nothing = len(self.orders) // 2
        screened = (self.levels > 0) & (self.levels < 1)
        self.table = np.zeros((len(self.levels), len(self.orders)), dtype=complex)
        for level in np.flatnonzero(screened):
            self.table[level] = self._coefficients(float(self.levels[level]), reach).ravel()
        self.table[:, self.nothing] = 1.0
        self.modulus = np.abs(self.table)
        self.envelope = self.modulus.max(axis=0)

    def positions(self, orders: OrderArray) -> IndexArray:
        """Flat positions of orders (n, axes) inside the reach."""
        side = 2 * self.reach + 1
        at = np.zeros(len(orders), dtype=np.intp)
        for axis in range(self.axes):
            at = at * side + (orders[:, axis] + self.reach)
        return at

    def at_row(self, row: int) -> tuple[ComplexArray, FloatArray]:
        """Coefficients and their moduli (orders,) in one row of tones."""
        level = self._level_of_row[row]
        return self.table[level], self.modulus[level]

    def tail(self, radius: float) -> float:
        """The largest tail bound over all tones that occur."""
        if radius not in self._bounds:
            screened = self.levels[(self.levels > 0) & (self.levels < 1)]
            self._bounds[radius] = max((self._tail(float(tone), radius) for tone in screened), default=0.0)
        return self._bounds[radius]

    def unlisted(self, share: float) -> FloatArray:
        """Rows (length, weight) that bound all orders beyond the reach, `share` times the tail.

        Beyond the reach some |k| on an axis is at least reach + 1.  A vector as long as
        `longest` * r has an order of at least r.
        """
        first = self.reach + 1.0
        rows = [(self.shortest_per_mm * first, share * self.tail(first))]
        for factor in _TAIL_RADII[1:]:
            length = self.longest_per_mm * first * float(factor)
            rows.append((length, min(rows[-1][1], share * self.tail(first * float(factor)))))
        return np.array(rows)

    def candidates(self, share: float, *, least: float = 0.0) -> tuple[Candidates, IndexArray]:
        """Orders with `share` times the coefficient above `least`, and their flat positions."""
        weight = share * self.envelope
        weight[self.nothing] = 0.0
        kept = np.flatnonzero(weight > max(least, 1e-15))
        orders = self.orders[kept]
        return Candidates(orders, orders @ self.frequencies_per_mm, weight[kept], self.unlisted(share)), kept
