"""The sheet as SVG: true size, one top-level group an ink.

SVG knows neither separations nor overprint, so a group carries its ink's name in `data-ink`
and a display colour; the PDF is the print master.  The lattice stands in a group's matrix
and shapes at whole numbers in it.  Plain discs are strokes of no length with round caps,
everything else is filled outlines; many shapes share one path.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping

import numpy as np
import svgwrite
from numpy.typing import NDArray

from patterngen.model.design import Design, Layer
from patterngen.model.job import SheetSize
from patterngen.model.lattice import FloatArray, Lattice
from patterngen.model.shapes import Outline, Polygons, Stamps
from patterngen.writers._integers import UNIT_MM, whole
from patterngen.writers._number import integers, lookup, number, numbers, rows
from patterngen.writers._page import MARK_WIDTH_MM, Page, page_of

_TEXT_A_PATH = 2_000_000
"""Characters in one path: well under the 8 to 10 million at which readers refuse an attribute."""
_SHAPES_A_PATH = 20_000


def write(design: Design, *, rgb: Mapping[str, str]) -> bytes:
    """The base sheet of a design as an SVG file.

    `rgb` gives each ink's display colour as "#rrggbb".  The same design gives the same bytes.
    """
    sheet = design.job.sheet
    page = page_of(sheet)
    drawing = svgwrite.Drawing(
        debug=False,
        size=(f"{number(page.width_mm)}mm", f"{number(page.height_mm)}mm"),
        viewBox=f"0 0 {numbers(page.width_mm, page.height_mm)}",
    )
    drawing.set_desc(title=design.job.title, desc=_describe(sheet))
    taken: set[str] = set()
    for layer in design.base.layers:
        drawing.add(_ink_group(drawing, layer, page, colour=rgb[layer.ink.name], taken=taken))
    if page.marks_mm:
        drawing.add(_marks(drawing, page))
    return b'<?xml version="1.0" encoding="UTF-8"?>\n' + drawing.tostring().encode() + b"\n"


def _describe(sheet: SheetSize) -> str:
    return (
        f"Trim {number(sheet.width_mm)} x {number(sheet.height_mm)} mm, bleed {number(sheet.bleed_mm)} mm. "
        "Colours are for display; the inks are named in data-ink."
    )


def _ink_group(
    drawing: svgwrite.Drawing, layer: Layer, page: Page, *, colour: str, taken: set[str]
) -> svgwrite.container.Group:
    name = layer.ink.name
    extra = {"data-ink": name, "fill": colour}
    if not layer.ink.opaque:
        extra["style"] = "mix-blend-mode:multiply"
    group = drawing.g(id=_identifier(name, taken), **extra)
    for screen in layer.screens:
        inner = drawing.g(**{"data-screen": screen.name})
        for batch in screen.shapes():
            if batch.total:
                draw = _stamps if isinstance(batch, Stamps) else _polygons
                for part in draw(drawing, batch, page, colour):
                    inner.add(part)
        group.add(inner)
    return group


def _identifier(ink: str, taken: set[str]) -> str:
    """An XML name that stays the same when other inks come or go."""
    stem = "ink-" + (re.sub(r"[^a-z0-9]+", "-", ink.lower()).strip("-") or "x")
    name, k = stem, 2
    while name in taken:
        name, k = f"{stem}-{k}", k + 1
    taken.add(name)
    return name


def _frame(drawing: svgwrite.Drawing, lattice: Lattice, page: Page, **extra: str) -> svgwrite.container.Group:
    """A group in which lattice steps are the unit and y points up."""
    (a, b), (c, d) = lattice.steps_mm
    e, f = lattice.origin_mm[0] - page.media_mm[0], page.media_mm[3] - lattice.origin_mm[1]
    return drawing.g(transform=f"matrix({numbers(a, -b, c, -d, e, f)})", **extra)


def _path(drawing: svgwrite.Drawing, text: bytes, **extra: str) -> svgwrite.path.Path:
    return drawing.path(d=text.decode("ascii"), **extra)


def _stamps(
    drawing: svgwrite.Drawing, stamps: Stamps, page: Page, colour: str
) -> Iterator[svgwrite.container.Group]:
    """Repeated shapes, a path or more for each variety."""
    ij, variety = stamps.expand()
    order = np.argsort(variety, kind="stable")
    ij, variety = ij[order].astype(np.int64), variety[order]
    used, begin = np.unique(variety, return_index=True)
    cells = -(-np.hypot(*stamps.lattice.steps_mm.T) // UNIT_MM)
    fine = Lattice(stamps.lattice.origin_mm, stamps.lattice.steps_mm / cells[:, None])
    discs = _frame(drawing, stamps.lattice, page, fill="none", stroke=colour, stroke_linecap="round")
    outlines = _frame(drawing, fine, page)
    for which, at in zip(used, np.split(ij, begin[1:]), strict=True):
        outline = stamps.outlines[which]
        if outline.disc is not None:
            for text in _cap_texts(at):
                discs.add(_path(drawing, text, stroke_width=number(2 * outline.disc)))
        else:
            for text in _outline_texts(outline, at, cells):
                outlines.add(_path(drawing, text))
    for group in (discs, outlines):
        if group.elements:
            yield group


def _cap_texts(ij: NDArray[np.int64]) -> Iterator[bytes]:
    """Strokes of no length, each placed from the one before."""
    for start in range(0, len(ij), _SHAPES_A_PATH):
        step = np.diff(ij[start : start + _SHAPES_A_PATH], axis=0, prepend=np.zeros((1, 2), dtype=np.int64))
        yield rows(b"m", integers(step[:, 0]), b" ", integers(step[:, 1]), b"h0")


def _outline_texts(outline: Outline, ij: NDArray[np.int64], cells: FloatArray) -> Iterator[bytes]:
    """Filled outlines in whole numbers, `cells` to a lattice step, each placed from the one before."""
    start, home, body = _outline_body(outline, cells)
    most = max(1, min(_SHAPES_A_PATH, _TEXT_A_PATH // (len(body) + 24)))
    where = ij * cells.astype(np.int64)
    for first in range(0, len(ij), most):
        at = where[first : first + most]
        step = np.diff(at, axis=0, prepend=at[:1]) + start - home
        step[0] = at[0] + start
        yield rows(b"m", integers(step[:, 0]), b" ", integers(step[:, 1]), body)


def _outline_body(outline: Outline, cells: FloatArray) -> tuple[NDArray[np.int64], NDArray[np.int64], bytes]:
    """(where the first contour starts, where the pen ends, the text between)."""

    def rounded(uv: FloatArray) -> NDArray[np.int64]:
        return np.rint(uv * cells).astype(np.int64)

    def spelled(points: NDArray[np.int64]) -> str:
        return " ".join(str(int(value)) for value in points.ravel())

    begin = home = rounded(outline.contours[0].start)
    text = []
    for contour in outline.contours:
        start = rounded(contour.start)
        if text:
            text.append(f"m{spelled(start - home)}")
        home = here = start
        for bend, straight in zip(rounded(contour.bends), contour.straight, strict=True):
            text.append(f"l{spelled(bend[2] - here)}" if straight else f"c{spelled(bend - here)}")
            here = bend[2]
        text.append("z")
    return begin, home, "".join(text).encode()


def _polygons(
    drawing: svgwrite.Drawing, polygons: Polygons, page: Page, colour: str
) -> Iterator[svgwrite.container.Group]:
    """Loose polygons, whole shapes together in a path."""
    figures = whole(polygons)
    group = _frame(drawing, figures.frame, page)
    starts = figures.ring_start[:-1]
    before = np.roll(figures.points, 1, axis=0)
    before[starts[1:]] = figures.points[starts[:-1]]
    before[0] = 0
    step = figures.points - before
    lead = lookup([b" ", b"m"], figures.first.astype(np.int64))
    close = lookup([b"", b"z"], figures.last.astype(np.int64))
    for piece in figures.pieces(figures.shape_end, most=_TEXT_A_PATH // 24):
        part = step[piece]
        part[0] = figures.points[piece.start]
        text = rows(lead[piece], integers(part[:, 0]), b" ", integers(part[:, 1]), close[piece])
        group.add(_path(drawing, text))
    yield group


def _marks(drawing: svgwrite.Drawing, page: Page) -> svgwrite.container.Group:
    group = drawing.g(id="marks", fill="none", stroke="#000000", stroke_width=number(MARK_WIDTH_MM))
    left, top = page.media_mm[0], page.media_mm[3]
    text = "".join(
        f"M{numbers(x0 - left, top - y0)}L{numbers(x1 - left, top - y1)}" for x0, y0, x1, y1 in page.marks_mm
    )
    group.add(drawing.path(d=text))
    return group
