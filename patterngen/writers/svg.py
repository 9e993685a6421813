"""The sheet as SVG: true size, one top-level group an ink.

SVG knows neither separations nor overprint, so a group carries its ink's name in `data-ink`
and a display colour; the PDF is the print master.  The lattice stands in a group's matrix
and shapes at whole numbers in it.  Many shapes share one path, for what is one fill shows no
seams between neighbours; where that would be too long a text, long runs are blocks used
again and again.

Shapes are outlines of chords that enclose the exact area.  A sheet with too many different
shapes for a file that anything could open is drawn lighter: with fewer chords, up to a
micrometre and a quarter off, and plain discs as strokes of no length with round caps, which readers show
one to two per cent too thin at 2400 dpi.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import chain

import numpy as np
import svgwrite
from numpy.typing import NDArray

from patterngen.model.design import Design
from patterngen.model.job import Ink, SheetSize
from patterngen.model.lattice import FloatArray, Lattice
from patterngen.model.screen import Screen
from patterngen.model.shapes import Batch, Outline, Polygons, Stamps
from patterngen.writers._curves import SAGITTA_MM, chords, content
from patterngen.writers._integers import LARGEST, UNIT_MM, whole
from patterngen.writers._number import integers, lookup, number, numbers, rows
from patterngen.writers._page import MARK_WIDTH_MM, Page, page_of
from patterngen.writers._progress import Count

_TEXT_A_PATH = 2_000_000
"""Characters in one path: well under the 8 to 10 million at which readers refuse an attribute."""
_SHAPES_A_PATH = 20_000
_PLACE_TEXT = 24
"""Characters that put a shape in its place, at the most."""
_MOST_EXACT = 40_000
"""Shapes drawn one by one, above which the sheet is drawn lighter: about 10 MB of outlines."""
_LIGHT_SAGITTA_MM = 1.5e-3
_LIGHT_UNIT_MM = 5 * UNIT_MM
_STAMP_UNIT_MM = UNIT_MM / 4
"""Shapes that repeat are rounded finer, for each rounds the same way and their area would be off together."""
_BLOCKS = (1024, 512, 256, 128, 64, 32, 16, 8, 4)
"""Lengths of the blocks that long runs are made of."""


def write(design: Design, *, rgb: Mapping[str, str], progress: Callable[[str], None] | None = None) -> bytes:
    """The base sheet of a design as an SVG file: all `pieces` in one."""
    return b"".join(pieces(design, rgb=rgb, progress=progress))


def pieces(design: Design, *, rgb: Mapping[str, str], progress: Callable[[str], None] | None = None) -> Iterator[bytes]:
    """The base sheet of a design as an SVG file, piece by piece: memory holds a batch of shapes.

    `rgb` gives each ink's display colour as "#rrggbb", `progress` is told how far it is.  The
    same design gives the same bytes.
    """
    sheet = design.job.sheet
    page = page_of(sheet)
    drawing = svgwrite.Drawing(
        debug=False,
        size=(f"{number(page.width_mm)}mm", f"{number(page.height_mm)}mm"),
        viewBox=f"0 0 {numbers(page.width_mm, page.height_mm)}",
    )
    batches, light = _begun(design.base.screens)
    drawing.set_desc(title=design.job.title, desc=_describe(sheet, light=light))
    head: str = drawing.tostring()
    yield b'<?xml version="1.0" encoding="UTF-8"?>\n' + head.removesuffix("</svg>").encode()
    taken: set[str] = set()
    for layer in design.base.layers:
        writer = _InkWriter(drawing, page, layer.ink, rgb[layer.ink.name], _identifier(layer.ink.name, taken))
        counted = Count("base.svg", layer.ink.name, progress)
        drawn = [
            writer.screen(screen.name, counted.each(batches[screen.name]), light=light) for screen in layer.screens
        ]
        yield from _group(writer.group, chain.from_iterable(drawn), empty=True)
    if page.marks_mm:
        yield _marks(drawing, page).tostring().encode()
    yield b"</svg>\n"


def _begun(screens: Sequence[Screen]) -> tuple[dict[str, Iterator[Batch]], bool]:
    """The batches of each screen, and whether they are too many shapes for an exact drawing.

    Only as many are made, and held, as it takes to tell.
    """
    begun: dict[str, Iterator[Batch]] = {}
    lone = 0
    for screen in screens:
        batches, held = screen.shapes(), []
        while lone <= _MOST_EXACT and (batch := next(batches, None)) is not None:
            held.append(batch)
            lone += _lone(batch)
        begun[screen.name] = chain(held, batches)
    return begun, lone > _MOST_EXACT


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
        self.blocks: dict[tuple[bytes, bytes, int], bytes] = {}
        self.figures: dict[tuple[bytes, bytes, bytes, float], _Spelled] = {}

    def screen(self, name: str, batches: Iterator[Batch], *, light: bool) -> Iterator[bytes]:
        """One screen as a group of its own."""
        drawn = (
            self._polygons(batch) if isinstance(batch, Polygons) else self._stamps(batch, light=light)
            for batch in batches
            if batch.total
        )
        return _group(self.drawing.g(**{"data-screen": name}), chain.from_iterable(drawn), empty=True)

    def _frame(self, lattice: Lattice, **extra: str) -> svgwrite.container.Group:
        """A group in which lattice steps are the unit and y points up."""
        (a, b), (c, d) = lattice.steps_mm
        e = lattice.origin_mm[0] - self.page.media_mm[0]
        f = self.page.media_mm[3] - lattice.origin_mm[1]
        return self.drawing.g(transform=f"matrix({numbers(a, -b, c, -d, e, f)})", **extra)

    def _stamps(self, stamps: Stamps, *, light: bool) -> Iterator[bytes]:
        """Repeated shapes: plain discs of a light drawing as strokes, all others as outlines."""
        round_caps = np.array([light and outline.disc is not None for outline in stamps.outlines])
        capped = round_caps[stamps.variety]
        yield from _group(
            self._frame(stamps.lattice, fill="none", stroke=self.colour, stroke_linecap="round"),
            _discs(_runs(stamps, capped)),
        )
        unit_mm, sagitta_mm = (_LIGHT_UNIT_MM, _LIGHT_SAGITTA_MM) if light else (_STAMP_UNIT_MM, SAGITTA_MM)
        cells = _cells(stamps, unit_mm)
        yield from _group(
            self._frame(Lattice(stamps.lattice.origin_mm, stamps.lattice.steps_mm / cells[:, None])),
            self._outlines(_runs(stamps, ~capped), cells, sagitta_mm),
        )

    def _outlines(self, stamps: Stamps, cells: FloatArray, sagitta_mm: float) -> Iterator[bytes]:
        """All shapes in one path where that is not too long, else long runs as blocks and the rest together."""
        used, variety = np.unique(stamps.variety, return_inverse=True)
        figures = _Figures.of(
            [self._figure(stamps.outlines[k], stamps.lattice, cells, sagitta_mm) for k in used], cells
        )
        first, count = stamps.first.astype(np.int64), stamps.count.astype(np.int64)
        if not len(used) or int(figures.length[variety] @ count) <= _TEXT_A_PATH:
            yield from figures.paths(_along(first, count), np.repeat(variety, count))
            return
        lone = []
        order = np.argsort(variety, kind="stable")
        runs_of = np.split(order, np.searchsorted(variety[order], np.arange(1, len(used))))
        for which, runs in enumerate(runs_of):
            for length, at in _cut(first[runs], count[runs]):
                known, block = self._block(stamps.outlines[used[which]], figures, which, length, worth=len(at) > 1)
                if block:
                    x, y = (at * figures.cells).T
                    yield known + rows(
                        b'<use xlink:href="#', block, b'" x="', integers(x), b'" y="', integers(y), b'"/>'
                    )
                else:
                    lone.append((_along(at, np.full(len(at), length)), which))
        if lone:
            places = np.concatenate([at for at, _ in lone])
            kind = np.repeat([which for _, which in lone], [len(at) for at, _ in lone])
            # row after row whatever their shapes, so that neighbours come into one path
            by_row = np.lexsort((places[:, 0], places[:, 1]))
            yield from figures.paths(places[by_row], kind[by_row])

    def _figure(self, outline: Outline, lattice: Lattice, cells: FloatArray, sagitta_mm: float) -> _Spelled:
        """An outline as text; a picture's batches have most of theirs in common."""
        key = (content(outline), lattice.steps_mm.tobytes(), cells.tobytes(), sagitta_mm)
        if key not in self.figures:
            self.figures[key] = _Spelled.of(outline, lattice, cells, sagitta_mm)
        return self.figures[key]

    def _block(
        self, outline: Outline, figures: _Figures, which: int, length: int, *, worth: bool
    ) -> tuple[bytes, bytes]:
        """(definition, name) of `length` shapes in a row, made if it is worth it; no name if it is not."""
        if length == 1:
            return b"", b""
        key = (content(outline), figures.cells.tobytes(), length)
        if key in self.blocks:
            return b"", self.blocks[key]
        if not worth:
            return b"", b""
        name = self.blocks[key] = f"{self.identifier}-{len(self.blocks) + 1}".encode()
        row = _along(np.zeros((1, 2), dtype=np.int64), np.array([length]))
        text = b"".join(figures.texts(row, np.full(length, which)))
        return b'<defs><path id="%s" d="%s"/></defs>' % (name, text), name

    def _polygons(self, polygons: Polygons) -> Iterator[bytes]:
        """Loose polygons, whole shapes together in a path."""
        figures = whole(polygons)
        starts = figures.ring_start[:-1]
        before = np.roll(figures.points, 1, axis=0)
        before[starts[1:]] = figures.points[starts[:-1]]
        step = figures.points - before
        lead = lookup([b" ", b"m"], figures.first.astype(np.int64))
        close = lookup([b"", b"z"], figures.last.astype(np.int64))

        def paths() -> Iterator[bytes]:
            for piece in figures.pieces(figures.shape_end, most=_TEXT_A_PATH // 24):
                part = step[piece]
                part[0] = figures.points[piece.start]
                yield _path(rows(lead[piece], integers(part[:, 0]), b" ", integers(part[:, 1]), close[piece]))

        return _group(self._frame(figures.frame), paths())


@dataclass(frozen=True, slots=True, eq=False)
class _Spelled:
    """One outline as path text in whole numbers, `start` and `home` (2,) as in `_Figures`."""

    start: NDArray[np.int64]
    home: NDArray[np.int64]
    body: bytes

    @classmethod
    def of(cls, outline: Outline, lattice: Lattice, cells: FloatArray, sagitta_mm: float) -> _Spelled:
        """Contours of straight pieces that enclose the exact area."""
        rings = [
            np.rint(chords(contour, steps_mm=lattice.steps_mm, sagitta_mm=sagitta_mm) * cells).astype(np.int64)
            for contour in outline.contours
        ]
        text: list[str] = []
        for k, ring in enumerate(rings):
            if k:
                text.append(f"m{_spelled(ring[0] - rings[k - 1][0])}")
            text.append(f"l{_spelled(np.diff(ring, axis=0))}z")
        return cls(rings[0][0], rings[-1][0], "".join(text).encode())


@dataclass(frozen=True, slots=True, eq=False)
class _Figures:
    """Outlines as path text in whole numbers, `cells` (2,) to a lattice step.

    `start` (n, 2) is where the pen goes first, `home` (n, 2) where it ends, `body` (n,) the
    text between and `length` (n,) about how many characters a shape takes.
    """

    cells: NDArray[np.int64]
    start: NDArray[np.int64]
    home: NDArray[np.int64]
    body: list[bytes]
    length: NDArray[np.int64]

    @classmethod
    def of(cls, spelled: Sequence[_Spelled], cells: FloatArray) -> _Figures:
        """Columns of single figures."""
        return cls(
            cells.astype(np.int64),
            np.array([figure.start for figure in spelled], dtype=np.int64).reshape(-1, 2),
            np.array([figure.home for figure in spelled], dtype=np.int64).reshape(-1, 2),
            [figure.body for figure in spelled],
            np.array([len(figure.body) for figure in spelled], dtype=np.int64) + _PLACE_TEXT,
        )

    def paths(self, ij: NDArray[np.int64], which: NDArray[np.intp]) -> Iterator[bytes]:
        """Path elements of the outlines `which` (n,) at lattice points (n, 2)."""
        return (_path(text) for text in self.texts(ij, which))

    def texts(self, ij: NDArray[np.int64], which: NDArray[np.intp]) -> Iterator[bytes]:
        """Path texts of the outlines `which` (n,) at lattice points (n, 2), each placed from the one before."""
        ends = np.cumsum(self.length[which])
        first = 0
        while first < len(ij):
            before = int(ends[first - 1]) if first else 0
            after = max(first + 1, int(np.searchsorted(ends, before + _TEXT_A_PATH, side="right")))
            kind = which[first:after]
            at = ij[first:after] * self.cells
            step = np.diff(at, axis=0, prepend=at[:1]) + self.start[kind]
            step[1:] -= self.home[kind[:-1]]
            step[0] = at[0] + self.start[kind[0]]
            used, index = np.unique(kind, return_inverse=True)
            body = lookup([self.body[k] for k in used], index)
            yield rows(b"m", integers(step[:, 0]), b" ", integers(step[:, 1]), body)
            first = after


def _group(group: svgwrite.container.Group, inside: Iterator[bytes], *, empty: bool = False) -> Iterator[bytes]:
    """A group's tags about what is inside; nothing at all if that is nothing, unless it may be `empty`."""
    tag: str = group.tostring()
    head = (tag.removesuffix("/>").rstrip() + ">").encode()
    first = next(inside, None)
    if first is None and not empty:
        return
    yield head
    if first is not None:
        yield first
        yield from inside
    yield b"</g>\n"


def _path(text: bytes, attributes: bytes = b"") -> bytes:
    return b'<path%s d="%s"/>\n' % (attributes, text)


def _discs(stamps: Stamps) -> Iterator[bytes]:
    """Plain discs as strokes of no length with round caps, one path or more for each size."""
    used, variety = np.unique(stamps.variety, return_inverse=True)
    order = np.argsort(variety, kind="stable")
    bounds = np.searchsorted(variety[order], np.arange(1, len(used)))
    for which, runs in zip(used, np.split(order, bounds), strict=False):
        width = b' stroke-width="%s"' % number(2 * (stamps.outlines[which].disc or 0.0)).encode()
        for text in _cap_texts(_along(stamps.first[runs].astype(np.int64), stamps.count[runs].astype(np.int64))):
            yield _path(text, width)


def _runs(stamps: Stamps, which: NDArray[np.bool_]) -> Stamps:
    """Only the runs (n,) marked."""
    return replace(stamps, first=stamps.first[which], count=stamps.count[which], variety=stamps.variety[which])


def _cells(stamps: Stamps, unit_mm: float) -> FloatArray:
    """Whole numbers (2,) to a lattice step: of `unit_mm`, or coarser on a very large sheet."""
    steps_mm = stamps.lattice.steps_mm
    farthest = max(1, int(np.abs(stamps.first).max()), int((stamps.first[:, 0] + stamps.count).max()))
    return np.minimum(np.ceil(np.hypot(steps_mm[:, 0], steps_mm[:, 1]) / unit_mm), LARGEST // farthest)


def _spelled(points: NDArray[np.int64]) -> str:
    # a minus sign parts two numbers as well as a blank does
    return " ".join(str(value) for value in points.ravel().tolist()).replace(" -", "-")


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
