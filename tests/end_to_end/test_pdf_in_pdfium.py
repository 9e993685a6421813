"""second way: the print master in pdfium, against explicit curves in the same reader and the screens' own numbers."""

from __future__ import annotations

import io

import numpy as np
import pikepdf
import pytest

from patterngen import registry
from patterngen.model.job import Ink
from patterngen.model.lattice import Lattice
from patterngen.model.shapes import Polygons, Stamps
from patterngen.writers import pdf
from tests import drawings

pdfium = pytest.importorskip("pypdfium2")

INKS = (Ink("Fennick Blue", (55, -37, -50)), Ink("Oake Red #2", (48, 74, -3)), Ink("Grün (matt)", (60, -35, 25)))
# one square angle, two that no pixel grid repeats; dots that touch, overlap and stand free
CASES = [
    ("dots", "simpledot", 0.02, 41, 23),
    ("dots", "simpledot", 0.3, 45, 12),
    ("dots", "simpledot", 0.7, 41, 23),
    ("dots", "simpledot", 0.85, 41, 23),
    ("dots", "simpledot", 0.3, 47, 0),
    ("dots", "round", 0.7, 41, 23),
    ("dots", "cosinedot", 0.75, 45, 12),
    ("dots", "ellipse", 0.8, 41, 23),
    ("lines", None, 0.3, 41, 23),
]


def box(x0: float, y0: float, x1: float, y1: float) -> Polygons:
    corners = np.array([[x0, y0], [x1, y0], [x1, y1], [x0, y1]])
    return Polygons(Lattice.millimetres(), corners, np.array([0, 4], np.int32), np.array([0, 1], np.int32))


@pytest.mark.parametrize(("kind", "shape", "tone", "a", "b"), CASES)
def test_tone_and_first_coefficient(kind: str, shape: str | None, tone: float, a: int, b: int) -> None:
    """A whole number of periods fits the page, so its mean is the tone and its coefficient the screen's."""
    screen = registry.load("patterngen.screens", kind).make(drawings.request(kind, shape, tone, a=a, b=b))
    ours = drawings.read_pdf(pdf.write(drawings.design(drawings.job(), screen)))
    explicit = drawings.read_pdf(drawings.explicit_pdf(screen.shapes()))
    drawings.assert_as_explicit_and_true(ours, explicit, screen, tone)


def test_blocks_single_stamps_and_rows_fall_on_the_same_places() -> None:
    """Runs of 1 to 4200 dots, whichever forms they are made of, put a dot on every place of the lattice."""
    lattice = Lattice.square(pitch_mm=0.1, angle_deg=0.0, origin_mm=np.array([0.05, 0.05]))
    lengths = np.array([1, 7, 8, 63, 64, 65, 127, 128, 129, 640, 4095, 4096, 4097, 4200])
    count = np.repeat(lengths, 2)
    first = np.column_stack([np.zeros(len(count)), np.arange(len(count))])
    stamps = Stamps(
        lattice, (drawings.disc(0.3),), first.astype(np.int32), count.astype(np.int32), np.zeros(len(count), np.int32)
    )
    # a micrometre less, because the reader rounds a page up to whole pixels
    job = drawings.job(width_mm=420.0 - 1e-3, height_mm=0.1 * len(count) - 1e-3)
    covered = drawings.read_pdf(pdf.write(drawings.design(job, drawings.Drawn("s", "Black", [stamps]))), dpi=254)
    # one pixel a place, the lowest row first
    dots = covered[::-1]
    for row, length in enumerate(count):
        assert np.array_equal(np.flatnonzero(dots[row] > 0.15), np.arange(length))


def test_pages_have_their_size_and_boxes() -> None:
    """invariant: media, bleed and trim box within 5 um of what was asked for."""
    job = drawings.job(width_mm=90, height_mm=61.3, bleed_mm=3, marks=True)
    data = pdf.write(drawings.design(job, drawings.Drawn("s", "Black", [box(0, 0, 5, 5)])))
    page = pdfium.PdfDocument(data)[0]
    mm = 25.4 / 72
    room = 12.0
    assert np.array(page.get_size()) * mm == pytest.approx([90 + 2 * room, 61.3 + 2 * room], abs=0.005)
    assert np.array(page.get_trimbox()) * mm == pytest.approx([room, room, 90 + room, 61.3 + room], abs=0.005)
    assert np.array(page.get_bleedbox()) * mm == pytest.approx([9, 9, 93 + room, 64.3 + room], abs=0.005)
    plain = pdf.write(drawings.design(drawings.job(width_mm=90, height_mm=61.3), drawings.Drawn("s", "Black", [])))
    assert np.array(pdfium.PdfDocument(plain)[0].get_size()) * mm == pytest.approx([90, 61.3], abs=0.005)


def test_shapes_stand_where_they_belong() -> None:
    """invariant: a box drawn from 10 to 20 mm right and 5 to 7 mm up of the trim is found there."""
    job = drawings.job(width_mm=40, height_mm=30, bleed_mm=2, marks=True)
    covered = drawings.read_pdf(
        pdf.write(drawings.design(job, drawings.Drawn("s", "Black", [box(10, 5, 20, 7)]))), dpi=254
    )
    # ten pixels a mm; the marks are cut off: 12 mm, of which 11 lie outside the trim
    inner = np.argwhere(covered[120:-120, 120:-120] > 0.5)
    rows = covered.shape[0] - 240
    (top, left), (bottom, right) = inner.min(axis=0), inner.max(axis=0) + 1
    assert (left, right) == pytest.approx((90, 190), abs=1)
    assert (rows - bottom, rows - top) == pytest.approx((40, 60), abs=1)


