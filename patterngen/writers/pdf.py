"""The print master: every ink a separation that overprints, on a layer of its own.

reportlab makes the envelope (page, boxes, marks, title), pikepdf finishes it.  A shape that
repeats is a filled form, stamped at whole numbers in the lattice's own matrix: positions
are exact, text is short, and nothing adds up along a row.  Long runs are forms of forms.
"""

from __future__ import annotations

import io
import zlib
from collections.abc import Callable, Iterable, Iterator
from decimal import Decimal

import numpy as np
import pikepdf
from numpy.typing import NDArray
from pikepdf import Array, Dictionary, Name
from reportlab.lib.colors import CMYKColorSep
from reportlab.pdfgen.canvas import Canvas

import patterngen
from patterngen.model.design import Design, Layer
from patterngen.model.job import Job, Lab
from patterngen.model.lattice import FloatArray, Lattice
from patterngen.model.shapes import Outline, Polygons, Stamps
from patterngen.writers._curves import chords, content
from patterngen.writers._integers import whole
from patterngen.writers._number import integers, lookup, number, numbers, rows
from patterngen.writers._page import MARK_WIDTH_MM, Page, page_of
from patterngen.writers._progress import Count

POINTS_PER_MM = 72 / 25.4
BLOCK = 64
"""Stamps in a block, and blocks in a row of blocks."""
_LEAST_BLOCK = 8
_WORTH = 128
"""A block of at least `_LEAST_BLOCK` becomes a form when it stands for this many stamps in one batch."""
_BOX_ROOM = 0.25
"""Room between an outline and its form's box, in cells, so that no reader shaves an edge."""
_STAMPS_A_STREAM = 100_000
_CORNERS_A_STREAM = 200_000
_SHAPES_A_FILL = 500
_CELL_DIGITS = 6
"""Decimals of an outline's coordinates in its cell: a nanometre on a pitch of a millimetre."""
_D50 = (0.9642, 1.0, 0.8249)


def write(design: Design, *, progress: Callable[[str], None] | None = None) -> bytes:
    """The base sheet of a design as one PDF page; `progress` is told how far it is.

    The same design gives the same bytes.  Each ink is `/Separation` with a Lab alternate
    (paper to solid, as measured), painted at full tint with overprint on.
    """
    job = design.job
    page = page_of(job.sheet)
    with pikepdf.open(io.BytesIO(_envelope(job, page))) as pdf:
        marks = _clean(pdf)
        sheet = _SheetWriter(pdf, page, job.paper_lab, progress)
        for layer in design.base.layers:
            sheet.draw(layer)
        sheet.close(marks)
        out = io.BytesIO()
        pdf.save(
            out,
            min_version="1.6",
            deterministic_id=True,
            object_stream_mode=pikepdf.ObjectStreamMode.disable,
        )
    return out.getvalue()


def _envelope(job: Job, page: Page) -> bytes:
    """Page size, boxes, title and marks."""
    buffer = io.BytesIO()
    x0, y0, _, _ = page.media_mm

    def points(*mm: float) -> tuple[float, ...]:
        return tuple((value - (x0, y0)[k % 2]) * POINTS_PER_MM for k, value in enumerate(mm))

    canvas = Canvas(
        buffer,
        pagesize=(page.width_mm * POINTS_PER_MM, page.height_mm * POINTS_PER_MM),
        invariant=1,
        pageCompression=0,
    )
    canvas.setTitle(job.title)
    canvas.setCreator(f"patterngen {patterngen.__version__}")
    canvas.setTrimBox(points(*page.trim_mm))
    canvas.setBleedBox(points(*page.bleed_mm))
    if page.marks_mm:
        canvas.setStrokeColor(CMYKColorSep(1, 1, 1, 1, spotName="All"))
        canvas.setStrokeOverprint(True)
        canvas.setLineWidth(MARK_WIDTH_MM * POINTS_PER_MM)
        for segment in page.marks_mm:
            canvas.line(*points(*segment))
    canvas.showPage()
    canvas.save()
    return buffer.getvalue()


def _clean(pdf: pikepdf.Pdf) -> list[pikepdf.Stream]:
    """Take out what the envelope brings along without need; its content that stays (the marks), if any."""
    page = pdf.pages[0]
    kept, in_text = [], False
    for instruction in pikepdf.parse_content_stream(page):
        operator = str(instruction.operator)
        # the envelope sets a font, which is not embedded, although it writes no text
        in_text = in_text or operator == "BT"
        if not in_text:
            kept.append(instruction)
        in_text = in_text and operator != "ET"
    for holder, keys in (
        (page.Resources, ("/Font", "/ProcSet")),
        (page.obj, ("/Trans",)),
        (pdf.docinfo, ("/Author", "/Subject", "/Keywords")),
        (pdf.Root, ("/PageMode", "/Outlines")),
    ):
        for key in keys:
            if key in holder:
                del holder[key]
    drawn = any(str(instruction.operator) == "S" for instruction in kept)
    return [_stream(pdf, b"q\n" + pikepdf.unparse_content_stream(kept) + b"\nQ\n")] if drawn else []


