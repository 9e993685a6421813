"""Screens, inks and eyes that the tests of beats share."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from patterngen.beats.find import find_beats
from patterngen.colour.inks import InkStack
from patterngen.model.area import Area, ToneField
from patterngen.model.job import Gain, Ink, Overprint, Press, ScreenRequest, SheetSize
from patterngen.model.lattice import direction
from patterngen.model.screen import Grid, Screen
from patterngen.model.seeing import Viewer
from patterngen.model.verdict import Balance, BeatTable
from patterngen.registry import load
from patterngen.vision import barten1999

SHEET = SheetSize(90.0, 60.0)

PAPER = (95.0, 0.0, -2.0)
PROCESS_INKS = (
    Ink("C", (55.0, -37.0, -50.0)),
    Ink("M", (48.0, 74.0, -3.0)),
    Ink("Y", (89.0, -5.0, 93.0)),
    Ink("K", (16.0, 0.0, 0.0)),
)
"""Solids close to those of ISO 12647-2 sheet-fed offset on coated paper, from memory."""

SPOT_INKS = (
    Ink("Rust", (60.0, 45.0, 50.0)),
    Ink("Moss", (55.0, -45.0, 30.0)),
    Ink("Dusk", (30.0, 40.0, -50.0)),
)

LUMINANCE_CD_M2 = 139.8
"""500 lx on that paper."""


class PerfectInks:
    """Inks that swallow all light on paper that returns all of it: reflectance is the clear share."""

    yule_nielsen = 1.0

    def primaries(self, inks: Sequence[str]) -> np.ndarray:
        table = np.zeros((2,) * len(inks) + (3,))
        table[(0,) * len(inks)] = 1.0
        return table

    def lab(self, xyz: np.ndarray) -> np.ndarray:
        # a lightness that is monotonous in Y is all that a test of grey needs
        y = np.asarray(xyz)[:, 1]
        return np.stack([116.0 * np.cbrt(np.maximum(y, 1e-9)) - 16.0, np.zeros_like(y), np.zeros_like(y)], axis=1)

    def difference(self, lab_a: np.ndarray, lab_b: np.ndarray) -> np.ndarray:
        return np.abs(lab_a[:, 0] - lab_b[:, 0])


class GreyInks(PerfectInks):
    """Grey inks of one reflectance on grey paper, multiplying."""

    def __init__(self, *, paper: float, ink: float) -> None:
        self.paper, self.ink = paper, ink

    def primaries(self, inks: Sequence[str]) -> np.ndarray:
        table = np.full((2,) * len(inks) + (3,), self.paper)
        for axis in range(len(inks)):
            table[(slice(None),) * axis + (1,)] *= self.ink / self.paper
        return table


def process_stack(*, yule_nielsen: float = 1.0, overprints: tuple[Overprint, ...] = ()) -> InkStack:
    return InkStack(PAPER, PROCESS_INKS + SPOT_INKS, overprints, yule_nielsen)


def eye(*, distance_mm: float = 350.0, far_mm: float = 700.0) -> Viewer:
    return Viewer(
        distance_mm, far_mm, 4.0, 1.0, lambda cpd: barten1999.sensitivity(cpd, luminance_cd_m2=LUMINANCE_CD_M2)
    )


def sharp_eye(sensitivity: float) -> Viewer:
    """An eye for which every frequency up to 60 cycles per degree is as easy to see."""
    return Viewer(350.0, 700.0, 4.0, 1.0, lambda cpd: np.where(np.asarray(cpd) < 60.0, sensitivity, 1e-12))


def screen(
    name: str, *, ruling_per_mm: float, angle_deg: float, tone: float | ToneField, kind: str = "dots",
    shape: str = "simpledot", ink: str | None = None, area: Area | None = None,
    origin_mm: tuple[float, float] = (0.0, 0.0), gain: Gain | None = None, sheet: SheetSize = SHEET,
) -> Screen:  # fmt: skip
    request = ScreenRequest(
        name=name,
        ink=ink or name,
        kind=kind,
        shape=shape if kind == "dots" else None,
        ruling_per_mm=ruling_per_mm,
        angle_deg=angle_deg,
        tone=tone if isinstance(tone, ToneField) else ToneField(constant=tone),
        area=area or Area(sheet.box_mm),
        origin_mm=origin_mm,
        gain=gain or Gain(),
    )
    made: Screen = load("patterngen.screens", kind).make(request)
    return made


class PixelComb(Grid):
    """Square pixels on a square comb."""

    kind = "pixels"
    samples = True

    def __init__(self, name: str, *, ruling_per_mm: float, angle_deg: float = 0.0) -> None:
        self.name = name
        self.frequencies_per_mm = ruling_per_mm * np.stack([direction(angle_deg), direction(angle_deg + 90.0)])

    def coefficients(self, *, reach: int) -> np.ndarray:
        return np.ones((2 * reach + 1, 2 * reach + 1), dtype=complex)

    def transfer(self, frequency_per_mm: np.ndarray) -> np.ndarray:
        u = np.asarray(frequency_per_mm) @ np.linalg.inv(self.frequencies_per_mm)
        return np.sinc(u[:, 0]) * np.sinc(u[:, 1])


class SineMesh(Grid):
    """A mesh that lets 1 + depth cos through, in two directions."""

    kind = "mesh"
    samples = False

    def __init__(self, name: str, *, ruling_per_mm: float, angle_deg: float, depth: float) -> None:
        self.name, self.depth = name, depth
        self.frequencies_per_mm = ruling_per_mm * np.stack([direction(angle_deg), direction(angle_deg + 90.0)])

    def coefficients(self, *, reach: int) -> np.ndarray:
        axis = np.zeros(2 * reach + 1, dtype=complex)
        axis[reach] = 1.0
        axis[[reach - 1, reach + 1]] = 0.5 * self.depth
        return np.outer(axis, axis)

    def tail(self, *, radius: float) -> float:
        return 0.0 if radius >= 2.0 else 1.0

    def transfer(self, frequency_per_mm: np.ndarray) -> np.ndarray:
        return np.ones(len(frequency_per_mm))


def beats_of(
    screens: Sequence[Screen], *, colours: Any = None, viewer: Viewer | None = None, grids: Sequence[Grid] = (),
    press: Press | None = None, sheet: SheetSize = SHEET, overprints: Sequence[Overprint] = (),
) -> tuple[BeatTable, tuple[Balance, ...]]:  # fmt: skip
    return find_beats(
        screens=screens,
        grids=grids,
        colours=colours or process_stack(),
        viewer=viewer or eye(),
        sheet=sheet,
        press=press or Press(),
        overprints=overprints,
    )


def process_set(
    angles_deg: Sequence[float], tones: Sequence[float], *, lpi: float, names: str = "CMYK"
) -> list[Screen]:
    return [
        screen(name, ruling_per_mm=lpi / 25.4, angle_deg=angle, tone=tone)
        for name, angle, tone in zip(names, angles_deg, tones, strict=True)
    ]


def row_of(table: BeatTable, orders: dict[str, list[int]]) -> int | None:
    """The row whose participants have these orders (or all of them negated)."""
    for row in range(len(table)):
        found = table.participants(row)
        if found in (orders, {name: [-k for k in ks] for name, ks in orders.items()}):
            return row
    return None
