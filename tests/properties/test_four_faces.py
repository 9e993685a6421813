"""The four faces of a screen agree, for every kind there is: a new kind joins by giving `examples()`."""

from __future__ import annotations

from dataclasses import replace
from functools import cache
from io import BytesIO

import numpy as np
import pytest
import resvg_py
import shapely
from PIL import Image

from patterngen import registry
from patterngen.model.area import Area
from patterngen.model.job import GridRequest, ScreenRequest
from patterngen.model.lattice import FloatArray
from patterngen.model.screen import Screen
from patterngen.model.shapes import Polygons, Stamps

KINDS = registry.modules("patterngen.screens")
REQUESTS: list[ScreenRequest] = [request for module in KINDS.values() for request in module.examples()]


def _name(request: ScreenRequest) -> str:
    tone = "picture" if request.tone.constant is None else f"{request.tone.constant:g}"
    return f"{request.kind}-{request.shape or 'plain'}-{tone}-{request.angle_deg:g}deg"


EXAMPLES = [pytest.param(index, id=_name(request)) for index, request in enumerate(REQUESTS)]
EVEN = [example for example in EXAMPLES if REQUESTS[example.values[0]].tone.constant is not None]


def made(request: ScreenRequest) -> Screen:
    return KINDS[request.kind].make(request)


@cache
def drawn(index: int) -> list[FloatArray]:
    """Every ring that an example's screen draws, in mm, curves as 24 chords a cubic."""
    rings = []
    for batch in made(REQUESTS[index]).shapes():
        if isinstance(batch, Stamps):
            ij, variety = batch.expand()
            outlines = [[contour.points(steps=24) for contour in outline.contours] for outline in batch.outlines]
            for place, which in zip(ij, variety, strict=True):
                rings.extend(batch.lattice.place(ring + place) for ring in outlines[which])
        else:
            assert isinstance(batch, Polygons)
            rings.extend(batch.frame.place(ring) for ring in batch.rings())
    return rings


@cache
def inked_area(index: int) -> shapely.Geometry:
    return union(drawn(index))


def spread(count: int) -> tuple[FloatArray, FloatArray]:
    """Points of the unit square that fill it evenly and are in step with no lattice."""
    n = np.arange(1, count + 1)
    return (0.7548776662466927 * n) % 1.0, (0.5698402909980532 * n) % 1.0


def union(rings: list[FloatArray]) -> shapely.Geometry:
    """What the rings ink together, filled non-zero: holes cut only the outline that they follow."""
    shapes: list[shapely.Geometry] = []
    for ring in rings:
        polygon = shapely.make_valid(shapely.Polygon(ring))
        if shapely.LinearRing(ring).is_ccw:
            shapes.append(polygon)
        else:
            shapes[-1] = shapes[-1].difference(polygon)
    return shapely.union_all(shapes)


def rendered(rings: list[FloatArray], box_mm: tuple[float, float, float, float], *, pixels: int) -> FloatArray:
    """Grey coverage (rows, columns), row 0 at the bottom, by the outside renderer."""
    x0, y0, x1, y1 = box_mm
    # shapes that overlap are separate elements: their coverage may only grow
    paths = []
    for ring in rings:
        text = " ".join(f"{x:.7f},{y:.7f}" for x, y in ring)
        if shapely.LinearRing(ring).is_ccw:
            paths.append(f"M{text}Z")
        else:
            paths[-1] += f"M{text}Z"
    body = "".join(f'<path d="{path}"/>' for path in paths)
    high = round(pixels * (y1 - y0) / (x1 - x0))
    svg = (
        f'<svg xmlns="http://www.w3.org/2000/svg" width="{pixels}" height="{high}" '
        f'viewBox="{x0} {-y1} {x1 - x0} {y1 - y0}"><rect x="{x0}" y="{-y1}" width="100%" height="100%" fill="#fff"/>'
        f'<g transform="scale(1,-1)" fill="#000" fill-rule="nonzero">{body}</g></svg>'
    )
    grey = np.asarray(Image.open(BytesIO(bytes(resvg_py.svg_to_bytes(svg_string=svg)))).convert("L"), dtype=float)
    return 1.0 - grey[::-1] / 255.0


