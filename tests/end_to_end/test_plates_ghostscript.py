"""second way: which ink lands on which plate, as Ghostscript separates the print master."""

from __future__ import annotations

import shutil
import subprocess
from pathlib import Path

import numpy as np
import pytest
from PIL import Image

from patterngen.model.job import Ink
from patterngen.model.lattice import Lattice
from patterngen.model.shapes import Polygons
from patterngen.writers import pdf
from tests import drawings

pytestmark = pytest.mark.skipif(shutil.which("gs") is None, reason="Ghostscript (gs) is not installed")

INKS = (Ink("Fennick Blue", (55, -37, -50)), Ink("Oake Red", (48, 74, -3)))
DPI = 254


def box(x0: float, y0: float, x1: float, y1: float) -> Polygons:
    corners = np.array([[x0, y0], [x1, y0], [x1, y1], [x0, y1]])
    return Polygons(Lattice.millimetres(), corners, np.array([0, 4], np.int32), np.array([0, 1], np.int32))


def plates(data: bytes, folder: Path) -> dict[str, np.ndarray]:
    """Inked pixels of each separation."""
    source = drawings.keep(data, folder, "sheet.pdf")
    run = subprocess.run(
        ["gs", "-q", "-dSAFER", "-dNOPAUSE", "-dBATCH", "-sDEVICE=tiffsep", f"-r{DPI}", "-o", "plate.tif", source.name],
        cwd=folder, capture_output=True, text=True, timeout=60, check=True,
    )  # fmt: skip
    assert run.stdout + run.stderr == ""
    found = {path.stem.removeprefix("plate(").removesuffix(")"): path for path in folder.glob("plate(*).tif")}
    return {name: np.asarray(Image.open(path)) < 128 for name, path in found.items()}


def two_boxes(*, marks: bool) -> bytes:
    screens = [
        drawings.Drawn("a", INKS[0].name, [box(1, 1, 7, 7)]),
        drawings.Drawn("b", INKS[1].name, [box(4, 4, 10, 10)]),
    ]
    return pdf.write(drawings.design(drawings.job(INKS, width_mm=12, height_mm=12, marks=marks), *screens))


def test_overprint_keeps_both_inks(tmp_path: Path) -> None:
    """The second ink lies on the first and takes nothing from its plate; the process plates stay empty."""
    found = plates(two_boxes(marks=False), tmp_path)
    assert set(found) == {"Cyan", "Magenta", "Yellow", "Black", *(ink.name for ink in INKS)}
    assert not any(found[name].any() for name in ("Cyan", "Magenta", "Yellow", "Black"))
    both = found[INKS[0].name] & found[INKS[1].name]
    # 3 x 3 mm at ten pixels a mm, give or take the rim
    assert np.count_nonzero(both) == pytest.approx(900, abs=65)
    assert np.count_nonzero(found[INKS[0].name]) == pytest.approx(3600, abs=125)


def test_without_overprint_the_test_would_notice(tmp_path: Path) -> None:
    """The same sheet with overprint taken out loses the first ink where the second lies."""
    import io

    import pikepdf

    out = io.BytesIO()
    with pikepdf.open(io.BytesIO(two_boxes(marks=False))) as document:
        over = document.pages[0].Resources.ExtGState["/Over"]
        over.OP, over.op = False, False
        document.save(out)
    found = plates(out.getvalue(), tmp_path)
    assert np.count_nonzero(found[INKS[0].name] & found[INKS[1].name]) < 100


def test_marks_are_on_every_plate(tmp_path: Path) -> None:
    """Register marks stand on all separations, at the same place."""
    found = plates(two_boxes(marks=True), tmp_path)
    room = 9 * DPI // 25.4
    rim = next(iter(found.values())).copy()
    rim[:] = True
    rim[int(room) : -int(room), int(room) : -int(room)] = False
    marks = [found[ink.name] & rim for ink in INKS]
    assert np.count_nonzero(marks[0]) > 400
    assert (marks[0] == marks[1]).all()
    assert (found["Black"] & rim == marks[0]).all()
