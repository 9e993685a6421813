"""Colours that move with register: extremes over phases, by CIEDE2000."""

from __future__ import annotations

import numpy as np

from patterngen.beats._lattice import IntegerArray
from patterngen.model.lattice import FloatArray
from patterngen.model.screen import ComplexArray
from patterngen.model.seeing import InkColours

_TORUS = {1: 240, 2: 60, 3: 20, 4: 10}
_SCATTERED = 20_000
_REFINE = 8


def _directions() -> FloatArray:
    """Directions of CIELAB in which extremes are looked for."""
    grid = np.stack(np.meshgrid(*[[-1.0, -0.5, 0.0, 0.5, 1.0]] * 3, indexing="ij"), axis=-1).reshape(-1, 3)
    grid = grid[np.abs(grid).max(axis=1) == 1.0]
    return np.asarray(grid / np.linalg.norm(grid, axis=1)[:, None])


_DIRECTIONS = _directions()


class PhaseMean:
    """Mean XYZ as a function of free phases, from the mean and amplitudes of Yule-Nielsen's root.

    XYZ = (N + sum 2 Re(A_j exp(2 pi i n_j . theta)))^n, where N^n is the mean (3,) and n N^(n-1) A_j
    the `amplitude` (j, 3) of component j; `turns` (j, r) are the integers n_j.  With n = 1 this is
    the plain sum.
    """

    def __init__(
        self, mean: FloatArray, amplitude: ComplexArray, turns: IntegerArray, *, yule_nielsen: float = 1.0
    ) -> None:
        self._power = yule_nielsen
        self.mean = np.maximum(mean, 0.0) ** (1.0 / yule_nielsen)
        slope = yule_nielsen * np.maximum(self.mean, 1e-9) ** (yule_nielsen - 1.0)
        self.amplitude, self.turns = amplitude / slope, turns
        self.rank = turns.shape[1]

    def _xyz(self, root: FloatArray) -> FloatArray:
        return np.asarray(np.maximum(root, 0.0) ** self._power)

    def at(self, theta: FloatArray) -> FloatArray:
        """XYZ (n, 3), never negative, at phases (n, r) in cycles."""
        out = np.empty((len(theta), 3))
        for start in range(0, len(theta), 4096):
            phase = np.exp(2j * np.pi * (theta[start : start + 4096] @ self.turns.T))
            out[start : start + 4096] = self.mean + 2.0 * (phase @ self.amplitude).real
        return self._xyz(out)

    def spread(self) -> tuple[FloatArray, FloatArray]:
        """Phases that cover the torus (n, r), and XYZ there."""
        if self.rank not in _TORUS:
            theta = scattered(_SCATTERED, self.rank)
            theta[0] = 0.0
            return theta, self.at(theta)
        size = _TORUS[self.rank]
        theta = np.stack(np.unravel_index(np.arange(size**self.rank), (size,) * self.rank), axis=1) / size
        xyz = np.empty((len(theta), 3))
        for channel in range(3):
            grid = np.zeros((size,) * self.rank, dtype=complex)
            np.add.at(grid, tuple((self.turns % size).T), self.amplitude[:, channel])
            xyz[:, channel] = self.mean[channel] + 2.0 * np.fft.ifftn(grid, norm="forward").real.ravel()
        return theta, self._xyz(xyz)

    def luminance_extremes(self, theta: FloatArray, xyz: FloatArray) -> tuple[float, float]:
        """(least, largest) Y over all phases, from a covering, refined."""
        ends = []
        for sign in (-1.0, 1.0):
            at = theta[int(np.argmax(sign * xyz[:, 1]))]
            best = float(xyz[int(np.argmax(sign * xyz[:, 1])), 1])
            for trial in self._around():
                value = self.at(at + trial)[:, 1]
                k = int(np.argmax(sign * value))
                if sign * float(value[k]) > sign * best:
                    at, best = at + trial[k], float(value[k])
            ends.append(best)
        return ends[0], ends[1]

    def widest_pair(
        self, colours: InkColours, theta: FloatArray, xyz: FloatArray, *, refine: bool
    ) -> tuple[FloatArray, FloatArray, float]:
        """(Lab, Lab, CIEDE2000) of the two colours that differ most, darker first."""
        lab = colours.lab(xyz)
        along = lab @ _DIRECTIONS.T
        rows = np.unique(np.concatenate([np.argmax(along, axis=0), np.argmin(along, axis=0)]))
        i, j = np.triu_indices(len(rows), 1)
        if not len(i):
            return lab[rows[0]], lab[rows[0]], 0.0
        apart = colours.difference(lab[rows[i]], lab[rows[j]])
        k = int(np.argmax(apart))
        ends, best = [theta[rows[i[k]]], theta[rows[j[k]]]], float(apart[k])
        labs = [lab[rows[i[k]]], lab[rows[j[k]]]]
        if refine:
            for trial in self._around():
                for end in (0, 1):
                    moved = colours.lab(self.at(ends[end] + trial))
                    value = colours.difference(moved, np.broadcast_to(labs[1 - end], moved.shape))
                    m = int(np.argmax(value))
                    if float(value[m]) > best:
                        ends[end], labs[end], best = ends[end] + trial[m], moved[m], float(value[m])
        if labs[0][0] > labs[1][0]:
            labs.reverse()
        return labs[0], labs[1], best

    def _around(self) -> list[FloatArray]:
        """Ever smaller neighbourhoods on the torus."""
        if self.rank <= 3:
            box = np.stack(np.meshgrid(*[[-1.0, 0.0, 1.0]] * self.rank, indexing="ij"), axis=-1)
            around = box.reshape(-1, self.rank)
        else:
            around = np.concatenate([np.eye(self.rank), -np.eye(self.rank)])
        step = 0.5 / _TORUS.get(self.rank, 8)
        return [around * step * 0.5**k for k in range(_REFINE)]


def scattered(count: int, dimensions: int) -> FloatArray:
    """Evenly scattered points in the unit cube (additive recurrence on roots of x^(d+1) = x + 1)."""
    root = 2.0
    for _ in range(60):
        root = (1.0 + root) ** (1.0 / (dimensions + 1.0))
    steps = (1.0 / root) ** np.arange(1, dimensions + 1)
    return np.asarray((0.5 + np.arange(1, count + 1)[:, None] * steps) % 1.0)


def crest_to_trough(colours: InkColours, mean: FloatArray, amplitude: FloatArray) -> FloatArray:
    """(n,) CIEDE2000 between mean + 2 a and mean - 2 a, for real XYZ amplitudes (n, 3)."""
    crest, trough = np.maximum(mean + 2.0 * amplitude, 0.0), np.maximum(mean - 2.0 * amplitude, 0.0)
    return colours.difference(colours.lab(crest), colours.lab(trough))