def _stream(pdf: pikepdf.Pdf, text: bytes) -> pikepdf.Stream:
    stream = pikepdf.Stream(pdf, b"")
    stream.write(zlib.compress(text, 1), filter=Name.FlateDecode)
    return stream


class _SheetWriter:
    """Draws the layers of one page: content in self-contained streams, repeated shapes as forms."""

    def __init__(
        self, pdf: pikepdf.Pdf, page: Page, paper_lab: Lab, progress: Callable[[str], None] | None = None
    ) -> None:
        self.pdf, self.page, self.paper_lab, self.progress = pdf, page, paper_lab, progress
        self.streams: list[pikepdf.Stream] = []
        self.groups: list[pikepdf.Object] = []
        self.forms: dict[tuple[bytes, bytes, int], int] = {}
        resources = pdf.pages[0].Resources
        for key in ("/ColorSpace", "/ExtGState", "/Properties", "/XObject"):
            if key not in resources:
                resources[key] = Dictionary()
        self.resources = resources
        resources.ExtGState["/Over"] = pdf.make_indirect(Dictionary(Type=Name.ExtGState, OP=True, op=True, OPM=1))

    def draw(self, layer: Layer) -> None:
        """One ink: its separation, its layer, its shapes."""
        k = len(self.groups)
        group = self.pdf.make_indirect(Dictionary(Type=Name.OCG, Name=layer.ink.name))
        self.groups.append(group)
        self.resources.Properties[f"/Layer{k}"] = group
        self.resources.ColorSpace[f"/Ink{k}"] = self.pdf.make_indirect(
            _separation(layer.ink.name, solid=layer.ink.lab, paper=self.paper_lab)
        )
        head = b"/OC /Layer%d BDC\nq\n/Over gs /Ink%d cs 1 scn\n" % (k, k)
        counted = Count("base.pdf", layer.ink.name, self.progress)
        for screen in layer.screens:
            for batch in counted.each(screen.shapes()):
                if batch.total == 0:
                    continue
                paint = self._stamps(batch) if isinstance(batch, Stamps) else self._polygons(batch)
                for text in paint:
                    self.streams.append(_stream(self.pdf, head + text + b"Q\nEMC\n"))

    def close(self, marks: list[pikepdf.Stream]) -> None:
        """Hand the streams and layers to the page, the marks last and on no layer."""
        self.pdf.pages[0].Contents = Array([*self.streams, *marks])
        self.pdf.Root.OCProperties = Dictionary(
            OCGs=Array(self.groups),
            D=Dictionary(Name="Inks", BaseState=Name.ON, Order=Array(self.groups)),
        )

    def _matrix(self, lattice: Lattice) -> bytes:
        """The operator that makes lattice steps the unit."""
        (a, b), (c, d) = lattice.steps_mm * POINTS_PER_MM
        e, f = (lattice.origin_mm - np.array(self.page.media_mm[:2])) * POINTS_PER_MM
        return f"{numbers(a, b, c, d, e, f)} cm\n".encode()

    def _polygons(self, polygons: Polygons) -> Iterator[bytes]:
        """Loose polygons as plain paths."""
        figures = whole(polygons)
        shape: NDArray[np.int64] = np.cumsum(figures.shape_end) - figures.shape_end
        paint = figures.shape_end & ((shape + 1) % _SHAPES_A_FILL == 0)
        paint[-1] = True
        kind = np.where(figures.first, 0, np.where(paint, 3, np.where(figures.last, 2, 1)))
        matrix = self._matrix(figures.frame)
        for piece in figures.pieces(paint, most=_CORNERS_A_STREAM):
            x, y = figures.points[piece].T
            tail = lookup([b" m\n", b" l\n", b" l h\n", b" l h f\n"], kind[piece])
            yield matrix + rows(integers(x), b" ", integers(y), tail)

    def _stamps(self, stamps: Stamps) -> Iterator[bytes]:
        """Repeated shapes, sorted by form because equal lines pack well."""
        matrix = self._matrix(stamps.lattice)
        ij, form = self._placements(stamps)
        order = np.argsort(form, kind="stable")
        ij, form = ij[order], form[order]
        for start in range(0, len(form), _STAMPS_A_STREAM):
            at = slice(start, start + _STAMPS_A_STREAM)
            used, index = np.unique(form[at], return_inverse=True)
            name = lookup([b"%d" % k for k in used], index)
            i, j = integers(ij[at, 0]), integers(ij[at, 1])
            yield matrix + rows(b"q 1 0 0 1 ", i, b" ", j, b" cm /Form", name, b" Do Q\n")

    def _placements(self, stamps: Stamps) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
        """Where forms go: lattice indices (n, 2), and each form's number (n,)."""
        ij, variety, size = _cut(stamps)
        kinds, kind, uses = np.unique(variety * (BLOCK**2 + 1) + size, return_inverse=True, return_counts=True)
        which, length = np.divmod(kinds, BLOCK**2 + 1)
        block = (length >= _LEAST_BLOCK) & (length * uses >= _WORTH)
        used, index = np.unique(which, return_inverse=True)
        steps_mm = stamps.lattice.steps_mm
        form = np.array([self._form(stamps.outlines[k], steps_mm, 1) for k in used], dtype=np.int64)[index]
        for k in np.flatnonzero(block):
            form[k] = self._form(stamps.outlines[which[k]], steps_mm, int(length[k]))
        repeat = np.where(block[kind], 1, size)
        begin = np.cumsum(repeat) - repeat
        ij = np.repeat(ij, repeat, axis=0)
        ij[:, 0] += np.arange(len(ij)) - np.repeat(begin, repeat)
        return ij, np.repeat(form[kind], repeat)

    def _form(self, outline: Outline, steps_mm: FloatArray, length: int) -> int:
        """The number of the form that stamps an outline `length` times along a row."""
        key = (content(outline), steps_mm.tobytes(), length)
        if key in self.forms:
            return self.forms[key]
        if length == 1:
            rings = [_ring(chords(contour, steps_mm=steps_mm)) for contour in outline.contours]
            text, inner = b"".join(rings) + b"f\n", []
        else:
            step = BLOCK if length > BLOCK else 1
            part = self._form(outline, steps_mm, step)
            inner = [f"/Form{part}"]
            text = b"".join(b"q 1 0 0 1 %d 0 cm /Form%d Do Q\n" % (k, part) for k in range(0, length, step))
        u0, v0, u1, v1 = outline.bounds()
        form = _stream(self.pdf, text)
        form.Type, form.Subtype, form.FormType = Name.XObject, Name.Form, 1
        box = (u0 - _BOX_ROOM, v0 - _BOX_ROOM, u1 + length - 1 + _BOX_ROOM, v1 + _BOX_ROOM)
        form.BBox = _decimals(box)
        form.Resources = Dictionary()
        if inner:
            form.Resources.XObject = Dictionary({name: self.resources.XObject[name] for name in inner})
        self.forms[key] = len(self.forms)
        self.resources.XObject[f"/Form{self.forms[key]}"] = self.pdf.make_indirect(form)
        return self.forms[key]


