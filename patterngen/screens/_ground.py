"""The area a screen prints on, seen from its lattice: which places lie inside, which are cut.

Rows of the lattice meet the outline in crossings, and pairs of crossings are ranges of
indices; so a million dots are placed without looking at one of them.  Only the shapes that
touch the outline are cut with it, a few at a time against the bit of outline near them.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from patterngen.model.area import Area, BoolArray
from patterngen.model.lattice import FloatArray, Lattice
from patterngen.model.shapes import Polygons

if TYPE_CHECKING:
    from shapely.geometry.base import BaseGeometry

Geometries = NDArray[np.object_]


@dataclass(frozen=True, slots=True, eq=False)
class Ranges:
    """Runs of lattice places: rows (n,), from `first` (n,) to `last` (n,), both taken; sorted by row."""

    row: NDArray[np.int64]
    first: NDArray[np.int64]
    last: NDArray[np.int64]

    @property
    def count(self) -> NDArray[np.int64]:
        """How many places each run holds."""
        return self.last - self.first + 1

    def places(self) -> NDArray[np.int64]:
        """(m, 2): every place as (i, j)."""
        count = self.count
        run = np.repeat(np.arange(len(count)), count)
        along = np.arange(len(run)) - np.repeat(np.cumsum(count) - count, count)
        return np.stack([self.first[run] + along, self.row[run]], axis=1)

    def bands(self, size: int) -> list[Ranges]:
        """The same in parts of whole runs with about `size` places each."""
        if not len(self.row):
            return []
        part = (np.cumsum(self.count) - 1) // size
        cuts = np.searchsorted(part, np.arange(part[-1] + 2))
        return [Ranges(self.row[a:b], self.first[a:b], self.last[a:b]) for a, b in pairwise(cuts) if b > a]


class Ground:
    """An area in the coordinates of a lattice."""

    def __init__(self, area: Area, lattice: Lattice) -> None:
        """Takes the area into the lattice's coordinates."""
        import shapely

        self.lattice = lattice
        self.geometry: BaseGeometry = shapely.transform(area.geometry(), lattice.locate)

    def places(self, radius: float) -> tuple[Ranges, Ranges]:
        """(inside, rim): places whose shape surely lies inside, and those whose shape the outline may cross.

        `radius` holds every shape about its place, in lattice units.
        """
        import shapely

        # eight chords a quarter circle fall short by half a percent
        inner, outer = shapely.buffer(self.geometry, [-1.02 * radius - 1e-9, 1.02 * radius + 1e-9])
        inside, all_round = _ranges(inner), _ranges(outer)
        return inside, _difference(all_round, inside)

    def cut(self, shapes: Geometries) -> tuple[BoolArray, Geometries, NDArray[np.int64]]:
        """Shapes (n,) against the area: (which lie wholly inside (n,), the cut ones' rests (m,), whose (m,))."""
        whole = np.zeros(len(shapes), dtype=bool)
        pieces: list[Geometries] = []
        owners: list[NDArray[np.int64]] = []
        if len(shapes):
            import shapely

            index, bounds = np.arange(len(shapes)), shapely.bounds(shapes)
            self._cut(shapely, self.geometry, shapes, index, bounds, whole, pieces, owners)
        if not pieces:
            return whole, np.empty(0, dtype=object), np.empty(0, dtype=np.int64)
        return whole, np.concatenate(pieces), np.concatenate(owners)

    def _cut(
        self,
        shapely: Any,
        near: Any,
        shapes: Geometries,
        index: NDArray[np.int64],
        bounds: FloatArray,
        whole: BoolArray,
        pieces: list[Geometries],
        owners: list[NDArray[np.int64]],
    ) -> None:
        if not len(index) or near.is_empty:
            return
        box = bounds[index]
        low, high = box[:, :2].min(axis=0), box[:, 2:].max(axis=0)
        axis = int(np.argmax(high - low))
        centre = 0.5 * (box[:, axis] + box[:, axis + 2])
        middle = float(np.median(centre))
        left = centre < middle
        few = shapely.count_coordinates(near) <= 24 or len(index) <= 4
        if few or left.all() or not left.any():
            shapely.prepare(near)
            own = shapes[index]
            inside = shapely.covers(near, own)
            whole[index[inside]] = True
            crossing = ~inside & shapely.intersects(near, own)
            if crossing.any():
                pieces.append(np.atleast_1d(shapely.intersection(near, own[crossing])))
                owners.append(index[crossing])
            return
        for part in (index[left], index[~left]):
            hold = bounds[part]
            margin = 1e-6 * (1 + np.abs(hold).max())
            frame = shapely.box(*(hold[:, :2].min(axis=0) - margin), *(hold[:, 2:].max(axis=0) + margin))
            self._cut(shapely, shapely.intersection(near, frame), shapes, part, bounds, whole, pieces, owners)


