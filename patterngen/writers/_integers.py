"""Loose polygons as whole numbers: a frame fine enough that rounding stays far below a micrometre."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from patterngen.model.lattice import Lattice
from patterngen.model.shapes import Polygons

UNIT_MM = 1e-4
"""One whole number: 0.1 micrometre, so that no corner moves by more than 0.05 along either axis."""
LARGEST = 2**23
"""Whole numbers of this size are still exact in the single precision that readers calculate in."""


@dataclass(frozen=True, slots=True, eq=False)
class WholePolygons:
    """Corners as whole numbers `points` (n, 2) in `frame`, and the row at which each ring begins.

    `ring_start` (rings + 1,) and `shape_end` (n,) bool marks the last corner of each shape.
    """

    frame: Lattice
    points: NDArray[np.int64]
    ring_start: NDArray[np.int64]
    shape_end: NDArray[np.bool_]

    @property
    def first(self) -> NDArray[np.bool_]:
        """Which corners begin a ring."""
        out = np.zeros(len(self.points), dtype=bool)
        out[self.ring_start[:-1]] = True
        return out

    @property
    def last(self) -> NDArray[np.bool_]:
        """Which corners end a ring."""
        out = np.zeros(len(self.points), dtype=bool)
        out[self.ring_start[1:] - 1] = True
        return out

    def pieces(self, ends: NDArray[np.bool_], *, most: int) -> Iterator[slice]:
        """Slices that stop only where `ends` is set, of `most` corners unless one stretch is longer."""
        stops = np.flatnonzero(ends) + 1
        start = 0
        for k, stop in enumerate(stops):
            if k + 1 == len(stops) or stops[k + 1] - start > most:
                yield slice(start, int(stop))
                start = int(stop)


def whole(polygons: Polygons) -> WholePolygons:
    """Round polygons to whole numbers about their middle.

    Corners that fall together are kept as they are: they change no area.
    """
    steps_mm = np.hypot(polygons.frame.steps_mm[:, 0], polygons.frame.steps_mm[:, 1])
    low, high = polygons.uv.min(axis=0), polygons.uv.max(axis=0)
    unit = np.maximum(UNIT_MM / steps_mm, 0.5 * (high - low) / LARGEST)
    middle = np.rint(0.5 * (low + high) / unit)
    points = np.rint(polygons.uv / unit) - middle
    frame = Lattice(polygons.frame.place((middle * unit)[None, :])[0], unit[:, None] * polygons.frame.steps_mm)
    ring_start = np.asarray(polygons.ring_start, dtype=np.int64)
    shape_end = np.zeros(len(points), dtype=bool)
    shape_end[ring_start[np.asarray(polygons.shape_start[1:], dtype=np.int64)] - 1] = True
    return WholePolygons(frame, points.astype(np.int64), ring_start, shape_end)
