"""Spot functions: the standard's formulas against the mechanism that replaces them."""

from __future__ import annotations

import numpy as np
import pytest
import shapely

from patterngen.errors import InputError
from patterngen.model.area import Area, ToneField
from patterngen.model.job import Gain, ScreenRequest
from patterngen.screens import _outlines as outlines
from patterngen.screens import _quadrant as quadrant
from patterngen.screens import _spot as spot
from patterngen.screens import dots

TONES = np.array([0.002, 0.03, 0.1, 0.25, 0.375, 0.3927, 0.393, 0.4999, 0.5, 0.6, 0.7853, 0.786, 0.9, 0.97, 0.999])


def made(shape: str, **more: object) -> dots.DotScreen:
    fields: dict[str, object] = {
        "name": "a", "ink": "Slate", "kind": "dots", "shape": shape, "ruling_per_mm": 4.0, "angle_deg": 0.0,
        "tone": ToneField(constant=0.3), "area": Area((-50.0, -50.0, 50.0, 50.0)), "origin_mm": (0.0, 0.0),
        "gain": Gain(),
    }  # fmt: skip
    screen = dots.make(ScreenRequest(**{**fields, **more}))  # type: ignore[arg-type]
    assert isinstance(screen, dots.DotScreen)
    return screen


def test_the_standards_list() -> None:
    """from memory: the 21 predefined spot functions of ISO 32000-1:2008, Table 130."""
    assert set(spot.FUNCTIONS) == set(quadrant.SHAPES)
    assert len(spot.FUNCTIONS) == 21


@pytest.mark.parametrize(
    ("name", "x", "y", "expected"),
    [
        ("simpledot", 0.3, -0.4, 0.75),
        ("invertedsimpledot", 0.3, -0.4, -0.75),
        ("doubledot", 0.25, 0.25, 1.0),
        ("inverteddoubledot", 0.25, 0.25, -1.0),
        ("cosinedot", 0.0, 1.0, 0.0),
        ("double", 0.5, 0.25, 1.0),
        ("inverteddouble", 0.5, 0.25, -1.0),
        ("line", 0.9, -0.2, -0.2),
        ("linex", 0.9, -0.2, 0.9),
        ("liney", 0.9, -0.2, -0.2),
        ("round", 0.5, 0.4, 0.59),
        ("round", 0.8, 0.6, -0.8),
        ("ellipse", 0.2, 0.3, 0.95),
        ("ellipse", 0.5, 0.5, 0.0),
        ("ellipse", 1.0, 1.0, -1.0),
        ("ellipsea", 0.5, 1.0, -0.15),
        ("invertedellipsea", 0.5, 1.0, 0.15),
        ("ellipseb", 0.0, 0.8, 1 - 0.4**0.5),
        ("ellipsec", 1.0, 0.5, -0.15),
        ("invertedellipsec", 1.0, 0.5, 0.15),
        ("square", -0.7, 0.2, -0.7),
        ("cross", -0.7, 0.2, -0.2),
        ("rhomboid", -1.0, 0.5, 0.7),
        ("diamond", 0.3, 0.4, 0.75),
        ("diamond", 0.6, 0.4, 0.09),
        ("diamond", 0.9, 0.7, -0.9),
    ],
)
def test_values(name: str, x: float, y: float, expected: float) -> None:
    """second way: the standard's formulas (from memory) worked out by hand at one place of each branch."""
    assert float(spot.value(name, np.array(x), np.array(y))) == pytest.approx(expected, abs=1e-12)


