"""Outlines from SVG: geometry in mm."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
import shapely

from patterngen.job.outlines import OutlineError, Outlines, read
from patterngen.job.svg_curves import CHORD_ERROR_MM, path_points
from patterngen.model.area import Area

PAGE = (
    '<svg xmlns="http://www.w3.org/2000/svg" xmlns:xlink="http://www.w3.org/1999/xlink"'
    ' width="90mm" height="60mm" viewBox="0 0 90 60">{}</svg>'
)
BOX = (-3.0, -3.0, 93.0, 63.0)


def outlines(body: str, *, page: str = PAGE, element: str | None = None, box: Any = BOX) -> Outlines:
    return read(page.format(body).encode(), element=element, sheet_mm=(90.0, 60.0), box_mm=box, label="art/lid.svg")


def geometry(body: str, **more: Any) -> shapely.Geometry:
    found = outlines(body, **more)
    return Area(BOX, tuple(found.rings)).geometry()


def test_rectangle_lands_from_the_top_left() -> None:
    """invariant: the page's top left corner lies on the sheet's, y turned up; rectangles are exact."""
    (ring,) = outlines('<rect x="10" y="5" width="20" height="8"/>').rings
    assert shapely.Polygon(ring).equals(shapely.box(10, 47, 30, 55))
    assert shapely.LinearRing(ring).is_ccw


@pytest.mark.parametrize(
    ("size", "factor"),
    [
        ('width="90mm" height="60mm" viewBox="0 0 90 60"', 1.0),
        ('width="9cm" height="6cm" viewBox="0 0 900 600"', 0.1),
        ('width="90" height="60"', 25.4 / 96),
        ('width="340.157px" height="226.772px"', 25.4 / 96),
        ('width="3.54330708661in" height="2in" viewBox="0 0 3.54330708661 2"', 25.4),
        ('width="72pt" height="72pt" viewBox="0 0 72 72"', 25.4 / 72),
    ],
)
def test_page_sizes(size: str, factor: float) -> None:
    """published: CSS 2.1 (W3C 2011), section 4.3.2: 1 in = 96 px = 72 pt = 25.4 mm; an SVG user unit is a px."""
    svg = f'<svg xmlns="http://www.w3.org/2000/svg" {size}>{{}}</svg>'
    width = 60 * factor if factor < 20 else 1.5 * factor
    found = geometry(f'<rect x="0" y="0" width="{width / factor}" height="1"/>', page=svg)
    assert found.bounds[2] - found.bounds[0] == pytest.approx(width, rel=1e-10)


@pytest.mark.parametrize(
    ("how", "box"),
    [
        ("", (15.0, 0.0, 75.0, 60.0)),
        ("xMinYMid meet", (0.0, 0.0, 60.0, 60.0)),
        ("xMaxYMax", (30.0, 0.0, 90.0, 60.0)),
        ("none", (0.0, 0.0, 90.0, 60.0)),
        ("xMidYMin slice", (0.0, -3.0, 90.0, 60.0)),
    ],
)
def test_aspect(how: str, box: tuple[float, ...]) -> None:
    """second way: a square page in a 90 x 60 window, placed by hand as SVG 1.1, section 7.8, says."""
    attribute = f'preserveAspectRatio="{how}"' if how else ""
    svg = PAGE.replace('viewBox="0 0 90 60"', f'viewBox="0 0 10 10" {attribute}')
    assert geometry('<rect width="10" height="10"/>', page=svg).bounds == pytest.approx(box, abs=1e-9)


def test_circle_area_and_chords() -> None:
    """invariant: chords lie inside the circle, no deeper than the stated error; so does the area."""
    (ring,) = outlines('<circle cx="45" cy="30" r="20"/>').rings
    centre = np.array([45.0, 30.0])
    middles = (ring + np.roll(ring, -1, axis=0)) / 2
    depth = 20 - np.hypot(*(middles - centre).T)
    assert np.abs(np.hypot(*(ring - centre).T) - 20).max() < 1e-9
    assert 0 < depth.max() <= CHORD_ERROR_MM * (1 + 1e-6)
    # area lost is at most two thirds of depth times circumference
    area = shapely.Polygon(ring).area
    assert 0 <= math.pi * 400 - area <= CHORD_ERROR_MM * 2 * math.pi * 20


@pytest.mark.parametrize(
    "d",
    [
        "M14 6 C20 3 70 3 76 6 C82 10 86 20 86 32 C86 44 82 54 76 58 C70 61 20 61 14 58 C8 54 4 44 14 6 z",
        "M10 10 q20 -15 40 0 t20 10 L 60 50 H 20 v-20 z",
        "m10,10 s10 20 30 5 s 10 -10 20 20 l-30,10z",
        "M20 20 a 15 8 30 1 0 20 10 z",
        "M20 20 a15 8 30 0110 5z m20 10 a 5 5 0 1 1 3 3 z",
        "M10 10 A 1 1 0 0 0 40 40 L 10 40 Z",
        "M10-10.5.5 20L30 1e1 20 3e1z",
        "M 5 5 30 5 30 30 5 30 z l 40 20 0 10 -10 0 z",
    ],
)
@pytest.mark.parametrize(
    "transform",
    ["", "rotate(20 30 30)", "matrix(.8 .1 -.2 .9 5 3)", "translate(3) scale(-1 1) translate(-60) skewX(10)"],
)
def test_paths_against_another_reader(d: str, transform: str) -> None:
    """second way: the same path through the library svgelements, sampled finely; largest distance both ways."""
    svgelements = pytest.importorskip("svgelements")
    m = svgelements.Matrix(transform)
    matrix = np.array([[m.a, m.c, m.e], [m.b, m.d, m.f], [0, 0, 1]])
    mine = [ring for ring, _ in path_points(d, matrix)]
    theirs = []
    for sub in svgelements.Path(d).as_subpaths():
        pieces = [segment for segment in svgelements.Path(sub) if type(segment).__name__ != "Move"]
        points = [segment.point(t) for segment in pieces for t in np.linspace(0, 1, 801)]
        # sampled first and then transformed: that library does not shear its arcs rightly
        theirs.append(np.array([(p.x, p.y) for p in points]) @ matrix[:2, :2].T + matrix[:2, 2])
    assert len(mine) == len(theirs)
    for a, b in zip(mine, theirs, strict=True):
        off = max(_farthest(a, b), _farthest(b, a))
        # our stated error, and that of their 800 chords to a piece (below 0.02 um)
        assert off <= CHORD_ERROR_MM + 2e-5


def _farthest(points: Any, ring: Any) -> float:
    closed = shapely.LineString(np.vstack([ring, ring[:1]]))
    shapely.prepare(closed)
    return float(shapely.distance(shapely.points(points), closed).max())


def star(turn: int = 0) -> str:
    corners = [(45 + 20 * math.sin(0.8 * math.pi * k), 30 - 20 * math.cos(0.8 * math.pi * k)) for k in range(5)]
    return "M" + " ".join(f"{x:.12f} {y:.12f}" for x, y in corners) + "z"


def test_fill_rules_on_a_star() -> None:
    """second way: area of a five-pointed star with and without its middle, from its corners by hand."""
    # non-zero: ten triangles; even-odd: the inner pentagon is left out
    inner = 20 * math.cos(math.radians(72)) / math.cos(math.radians(36))
    whole = 10 * 0.5 * 20 * inner * math.sin(math.radians(36))
    middle = 5 * 0.5 * inner**2 * math.sin(math.radians(72))
    nonzero, evenodd = (outlines(f'<path fill-rule="{rule}" d="{star()}"/>') for rule in ("nonzero", "evenodd"))
    assert Area(BOX, tuple(nonzero.rings)).area_mm2() == pytest.approx(whole, rel=1e-9)
    assert Area(BOX, tuple(evenodd.rings)).area_mm2() == pytest.approx(whole - middle, rel=1e-9)
    assert all("crosses itself" in found.remarks[0] and "mm2" in found.remarks[0] for found in (nonzero, evenodd))


def test_rings_within_rings() -> None:
    """invariant: direction decides under the non-zero rule, number under the even-odd; islands stand in holes."""
    outer, same, back = "M0 0h30v30h-30z", "M10 10h10v10h-10z", "M10 10v10h10v-10z"
    assert geometry(f'<path d="{outer}{same}"/>').area == pytest.approx(900)
    assert geometry(f'<path d="{outer}{back}"/>').area == pytest.approx(800)
    assert geometry(f'<path fill-rule="evenodd" d="{outer}{same}"/>').area == pytest.approx(800)
    island = "M14 14h2v2h-2z"
    found = outlines(f'<path fill-rule="evenodd" d="{outer}{same}{island}"/>')
    area = Area(BOX, tuple(found.rings))
    assert area.area_mm2() == pytest.approx(804)
    assert area.geometry().area == pytest.approx(804)
    assert area.contains(np.array([15.0, 12.0, 5.0]), np.array([45.0, 45.0, 45.0])).tolist() == [
        True,
        False,
        True,
    ]
    assert found.remarks == []


@pytest.mark.parametrize(
    "body",
    [
        '<style>.hole{fill-rule:evenodd}</style><path class="hole" d="M0 0h30v30h-30z M10 10h10v10h-10z"/>',
        '<style>path{fill-rule:evenodd}</style><path d="M0 0h30v30h-30z M10 10h10v10h-10z"/>',
        '<style>#p , g{ fill-rule : evenodd ; fill : red }</style><g><path d="M0 0h30v30h-30z M10 10h10v10h-10z"/></g>',
        '<g fill-rule="evenodd"><path d="M0 0h30v30h-30z M10 10h10v10h-10z"/></g>',
        '<path style="fill:none; fill-rule:evenodd" d="M0 0h30v30h-30z M10 10h10v10h-10z"/>',
        '<path d="M0 0h30v30h-30z"/><path fill-rule="evenodd" transform="translate(1)" d="M0 0 z"/>'
        '<rect display="none" width="80" height="50"/><rect style="visibility:hidden" width="80" height="50"/>'
        '<defs><rect width="80" height="50"/></defs><g display="none"><rect width="80" height="50"/></g>',
    ],
)
def test_style(body: str) -> None:
    """invariant: fill rule, display and visibility count wherever they stand; paint does not."""
    assert geometry(body).area == pytest.approx(900 if "display" in body else 800)


def test_use_and_symbol() -> None:
    """second way: the same drawing with its uses spelt out by hand."""
    body = (
        '<defs><g id="pair"><rect id="r" width="4" height="2"/><use href="#r" x="6"/></g>'
        '<symbol id="s"><circle cx="1" cy="1" r="1"/></symbol></defs>'
        '<use xlink:href="#pair" x="10" y="10" transform="scale(2)"/><use href="#s" x="50" y="20"/>'
    )
    spelt = (
        '<rect x="20" y="20" width="8" height="4"/><rect x="32" y="20" width="8" height="4"/>'
        '<circle cx="51" cy="21" r="1"/>'
    )
    assert shapely.symmetric_difference(geometry(body), geometry(spelt)).area < 1e-9


def test_one_element() -> None:
    """invariant: an id picks one element, with the transforms around it."""
    body = (
        '<g transform="translate(10 10)"><rect id="a" width="5" height="5"/>'
        '<rect id="b" x="20" width="5" height="5"/></g>'
    )
    assert geometry(body, element="a").equals(shapely.box(10, 45, 15, 50))
    inside = '<defs><g transform="scale(2)"><rect id="panel" width="5" height="5"/></g></defs>'
    assert geometry(inside, element="panel").equals(shapely.box(0, 50, 10, 60))


def test_rounded_rectangle_and_ellipse() -> None:
    """second way: areas by formula."""
    found = geometry('<rect width="30" height="20" rx="4"/>')
    # chords lose at most the error along the round parts
    assert found.area == pytest.approx(600 - (4 - math.pi) * 16, abs=2 * math.pi * 4 * CHORD_ERROR_MM)
    found = geometry('<rect width="30" height="20" rx="99" ry="5"/>')
    assert found.area == pytest.approx(600 - (4 - math.pi) * 15 * 5, abs=70 * CHORD_ERROR_MM)
    assert geometry('<ellipse cx="40" cy="30" rx="10" ry="3"/>').area == pytest.approx(
        math.pi * 30, abs=50 * CHORD_ERROR_MM
    )
    assert geometry(
        '<circle cx="40mm" cy="30mm" r="1cm"/>', page=PAGE.replace('viewBox="0 0 90 60"', "")
    ).bounds == pytest.approx((30, 20, 50, 40), abs=CHORD_ERROR_MM)


def test_cut_to_the_sheet() -> None:
    """invariant: what reaches beyond the bleed is cut there, and that is told."""
    found = outlines('<rect x="-50" y="10" width="200" height="10"/>')
    assert Area(BOX, tuple(found.rings)).geometry().equals(shapely.box(-3, 40, 93, 50))
    assert "cut there" in found.remarks[0]


def test_mended_outlines() -> None:
    """invariant: open outlines are closed, those without area left out; both are told."""
    found = outlines('<path d="M0 0h30v30M50 50h10z"/><polyline points="40 0 50 0 50 10"/><path d=""/>')
    assert Area(BOX, tuple(found.rings)).area_mm2() == pytest.approx(450 + 50)
    assert any("2 open outlines were closed" in remark for remark in found.remarks)
    assert any("without area" in remark for remark in found.remarks)


def test_duplicate_rings() -> None:
    """invariant: the same outline twice is once under the non-zero rule and nothing under the even-odd."""
    twice = "M0 0h30v30h-30z" * 2
    assert geometry(f'<path d="{twice}"/><rect x="40" width="1" height="1"/>').area == pytest.approx(901)
    assert geometry(
        f'<path fill-rule="evenodd" d="{twice}"/><rect x="40" width="1" height="1"/>'
    ).area == pytest.approx(1)


@pytest.mark.parametrize(
    ("size", "remarks"),
    [
        ('width="90mm" height="60mm" viewBox="0 0 90 60"', ()),
        ('width="255pt" height="170pt" viewBox="0 0 90 60"', ()),  # 89.96 x 59.97 mm
        ('width="90.4mm" height="60mm" viewBox="0 0 90 60"', ()),
        ('width="96mm" height="66mm" viewBox="-3 -3 96 66"', ("its page is 96 x 66 mm, but the sheet 90 x 60 mm",)),
        ('width="90mm" height="60.6mm" viewBox="0 0 90 60"', ("its page is 90 x 60.6 mm",)),
        (
            'width="90" height="60" viewBox="0 0 90 60"',
            ("have no unit; px were read as 1/96 in, so that the page is 23.81 x 15.88 mm", "but the sheet 90 x 60 mm"),
        ),
        ('width="340.157px" height="226.772px"', ("width and height are in px; px were read as 1/96 in",)),
        ('width="340.157px" height="60mm" viewBox="0 0 90 60"', ("in part in px",)),
        ('width="90mm" height="60mm"', ("no viewBox",)),
    ],
)
def test_odd_pages_are_told(size: str, remarks: tuple[str, ...]) -> None:
    """second way: sizes worked out by hand at 25.4 mm = 96 px = 72 pt; 0.5 mm apart is the same size."""
    svg = f'<svg xmlns="http://www.w3.org/2000/svg" {size}>{{}}</svg>'
    found = outlines('<rect x="10" y="5" width="20" height="8"/>', page=svg).remarks
    assert len(found) == len(remarks), found
    for words, remark in zip(remarks, found, strict=True):
        assert words in remark
        assert remark.startswith("art/lid.svg: its page")


def test_flat_rings_hold_nothing() -> None:
    """regression: a ring with no inside stopped the reader; beside a square it adds nothing, alone it is refused."""
    drawn = outlines('<path d="M0 0H10V10H0zM30 30L40 30L35 30z"/>')
    assert len(drawn.rings) == 1
    with pytest.raises(OutlineError, match="has an area"):
        outlines('<path d="M0 0L10 0L20 0z"/>')
