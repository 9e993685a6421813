"""Sheets to draw, a second writer that shares no line with the program's, and what readers make of both."""

from __future__ import annotations

import io
from collections.abc import Iterable, Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from patterngen.model.area import Area, ToneField
from patterngen.model.design import Design, Layer, Sheet
from patterngen.model.job import Gain, Ink, Job, Press, ScreenRequest, SheetSize, Viewing
from patterngen.model.lattice import Lattice
from patterngen.model.shapes import Batch, Contour, Outline, Polygons, Stamps

DPI = 2400
PIXEL_MM = 25.4 / DPI
SIDE_PIXELS = 756
# a thousandth of a pixel less, because readers round a page up to whole pixels
SIDE_MM = (SIDE_PIXELS - 0.001) * PIXEL_MM
# full black: readers round coverage to the steps between paper and ink, 255 are the most there are
BLACK = Ink("Black", (0.0, 0.0, 0.0))


class Drawn:
    """Stands in for a screen: a name, an ink, and batches that are given."""

    def __init__(self, name: str, ink: str, batches: Iterable[Batch]) -> None:
        self.name, self.ink, self.batches = name, ink, tuple(batches)

    def shapes(self) -> Iterator[Batch]:
        return iter(self.batches)


def job(
    inks: tuple[Ink, ...] = (BLACK,),
    *,
    width_mm: float = SIDE_MM,
    height_mm: float = SIDE_MM,
    bleed_mm: float = 0.0,
    marks: bool = False,
    title: str = "Marrowfield butter wrapper",
    name: str = "wrapper",
) -> Job:
    return Job(
        name=name, title=title, text="patterngen = 1\n", folder=None,
        sheet=SheetSize(width_mm, height_mm, bleed_mm, marks), viewing=Viewing(), press=Press(),
        paper_lab=(95.0, 0.0, -2.0), inks=inks, overprints=(), screens=(),
    )  # fmt: skip


def design(of: Job, *screens: Any) -> Design:
    layers = tuple(Layer(ink, tuple(s for s in screens if s.ink == ink.name)) for ink in of.inks)
    return Design(of, Sheet(tuple(layer for layer in layers if layer.screens)))


def disc(radius: float) -> Outline:
    """Four cubic arcs that together have the area of the disc (radius in cells)."""
    k = 0.5522847498307936
    quarter = np.array([[1, k], [k, 1], [0, 1]])
    turn = np.array([[0, 1], [-1, 0]])
    bends = np.stack([quarter @ np.linalg.matrix_power(turn, n) for n in range(4)])
    unit = Contour(np.array([1.0, 0.0]), bends, np.zeros(4, dtype=bool))
    scale = radius * np.sqrt(np.pi / unit.area())
    contour = Contour(unit.start * scale, unit.bends * scale, unit.straight)
    return Outline((contour,), float(np.pi * radius**2), disc=radius)


def stamps_inside(outline: Outline, lattice: Lattice, box_mm: tuple[float, float, float, float]) -> Stamps:
    """The outline at every lattice point of a box, as one run a row."""
    x0, y0, x1, y1 = box_mm
    corners = lattice.locate(np.array([[x0, y0], [x1, y0], [x1, y1], [x0, y1]]))
    low, high = np.floor(corners.min(axis=0)).astype(int), np.ceil(corners.max(axis=0)).astype(int)
    i = np.arange(low[0], high[0] + 1)
    first, count = [], []
    for j in range(low[1], high[1] + 1):
        x, y = lattice.place(np.column_stack([i, np.full_like(i, j)])).T
        inside = i[(x > x0) & (x < x1) & (y > y0) & (y < y1)]
        if len(inside):
            first.append((inside[0], j))
            count.append(len(inside))
    return Stamps(
        lattice,
        (outline,),
        np.array(first, np.int32),
        np.array(count, np.int32),
        np.zeros(len(count), np.int32),
    )


def request(kind: str, shape: str | None, tone: float, *, a: int, b: int) -> ScreenRequest:
    """A screen with a whole number of periods, `a` across and `b` up, on the square test sheet."""
    return ScreenRequest(
        name="screen", ink="Black", kind=kind, shape=shape, ruling_per_mm=float(np.hypot(a, b)) / SIDE_MM,
        angle_deg=float(np.rad2deg(np.arctan2(b, a))), tone=ToneField(tone),
        area=Area((0.0, 0.0, SIDE_MM, SIDE_MM)), origin_mm=(0.0, 0.0), gain=Gain(),
    )  # fmt: skip


# --- the second writer: every curve written out in the page's own coordinates


def figures_mm(batches: Iterable[Batch]) -> Iterator[list[tuple[np.ndarray, bool]]]:
    """Each shape as closed cubic chains ((3 n + 1, 2) points in mm, curved or not)."""
    for batch in batches:
        if isinstance(batch, Polygons):
            rings = list(batch.rings())
            for start, end in zip(batch.shape_start[:-1], batch.shape_start[1:], strict=True):
                yield [(batch.frame.place(ring), False) for ring in rings[start:end]]
        else:
            chains = [[_finely(contour) for contour in outline.contours] for outline in batch.outlines]
            ij, variety = batch.expand()
            for place, which in zip(ij, variety, strict=True):
                yield [(batch.lattice.place(chain + place), True) for chain in chains[which]]