def test_inks_look_like_their_lab_values() -> None:
    """second way: solids in pdfium against colour-science, 10 of 255 for the reader's own conversion."""
    colour = pytest.importorskip("colour")
    screens = [drawings.Drawn(ink.name, ink.name, [box(10 * k, 0, 10 * k + 10, 10)]) for k, ink in enumerate(INKS)]
    data = pdf.write(drawings.design(drawings.job(INKS, width_mm=30, height_mm=10), *screens))
    seen = pdfium.PdfDocument(data)[0].render(scale=1).to_pil().convert("RGB")
    white = colour.CCS_ILLUMINANTS["CIE 1931 2 Degree Standard Observer"]["D50"]
    for k, ink in enumerate(INKS):
        rgb = colour.XYZ_to_sRGB(colour.Lab_to_XYZ(ink.lab, white), white)
        assert seen.getpixel((14 + 28 * k, 14)) == pytest.approx(np.clip(rgb, 0, 1) * 255, abs=10)


def test_structure() -> None:
    """invariant: separations, overprint and layers are there; fonts, transparency, even-odd fills are not."""
    screens = [drawings.Drawn(ink.name, ink.name, [box(0, 0, 9, 9)]) for ink in INKS]
    title = r") /OpenAction (\ <</S/JavaScript>>"
    data = pdf.write(drawings.design(drawings.job(INKS, marks=True, title=title), *screens))
    with pikepdf.open(io.BytesIO(data)) as document:
        assert not document.check_pdf_syntax()
        page, root = document.pages[0], document.Root
        spaces = page.Resources.ColorSpace
        assert [str(spaces[f"/Ink{k}"][1])[1:] for k in range(3)] == [ink.name for ink in INKS]
        assert {str(space[0]) for space in spaces.values()} == {"/Separation"}
        over = page.Resources.ExtGState["/Over"]
        assert (bool(over.OP), bool(over.op), int(over.OPM)) == (True, True, 1)
        assert [str(group.Name) for group in root.OCProperties.OCGs] == [ink.name for ink in INKS]
        assert list(root.OCProperties.D.Order) == list(root.OCProperties.OCGs)
        assert "/AS" not in root.OCProperties.D
        assert "/Font" not in page.Resources
        assert not {"/Trans", "/Annots", "/AA", "/Group"} & set(page.keys())
        assert not {"/OpenAction", "/AA", "/Names", "/AcroForm"} & set(root.keys())
        assert str(document.docinfo["/Title"]) == title
        assert "/ID" in document.trailer
        depth, spot = 0, []
        for instruction in pikepdf.parse_content_stream(page):
            operator = str(instruction.operator)
            depth += (operator == "q") - (operator == "Q")
            assert depth >= 0
            assert operator not in ("f*", "B*", "b*", "Tj", "TJ", "sh", "rg", "RG", "k", "K", "g", "G")
            if operator == "cs":
                spot.append(str(instruction.operands[0]))
        assert depth == 0
        assert spot == ["/Ink0", "/Ink1", "/Ink2"]


def test_same_design_same_bytes() -> None:
    """invariant: nothing of the clock, the machine or the order of a set is in the file."""
    screen = registry.load("patterngen.screens", "dots").make(drawings.request("dots", "round", 0.4, a=21, b=8))
    design = drawings.design(drawings.job(), screen)
    assert pdf.write(design) == pdf.write(design)


def test_far_end_of_a_long_row() -> None:
    """second way: the last of 7990 dots in a row against the same few drawn alone, in absolute numbers."""
    lattice = Lattice.square(pitch_mm=0.25, angle_deg=0.0, origin_mm=np.zeros(2))
    side_mm, shown_mm = 2000.0, 3.0

    def row(first: int, count: int) -> Stamps:
        return Stamps(
            lattice, (drawings.disc(0.3),), np.array([[first, 4]], np.int32), np.array([count], np.int32),
            np.zeros(1, np.int32),
        )  # fmt: skip

    def end(data: bytes) -> np.ndarray:
        page = pdfium.PdfDocument(data)[0]
        width, height = page.get_size()
        shown = shown_mm / 25.4 * 72
        picture = page.render(scale=1200 / 72, crop=(width - shown, 0, 0, height - shown), grayscale=True)
        return 1 - picture.to_numpy().squeeze() / 255.0

    job = drawings.job(width_mm=side_mm, height_mm=side_mm)
    ours = end(pdf.write(drawings.design(job, drawings.Drawn("s", "Black", [row(4, 7990)]))))
    alone = end(drawings.explicit_pdf([row(7974, 20)], side_mm=side_mm))
    assert ours.shape == alone.shape
    assert alone.sum() > 100
    # a shift by one micrometre (a twentieth of a pixel) changes an edge pixel by 0.05
    assert np.abs(ours - alone).max() < 0.06


def test_progress_is_told_at_each_batch() -> None:
    """invariant: the shapes so far, by ink, and the same bytes as without."""
    told: list[str] = []
    design = drawings.design(
        drawings.job(INKS[:1]), drawings.Drawn("s", INKS[0].name, [box(0, 0, 5, 5), box(1, 1, 2, 2)])
    )
    assert pdf.write(design, progress=told.append) == pdf.write(design)
    assert told == [f"writing base.pdf: {INKS[0].name}, {n} shapes" for n in (1, 2)]