@pytest.mark.parametrize("index", EVEN)
def test_fourier_transform_of_covers_is_the_coefficient(index: int) -> None:
    """second way: `covers` sampled over one cell of the lattice, and transformed, order by order."""
    large = Area((-1e3, -1e3, 1e3, 1e3))
    screen = made(replace(REQUESTS[index], area=large))
    f = screen.frequencies_per_mm
    tone = screen.tone.constant
    assert tone is not None
    reach, n = 5, 400
    mean = screen.coefficients(tone, reach=reach)[(reach,) * len(f)]
    assert abs(mean - tone) < 1e-9  # stated error of the tone's inversion
    steps = np.linalg.pinv(f)
    axes = np.meshgrid(*[(np.arange(n) + 0.5) / n] * len(f), indexing="ij")
    cells = np.stack([axis.ravel() for axis in axes], axis=1)
    xy = cells @ steps.T
    if len(f) == 1:
        # one row of points suffices for lines: make it long
        cells = (np.arange(n * n) + 0.5)[:, None] / (n * n)
        xy = cells @ steps.T
    inked = screen.covers(xy[:, 0], xy[:, 1]).astype(float)
    k = np.arange(-reach, reach + 1)
    if len(f) == 1:
        seen = np.exp(-2j * np.pi * np.outer(k, cells[:, 0])) @ inked / len(inked)
    else:
        wave = np.exp(-2j * np.pi * np.outer(k, (np.arange(n) + 0.5) / n))
        seen = wave @ inked.reshape(n, n) @ wave.T / n**2
    # point samples put an edge off by up to half a step; straight edges along the samples add up: one step of edge
    assert np.abs(seen - screen.coefficients(tone, reach=reach)).max() < 3e-3


@pytest.mark.parametrize("index", EVEN)
def test_tail_bounds_every_coefficient_beyond(index: int) -> None:
    """invariant: no coefficient of order |k| >= radius exceeds the stated bound."""
    screen = made(REQUESTS[index])
    tone = screen.tone.constant
    assert tone is not None
    reach = 24
    c = np.abs(screen.coefficients(tone, reach=reach))
    k = np.meshgrid(*[np.arange(-reach, reach + 1)] * c.ndim, indexing="ij")
    radius = np.sqrt(sum(axis.astype(float) ** 2 for axis in k))
    for at in (1.0, 1.5, 3.0, 7.0, 20.0):
        assert c[radius >= at].max() <= screen.tail(tone, radius=at) + 1e-12


@pytest.mark.parametrize("index", EXAMPLES)
def test_area_of_shapes_is_the_mean_tone(index: int) -> None:
    """second way: shapely's union of everything drawn, against `covers` and the tone over the area."""
    screen = made(REQUESTS[index])
    inked = inked_area(index)
    area = screen.area.geometry()
    # cut exactly: what lies outside is the clipper's rounding
    assert inked.difference(area).area < 1e-9
    x0, y0, x1, y1 = screen.area.box_mm
    x, y = spread(300_000)
    seen = float(screen.covers(x0 + x * (x1 - x0), y0 + y * (y1 - y0)).mean()) * (x1 - x0) * (y1 - y0)
    # 300,000 spread points along 200 mm of edge, chords 2e-4 short of the ink; in this picture,
    # whose tone moves by a seventh from cell to cell, neighbours' overlaps stick out a little
    assert inked.area == pytest.approx(seen, abs=0.03 if screen.tone.constant is None else 0.01)
    tone = screen.tone.constant
    if tone is not None:
        # whole cells are exact; about 80 cut cells of 0.09 mm2 vary by their place
        assert inked.area == pytest.approx(tone * area.area, abs=0.4 * np.sqrt(tone * (1 - tone)))


