"""Rings of points: what they fill by a rule, and areas given back as rings."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

import numpy as np

from patterngen.job.svg_remarks import OutlineError
from patterngen.model.lattice import FloatArray

if TYPE_CHECKING:
    from shapely.geometry.base import BaseGeometry

SMALLEST_MM2 = 1e-8
"""What is smaller counts as without area."""
_MOST_WORK = 2_000_000_000
"""Points of crossing rings times the faces that they are asked about."""


def fill(rings: list[FloatArray], *, even_odd: bool) -> tuple[BaseGeometry, bool]:
    """(what rings (n, 2) fill by the even-odd or the non-zero rule, whether any ring crosses itself).

    Raises `OutlineError` where crossings are too many to be worked out.
    """
    import shapely

    polygons = np.array([shapely.Polygon(ring) for ring in rings])
    valid = shapely.is_valid(polygons)
    if len(rings) == 1 and valid[0]:
        return polygons[0], False
    lines = shapely.union_all(shapely.get_exterior_ring(polygons))
    faces = shapely.get_parts(shapely.polygonize(shapely.get_parts(lines)))
    inside = shapely.get_coordinates(shapely.point_on_surface(faces))
    turns = np.zeros(len(faces), dtype=np.int64)
    work = 0
    for ring, polygon, sound in zip(rings, polygons, valid, strict=True):
        low, high = ring.min(axis=0), ring.max(axis=0)
        near = np.flatnonzero(((inside >= low) & (inside <= high)).all(axis=1))
        if sound:
            # a ring that does not cross itself turns once around what it holds
            shapely.prepare(polygon)
            turns[near] += shapely.contains_xy(polygon, inside[near]) * (1 if signed_area(ring) > 0 else -1)
            continue
        work += len(near) * len(ring)
        if work > _MOST_WORK:
            raise OutlineError("its outlines cross too often", allowed="simpler outlines: unite them first")
        turns[near] += np.array([_winding(ring, point) for point in inside[near]], dtype=np.int64)
    kept = faces[turns % 2 == 1] if even_odd else faces[turns != 0]
    # a ring that touches itself in a point, or lies flat, is not "valid" but crosses nothing
    odd = ~valid & (shapely.area(shapely.convex_hull(polygons)) > 0.0)
    crossing = not shapely.is_simple(shapely.get_exterior_ring(polygons[odd])).all()
    return shapely.union_all(kept), bool(crossing)


def _winding(ring: FloatArray, point: FloatArray) -> int:
    """How often a ring (n, 2) turns around a point, counted along the ray to its right."""
    x, y = point
    x0, y0 = ring.T
    x1, y1 = np.roll(ring, -1, axis=0).T
    left = (x1 - x0) * (y - y0) - (x - x0) * (y1 - y0)
    rising, falling = (y0 <= y) & (y1 > y), (y0 > y) & (y1 <= y)
    return int(np.count_nonzero(rising & (left > 0)) - np.count_nonzero(falling & (left < 0)))


def signed_area(ring: FloatArray) -> float:
    """The area in a ring (n, 2), above zero where it runs counter-clockwise with y up."""
    x, y = ring.T
    return float(0.5 * np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y))


def rings_of(geometry: BaseGeometry) -> Iterator[FloatArray]:
    """Rings (n, 2) of polygons: outlines counter-clockwise, each followed by its holes, clockwise."""
    import shapely
    from shapely.geometry.polygon import orient

    polygons = [p for p in shapely.get_parts(shapely.get_parts(geometry)) if p.geom_type == "Polygon"]
    for polygon in polygons:
        if polygon.area < SMALLEST_MM2:
            continue
        turned = orient(polygon, sign=1.0)
        for ring in (turned.exterior, *turned.interiors):
            yield np.asarray(ring.coords, dtype=float)[:-1, :2]
