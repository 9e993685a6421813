"""Where a screen prints, and how much: an area and a tone field."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from patterngen.model.lattice import FloatArray

if TYPE_CHECKING:
    from shapely.geometry.base import BaseGeometry

BoolArray = NDArray[np.bool_]


@dataclass(frozen=True, slots=True, eq=False)
class Area:
    """A box in mm, or outlines with holes.

    `box_mm` is (x low, y low, x high, y high).  `rings` is None for the box itself,
    else one (n, 2) array a ring in mm (outlines counter-clockwise, each followed by its
    holes, clockwise; already repaired and cut to the sheet with its bleed).
    `label` says in words what it is ("the sheet", "art/panel.svg").
    """

    box_mm: tuple[float, float, float, float]
    rings: tuple[FloatArray, ...] | None = None
    label: str = "the sheet"

    def geometry(self) -> BaseGeometry:
        """The same as a shapely geometry (imports shapely)."""
        import shapely

        if self.rings is None:
            return shapely.box(*self.box_mm)
        # each hole is cut from its own outline only: there may be an island in it
        holes: list[list[FloatArray]] = []
        shells: list[FloatArray] = []
        for ring in self.rings:
            if _is_ccw(ring):
                shells.append(ring)
                holes.append([])
            else:
                holes[-1].append(ring)
        return shapely.union_all([shapely.Polygon(s, h) for s, h in zip(shells, holes, strict=True)])

    def area_mm2(self) -> float:
        """Area in mm2."""
        if self.rings is None:
            x0, y0, x1, y1 = self.box_mm
            return (x1 - x0) * (y1 - y0)
        return float(sum(_signed_area(r) for r in self.rings))

    def contains(self, x_mm: FloatArray, y_mm: FloatArray) -> BoolArray:
        """Which points lie inside (edges count as either)."""
        x, y = np.asarray(x_mm, dtype=float), np.asarray(y_mm, dtype=float)
        x0, y0, x1, y1 = self.box_mm
        inside = (x >= x0) & (x < x1) & (y >= y0) & (y < y1)
        if self.rings is None or not inside.any():
            return inside
        import shapely

        geometry = self.geometry()
        shapely.prepare(geometry)
        inside[inside] = shapely.contains_xy(geometry, x[inside], y[inside])
        return inside


    def within(self, box_mm: tuple[float, float, float, float]) -> Area:
        """The part of the area that lies in a box."""
        x0, y0, x1, y1 = self.box_mm
        a0, b0, a1, b1 = box_mm
        box = (max(x0, a0), max(y0, b0), min(x1, a1), min(y1, b1))
        if box == self.box_mm:
            return self
        if self.rings is None:
            return Area(box, None, self.label)
        import shapely

        cut = self.geometry().intersection(shapely.box(*box))
        rings = []
        for part in shapely.get_parts(cut):
            if part.geom_type == "Polygon" and not part.is_empty:
                turned = shapely.orient_polygons(part)
                rings += [shapely.get_coordinates(ring)[:-1] for ring in shapely.get_rings(turned)]
        return Area(tuple(float(c) for c in cut.bounds), tuple(rings), self.label)  # type: ignore[arg-type]


def _signed_area(ring: FloatArray) -> float:
    x, y = ring[:, 0], ring[:, 1]
    return float(0.5 * np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y))


def _is_ccw(ring: FloatArray) -> bool:
    return _signed_area(ring) > 0


@dataclass(frozen=True, slots=True, eq=False)
class ToneField:
    """Tone (0 to 1, on the plate) over the sheet: one value, or a grey picture.

    `values` (rows, columns) float32, row 0 at the top, fills `box_mm`.  Beyond the box its edge
    goes on, so that a dot whose centre lies just outside is drawn and cut like any other;
    whoever prints a picture cuts the area to the box (`Area.within`).  `constant` is None for a
    picture.
    """

    constant: float | None = None
    values: NDArray[np.float32] | None = None
    box_mm: tuple[float, float, float, float] = (0.0, 0.0, 0.0, 0.0)
    label: str = ""

    def at(self, x_mm: FloatArray, y_mm: FloatArray, *, size_mm: float) -> FloatArray:
        """Tone at points, averaged over about `size_mm` (a cell), bilinear between samples.

        A picture finer than half of `size_mm` is averaged first, so that detail finer
        than the screen does not alias into it.
        """
        x, y = np.asarray(x_mm, dtype=float), np.asarray(y_mm, dtype=float)
        if self.constant is not None:
            return np.full(np.broadcast(x, y).shape, self.constant)
        values, (x0, y0, x1, y1) = self.reduced(size_mm)
        rows, columns = values.shape
        u = np.clip((x - x0) / (x1 - x0) * columns - 0.5, 0.0, columns - 1.0)
        v = np.clip((y1 - y) / (y1 - y0) * rows - 0.5, 0.0, rows - 1.0)
        i = np.minimum(u.astype(np.int64), max(columns - 2, 0))
        j = np.minimum(v.astype(np.int64), max(rows - 2, 0))
        a, b = u - i, v - j
        i1, j1 = np.minimum(i + 1, columns - 1), np.minimum(j + 1, rows - 1)
        above = (1 - a) * values[j, i] + a * values[j, i1]
        below = (1 - a) * values[j1, i] + a * values[j1, i1]
        return np.asarray((1 - b) * above + b * below)

    def averaged(self, *, size_mm: float) -> ToneField:
        """The same field, its picture averaged once for `size_mm`, for whoever asks `at` many times."""
        if self.constant is not None:
            return self
        values, box_mm = self.reduced(size_mm)
        return ToneField(values=values, box_mm=box_mm, label=self.label)

    def reduced(self, size_mm: float) -> tuple[NDArray[np.float32], tuple[float, float, float, float]]:
        """(values, box_mm) of the picture averaged in whole blocks to about half of `size_mm`."""
        if self.values is None:
            raise ValueError("a constant tone has no picture")
        rows, columns = self.values.shape
        x0, y0, x1, y1 = self.box_mm
        sample_mm = (x1 - x0) / columns
        block = int(max(1, np.floor(0.5 * size_mm / sample_mm + 1e-9)))
        if block == 1:
            return self.values, self.box_mm
        # rows and columns that do not fill a block are averaged over what is there
        edges_r, edges_c = np.arange(0, rows, block), np.arange(0, columns, block)
        by_row = np.add.reduceat(self.values, edges_r, axis=0, dtype=np.float64)
        sums = np.add.reduceat(by_row, edges_c, axis=1)
        n_r = np.diff(np.append(edges_r, rows))
        n_c = np.diff(np.append(edges_c, columns))
        mean = (sums / np.outer(n_r, n_c)).astype(np.float32)
        # the last, partial blocks make the grid a little larger than the picture
        wide = (x1 - x0) * len(edges_c) * block / columns
        high = (y1 - y0) * len(edges_r) * block / rows
        return mean, (x0, y1 - high, x0 + wide, y1)