@pytest.mark.parametrize("index", EXAMPLES)
def test_rendered_shapes_are_what_covers_says(index: int) -> None:
    """second way: resvg draws the shapes; where no edge is near, pixels are full or bare as `covers` says."""
    screen = made(REQUESTS[index])
    width, fine = 300, 3
    picture = rendered(drawn(index), screen.area.box_mm, pixels=width)
    x, y = _grid(screen.area, width * fine)
    inked = screen.covers(x, y).reshape(picture.shape[0], fine, width, fine)
    share = inked.mean(axis=(1, 3))
    low, high = share.copy(), share.copy()
    for down in (-1, 0, 1):
        for right in (-1, 0, 1):
            beside = np.roll(share, (down, right), (0, 1))
            low, high = np.minimum(low, beside), np.maximum(high, beside)
    full, bare = picture[low == 1.0], picture[high == 0.0]
    # tips finer than the samples of `covers` may show in a few pixels
    assert np.count_nonzero(bare > 0.02) <= 8
    if screen.tone.constant is not None:
        # an open seam between two antialiased edges would show with 0.75; the overlap is half a pixel here
        assert full.min(initial=1.0) > 0.85
    else:
        # in a picture gaps may be finer than the samples
        assert np.count_nonzero(full < 0.85) <= 0.015 * full.size
    # antialiasing (and joints of overlapping stamps) put an edge off by a twentieth of a pixel at the most
    ink = inked_area(index)
    assert picture.mean() * 30.0 == pytest.approx(ink.area, abs=0.02 / 20 * ink.length)


@pytest.mark.parametrize("index", EVEN)
def test_frequencies_are_where_the_spectrum_peaks(index: int) -> None:
    """second way: the strongest coefficient's frequency carries its amplitude, a frequency beside it none."""
    side_mm = 16.0
    screen = made(replace(REQUESTS[index], area=Area((0.0, 0.0, side_mm, side_mm))))
    tone = screen.tone.constant
    assert tone is not None
    reach = 2
    c = screen.coefficients(tone, reach=reach).copy()
    c[(reach,) * c.ndim] = 0.0
    order = np.array(np.unravel_index(np.argmax(np.abs(c)), c.shape)) - reach
    frequency = order @ screen.frequencies_per_mm
    x, y = (side_mm * axis for axis in spread(150_000))
    window = (1 - np.cos(2 * np.pi * x / side_mm)) * (1 - np.cos(2 * np.pi * y / side_mm))
    inked = screen.covers(x, y) * window

    def amplitude(f: FloatArray) -> float:
        return float(abs(np.mean(inked * np.exp(-2j * np.pi * (f[0] * x + f[1] * y)))))

    expected = float(np.abs(c).max())
    # 150,000 spread points along 1,500 mm of edge
    assert amplitude(frequency) == pytest.approx(expected, abs=0.004)
    # four widths of the field beside it the window lets nothing through
    assert amplitude(frequency + 4 / side_mm * np.array([0.6, -0.8])) < 0.004


@pytest.mark.parametrize("name", registry.names("patterngen.grids"))
def test_grid_transfer_and_comb(name: str) -> None:
    """invariant: order zero is 1; what a grid does to a uniform print is nothing."""
    module = registry.load("patterngen.grids", name)
    for request in module.examples():
        assert isinstance(request, GridRequest)
        grid = module.make(request)
        c = grid.coefficients(reach=3)
        assert c[(3,) * c.ndim] == pytest.approx(1.0, abs=1e-15)
        assert grid.transfer(np.zeros((1, 2)))[0] == pytest.approx(1.0, abs=1e-15)
        if grid.samples:
            assert np.all(np.abs(c) == 1.0)


def test_every_kind_gives_examples() -> None:
    """invariant: no kind stays out of these tests."""
    assert {request.kind for request in REQUESTS} == set(KINDS)
    assert any(request.tone.constant is None for request in REQUESTS)


def _grid(area: Area, across: int) -> tuple[FloatArray, FloatArray]:
    x0, y0, x1, y1 = area.box_mm
    high = round(across * (y1 - y0) / (x1 - x0))
    x = x0 + (np.arange(across) + 0.5) / across * (x1 - x0)
    y = y0 + (np.arange(high) + 0.5) / high * (y1 - y0)
    grid_x, grid_y = np.meshgrid(x, y)
    return grid_x, grid_y