def _cut(stamps: Stamps) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.int64]]:
    """Runs cut into whole rows of blocks and what is left: start (n, 2), variety (n,), length (n,)."""
    first, count = stamps.first.astype(np.int64), stamps.count.astype(np.int64)
    longest = BLOCK**2
    pieces = -(-count // longest)
    run = np.repeat(np.arange(len(count)), pieces)
    done = longest * (np.arange(len(run)) - np.repeat(np.cumsum(pieces) - pieces, pieces))
    length = np.minimum(count[run] - done, longest)
    rest = length % BLOCK
    start = first[run]
    start[:, 0] += done
    after = start.copy()
    after[:, 0] += length - rest
    variety = stamps.variety.astype(np.int64)[run]
    full, part = length >= BLOCK, rest > 0
    return (
        np.concatenate([start[full], after[part]]),
        np.concatenate([variety[full], variety[part]]),
        np.concatenate([(length - rest)[full], rest[part]]),
    )


def _ring(corners: FloatArray) -> bytes:
    """A closed figure of straight pieces in cell units."""
    points = [numbers(*corner) for corner in np.round(corners, _CELL_DIGITS)]
    return f"{points[0]} m {' '.join(f'{point} l' for point in points[1:])} h\n".encode()


def _separation(name: str, *, solid: Lab, paper: Lab) -> Array:
    """A spot colour whose stand-in on a screen runs from the paper to the solid in CIELAB."""
    space = Array([Name.Lab, Dictionary(WhitePoint=_decimals(_D50), Range=_decimals((-128, 127, -128, 127)))])
    tint = Dictionary(FunctionType=2, Domain=_decimals((0, 1)), C0=_decimals(paper), C1=_decimals(solid), N=1)
    return Array([Name.Separation, Name("/" + name), space, tint])


def _decimals(values: Iterable[float]) -> Array:
    return Array([Decimal(number(value)) for value in values])
