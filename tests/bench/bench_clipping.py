"""second way: places, cuts and whole screens inside a large outline with a hole, against shapely one by one.

Outline 5,000 vertices, hole 500; as many dots and lines as an A4 page at 150 lpi.  Both sides
must find the same places and the same area.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import shapely

from patterngen.model.area import Area, ToneField
from patterngen.model.job import Gain, ScreenRequest
from patterngen.model.lattice import FloatArray
from patterngen.model.shapes import Polygons
from patterngen.screens import dots, lines
from patterngen.screens._ground import Ground, _ranges
from tests.bench._timing import median_seconds


def ring(count: int, *, radius_mm: float, seed: int) -> FloatArray:
    """A closed outline with bays."""
    rng = np.random.default_rng(seed)
    turn = np.arange(count) / count * 2 * np.pi
    bays = sum(rng.uniform(-0.1, 0.1) * np.cos(k * turn + rng.uniform(0, 6)) for k in (2, 3, 5, 9, 17))
    return np.asarray(np.stack([np.cos(turn), np.sin(turn)], 1) * ((1 + bays) * radius_mm)[:, None])


def request(kind: str, tone: ToneField, area: Area) -> ScreenRequest:
    return ScreenRequest("a", "Slate", kind, None, 150 / 25.4, 15.0, tone, area, (0.0, 0.0), Gain())


def run() -> Iterator[tuple[str, str, str]]:
    """Rows of (what, seconds, ratio)."""
    outline = ring(5000, radius_mm=140.0, seed=1)
    x0, y0, x1, y1 = (*outline.min(axis=0).tolist(), *outline.max(axis=0).tolist())
    area = Area((x0, y0, x1, y1), (outline, ring(500, radius_mm=40.0, seed=2)[::-1]))
    yield _places(area)
    yield _strips(area)
    yield from _screens(area)


def _places(area: Area) -> tuple[str, str, str]:
    screen = dots.DotScreen(request("dots", ToneField(constant=0.3), area))
    geometry = Ground(area, screen.frame).geometry
    low_u, low_v, high_u, high_v = (int(x) for x in shapely.bounds(geometry))
    i, j = np.meshgrid(np.arange(low_u - 1, high_u + 2), np.arange(low_v - 1, high_v + 2))
    u, v = i.ravel().astype(float), j.ravel().astype(float)
    shapely.prepare(geometry)
    inside = shapely.contains_xy(geometry, u, v)
    places = _ranges(geometry).places()
    assert np.array_equal(places, np.stack([u, v], axis=1)[inside].astype(np.int64))
    ours = median_seconds(lambda: _ranges(geometry))
    theirs = median_seconds(lambda: shapely.contains_xy(geometry, u, v))
    return (f"{len(places):,} places inside", f"{ours:.4f} s", f"{theirs / ours:.0f} x prepared contains_xy")


def _strips(area: Area) -> tuple[str, str, str]:
    screen = lines.LineScreen(request("lines", ToneField(constant=0.3), area))
    ground = Ground(area, screen.frame)
    low_u, low_v, high_u, high_v = shapely.bounds(ground.geometry)
    line = np.arange(np.ceil(low_v), np.floor(high_v) + 1)
    strips = shapely.box(low_u - 1, line - 0.15, high_u + 1, line + 0.15)
    (drawn,) = screen.shapes()
    assert isinstance(drawn, Polygons)
    shoelace = sum(
        0.5 * float(np.sum(r[:, 0] * np.roll(r[:, 1], -1) - np.roll(r[:, 0], -1) * r[:, 1])) for r in drawn.rings()
    )
    expected = float(shapely.area(shapely.intersection(strips, ground.geometry)).sum())
    assert abs(shoelace / expected - 1) < 1e-6
    ours = median_seconds(lambda: list(screen.shapes()))
    theirs = median_seconds(lambda: shapely.intersection(strips, ground.geometry))
    return (
        f"{drawn.total:,} cut lines",
        f"{ours:.3f} s",
        f"{theirs / ours:.1f} x shapely, each line with the whole outline",
    )


def _screens(area: Area) -> Iterator[tuple[str, str, str]]:
    y, x = np.mgrid[0:2000, 0:2000]
    grey = (0.5 + 0.5 * np.sin(x / 300) * np.cos(y / 270)).astype(np.float32)
    point = median_seconds(lambda: [shapely.Point(n, n).buffer(0.4) for n in range(20_000)], 3) / 20_000
    for name, tone in (("even tint", ToneField(constant=0.3)), ("picture", ToneField(None, grey, area.box_mm))):
        screen = dots.DotScreen(request("dots", tone, area))
        total = sum(batch.total for batch in screen.shapes())
        ours = median_seconds(lambda screen=screen: list(screen.shapes()))  # type: ignore[misc]
        yield (
            f"{name}, {total:,} dots",
            f"{ours:.3f} s",
            f"{point * total / ours:.0f} x shapely circles made one by one",
        )
