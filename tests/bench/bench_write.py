"""second way: an A4 page of 2.2 million dots against pycairo's PDF surface drawing the same dots.

pycairo draws the dots of one band of the page, as filled circles and, its quickest way, as
strokes with round caps (which two common readers paint wrong); its time a dot is constant,
so it is scaled to the whole page.
"""

from __future__ import annotations

import io
import math
import subprocess
import sys
import tempfile
import zlib
from pathlib import Path
from types import ModuleType
from typing import Any

import numpy as np

from patterngen.model.area import Area, ToneField
from patterngen.model.design import Design
from patterngen.model.job import Gain, Ink, ScreenRequest
from patterngen.model.shapes import Stamps
from patterngen.screens import dots
from patterngen.writers import pdf, svg
from tests import drawings
from tests.bench._timing import median_seconds

SIZE_MM = (210.0, 297.0)
BLACK = Ink("Black", (16.0, 0.0, 0.0))
BAND = 200_000
POINTS_PER_MM = 72 / 25.4


def grey() -> np.ndarray:
    """Tones of a smooth picture in the page's proportions."""
    y, x = np.mgrid[0:1202, 0:850]
    return np.clip(0.5 + 0.35 * np.sin(x / 90) * np.cos(y / 130) + 0.1 * np.sin(x * y / 40_000), 0.02, 0.98)


def page() -> tuple[Design, list[Any]]:
    """A smooth grey picture at 150 lpi and 15 degrees, its shapes made in advance."""
    box = (0.0, 0.0, *SIZE_MM)
    request = ScreenRequest(
        name="grey", ink="Black", kind="dots", shape="simpledot", ruling_per_mm=150 / 25.4, angle_deg=15.0,
        tone=ToneField(None, grey().astype(np.float32), box), area=Area(box),
        origin_mm=(0.0, 0.0), gain=Gain(),
    )  # fmt: skip
    batches = list(dots.make(request).shapes())
    job = drawings.job((BLACK,), width_mm=SIZE_MM[0], height_mm=SIZE_MM[1])
    return drawings.design(job, drawings.Drawn("grey", "Black", batches)), batches


def band_of(batches: list[Any]) -> tuple[np.ndarray, np.ndarray]:
    """Places in points and radii of the first dots of the page."""
    places, radii = [], []
    for batch in batches:
        if isinstance(batch, Stamps):
            ij, variety = batch.expand()
            radius = np.array([outline.disc for outline in batch.outlines], dtype=float)
            places.append(batch.lattice.place(ij) * POINTS_PER_MM)
            radii.append(radius[variety] * math.sqrt(batch.lattice.cell_mm2) * POINTS_PER_MM)
    return np.concatenate(places)[:BAND], np.concatenate(radii)[:BAND]


def cairo_page(cairo: ModuleType, places: np.ndarray, radii: np.ndarray, *, caps: bool) -> int:
    """Bytes of pycairo's page with those dots."""
    out = io.BytesIO()
    surface = cairo.PDFSurface(out, SIZE_MM[0] * POINTS_PER_MM, SIZE_MM[1] * POINTS_PER_MM)
    context = cairo.Context(surface)
    context.set_line_cap(cairo.LINE_CAP_ROUND)
    turn = 2 * math.pi
    for (x, y), radius in zip(places.tolist(), radii.tolist(), strict=True):
        if caps:
            context.set_line_width(2 * radius)
            context.move_to(x, y)
            context.line_to(x, y)
            context.stroke()
        else:
            context.arc(x, y, radius, 0, turn)
            context.fill()
    surface.finish()
    return len(out.getvalue())


def run() -> list[tuple[str, ...]]:
    """Rows of (what, seconds, ratio, bytes a dot)."""
    design, batches = page()
    total = sum(batch.total for batch in batches)
    data = pdf.write(design)
    # both sides draw the page: as many stamps are written as there are dots
    check_every_dot_is_stamped(data, batches)
    ours = median_seconds(lambda: pdf.write(design))
    drawn = svg.write(design, rgb={"Black": "#000000"})
    ours_svg = median_seconds(lambda: svg.write(design, rgb={"Black": "#000000"}))
    rows = [
        ("dots on the page", f"{total}"),
        ("PDF", f"{ours:.2f} s", f"{len(data) / total:.1f} bytes a dot"),
        ("SVG", f"{ours_svg:.2f} s", f"{len(drawn) / total:.1f} bytes a dot"),
    ]
    whole = whole_build_seconds()
    rows.append(("whole `patterngen build`, process start to files on disk", f"{whole:.2f} s"))
    try:
        import cairo
    except ImportError:
        return [*rows, ("pycairo is not installed: no ratio",)]
    places, radii = band_of(batches)
    for what, caps in (("filled circles", False), ("round caps", True)):
        size = cairo_page(cairo, places, radii, caps=caps)
        theirs = median_seconds(lambda caps=caps: cairo_page(cairo, places, radii, caps=caps), 3) * total / BAND
        rows.append(
            (
                f"pycairo PDF, {what}",
                f"{theirs:.1f} s",
                f"{size / BAND:.1f} bytes a dot",
                f"PDF {ours / theirs:.3f}, PDF and SVG {(ours + ours_svg) / theirs:.3f}, "
                f"whole build {whole / theirs:.3f} of its time",
            )
        )
    return rows


PRESET = """patterngen = 1
title = "A page"
[sheet]
size = ["210 mm", "297 mm"]
[press]
process = "sheetfed-offset"
imager = "2400 dpi"
[[ink]]
name = "Black"
lab = [16, 0, 0]
[[screen]]
name = "grey"
ink = "Black"
kind = "dots"
shape = "simpledot"
ruling = "150 lpi"
angle = "15 deg"
tone = { image = "grey.png" }
"""


def whole_build_seconds() -> float:
    """The same page from its preset and picture, verdict and all files included, as its own process."""
    from PIL import Image

    with tempfile.TemporaryDirectory() as folder:
        Image.fromarray(np.rint(255 * (1 - grey())).astype(np.uint8)).save(Path(folder, "grey.png"))
        Path(folder, "page.toml").write_text(PRESET, encoding="utf-8")
        call = [sys.executable, "-m", "patterngen", "build", "page.toml", "--quiet"]
        return median_seconds(lambda: subprocess.run(call, cwd=folder, check=True), 3)


def check_every_dot_is_stamped(data: bytes, batches: list[Any]) -> None:
    """Count the dots that the file's streams stamp, blocks by their length."""
    import pikepdf

    with pikepdf.open(io.BytesIO(data)) as document:
        forms = document.pages[0].Resources.XObject
        worth: dict[str, int] = {}

        def dots_in(name: str) -> int:
            if name not in worth:
                text = forms[name].read_bytes()
                inner = [word for word in text.split() if word.startswith(b"/Form")]
                worth[name] = sum(dots_in(word.decode()) for word in inner) if inner else 1
            return worth[name]

        stamped = 0
        for stream in document.pages[0].Contents:
            text = zlib.decompress(stream.read_raw_bytes())
            names, uses = np.unique([w for w in text.split() if w.startswith(b"/Form")], return_counts=True)
            stamped += sum(dots_in(name.decode()) * int(n) for name, n in zip(names, uses, strict=True))
    expected = sum(batch.total for batch in batches if isinstance(batch, Stamps))
    assert stamped == expected
