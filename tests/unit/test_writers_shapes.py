"""invariant: chords have the curve's area and stay on it; whole numbers stay where the polygons were."""

from __future__ import annotations

import numpy as np
import pytest

from patterngen import registry
from patterngen.model.job import SheetSize
from patterngen.model.lattice import Lattice
from patterngen.model.shapes import Contour, Outline, Polygons
from patterngen.writers._curves import chords
from patterngen.writers._integers import whole
from patterngen.writers._page import page_of
from tests import drawings


def area(ring: np.ndarray) -> float:
    x, y = ring.T
    return float(0.5 * np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y))


def outlines() -> list[tuple[str, Outline]]:
    out = [(f"disc {r}", drawings.disc(r)) for r in (0.03, 0.36, 0.5)]
    for shape in ("round", "ellipse", "cosinedot", "square", "cross"):
        screen = registry.load("patterngen.screens", "dots").make(drawings.request("dots", shape, 0.35, a=21, b=8))
        out.append((shape, next(b for b in screen.shapes() if hasattr(b, "outlines")).outlines[0]))
    return out


@pytest.mark.parametrize(("name", "outline"), outlines())
@pytest.mark.parametrize("pitch_mm", [0.1, 0.4, 5.0])
def test_chords(name: str, outline: Outline, pitch_mm: float) -> None:
    """Same area, and no corner or middle of a chord further than half a micrometre from the curve."""
    import shapely

    for contour in outline.contours:
        ring = chords(contour, steps_mm=pitch_mm * np.eye(2))
        assert area(ring) == pytest.approx(contour.area(), rel=1e-9)
        # twenty times finer than the chords, so that its own chords do not count
        curve = shapely.LinearRing(contour.points(steps=400) * pitch_mm)
        points = np.concatenate([ring, (ring + np.roll(ring, -1, axis=0)) / 2]) * pitch_mm
        assert shapely.distance(curve, shapely.points(points)).max() < 0.5e-3


def test_straight_pieces_stay_as_they_are() -> None:
    """A square is its four corners."""
    corners = np.array([[0, 0], [1, 0], [1, 1], [0, 1]], dtype=float)
    ends = np.roll(corners, -1, axis=0)
    bends = np.stack([corners + (ends - corners) / 3, corners + 2 * (ends - corners) / 3, ends], axis=1)
    square = Contour(corners[0], bends, np.ones(4, dtype=bool))
    assert np.array_equal(chords(square, steps_mm=np.eye(2)), corners)


def test_whole_numbers_keep_polygons_in_place() -> None:
    """In an oblique frame every corner stays within 0.05 um along each axis of the frame."""
    frame = Lattice(np.array([3.0, -2.0]), np.array([[0.17, 0.02], [-0.03, 0.21]]))
    uv = np.random.default_rng(5).uniform(-900, 900, (300, 2))
    starts = np.arange(0, 301, 10, dtype=np.int32)
    polygons = Polygons(frame, uv, starts, np.array([0, 2, 3, 30], np.int32))
    figures = whole(polygons)
    off = (figures.frame.place(figures.points.astype(float)) - frame.place(uv)) @ np.linalg.inv(frame.steps_mm)
    assert (np.abs(off) * np.hypot(*frame.steps_mm.T) <= 0.0500001e-3).all()
    assert list(np.flatnonzero(figures.shape_end)) == [19, 29, 299]
    assert np.array_equal(np.flatnonzero(figures.first), starts[:-1])


def test_very_large_sheets_stay_in_single_precision() -> None:
    """Ten metres: whole numbers below 2^23, rounding still under a micrometre."""
    uv = np.array([[0, 0], [10_000, 0], [10_000, 3], [0, 3]], dtype=float)
    polygons = Polygons(Lattice.millimetres(), uv, np.array([0, 4], np.int32), np.array([0, 1], np.int32))
    figures = whole(polygons)
    assert np.abs(figures.points).max() <= 2**23
    assert np.abs(figures.frame.place(figures.points.astype(float)) - uv).max() < 1e-3


def test_pieces_end_only_where_shapes_end() -> None:
    """Corners are shared out in order, all of them, never a shape in two pieces."""
    starts = np.array([0, 3, 7, 11, 40, 44], np.int32)
    polygons = Polygons(
        Lattice.millimetres(), np.random.default_rng(2).uniform(0, 9, (44, 2)), starts, np.arange(6, dtype=np.int32)
    )
    figures = whole(polygons)
    slices = list(figures.pieces(figures.shape_end, most=8))
    assert [(s.start, s.stop) for s in slices] == [(0, 7), (7, 11), (11, 40), (40, 44)]


def test_page_without_bleed_and_marks_is_the_sheet() -> None:
    page = page_of(SheetSize(90, 60))
    assert page.media_mm == page.bleed_mm == page.trim_mm == (0, 0, 90, 60)
    assert page.marks_mm == ()


@pytest.mark.parametrize("size", [(90.0, 60.0), (8.0, 300.0), (5.0, 5.0)])
def test_marks_stay_outside_the_bleed_and_on_the_page(size: tuple[float, float]) -> None:
    page = page_of(SheetSize(*size, bleed_mm=3, marks=True))
    x0, y0, x1, y1 = page.bleed_mm
    for ax, ay, bx, by in page.marks_mm:
        assert page.media_mm[0] < min(ax, bx)
        assert max(ax, bx) < page.media_mm[2]
        assert page.media_mm[1] < min(ay, by)
        assert max(ay, by) < page.media_mm[3]
        assert max(ax, bx) < x0 or min(ax, bx) > x1 or max(ay, by) < y0 or min(ay, by) > y1
    assert len(page.marks_mm) >= 8