def _finely(contour: Contour, pieces: int = 8) -> np.ndarray:
    """Every cubic halved three times, by de Casteljau's construction."""
    chain = [contour.start]
    for bend in contour.bends:
        cubics = [np.vstack([chain[-1], bend])]
        while len(cubics) < pieces:
            halves = []
            for p in cubics:
                q = (p[1:] + p[:-1]) / 2
                r = (q[1:] + q[:-1]) / 2
                s = (r[1:] + r[:-1]) / 2
                halves += [np.vstack([p[0], q[0], r[0], s]), np.vstack([s, r[1], q[2], p[3]])]
            cubics = halves
        for p in cubics:
            chain += list(p[1:])
    return np.array(chain)


def explicit_pdf(batches: Iterable[Batch], *, side_mm: float = SIDE_MM) -> bytes:
    k = 72 / 25.4
    lines = ["0 g"]
    for shape in figures_mm(batches):
        for points, curved in shape:
            p = points * k
            lines.append(f"{_spelled(p[0])} m")
            if curved:
                lines += [f"{_spelled(row)} c" for row in p[1:].reshape(-1, 6)]
            else:
                lines += [f"{_spelled(row)} l" for row in p[1:]]
            lines.append("h")
        lines.append("f")
    content = "\n".join(lines).encode()
    objects = [
        b"<</Type/Catalog/Pages 2 0 R>>",
        b"<</Type/Pages/Kids[3 0 R]/Count 1>>",
        b"<</Type/Page/Parent 2 0 R/Contents 4 0 R/Resources<<>>/MediaBox[0 0 %.5f %.5f]>>"
        % (side_mm * k, side_mm * k),
        b"<</Length %d>>stream\n%s\nendstream" % (len(content), content),
    ]
    out, at = b"%PDF-1.4\n", []
    for number, body in enumerate(objects, 1):
        at.append(len(out))
        out += b"%d 0 obj%sendobj\n" % (number, body)
    table = b"".join(b"%010d 00000 n \n" % place for place in at)
    return (
        out
        + b"xref\n0 5\n0000000000 65535 f \n%strailer<</Size 5/Root 1 0 R>>\nstartxref\n%d\n%%%%EOF"
        % (table, len(out))
    )


def explicit_svg(batches: Iterable[Batch], *, side_mm: float = SIDE_MM) -> bytes:
    paths = []
    for shape in figures_mm(batches):
        text = []
        for points, curved in shape:
            p = points * np.array([1, -1]) + np.array([0, side_mm])
            text.append(f"M{_spelled(p[0])}{'C' if curved else 'L'}{_spelled(p[1:])}Z")
        paths.append("".join(text))
    size = f'width="{side_mm:.7f}mm" height="{side_mm:.7f}mm" viewBox="0 0 {side_mm:.7f} {side_mm:.7f}"'
    # one fill: between elements a reader counts an edge that both share twice
    return f'<svg xmlns="http://www.w3.org/2000/svg" {size}><path d="{"".join(paths)}"/></svg>'.encode()


def _spelled(values: np.ndarray) -> str:
    return " ".join(f"{value:.6f}" for value in values.ravel())


# --- what readers make of it: coverage by pixel, linear in the coded value of black on white


def read_pdf(data: bytes, *, dpi: float = DPI) -> np.ndarray:
    pdfium = pytest.importorskip("pypdfium2")
    page = pdfium.PdfDocument(data)[0]
    values = page.render(scale=dpi / 72, grayscale=True).to_numpy().squeeze()
    return (255.0 - values) / (255.0 - values.min())


def read_svg(data: bytes, *, dpi: float = DPI) -> np.ndarray:
    resvg = pytest.importorskip("resvg_py")
    from PIL import Image

    picture = Image.open(io.BytesIO(bytes(resvg.svg_to_bytes(svg_string=data.decode(), dpi=int(dpi)))))
    return np.asarray(picture.convert("RGBA"))[..., 3] / 255.0


def coefficient(coverage: np.ndarray, frequency_per_mm: np.ndarray, *, pixel_mm: float = PIXEL_MM) -> complex:
    """Fourier coefficient of coverage by pixel over the whole page, the pixel's own blur taken out."""
    rows, columns = coverage.shape
    fx, fy = frequency_per_mm
    x = (np.arange(columns) + 0.5) * pixel_mm
    y = (rows - np.arange(rows) - 0.5) * pixel_mm
    total = np.exp(-2j * np.pi * fy * y) @ coverage @ np.exp(-2j * np.pi * fx * x)
    return complex(total / coverage.size / (np.sinc(fx * pixel_mm) * np.sinc(fy * pixel_mm)))


def keep(data: bytes, folder: Path, name: str) -> Path:
    path = folder / name
    path.write_bytes(data)
    return path


def assert_as_explicit_and_true(ours: np.ndarray, explicit: np.ndarray, screen: Any, tone: float) -> None:
    """Mean and first coefficient: as the same curves written out, in the same reader, and as computed."""
    assert ours.shape == explicit.shape == (SIDE_PIXELS, SIDE_PIXELS)
    frequency = screen.frequencies_per_mm[0]
    first = coefficient(ours, frequency)
    # what two ways to say the same may differ by in one reader: its eight bits and its own flattening
    assert ours.mean() == pytest.approx(explicit.mean(), rel=1e-3)
    assert abs(first / coefficient(explicit, frequency) - 1) < 3e-3
    # what the reader's antialiasing may add; where dots overlap it counts an edge twice
    coefficients = screen.coefficients(tone, reach=1)
    truth = coefficients[(2,) + (1,) * (coefficients.ndim - 1)]
    assert ours.mean() == pytest.approx(tone, rel=5e-3)
    assert abs(first / truth - 1) < 1.5e-2