@pytest.mark.parametrize("name", dots.SHAPES)
def test_mechanism_inks_what_the_function_does(name: str) -> None:
    """second way: 20,000 random places of a cell, the standard's formula against the quadrant curve, at 13 levels."""
    shape = quadrant.SHAPES[name]
    rng = np.random.default_rng(5)
    u, v = rng.random((2, 20_000)) - 0.5
    for tone in TONES:
        level = quadrant.level_of(name, float(tone))
        centre = 0.5 * (1.0 - tone) * np.array(shape.slides)
        a, b = 2 * np.abs(u - centre[0]), 2 * np.abs(v - centre[1])
        p, _ = quadrant.curve(shape, a - b, np.full(a.shape, level))
        inked = a + b < p
        x = 2 * (u / shape.copies[0] + shape.dot[0])
        y = 2 * (v / shape.copies[1] + shape.dot[1])
        wrap = (x + 1) % 2 - 1, (y + 1) % 2 - 1
        assert np.array_equal(inked, spot.inked(name, *wrap, level))
        # 20,000 random points: three standard deviations of a share
        assert abs(inked.mean() - tone) < 3.3 * np.sqrt(tone * (1 - tone) / 20_000) + 1e-9


@pytest.mark.parametrize("name", dots.SHAPES)
def test_tone_to_level_and_back(name: str) -> None:
    """second way: the area above the level by a midpoint rule on the formula itself, 4 million points of the cell."""
    n = 2000
    at = (np.arange(n) + 0.5) / n * 2 - 1
    x, y = np.meshgrid(at, at)
    value = spot.value(name, x, y)
    for tone in (0.07, 0.44, 0.81):
        level = quadrant.level_of(name, tone)
        assert float(quadrant.areas(quadrant.SHAPES[name], np.array([level]))[0]) == pytest.approx(tone, abs=1e-12)
        # straight edges along the samples are off by up to half a sample on each of at most eight edges
        assert float((value > level).mean()) == pytest.approx(tone, abs=8 * 0.5 / n)


@pytest.mark.parametrize("name", dots.SHAPES)
def test_stamps_side_by_side_ink_exactly_the_tone(name: str) -> None:
    """second way: shapely's union of five by five stamps, cut to one cell; 2e-5 is the fit plus the chords."""
    shape = quadrant.SHAPES[name]
    levels = quadrant.levels_of(shape, TONES)
    cell = shapely.box(-0.5, -0.5, 0.5, 0.5)
    for even in (True, False):
        for tone, contour in zip(TONES, outlines.of_levels(shape, levels, even=even), strict=True):
            ring = contour.points(steps=64)
            assert shapely.Polygon(ring).is_valid
            assert contour.area() > 0
            union = shapely.union_all(
                [shapely.Polygon(ring + np.array([i, j])) for i in range(-2, 3) for j in range(-2, 3)]
            )
            assert union.intersection(cell).area == pytest.approx(tone, abs=2e-5)


@pytest.mark.parametrize("name", dots.SHAPES)
def test_outline_keeps_to_the_curve(name: str) -> None:
    """second way: spot values along the outline equal the level, within 1e-5 cells of the curve (stated error)."""
    shape = quadrant.SHAPES[name]
    for tone in (0.1, 0.45, 0.7, 0.9):
        level = quadrant.level_of(name, tone)
        contour = outlines.of_levels(shape, np.array([level]), even=True)[0]
        a, b = 2 * np.abs(contour.points(steps=12)).T
        if shape.whole is None:
            inside = (a < 1 - 1e-9) & (b < 1 - 1e-9)
            a, b = a[inside], b[inside]
            w = a - b
            p, _ = quadrant.curve(shape, w, np.full(w.shape, level))
            assert np.abs(p - (a + b)).max(initial=0.0) < 4.1e-5  # p is in half cells, and is a + b
        else:
            figure = shape.whole
            m = figure.m(np.array(level))
            assert np.abs(np.sqrt((figure.A * a * a + figure.B * b * b) / m) - 1).max() < 1e-5


def test_shapes_with_an_axis() -> None:
    """second way: rows and columns differ for these by their formulas."""
    axis = {
        "double", "inverteddouble", "line", "linex", "liney", "ellipse", "ellipsea", "ellipseb", "ellipsec",
        "invertedellipsea", "invertedellipsec", "rhomboid", "diamond",
    }  # fmt: skip
    assert axis == dots.AXIS_SHAPES
    assert made("ellipse").symmetry_deg == 180.0
    assert made("round").symmetry_deg == 90.0


