"""Which tones meet somewhere on the sheet, over an area at least as wide as a beat."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import combinations
from typing import Any

import numpy as np
from numpy.typing import NDArray

from patterngen.model.area import Area, BoolArray
from patterngen.model.job import Overprint, SheetSize
from patterngen.model.lattice import FloatArray
from patterngen.model.screen import Screen

_SAMPLES_A_SIDE = 320
_SAMPLES_A_WINDOW = 4
_ROWS = 400
"""Rows of a region that are kept at the most, those of the largest share of it."""

_STEPS, _FINE_STEPS = 16, 64
"""Tones of pictures are told apart in so many steps; the extremes in the finer ones."""


@dataclass(frozen=True, slots=True, eq=False)
class _Region:
    """A part of the sheet on which the same screens print: `printing` (n,), and its outline (None: `box_mm`)."""

    printing: BoolArray
    box_mm: tuple[float, float, float, float]
    outline: Any = None

    def core(self, window_mm: float) -> _Region | None:
        """Where a window of that width has its middle so that it lies wholly inside; None where there is no place."""
        x0, y0, x1, y1 = self.box_mm
        if self.outline is None:
            across, down = min(window_mm, x1 - x0) / 2, min(window_mm, y1 - y0) / 2
            return _Region(self.printing, (x0 + across, y0 + down, x1 - across, y1 - down))
        inner = self.outline.buffer(-window_mm / 2, join_style="mitre") if window_mm > 0 else self.outline
        return None if inner.is_empty else _Region(self.printing, inner.bounds, inner)

    def points(self, step_mm: float) -> tuple[FloatArray, FloatArray]:
        """A grid of points inside, `step_mm` apart, one at least."""
        x0, y0, x1, y1 = self.box_mm
        columns, rows = max(round((x1 - x0) / step_mm), 1), max(round((y1 - y0) / step_mm), 1)
        x = x0 + (np.arange(columns) + 0.5) * (x1 - x0) / columns
        y = y0 + (np.arange(rows) + 0.5) * (y1 - y0) / rows
        grid_x, grid_y = (axis.ravel() for axis in np.meshgrid(x, y))
        if self.outline is None:
            return grid_x, grid_y
        import shapely

        shapely.prepare(self.outline)
        inside = shapely.contains_xy(self.outline, grid_x, grid_y)
        if inside.any():
            return grid_x[inside], grid_y[inside]
        one = self.outline.representative_point()
        return np.array([one.x]), np.array([one.y])


class Together:
    """The tones of a sheet's screens, by the regions on which the same screens print."""

    def __init__(self, screens: Sequence[Screen], overprints: Sequence[Overprint], sheet: SheetSize) -> None:
        self.screens, self.overprints, self.sheet = tuple(screens), tuple(overprints), sheet

    @cached_property
    def _regions(self) -> tuple[_Region, ...]:
        """All regions, from the outlines of the areas themselves: none is too narrow to be found."""
        whole = np.array([_is_whole_sheet(screen.area, self.sheet) for screen in self.screens], dtype=bool)
        if whole.all():
            return (_Region(whole, self.sheet.box_mm),)
        import shapely

        parts: list[tuple[BoolArray, Any]] = [(whole.copy(), shapely.box(*self.sheet.box_mm))]
        areas: dict[int, tuple[Area, list[int]]] = {}
        for i in np.flatnonzero(~whole):
            areas.setdefault(id(self.screens[i].area), (self.screens[i].area, []))[1].append(int(i))
        for area, users in areas.values():
            outline = area.geometry()
            cut: list[tuple[BoolArray, Any]] = []
            for printing, part in parts:
                inside, outside = part.intersection(outline), part.difference(outline)
                if inside.area > 0.0:
                    with_them = printing.copy()
                    with_them[users] = True
                    cut.append((with_them, inside))
                if outside.area > 0.0:
                    cut.append((printing, outside))
            parts = cut
        return tuple(_Region(printing, part.bounds, part) for printing, part in parts if printing.any())

    def samples(self, *, window_mm: float) -> FloatArray:
        """Plate tones (m, n) as they are at points of the sheet, averaged over the window, 0 where a screen is not."""
        found = [self._sampled(region, window_mm) for region in self._regions]
        return _split_never(np.concatenate([np.zeros((0, len(self.screens))), *found]), self.screens, self.overprints)

    def rows(self, *, window_mm: float) -> FloatArray:
        """Plate tones (m, n) that occur together over windows of `window_mm`, told apart in steps."""
        pictures = np.array([screen.tone.constant is None for screen in self.screens], dtype=bool)
        found = [
            _fewer(self._sampled(region, window_mm), np.flatnonzero(pictures & region.printing))
            for region in self._regions
        ]
        rows = _split_never(np.concatenate([np.zeros((0, len(self.screens))), *found]), self.screens, self.overprints)
        return np.unique(rows[(rows > 0).any(axis=1)], axis=0)

    def meeting_though_never(self) -> tuple[tuple[str, str], ...]:
        """Pairs of inks that are said never to meet and whose screens print on common ground all the same."""
        found = []
        printing = {
            frozenset(screen.ink for screen, prints in zip(self.screens, region.printing, strict=True) if prints)
            for region in self._regions
        }
        for overprint in self.overprints:
            for pair in combinations(sorted(overprint.inks), 2) if overprint.never else ():
                if any(set(pair) <= inks for inks in printing):
                    found.append(pair)
        return tuple(dict.fromkeys(found))

    def most_ink(self) -> float:
        """The largest sum of printed tones in one place; screens of one ink overlap and do not add up."""
        samples = np.unique(self.samples(window_mm=0.0), axis=0)
        open_paper: dict[str, FloatArray] = {}
        for i, screen in enumerate(self.screens):
            left = 1.0 - np.asarray(screen.printed_tone(samples[:, i]))
            open_paper[screen.ink] = open_paper.get(screen.ink, np.ones(len(samples))) * left
        return float(np.sum([1.0 - left for left in open_paper.values()], axis=0).max(initial=0.0))

    def _sampled(self, region: _Region, window_mm: float) -> FloatArray:
        core = region.core(window_mm)
        if core is None:
            return np.zeros((0, len(self.screens)))
        constant = [screen.tone.constant for screen in self.screens]
        if all(tone is not None or not prints for tone, prints in zip(constant, region.printing, strict=True)):
            return np.array([[t if p else 0.0 for t, p in zip(constant, region.printing, strict=True)]], dtype=float)
        x0, y0, x1, y1 = core.box_mm
        step_mm = max(x1 - x0, y1 - y0, 1e-6) / _SAMPLES_A_SIDE
        x, y = core.points(max(step_mm, window_mm / _SAMPLES_A_WINDOW))
        tones = np.zeros((len(x), len(self.screens)))
        for i in np.flatnonzero(region.printing):
            screen = self.screens[i]
            cell_mm = 1.0 / screen.ruling_per_mm if screen.ruling_per_mm else 0.0
            tones[:, i] = screen.tone.at(x, y, size_mm=max(window_mm, cell_mm))
        return np.clip(tones, 0.0, 1.0)