def _segments(geometry: BaseGeometry) -> tuple[FloatArray, FloatArray]:
    """Ends (n, 2), (n, 2) of every edge."""
    import shapely

    rings = shapely.get_rings(shapely.get_parts(geometry))
    xy, of = shapely.get_coordinates(rings, return_index=True)
    joined = of[:-1] == of[1:]
    return xy[:-1][joined], xy[1:][joined]


def _ranges(geometry: BaseGeometry) -> Ranges:
    """The lattice places inside a geometry given in lattice coordinates, by crossings with the rows."""
    empty = np.empty(0, dtype=np.int64)
    if geometry.is_empty:
        return Ranges(empty, empty, empty)
    a, b = _segments(geometry)
    down = a[:, 1] > b[:, 1]
    a, b = np.where(down[:, None], b, a), np.where(down[:, None], a, b)
    # half open: a row through a vertex is crossed once, and level edges never
    first, stop = np.ceil(a[:, 1]).astype(np.int64), np.ceil(b[:, 1]).astype(np.int64)
    count = stop - first
    edge = np.repeat(np.arange(len(count)), count)
    row = first[edge] + np.arange(len(edge)) - np.repeat(np.cumsum(count) - count, count)
    share = (row - a[edge, 1]) / (b[edge, 1] - a[edge, 1])
    u = a[edge, 0] + share * (b[edge, 0] - a[edge, 0])
    order = np.lexsort((u, row))
    row, u = row[order], u[order]
    enter, leave = np.ceil(u[0::2]).astype(np.int64), np.ceil(u[1::2]).astype(np.int64) - 1
    some = leave >= enter
    return Ranges(row[0::2][some], enter[some], leave[some])


def _difference(large: Ranges, small: Ranges) -> Ranges:
    """Places of `large` that are not in `small`, which lies inside it."""
    row = np.concatenate([large.row, large.row, small.row, small.row])
    at = np.concatenate([large.first, large.last + 1, small.first, small.last + 1])
    n, m = len(large.row), len(small.row)
    step = np.concatenate([np.ones(n), -np.ones(n), -np.ones(m), np.ones(m)]).astype(np.int64)
    order = np.lexsort((at, row))
    row, at, depth = row[order], at[order], np.cumsum(step[order])
    open_ = (depth[:-1] > 0) & (row[:-1] == row[1:]) & (at[1:] > at[:-1])
    return Ranges(row[:-1][open_], at[:-1][open_], at[1:][open_] - 1)


def polygons(geometries: Geometries, frame: Lattice) -> Polygons:
    """Polygons as columns, of mixed leftovers the parts that have an area.

    Outlines come out counter-clockwise, holes clockwise.
    """
    import shapely

    parts = shapely.get_parts(geometries)
    while np.any(shapely.get_type_id(parts) == 7):
        parts = shapely.get_parts(parts)
    parts = parts[(shapely.get_type_id(parts) == 3) & ~shapely.is_empty(parts)]
    rings, owner = shapely.get_rings(parts, return_index=True)
    xy, of = shapely.get_coordinates(rings, return_index=True)
    lengths = np.bincount(of, minlength=len(rings))
    ends = np.cumsum(lengths)
    open_ = np.ones(len(xy), dtype=bool)
    open_[ends - 1] = False
    starts = np.concatenate([[0], np.cumsum(lengths - 1)])
    outer = np.concatenate([[True], owner[1:] != owner[:-1]]) if len(owner) else np.empty(0, dtype=bool)
    turn = shapely.is_ccw(rings) != outer
    xy = xy[open_]
    if turn.any():
        # the other way round: index from the far end of the ring
        ring = np.repeat(np.arange(len(rings)), lengths - 1)
        here = np.arange(len(xy))
        xy = xy[np.where(turn[ring], starts[ring] + starts[ring + 1] - 1 - here, here)]
    shape_start = np.concatenate([np.nonzero(outer)[0], [len(rings)]])
    return Polygons(frame, xy, starts.astype(np.int32), shape_start.astype(np.int32))


def ring_polygons(rings: Sequence[FloatArray], which: NDArray[np.int32], offsets: FloatArray) -> Geometries:
    """Shapely polygons: ring number which[k] moved by offsets[k], all at once."""
    import shapely

    lengths = np.array([len(ring) for ring in rings])
    starts = np.cumsum(lengths) - lengths
    stacked = np.concatenate(rings)
    count = lengths[which]
    of = np.repeat(np.arange(len(which)), count)
    along = np.arange(len(of)) - np.repeat(np.cumsum(count) - count, count)
    xy = stacked[starts[which][of] + along] + offsets[of]
    closed = shapely.linearrings(xy, indices=of)
    return np.atleast_1d(shapely.polygons(closed))


def whole_area(area: Area) -> Polygons:
    """The area itself, in mm."""
    return polygons(np.array([area.geometry()]), Lattice.millimetres())
