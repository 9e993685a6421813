"""second way: a real photograph inside real outlines with holes, measured back from the written PDF.

The photograph is the one that matplotlib ships among its sample data, the outlines are glyphs of
the DejaVu font that matplotlib ships: neither was made for this program.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pypdfium2
import pytest
import shapely
from matplotlib import cbook
from matplotlib.path import Path as Curve
from matplotlib.textpath import TextPath
from PIL import Image

import patterngen

WIDTH_MM, HEIGHT_MM = 60.0, 44.0
GLYPHS_AT_MM, GLYPH_HEIGHT_MM = (1.0, 11.0), 29.0

PRESET = """patterngen = 1
title = "A photograph in letters"
[sheet]
size = ["60 mm", "44 mm"]
[press]
process = "sheetfed-offset"
imager = "2400 dpi"
[[ink]]
name = "Elderberry"
lab = [30, 30, -22]
[[screen]]
name = "portrait"
ink = "Elderberry"
kind = "dots"
shape = "{shape}"
ruling = "133 lpi"
angle = "37 deg"
tone = {{ image = "photograph.png" }}
area = {{ svg = "letters.svg" }}
"""


def letters() -> TextPath:
    return TextPath(GLYPHS_AT_MM, "B&8", size=GLYPH_HEIGHT_MM)


def svg_of(text: TextPath) -> str:
    """The glyphs as SVG path data, y downwards, millimetres."""
    words = []
    for points, code in text.iter_segments(curves=True, simplify=False):
        pairs = " ".join(f"{x:.6f} {HEIGHT_MM - y:.6f}" for x, y in np.reshape(points, (-1, 2)))
        words.append({Curve.MOVETO: "M", Curve.LINETO: "L", Curve.CURVE3: "Q", Curve.CURVE4: "C"}.get(code, "Z"))
        if code != Curve.CLOSEPOLY:
            words.append(pairs)
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" width="{WIDTH_MM}mm" height="{HEIGHT_MM}mm" '
        f'viewBox="0 0 {WIDTH_MM} {HEIGHT_MM}"><path fill-rule="nonzero" d="{" ".join(words)}"/></svg>'
    )


@pytest.mark.parametrize("shape", ["simpledot", "ellipse"])
def test_a_photograph_in_letters(shape: str, tmp_path: Path) -> None:
    photograph = Image.open(cbook.get_sample_data("grace_hopper.jpg", asfileobj=False)).convert("L")
    photograph = photograph.crop((0, 40, photograph.width, 40 + round(photograph.width * 22 / 56)))
    photograph.save(tmp_path / "photograph.png")
    (tmp_path / "letters.svg").write_text(svg_of(letters()), encoding="utf-8")
    preset = tmp_path / "portrait.toml"
    preset.write_text(PRESET.format(shape=shape), encoding="utf-8")
    job = patterngen.load(preset)
    folder = patterngen.build(job, tmp_path / "out")

    scale = 40.0  # pixels a mm: 1016 dpi, five pixels a dot and more
    page = pypdfium2.PdfDocument(folder / "base.pdf")[0]
    grey = page.render(scale=scale * 25.4 / 72, grayscale=True).to_numpy().squeeze().astype(float)
    paper, solid = 255.0, grey.min()
    inked = (paper - grey) / (paper - solid)

    # what should be there, by Pillow and shapely alone: tone of the photograph inside the glyphs
    area = job.screens[0].area
    x0, y0, x1, y1 = area.box_mm
    outline = shapely.unary_union([shapely.Polygon(r).buffer(0) for r in area.rings if shapely.LinearRing(r).is_ccw])
    for ring in area.rings:
        if not shapely.LinearRing(ring).is_ccw:
            outline = outline.difference(shapely.Polygon(ring).buffer(0))
    y, x = np.mgrid[0 : grey.shape[0], 0 : grey.shape[1]]
    x_mm, y_mm = (x + 0.5) / scale, HEIGHT_MM - (y + 0.5) / scale
    inside = shapely.contains_xy(outline, x_mm.ravel(), y_mm.ravel()).reshape(x.shape)
    values = 1.0 - np.asarray(photograph, dtype=float) / 255.0
    rows, columns = values.shape
    size = min((x1 - x0) / columns, (y1 - y0) / rows)
    left, top = (x0 + x1 - columns * size) / 2, (y0 + y1 + rows * size) / 2
    column = np.clip(((x_mm - left) / size).astype(int), 0, columns - 1)
    row = np.clip(((top - y_mm) / size).astype(int), 0, rows - 1)
    covered = (x_mm >= left) & (x_mm < left + columns * size) & (y_mm <= top) & (y_mm > top - rows * size)
    wanted = np.where(inside & covered, values[row, column], 0.0)

    # nothing outside the letters (a pixel's edge aside), holes stay open
    far_out = ~shapely.contains_xy(outline.buffer(0.08), x_mm.ravel(), y_mm.ravel()).reshape(x.shape)
    assert inked[far_out].max() < 0.02
    # the whole tone within 1 %: what antialiasing loses on curves in this reader stays below that
    assert inked.sum() == pytest.approx(wanted.sum(), rel=0.01)
    # and locally over 2 mm, where a window holds about 90 dots (the window's own edge cuts some)
    block = int(2 * scale)
    high, wide = grey.shape[0] // block * block, grey.shape[1] // block * block

    def means(picture: np.ndarray) -> np.ndarray:
        return picture[:high, :wide].reshape(high // block, block, wide // block, block).mean(axis=(1, 3))

    assert np.abs(means(inked) - means(wanted)).max() < 0.03
