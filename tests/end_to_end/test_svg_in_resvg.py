"""second way: the SVG in resvg, against explicit curves in the same reader and the screens' own numbers."""

from __future__ import annotations

import io
import re
from collections.abc import Iterator
from xml.etree import ElementTree

import numpy as np
import pytest
from PIL import Image

from patterngen import registry
from patterngen.model.job import Ink
from patterngen.model.lattice import Lattice
from patterngen.model.shapes import Batch, Polygons, Stamps
from patterngen.writers import svg
from tests import drawings

resvg = pytest.importorskip("resvg_py")

RGB = {"Black": "#000000"}
SVG = "{http://www.w3.org/2000/svg}"
# angles that no pixel grid repeats: this reader samples each pixel in a few rows only
CASES = [
    ("dots", "simpledot", 0.02, 41, 23),
    ("dots", "simpledot", 0.3, 45, 12),
    ("dots", "simpledot", 0.7, 41, 23),
    ("dots", "simpledot", 0.85, 41, 23),
    ("dots", "square", 0.4, 41, 23),
    ("dots", "rhomboid", 0.6, 41, 23),
    ("dots", "round", 0.7, 41, 23),
    ("dots", "cosinedot", 0.75, 45, 12),
    ("dots", "ellipse", 0.8, 41, 23),
    ("lines", None, 0.3, 41, 23),
]


@pytest.mark.parametrize(("kind", "shape", "tone", "a", "b"), CASES)
def test_tone_and_first_coefficient(kind: str, shape: str | None, tone: float, a: int, b: int) -> None:
    """A whole number of periods fits the page, so its mean is the tone and its coefficient the screen's."""
    screen = registry.load("patterngen.screens", kind).make(drawings.request(kind, shape, tone, a=a, b=b))
    ours = drawings.read_svg(svg.write(drawings.design(drawings.job(), screen), rgb=RGB))
    explicit = drawings.read_svg(drawings.explicit_svg(screen.shapes()))
    drawings.assert_as_explicit_and_true(ours, explicit, screen, tone)


def scattered(*, radius_steps: int, outline_disc: bool) -> Stamps:
    """Dots of many sizes, each a run of one, as a picture makes them."""
    rng = np.random.default_rng(3)
    lattice = Lattice.square(pitch_mm=0.4, angle_deg=17.0, origin_mm=np.array([4.0, 4.0]))
    outlines = tuple(drawings.disc(0.1 + 0.3 * k / radius_steps) for k in range(radius_steps))
    if not outline_disc:
        outlines = tuple(type(o)(o.contours, o.tone) for o in outlines)
    i, j = (axis.ravel() for axis in np.meshgrid(np.arange(-6, 7), np.arange(-6, 7)))
    return Stamps(
        lattice,
        outlines,
        np.column_stack([i, j]).astype(np.int32),
        np.ones(len(i), np.int32),
        rng.integers(0, radius_steps, len(i)).astype(np.int32),
    )


@pytest.mark.parametrize(("outline_disc", "ink"), [(True, 0.02), (False, 0.002)], ids=["caps", "chords"])
def test_the_lighter_drawing_is_the_same_drawing(
    monkeypatch: pytest.MonkeyPatch, outline_disc: bool, ink: float
) -> None:
    """second way: caps and fewer chords against the exact drawing; caps within the reader's two per cent of ink."""
    design = drawings.design(
        drawings.job(), drawings.Drawn("s", "Black", [scattered(radius_steps=9, outline_disc=outline_disc)])
    )
    exact = drawings.read_svg(svg.write(design, rgb=RGB))
    monkeypatch.setattr(svg, "_MOST_EXACT", 0)
    data = svg.write(design, rgb=RGB)
    light = drawings.read_svg(data)
    assert (b"stroke-linecap" in data) == outline_disc
    assert light.mean() == pytest.approx(exact.mean(), rel=ink)
    # a pixel on an edge differs by the reader's flattening, up to half a pixel
    assert np.abs(light - exact).max() < 0.6
    assert np.mean(np.abs(light - exact)) < 0.02 * exact.mean()


@pytest.mark.parametrize(("shape", "tone"), [("ellipse", 0.95), ("simpledot", 0.9), ("round", 0.8)])
@pytest.mark.parametrize("dpi", [96, 200])
def test_no_seams_between_neighbours_seen_from_afar(shape: str, tone: float, dpi: int) -> None:
    """With a few dots to a pixel the tone is still the tone: neighbours are one fill, not laid over each other.

    As one element a row such a tint came out 0.06 to 0.19 too light at 96 dpi.
    """
    screen = registry.load("patterngen.screens", "dots").make(drawings.request("dots", shape, tone, a=41, b=23))
    seen = drawings.read_svg(svg.write(drawings.design(drawings.job(), screen), rgb=RGB), dpi=dpi)
    # the reader's own antialiasing has sixteen steps or so; the page's rim is a pixel wide
    assert seen[1:-1, 1:-1].mean() == pytest.approx(tone, abs=6e-3)


