"""Colour averages and mixed differences over the primaries, for every set of screens at once.

A screen that only averages enters with (1 - t) R0 + t R1 (Demichel 1924), one that takes
part in a beat with R1 - R0.  Done axis by axis this is n 2^n work for all 2^n sets.

Sources by their keys: demichel-1924, neugebauer-1937, yule-nielsen-1951; wyble-berns-2000 reviews them.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from patterngen.model.area import BoolArray
from patterngen.model.lattice import FloatArray

MaskArray = NDArray[np.int64]

_LEAST = 1e-12


def all_differences(primaries: FloatArray, tones: FloatArray) -> FloatArray:
    """(rows, 2^n, 3): mean (set 0) and mixed differences for every set of screens.

    `primaries` (2,) * n + (3,), `tones` (rows, n) printed tones.  Bit i of a set is screen i.

    >>> paper_and_ink = np.array([[1.0, 1.0, 1.0], [0.2, 0.3, 0.4]])
    >>> all_differences(paper_and_ink, np.array([[0.5]]))[0].round(2).tolist()
    [[0.6, 0.65, 0.7], [-0.8, -0.7, -0.6]]
    """
    rows, n = tones.shape
    # axes reversed: the last screen becomes the slowest axis, so that bit i is screen i
    table = np.transpose(primaries, [*range(n - 1, -1, -1), n]).reshape(1, -1, 3)
    table = np.broadcast_to(table, (rows, 2**n, 3))
    for i in range(n):
        split = table.reshape(rows, 2 ** (n - 1 - i), 2, 2**i, 3)
        low, step = split[:, :, 0], split[:, :, 1] - split[:, :, 0]
        mean = low + tones[:, i][:, None, None, None] * step
        table = np.stack([mean, step], axis=2).reshape(rows, 2**n, 3)
    return np.asarray(table)


class Strengths:
    """Per row of tones and set of screens: by what the product of coefficients is multiplied.

    With Yule-Nielsen's n the averages N are those of R^(1/n); the mean is N^n, and a beat's
    amplitude is n N^(n-1) times the difference (first order of N^n).  Screens with no tone
    in a row cannot take part there and are left out of that row's table; of the others those may
    that `taking_part` (rows, screens) says.
    """

    def __init__(
        self, primaries: FloatArray, tones: FloatArray, *, yule_nielsen: float, taking_part: BoolArray | None = None
    ) -> None:
        self.rows, self.screens = tones.shape
        bits = 1 << np.arange(self.screens, dtype=np.int64)
        barred = np.zeros(tones.shape, dtype=bool) if taking_part is None else ~taking_part
        self._barred = barred.astype(np.int64) @ bits
        root = np.asarray(primaries, dtype=float) ** (1.0 / yule_nielsen)
        self.mean = np.empty((self.rows, 3))
        self._tables: list[FloatArray] = []
        self._active: list[list[int]] = []
        self._place = np.empty((self.rows, 2), dtype=np.intp)
        printing = tones > 0
        _, pattern = np.unique(printing, axis=0, return_inverse=True)
        pattern = pattern.ravel()
        for group in range(int(pattern.max()) + 1 if self.rows else 0):
            members = np.flatnonzero(pattern == group)
            active = [int(i) for i in np.flatnonzero(printing[members[0]])]
            index = tuple(slice(None) if i in active else 0 for i in range(self.screens))
            table = all_differences(root[index], tones[members][:, active])
            n_mean = table[:, 0, :].copy()
            self.mean[members] = n_mean**yule_nielsen
            table = table * (yule_nielsen * n_mean ** (yule_nielsen - 1.0))[:, None, :]
            self._place[members] = np.column_stack([np.full(len(members), group), np.arange(len(members))])
            self._tables.append(table)
            self._active.append(active)

    def at(self, row: int, sets: MaskArray) -> FloatArray:
        """(len(sets), 3) strengths in XYZ for sets of screens in one row (0 where one does not print)."""
        group, member = self._place[row]
        active = self._active[group]
        inside = np.zeros(len(sets), dtype=np.int64)
        covered = 0
        for bit, screen in enumerate(active):
            inside |= ((sets >> screen) & 1) << bit
            covered |= 1 << screen
        out = self._tables[group][member][inside]
        out[(sets & (~covered | self._barred[row])) != 0] = 0.0
        return np.asarray(out)

    def shares(self, channels: tuple[int, ...]) -> Shares:
        """Bounds on 2 |strength| / mean, the largest of the given channels of XYZ, row by row."""
        largest = np.zeros(2**self.screens)
        each = np.zeros((self.rows, self.screens))
        whole = 2.0
        for group, (table, active) in enumerate(zip(self._tables, self._active, strict=True)):
            members = np.flatnonzero(self._place[:, 0] == group)
            mean = np.maximum(self.mean[members], _LEAST)
            relative = (2.0 * np.abs(table[:, :, channels]) / mean[:, None, channels]).max(axis=2)
            relative[:, 0] = 2.0  # the mean itself, which grids alone can modulate
            sets = np.zeros(1, dtype=np.int64)
            for screen in active:
                sets = np.concatenate([sets, sets | (1 << screen)])
            relative[(sets[None, :] & self._barred[members][:, None]) != 0] = 0.0
            largest[sets] = np.maximum(largest[sets], relative.max(axis=0))
            for row, contrasts in zip(members, relative, strict=True):
                row_whole, each[row, active] = product_bound(contrasts)
                whole = max(whole, row_whole)
        return Shares(whole, each, largest)


@dataclass(frozen=True, slots=True, eq=False)
class Shares:
    """In a row of tones the contrast of a set S is at most `whole` times the product of its members' shares.

    `each` (rows, screens); `largest` (2^screens,) is the true factor of each set in the row where it is largest.
    """

    whole: float
    each: FloatArray
    largest: FloatArray


def product_bound(contrasts: FloatArray) -> tuple[float, FloatArray]:
    """(whole, each (n,)) with contrasts[S] <= whole * product of each[i] for i in S, for every S.

    Exact for inks that multiply; where an overprint is stronger than the product (an opaque
    white on black) the shares of the screens in that set are raised until the bound holds.
    """
    n = len(contrasts).bit_length() - 1
    whole = float(contrasts[0])
    each = np.maximum(contrasts[1 << np.arange(n)] / whole, 1e-9)
    for _ in range(40 * n):
        excess = contrasts / _products(whole, each)
        worst = int(np.argmax(excess))
        if worst == 0 or excess[worst] <= 1.0 + 1e-12:
            return whole * (1.0 + 1e-12), each
        members = [i for i in range(n) if (worst >> i) & 1]
        each[members] *= excess[worst] ** (1.0 / len(members))
    return whole * float((contrasts / _products(whole, each)).max()) * (1.0 + 1e-12), each


def _products(whole: float, each: FloatArray) -> FloatArray:
    """(2^n,) whole times the product of each[i] over the bits of the index."""
    out = np.full(1, whole)
    for share in each:
        out = np.concatenate([out, out * share])
    return out