def tones_together(
    screens: Sequence[Screen], overprints: Sequence[Overprint], sheet: SheetSize, *, window_mm: float
) -> FloatArray:
    """Plate tones (m, n) that occur together over windows of `window_mm`, one column a screen.

    0 where a screen does not print.  Windows lie wholly inside every area that prints there;
    the regions on which the same areas print are found exactly.  Constant tones give one row
    a region.  Pictures are averaged over the window and sampled; their tones are told apart in
    steps of 1/16, at most some hundred rows a region (those of the largest share), and beside
    them, in steps of 1/64, the rows in which one screen, or all together, are at their lightest
    and darkest.  Inks that never meet are split into alternatives.  No row means that no two
    tones hold over such a window (a sheet that is smaller than the window counts as one).
    """
    return Together(screens, overprints, sheet).rows(window_mm=window_mm)


def _is_whole_sheet(area: Area, sheet: SheetSize) -> bool:
    x0, y0, x1, y1 = area.box_mm
    return area.rings is None and x0 <= 0 and y0 <= 0 and x1 >= sheet.width_mm and y1 >= sheet.height_mm


def _fewer(tones: FloatArray, pictures: NDArray[np.intp]) -> FloatArray:
    """Rows in steps, few enough, with the extremes told apart more finely."""
    if not len(tones) or not len(pictures):
        return tones[:1]
    rows, places = _in_steps(tones, pictures, _STEPS)
    if len(rows) > _ROWS:
        # of rows that lie side by side the one of the larger share stands for both
        kept = np.zeros(len(rows), dtype=bool)
        _, bucket = np.unique(_packed(np.rint(rows[:, pictures] * _STEPS).astype(np.int64) // 2), return_inverse=True)
        by_share = np.lexsort((-places, bucket))
        kept[by_share[np.unique(bucket[by_share], return_index=True)[1]]] = True
        rows, places = rows[kept], places[kept]
        rows = rows[np.sort(np.argsort(-places, kind="stable")[:_ROWS])]
    inked = tones[:, pictures]
    sums = inked.sum(axis=1)
    extremes = {int(np.argmax(sums)), int(np.argmin(np.where(sums > 0, sums, np.inf)))}
    for column in inked.T:
        printing = np.flatnonzero(column > 0)
        if len(printing):
            extremes |= {int(printing[np.argmax(column[printing])]), int(printing[np.argmin(column[printing])])}
    fine, _ = _in_steps(tones[sorted(extremes)], pictures, _FINE_STEPS)
    return np.concatenate([rows, fine])


def _in_steps(tones: FloatArray, pictures: NDArray[np.intp], steps: int) -> tuple[FloatArray, NDArray[np.intp]]:
    """(rows (m, n), how many tones (m,) each stands for): pictures' tones in whole steps.

    No tone that prints is rounded away, none that does not reach a solid becomes one.
    """
    inked = tones[:, pictures]
    codes = np.clip(np.rint(inked * steps), inked > 0, np.where(inked < 1, steps - 1, steps)).astype(np.int64)
    _, first, count = np.unique(_packed(codes), return_index=True, return_counts=True)
    rows = tones[first].copy()
    rows[:, pictures] = codes[first] / steps
    return rows, count


def _packed(codes: NDArray[np.int64]) -> NDArray[np.int64]:
    """One number (m,) for each row of small numbers (m, n); equal numbers mean equal rows."""
    number = np.zeros(len(codes), dtype=np.int64)
    for column in codes.T:
        _, place = np.unique(column, return_inverse=True)
        # squeezed after every column, so that no count of screens overflows
        _, number = np.unique(number * (place.max(initial=0) + 1) + place, return_inverse=True)
    return number


def _split_never(rows: FloatArray, screens: Sequence[Screen], overprints: Sequence[Overprint]) -> FloatArray:
    """Rows in which inks that never meet both print become alternatives, one without each."""
    for overprint in overprints:
        if not overprint.never:
            continue
        for one, other in combinations(sorted(overprint.inks), 2):
            of_one = np.array([screen.ink == one for screen in screens])
            of_other = np.array([screen.ink == other for screen in screens])
            both = (rows[:, of_one] > 0).any(axis=1) & (rows[:, of_other] > 0).any(axis=1)
            without_one, without_other = rows[both].copy(), rows[both].copy()
            without_one[:, of_one] = 0.0
            without_other[:, of_other] = 0.0
            rows = np.concatenate([rows[~both], without_one, without_other])
    return rows