@pytest.mark.parametrize("name", dots.SHAPES)
def test_what_lies_at_the_origin(name: str) -> None:
    """invariant: a dot's centre lies there, for the inverted shapes and rhomboid a clear spot's."""
    at = (1.3, -0.4)
    clear_there = name.startswith("inverted") or name == "rhomboid"
    for tone in (0.05, 0.3):
        screen = made(name, angle_deg=30.0, origin_mm=at, tone=ToneField(constant=tone))
        if name in ("linex", "liney"):
            edge = screen.frame.place(np.array([[0.5, 0.0] if name == "linex" else [0.0, 0.5]]))[0]
            inward = (edge - np.array(at)) * 1e-6
            assert bool(screen.covers(edge[:1] - inward[0], edge[1:] - inward[1])[0])
        else:
            assert bool(screen.covers(np.array([at[0]]), np.array([at[1]]))[0]) is not clear_there
            # and the pattern is the same on both sides of it
            d = np.random.default_rng(1).uniform(-0.4, 0.4, (2, 500))
            assert np.array_equal(screen.covers(at[0] + d[0], at[1] + d[1]), screen.covers(at[0] - d[0], at[1] - d[1]))


@pytest.mark.parametrize("name", dots.SHAPES)
def test_edge_length(name: str) -> None:
    """second way: the length of shapely's union of five by five stamps inside one cell; 3e-4 for chords and cuts."""
    screen = made(name)
    for tone in (0.1, 0.45, 0.9):
        contour = outlines.of_levels(quadrant.SHAPES[name], np.array([quadrant.level_of(name, tone)]), even=True)[0]
        ring = contour.points(steps=64)
        union = shapely.union_all(
            [shapely.Polygon(ring + np.array([i, j])) for i in range(-2, 3) for j in range(-2, 3)]
        )
        edge = union.boundary.intersection(shapely.box(-0.501234, -0.501234, 0.498766, 0.498766))
        sides = np.array(screen._sides_mm)
        length = shapely.transform(edge, lambda xy, sides=sides: xy * sides).length
        assert screen.edge_per_mm(tone) == pytest.approx(length / sides.prod(), rel=3e-4)


def test_least_widths() -> None:
    """second way: discs, squares, holes and lines by hand at a pitch of 0.25 mm."""
    assert made("simpledot").smallest_mm(0.25) == pytest.approx(
        (0.25 * 2 * np.sqrt(0.25 / np.pi), 0.25 * (1 - 2 * np.sqrt(0.25 / np.pi))), abs=1e-12
    )
    assert made("invertedsimpledot").smallest_mm(0.9)[1] == pytest.approx(0.25 * 2 * np.sqrt(0.1 / np.pi), abs=1e-12)
    assert made("square").smallest_mm(0.36) == pytest.approx((0.15, 0.1), abs=1e-12)
    assert made("cross").smallest_mm(0.64)[1] == pytest.approx(0.15, abs=1e-12)
    assert made("line").smallest_mm(0.3) == pytest.approx((0.075, 0.175), abs=1e-12)
    assert made("linex").smallest_mm(0.3) == pytest.approx((0.075, 0.175), abs=1e-12)
    assert made("doubledot").smallest_mm(0.5)[0] == pytest.approx(0.125 / np.sqrt(2), abs=1e-9)
    assert made("simpledot").smallest_mm(0.0) == (np.inf, np.inf)


def test_unknown_shape_is_refused() -> None:
    """invariant: a parameter that is no spot function is refused."""
    with pytest.raises(ValueError, match="spot function"):
        dots.Params(shape="heptagon")


def test_open_ruling_is_refused() -> None:
    """invariant: nothing is drawn before ruling and angle are settled."""
    with pytest.raises(InputError, match="settled"):
        made("simpledot", ruling_per_mm=None)
