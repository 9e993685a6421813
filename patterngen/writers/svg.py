"""The sheet as SVG: true size, one top-level group an ink.

SVG knows neither separations nor overprint, so a group carries its ink's name in `data-ink`
and a display colour; the PDF is the print master.  The lattice stands in a group's matrix
and shapes at whole numbers in it; many shapes share one path, long runs are blocks used
again and again.

Shapes are outlines of chords that enclose the exact area.  A sheet with too many different
shapes for a file that anything could open is drawn lighter: with fewer chords, up to a
micrometre off, and plain discs as strokes of no length with round caps, which readers show
one to two per cent too thin at 2400 dpi.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

import numpy as np
import svgwrite
from numpy.typing import NDArray

from patterngen.model.design import Design
from patterngen.model.job import Ink, SheetSize
from patterngen.model.lattice import FloatArray, Lattice
from patterngen.model.shapes import Batch, Outline, Polygons, Stamps
from patterngen.writers._curves import SAGITTA_MM, chords, content
from patterngen.writers._integers import LARGEST, UNIT_MM, whole
from patterngen.writers._number import integers, lookup, number, numbers, rows
from patterngen.writers._page import MARK_WIDTH_MM, Page, page_of

_TEXT_A_PATH = 2_000_000
"""Characters in one path: well under the 8 to 10 million at which readers refuse an attribute."""
_SHAPES_A_PATH = 20_000
_MOST_EXACT = 40_000
"""Shapes drawn one by one, above which the sheet is drawn lighter: about 10 MB of outlines."""
_LIGHT_SAGITTA_MM = 1.5e-3
_STAMP_UNIT_MM = UNIT_MM / 4
"""Shapes that repeat are rounded finer, for each rounds the same way and their area would be off together."""
_BLOCKS = (1024, 512, 256, 128, 64, 32, 16, 8, 4)
"""Lengths of the blocks that long runs are made of."""


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
    batches = {screen.name: list(screen.shapes()) for screen in design.base.screens}
    light = sum(_lone(batch) for screen in batches.values() for batch in screen) > _MOST_EXACT
    drawing.set_desc(title=design.job.title, desc=_describe(sheet, light=light))
    taken: set[str] = set()
    for layer in design.base.layers:
        writer = _InkWriter(drawing, page, layer.ink, rgb[layer.ink.name], _identifier(layer.ink.name, taken))
        for screen in layer.screens:
            writer.draw(screen.name, batches.pop(screen.name), light=light)
        drawing.add(writer.group)
    if page.marks_mm:
        drawing.add(_marks(drawing, page))
    text: str = drawing.tostring()
    return b'<?xml version="1.0" encoding="UTF-8"?>\n' + text.encode() + b"\n"


def _describe(sheet: SheetSize, *, light: bool) -> str:
    return (
        f"Trim {number(sheet.width_mm)} x {number(sheet.height_mm)} mm, bleed {number(sheet.bleed_mm)} mm. "
        "Colours are for display; the inks are named in data-ink. "
        + ("Many shapes: drawn lighter, discs as strokes." if light else "Shapes are outlines of exact area.")
    )


def _lone(batch: Batch) -> int:
    """How many shapes of a batch do not fall into blocks."""
    return int((batch.count % _BLOCKS[-1]).sum()) if isinstance(batch, Stamps) else batch.total


def _identifier(ink: str, taken: set[str]) -> str:
    """An XML name that stays the same when other inks come or go."""
    stem = "ink-" + (re.sub(r"[^a-z0-9]+", "-", ink.lower()).strip("-") or "x")
    name, k = stem, 2
    while name in taken:
        name, k = f"{stem}-{k}", k + 1
    taken.add(name)
    return name


class _InkWriter:
    """Draws the screens of one ink into its group."""

    def __init__(self, drawing: svgwrite.Drawing, page: Page, ink: Ink, colour: str, identifier: str) -> None:
        self.drawing, self.page, self.colour, self.identifier = drawing, page, colour, identifier
        extra = {"data-ink": ink.name, "fill": colour}
        if not ink.opaque:
            extra["style"] = "mix-blend-mode:multiply"
        self.group = drawing.g(id=identifier, **extra)
        self.blocks: dict[tuple[bytes, bytes, int], str] = {}

    def draw(self, screen: str, batches: list[Batch], *, light: bool) -> None:
        """One screen as a group of its own."""
        group = self.drawing.g(**{"data-screen": screen})
        for batch in batches:
            if batch.total == 0:
                continue
            parts = self._polygons(batch) if isinstance(batch, Polygons) else self._stamps(batch, light=light)
            for part in parts:
                if part.elements:
                    group.add(part)
        self.group.add(group)

    def _frame(self, lattice: Lattice, **extra: str) -> svgwrite.container.Group:
        """A group in which lattice steps are the unit and y points up."""
        (a, b), (c, d) = lattice.steps_mm
        e = lattice.origin_mm[0] - self.page.media_mm[0]
        f = self.page.media_mm[3] - lattice.origin_mm[1]
        return self.drawing.g(transform=f"matrix({numbers(a, -b, c, -d, e, f)})", **extra)

    def _path(self, text: bytes, **extra: str) -> svgwrite.path.Path:
        return self.drawing.path(d=text.decode("ascii"), **extra)

    def _stamps(self, stamps: Stamps, *, light: bool) -> Iterator[svgwrite.container.Group]:
        """Repeated shapes by variety: long runs as blocks, the rest one by one."""
        unit_mm, sagitta_mm = (UNIT_MM, _LIGHT_SAGITTA_MM) if light else (_STAMP_UNIT_MM, SAGITTA_MM)
        cells = _cells(stamps, unit_mm)
        discs = self._frame(stamps.lattice, fill="none", stroke=self.colour, stroke_linecap="round")
        outlines = self._frame(Lattice(stamps.lattice.origin_mm, stamps.lattice.steps_mm / cells[:, None]))
        order = np.argsort(stamps.variety, kind="stable")
        used, begin = np.unique(stamps.variety[order], return_index=True)
        for which, runs in zip(used, np.split(order, begin[1:]), strict=True):
            outline = stamps.outlines[which]
            first, count = stamps.first[runs].astype(np.int64), stamps.count[runs].astype(np.int64)
            if light and outline.disc is not None:
                for text in _cap_texts(_along(first, count)):
                    discs.add(self._path(text, stroke_width=number(2 * outline.disc)))
                continue
            figure = _Figure.of(outline, stamps.lattice, cells, sagitta_mm)
            lone = []
            for length, at in _cut(first, count):
                block = self._block(outline, figure, length, worth=len(at) > 1)
                if block:
                    for i, j in (at * figure.cells).tolist():
                        outlines.add(self.drawing.use(block, x=i, y=j))
                else:
                    lone.append(_along(at, np.full(len(at), length)))
            for text in figure.texts(np.concatenate(lone)) if lone else ():
                outlines.add(self._path(text))
        yield discs
        yield outlines

    def _block(self, outline: Outline, figure: _Figure, length: int, *, worth: bool) -> str:
        """Reference to `length` shapes in a row, made if it is worth it; empty if it is not."""
        if length == 1:
            return ""
        key = (content(outline), figure.cells.tobytes(), length)
        if key not in self.blocks:
            if not worth:
                return ""
            self.blocks[key] = f"{self.identifier}-{len(self.blocks) + 1}"
            row = self._path(b"".join(figure.texts(_along(np.zeros((1, 2), dtype=np.int64), np.array([length])))))
            row["id"] = self.blocks[key]
            self.drawing.defs.add(row)
        return f"#{self.blocks[key]}"

    def _polygons(self, polygons: Polygons) -> Iterator[svgwrite.container.Group]:
        """Loose polygons, whole shapes together in a path."""
        figures = whole(polygons)
        group = self._frame(figures.frame)
        starts = figures.ring_start[:-1]
        before = np.roll(figures.points, 1, axis=0)
        before[starts[1:]] = figures.points[starts[:-1]]
        step = figures.points - before
        lead = lookup([b" ", b"m"], figures.first.astype(np.int64))
        close = lookup([b"", b"z"], figures.last.astype(np.int64))
        for piece in figures.pieces(figures.shape_end, most=_TEXT_A_PATH // 24):
            part = step[piece]
            part[0] = figures.points[piece.start]
            text = rows(lead[piece], integers(part[:, 0]), b" ", integers(part[:, 1]), close[piece])
            group.add(self._path(text))
        yield group


@dataclass(frozen=True, slots=True, eq=False)
class _Figure:
    """One outline as path text in whole numbers, `cells` (2,) to a lattice step.

    `start` (2,) is where the pen goes first, `home` (2,) where it ends, `body` the text between.
    """

    cells: NDArray[np.int64]
    start: NDArray[np.int64]
    home: NDArray[np.int64]
    body: bytes

    @classmethod
    def of(cls, outline: Outline, lattice: Lattice, cells: FloatArray, sagitta_mm: float) -> _Figure:
        """Contours of straight pieces that enclose the exact area."""
        steps_mm = lattice.steps_mm
        rings = [
            np.rint(chords(contour, steps_mm=steps_mm, sagitta_mm=sagitta_mm) * cells).astype(np.int64)
            for contour in outline.contours
        ]
        start = home = rings[0][0]
        text: list[str] = []
        for ring in rings:
            if text:
                text.append(f"m{_spelled(ring[0] - home)}")
            text.append(f"l{_spelled(np.diff(ring, axis=0))}z")
            home = ring[0]
        return cls(cells.astype(np.int64), start, home, "".join(text).encode())

    def texts(self, ij: NDArray[np.int64]) -> Iterator[bytes]:
        """Path texts that draw the outline at lattice points (n, 2), each placed from the one before."""
        most = max(1, min(_SHAPES_A_PATH, _TEXT_A_PATH // (len(self.body) + 24)))
        for first in range(0, len(ij), most):
            at = ij[first : first + most] * self.cells
            step = np.diff(at, axis=0, prepend=at[:1]) + self.start - self.home
            step[0] = at[0] + self.start
            yield rows(b"m", integers(step[:, 0]), b" ", integers(step[:, 1]), self.body)


def _cells(stamps: Stamps, unit_mm: float) -> FloatArray:
    """Whole numbers (2,) to a lattice step: of `unit_mm`, or coarser on a very large sheet."""
    steps_mm = stamps.lattice.steps_mm
    farthest = max(1, int(np.abs(stamps.first).max()), int((stamps.first[:, 0] + stamps.count).max()))
    return np.minimum(np.ceil(np.hypot(steps_mm[:, 0], steps_mm[:, 1]) / unit_mm), LARGEST // farthest)


def _spelled(points: NDArray[np.int64]) -> str:
    return " ".join(str(value) for value in points.ravel().tolist())


def _cut(first: NDArray[np.int64], count: NDArray[np.int64]) -> Iterator[tuple[int, NDArray[np.int64]]]:
    """Runs as blocks: (length, where such blocks begin (n, 2)), the longest first, then single shapes."""
    start, rest = first, count
    for length in (*_BLOCKS, 1):
        times = rest // length
        if times.any():
            steps = _along(np.zeros_like(start), times)
            yield length, np.repeat(start, times, axis=0) + length * steps
        start = start.copy()
        start[:, 0] += times * length
        rest = rest - times * length


def _along(start: NDArray[np.int64], count: NDArray[np.int64]) -> NDArray[np.int64]:
    """The places of runs, row after row."""
    at = np.repeat(start, count, axis=0)
    at[:, 0] += np.arange(len(at)) - np.repeat(np.cumsum(count) - count, count)
    return at


def _cap_texts(ij: NDArray[np.int64]) -> Iterator[bytes]:
    """Strokes of no length, each placed from the one before."""
    for start in range(0, len(ij), _SHAPES_A_PATH):
        step = np.diff(ij[start : start + _SHAPES_A_PATH], axis=0, prepend=np.zeros((1, 2), dtype=np.int64))
        yield rows(b"m", integers(step[:, 0]), b" ", integers(step[:, 1]), b"h0")


def _marks(drawing: svgwrite.Drawing, page: Page) -> svgwrite.container.Group:
    group = drawing.g(id="marks", fill="none", stroke="#000000", stroke_width=number(MARK_WIDTH_MM))
    left, top = page.media_mm[0], page.media_mm[3]
    text = "".join(
        f"M{numbers(x0 - left, top - y0)}L{numbers(x1 - left, top - y1)}" for x0, y0, x1, y1 in page.marks_mm
    )
    group.add(drawing.path(d=text))
    return group
