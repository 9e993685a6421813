"""What a screen draws, as columns: outlines stamped on a lattice, and loose polygons.

Everything is filled with the non-zero rule; holes run the other way round than the
outline that holds them (outlines counter-clockwise, holes clockwise).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from patterngen.model.lattice import FloatArray, Lattice

IntArray = NDArray[np.int32]


@dataclass(frozen=True, slots=True, eq=False)
class Contour:
    """A closed curve: `start` (2,), `bends` (m, 3, 2) = control, control, end of each cubic.

    `straight` (m,) marks the pieces that are straight lines (their controls lie on the
    chord).  The last end is the start.
    """

    start: FloatArray
    bends: FloatArray
    straight: NDArray[np.bool_]

    def points(self, *, steps: int = 16) -> FloatArray:
        """The curve as an open ring (n, 2): `steps` chords a curved piece, one a straight piece."""
        pieces = []
        here = self.start
        u = np.arange(1, steps + 1)[:, None] / steps
        for bend, straight in zip(self.bends, self.straight, strict=True):
            a, b, end = bend
            if straight:
                pieces.append(end[None, :])
            else:
                pieces.append(
                    (1 - u) ** 3 * here + 3 * (1 - u) ** 2 * u * a + 3 * (1 - u) * u**2 * b + u**3 * end
                )
            here = end
        return np.concatenate(pieces)

    def area(self) -> float:
        """Signed area, exact for the cubics (Green's theorem)."""
        p0 = np.concatenate([self.start[None, :], self.bends[:-1, 2]])
        p1, p2, p3 = self.bends[:, 0], self.bends[:, 1], self.bends[:, 2]

        def cross(a: FloatArray, b: FloatArray) -> FloatArray:
            return a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0]

        total = (
            6 * cross(p0, p1) + 3 * cross(p0, p2) + cross(p0, p3)
            + 3 * cross(p1, p2) + 3 * cross(p1, p3) + 6 * cross(p2, p3)
        )
        return float(total.sum() / 20)


@dataclass(frozen=True, slots=True, eq=False)
class Outline:
    """One shape in frame units (1 = one lattice step): contours, filled non-zero.

    `disc` is its radius when the shape is a plain disc about the lattice point on a
    square lattice (a writer may then stroke a round cap), else None.  `tone` is the share of
    the cell that stamps of this one outline, side by side on the lattice, ink together; the
    outline itself may be larger, since stamps overlap so that no seam shows between neighbours.
    """

    contours: tuple[Contour, ...]
    tone: float
    disc: float | None = None

    def bounds(self) -> tuple[float, float, float, float]:
        """(u low, v low, u high, v high) that surely holds the shape (control points)."""
        points = np.concatenate(
            [np.concatenate([c.start[None, :], c.bends.reshape(-1, 2)]) for c in self.contours]
        )
        low, high = points.min(axis=0), points.max(axis=0)
        return float(low[0]), float(low[1]), float(high[0]), float(high[1])


@dataclass(frozen=True, slots=True, eq=False)
class Stamps:
    """Outlines repeated on a lattice, as runs along its rows.

    Run r stamps `outlines[variety[r]]` at (first[r, 0] + 0..count[r]-1, first[r, 1]).
    A flat tint is a few thousand long runs; a picture is runs of one or a few.
    Columns: first (n, 2) int32, count (n,) int32, variety (n,) int32.
    """

    lattice: Lattice
    outlines: tuple[Outline, ...]
    first: IntArray
    count: IntArray
    variety: IntArray

    @property
    def total(self) -> int:
        """How many shapes."""
        return int(self.count.sum(dtype=np.int64))

    def expand(self) -> tuple[IntArray, IntArray]:
        """(ij (n, 2), variety (n,)) with a row for every shape."""
        ends = np.cumsum(self.count, dtype=np.int64)
        total = int(ends[-1]) if len(ends) else 0
        run = np.repeat(np.arange(len(self.count)), self.count)
        along = np.arange(total) - np.repeat(ends - self.count, self.count)
        ij = self.first[run].copy()
        ij[:, 0] += along.astype(np.int32)
        return ij, self.variety[run]


@dataclass(frozen=True, slots=True, eq=False)
class Polygons:
    """Loose polygons in a frame: `uv` (n, 2); ring r is uv[ring_start[r]:ring_start[r+1]].

    `shape_start` indexes rings the same way: shape s is rings shape_start[s] to
    shape_start[s+1] (first its outline, then its holes).  Rings are open (the last
    vertex is not the first again).
    """

    frame: Lattice
    uv: FloatArray
    ring_start: IntArray
    shape_start: IntArray

    @property
    def total(self) -> int:
        """How many shapes."""
        return len(self.shape_start) - 1

    def rings(self) -> Iterator[FloatArray]:
        """Each ring as (n, 2) frame coordinates."""
        for a, b in zip(self.ring_start[:-1], self.ring_start[1:], strict=True):
            yield self.uv[a:b]


Batch = Stamps | Polygons