@pytest.mark.parametrize("tone", [0.3, 0.85])
def test_blocks_draw_the_same(monkeypatch: pytest.MonkeyPatch, tone: float) -> None:
    """second way: what is too long for one path, as blocks used again and again, against the one path."""
    screen = registry.load("patterngen.screens", "dots").make(drawings.request("dots", "round", tone, a=45, b=12))
    design = drawings.design(drawings.job(), screen)
    one = svg.write(design, rgb=RGB)
    monkeypatch.setattr(svg, "_TEXT_A_PATH", 60_000)
    blocks = svg.write(design, rgb=RGB)
    assert b"<use" not in one
    assert blocks.count(b"<use") > 40
    assert len(blocks) < 0.5 * len(one)
    seen, wanted = drawings.read_svg(blocks), drawings.read_svg(one)
    # an edge that two elements share counts twice
    assert seen.mean() == pytest.approx(wanted.mean(), rel=2e-3)
    assert np.mean(np.abs(seen - wanted)) < 3e-3


def test_neighbours_in_a_picture_share_a_path() -> None:
    """invariant: lone shapes of many sizes go into one path row after row, each at its place."""
    stamps = scattered(radius_steps=9, outline_disc=False)
    data = svg.write(drawings.design(drawings.job(), drawings.Drawn("s", "Black", [stamps])), rgb=RGB)
    assert data.count(b"<path") == 1
    assert data.count(b"z") == stamps.total


def test_pieces_are_the_file_and_progress_is_told() -> None:
    """invariant: piece by piece the same bytes; each batch is told with the shapes so far, by ink."""
    told: list[str] = []
    stamps = scattered(radius_steps=2, outline_disc=True)
    inks = (Ink("Cream", (90, 0, 10)), Ink("Rind", (60, 20, 50)))
    design = drawings.design(
        drawings.job(inks), drawings.Drawn("a", "Cream", [stamps, stamps]), drawings.Drawn("b", "Rind", [stamps])
    )
    rgb = {"Cream": "#eeeecc", "Rind": "#cc8844"}
    parts = list(svg.pieces(design, rgb=rgb, progress=told.append))
    assert b"".join(parts) == svg.write(design, rgb=rgb)
    assert told == [
        "writing base.svg: Cream, 169 shapes",
        "writing base.svg: Cream, 338 shapes",
        "writing base.svg: Rind, 169 shapes",
    ]


