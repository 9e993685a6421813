"""What each participant can contribute at the tones that occur: tables of Fourier coefficients."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from patterngen.beats._enumerate import Candidates, IndexArray, OrderArray
from patterngen.model.lattice import FloatArray
from patterngen.model.screen import ComplexArray, Grid, Screen

_FIRST_REACH = {1: 64, 2: 40}
_LAST_REACH = {1: 1024, 2: 80}
_TAIL_RADII = (1.0, 4.0)
"""Where beyond the reach tails are asked for, in parts of the first order that is not worked out."""

_WIDE_LEVELS = 8
"""With more tones than these (pictures) a reach is not widened: each costs as much again."""

_NOTHING = 1e-15


class Spectrum:
    """Coefficients of one screen or grid, for every row of tones, up to a reach that can grow.

    Flat positions index all orders of the box |k| <= reach; `nothing` is the position that
    stands for not taking part (factor 1).
    """

    def __init__(
        self, name: str, frequencies_per_mm: FloatArray, coefficients: Callable[[float, int], ComplexArray],
        tail: Callable[[float, float], float], tones: FloatArray,
    ) -> None:  # fmt: skip
        self.name = name
        self.frequencies_per_mm = np.asarray(frequencies_per_mm, dtype=float)
        self.axes = len(self.frequencies_per_mm)
        self._coefficients, self._tail = coefficients, tail
        self._levels, self._level_of_row = np.unique(tones, return_inverse=True)
        stretch = np.linalg.svd(self.frequencies_per_mm, compute_uv=False)
        self.shortest_per_mm, self.longest_per_mm = float(stretch[-1]), float(stretch[0])
        self._bounds: dict[float, FloatArray] = {}
        self._work_out(_FIRST_REACH[self.axes])

    @classmethod
    def of_screen(cls, screen: Screen, tones: FloatArray) -> Spectrum:
        """The spectrum of a screen at the printed tones (rows,)."""
        return cls(
            screen.name, screen.frequencies_per_mm,
            lambda tone, reach: screen.coefficients(tone, reach=reach),
            lambda tone, radius: screen.tail(tone, radius=radius),
            np.asarray(tones, dtype=float),
        )  # fmt: skip

    @classmethod
    def of_grid(cls, grid: Grid, rows: int) -> Spectrum:
        """The spectrum of a grid that does not sample, the same in all rows."""
        return cls(
            grid.name, grid.frequencies_per_mm,
            lambda _tone, reach: grid.coefficients(reach=reach),
            lambda _tone, radius: grid.tail(radius=radius),
            np.full(rows, 0.5),
        )  # fmt: skip

    def widen(self) -> bool:
        """Double the reach; False when it is at its cap already, or too many tones occur."""
        if self.reach >= _LAST_REACH[self.axes] or len(self._levels) > _WIDE_LEVELS:
            return False
        self._work_out(min(2 * self.reach, _LAST_REACH[self.axes]))
        return True

    def _work_out(self, reach: int) -> None:
        self.reach = reach
        axis = np.arange(-reach, reach + 1, dtype=np.int32)
        grids = np.meshgrid(*[axis] * self.axes, indexing="ij")
        self.orders: OrderArray = np.stack(grids, axis=-1).reshape(-1, self.axes)
        self.nothing = len(self.orders) // 2
        screened = (self._levels > 0) & (self._levels < 1)
        self._table = np.zeros((len(self._levels), len(self.orders)), dtype=complex)
        for level in np.flatnonzero(screened):
            self._table[level] = self._coefficients(float(self._levels[level]), reach).ravel()
        self._table[:, self.nothing] = 1.0
        self._modulus = np.abs(self._table)

    def positions(self, orders: OrderArray) -> IndexArray:
        """Flat positions of orders (n, axes) inside the reach."""
        side = 2 * self.reach + 1
        at = np.zeros(len(orders), dtype=np.intp)
        for axis in range(self.axes):
            at = at * side + (orders[:, axis] + self.reach)
        return at

    def coefficients(self, row: int) -> ComplexArray:
        """Coefficients by flat position in one row of tones."""
        return np.asarray(self._table[self._level_of_row[row]])

    def moduli(self, row: int) -> FloatArray:
        """Their moduli."""
        return np.asarray(self._modulus[self._level_of_row[row]])

    @property
    def envelope(self) -> FloatArray:
        """By flat position the largest modulus at any tone that occurs."""
        return np.asarray(self._modulus.max(axis=0))

    def candidates(self, share: FloatArray) -> Candidates:
        """All orders of some weight: coefficient times `share` (rows,), in the row where that is largest."""
        of_level = np.zeros(len(self._levels))
        np.maximum.at(of_level, self._level_of_row, share)
        weight = (of_level[:, None] * self._modulus).max(axis=0)
        weight[self.nothing] = 0.0
        kept = np.flatnonzero(weight > _NOTHING)
        orders = self.orders[kept]
        return Candidates(orders, orders @ self.frequencies_per_mm, weight[kept], self._unlisted(of_level))

    def nobody(self) -> Candidates:
        """No order at all: the spectrum does not take part."""
        return Candidates(self.orders[:0], np.zeros((0, 2)), np.zeros(0), np.zeros((1, 2)))

    def _unlisted(self, share: FloatArray) -> FloatArray:
        """Rows (length, weight) that bound all orders beyond the reach, `share` (levels,) times the tails.

        Beyond the reach some |k| on an axis is at least reach + 1.  A vector as long as
        `longest` * r has an order of at least r.
        """
        first = self.reach + 1.0
        lengths = [self.shortest_per_mm * first, *[self.longest_per_mm * first * r for r in _TAIL_RADII[1:]]]
        weights = [float((share * self._tails(first * r)).max()) for r in _TAIL_RADII]
        return np.column_stack([lengths, np.minimum.accumulate(weights)])

    def _tails(self, radius: float) -> FloatArray:
        """(levels,) the tail bound at each tone that occurs."""
        if radius not in self._bounds:
            screened = (self._levels > 0) & (self._levels < 1)
            self._bounds[radius] = np.array(
                [
                    self._tail(float(t), radius) if inked else 0.0
                    for t, inked in zip(self._levels, screened, strict=True)
                ]
            )
        return self._bounds[radius]