def test_batches_are_made_only_when_they_are_drawn() -> None:
    """invariant: beyond what it takes to choose the lighter drawing no batch waits in memory."""
    made: list[int] = []
    n = 30_000
    index = np.arange(n)
    stamps = Stamps(
        Lattice.square(pitch_mm=0.1, angle_deg=0.0, origin_mm=np.zeros(2)),
        (drawings.disc(0.2), drawings.disc(0.3)),
        np.column_stack([index % 400, index // 400]).astype(np.int32),
        np.ones(n, np.int32),
        (index % 2).astype(np.int32),
    )

    class Long(drawings.Drawn):
        def shapes(self) -> Iterator[Batch]:
            for k in range(6):
                made.append(k)
                yield stamps

    parts = svg.pieces(drawings.design(drawings.job(), Long("s", "Black", [])), rgb=RGB)
    next(parts)
    assert made == [0, 1]
    for _ in parts:
        pass
    assert made == [0, 1, 2, 3, 4, 5]


def test_many_shapes_are_drawn_lighter() -> None:
    """invariant: beyond 40 000 lone shapes a disc takes few characters, and the description says so."""
    lattice = Lattice.square(pitch_mm=0.1, angle_deg=0.0, origin_mm=np.zeros(2))
    n = 110_000
    index = np.arange(n)
    stamps = Stamps(
        lattice,
        (drawings.disc(0.2), drawings.disc(0.3)),
        np.column_stack([index % 400, index // 400]).astype(np.int32),
        np.ones(n, np.int32),
        (index % 2).astype(np.int32),
    )
    data = svg.write(drawings.design(drawings.job(), drawings.Drawn("s", "Black", [stamps])), rgb=RGB)
    assert len(data) < 12 * n
    assert b"discs as strokes" in data


def test_no_attribute_is_longer_than_readers_take() -> None:
    """invariant: one path attribute stays under 8 MB however many corners a screen has."""
    n = 400_000
    angle = np.linspace(0, 2 * np.pi, 8, endpoint=False)
    ring = 0.01 * np.column_stack([np.cos(angle), np.sin(angle)])
    uv = (ring[None] + np.random.default_rng(1).uniform(1, 7, (n // 8, 1, 2))).reshape(-1, 2)
    starts = np.arange(0, n + 1, 8)
    polygons = Polygons(Lattice.millimetres(), uv, starts.astype(np.int32), np.arange(len(starts), dtype=np.int32))
    data = svg.write(drawings.design(drawings.job(), drawings.Drawn("s", "Black", [polygons])), rgb=RGB)
    lengths = [len(path.get("d", "")) for path in ElementTree.fromstring(data).iter(f"{SVG}path")]
    assert max(lengths) < 8_000_000
    assert len(lengths) > 1
    # polygons cut over several paths keep their places
    assert drawings.read_svg(data, dpi=600).mean() > 0


def test_page_has_its_size_and_place() -> None:
    """invariant: size in mm within 5 um, x to the right and y up from the trim's lower left corner."""
    job = drawings.job(width_mm=40, height_mm=30, bleed_mm=2, marks=True)
    corners = np.array([[10, 5], [20, 5], [20, 7], [10, 7]], dtype=float)
    polygon = Polygons(Lattice.millimetres(), corners, np.array([0, 4], np.int32), np.array([0, 1], np.int32))
    data = svg.write(drawings.design(job, drawings.Drawn("s", "Black", [polygon])), rgb=RGB)
    root = ElementTree.fromstring(data)
    sizes = [float(str(root.get(side)).removesuffix("mm")) for side in ("width", "height")]
    assert sizes == pytest.approx([62, 52], abs=0.005)
    inner = np.argwhere(drawings.read_svg(data, dpi=254)[120:-120, 120:-120] > 0.5)
    (top, left), (bottom, right) = inner.min(axis=0), inner.max(axis=0) + 1
    # ten pixels a mm; of the 12 mm cut off 11 lie outside the trim
    assert (left, right) == pytest.approx((90, 190), abs=1)
    assert (280 - bottom, 280 - top) == pytest.approx((40, 60), abs=1)


def test_structure_and_inert_text() -> None:
    """invariant: one top-level group an ink, names as data, nothing alive, text only as text."""
    inks = (
        Ink('Butter "1" <b>', (80, 0, 60)),
        Ink("butter 1 b", (80, 0, 60)),
        Ink("Ölig & matt", (50, 0, 0), opaque=True),
    )
    rgb = dict.fromkeys((ink.name for ink in inks), "#808080")
    title = "</title><script>alert(1)</script>]]>&x;"
    screens = [
        drawings.Drawn(f"s{k}", ink.name, [scattered(radius_steps=2, outline_disc=True)]) for k, ink in enumerate(inks)
    ]
    data = svg.write(drawings.design(drawings.job(inks, marks=True, title=title), *screens), rgb=rgb)
    root = ElementTree.fromstring(data)
    groups = root.findall(f"{SVG}g")
    assert [g.get("data-ink") for g in groups] == [*(ink.name for ink in inks), None]
    assert [g.get("id") for g in groups] == ["ink-butter-1-b", "ink-butter-1-b-2", "ink-lig-matt", "marks"]
    assert ["style" in g.attrib for g in groups[:3]] == [True, True, False]
    assert root.findtext(f"{SVG}title") == title
    known = {"svg", "title", "desc", "defs", "g", "path", "use"}
    assert {e.tag.removeprefix(SVG) for e in root.iter()} <= known
    for element in root.iter():
        assert not [name for name in element.attrib if name.startswith("on")]
        assert all(value.startswith("#") for name, value in element.attrib.items() if name.endswith("href"))
    assert not re.search(rb"nan|inf\b", data.replace(b"\n", b""), re.IGNORECASE)
    assert svg.write(drawings.design(drawings.job(inks, marks=True, title=title), *screens), rgb=rgb) == data


def test_overprint_shows_in_the_display_colours() -> None:
    """second way: where two inks lie on each other the picture is their product."""
    inks = (Ink("A", (80, 0, 60)), Ink("B", (50, 60, 0)))
    corners = np.array([[1, 1], [7, 1], [7, 7], [1, 7]], dtype=float)
    polygon = Polygons(Lattice.millimetres(), corners, np.array([0, 4], np.int32), np.array([0, 1], np.int32))
    screens = [drawings.Drawn(ink.name, ink.name, [polygon]) for ink in inks]
    data = svg.write(drawings.design(drawings.job(inks), *screens), rgb={"A": "#ff8000", "B": "#80c0ff"})
    picture = Image.open(io.BytesIO(bytes(resvg.svg_to_bytes(svg_string=data.decode(), dpi=254))))
    assert picture.convert("RGBA").getpixel((40, 40)) == pytest.approx((128, 96, 0, 255), abs=1)
