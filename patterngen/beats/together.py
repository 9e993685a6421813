"""Which tones meet somewhere on the sheet, over an area at least as wide as a beat."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
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
_ROWS = 160
"""Rows of a region that are kept at the most, those of the largest share of it."""

_STEPS, _FINE_STEPS = 16, 64
"""Tones of pictures are told apart in so many steps; the extremes in the finer ones."""


_MOST_REGIONS = 400
"""Overlaps of areas that are followed; a job with more has its rarest left out."""


@dataclass(frozen=True, slots=True, eq=False)
class TonesTogether:
    """Tones that occur together, one row a case: columns (m, n), one a screen.

    `plate` are tones on the plate.  `share` is 1 for a screen that prints all over the place,
    and where several areas cut it up the part of the place that the screen covers: such a
    screen only averages there, and does not take part (`taking_part` False).
    """

    plate: FloatArray
    share: FloatArray
    taking_part: BoolArray

    @classmethod
    def none(cls, screens: int) -> TonesTogether:
        """No row."""
        return cls(np.zeros((0, screens)), np.zeros((0, screens)), np.zeros((0, screens), dtype=bool))

    @classmethod
    def joined(cls, parts: Sequence[TonesTogether]) -> TonesTogether:
        """All rows of several."""
        return cls(*(np.concatenate([getattr(part, name) for part in parts]) for name in cls.__dataclass_fields__))

    def take(self, rows: NDArray[Any]) -> TonesTogether:
        """Some rows."""
        return TonesTogether(self.plate[rows], self.share[rows], self.taking_part[rows])


@dataclass(frozen=True, slots=True, eq=False)
class _Region:
    """A part of the sheet: its outline (None: `box_mm`), who prints all over it, and how much others cover.

    `printing` (n,), `share` (n,) with 1 for those who print.
    """

    printing: BoolArray
    share: FloatArray
    box_mm: tuple[float, float, float, float]
    outline: Any = None

    def core(self, window_mm: float) -> _Region | None:
        """Where a window of that width has its middle so that it lies wholly inside; None where there is no place."""
        x0, y0, x1, y1 = self.box_mm
        if self.outline is None:
            across, down = min(window_mm, x1 - x0) / 2, min(window_mm, y1 - y0) / 2
            return replace(self, box_mm=(x0 + across, y0 + down, x1 - across, y1 - down))
        if window_mm <= 0:
            return self
        inner = self.outline.simplify(window_mm / 40).buffer(-window_mm / 2, join_style="mitre")
        return None if inner.is_empty else replace(self, box_mm=inner.bounds, outline=inner)

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
        """Where the same areas lie on each other, from the outlines themselves: none is too narrow to be found.

        Every set of areas that overlap has up to two: its own ground without all other areas,
        and, where others cut into it, the whole overlap with those averaging.
        """
        whole = np.array([_is_whole_sheet(screen.area, self.sheet) for screen in self.screens], dtype=bool)
        if whole.all():
            return (_Region(whole, whole.astype(float), self.sheet.box_mm),)
        import shapely

        users: dict[int, list[int]] = {}
        for i in np.flatnonzero(~whole):
            users.setdefault(id(self.screens[i].area), []).append(int(i))
        outlines = {key: self.screens[who[0]].area.geometry() for key, who in users.items()}
        found: list[_Region] = []
        waiting: list[tuple[tuple[int, ...], Any]] = [((), shapely.box(*self.sheet.box_mm))]
        while waiting and len(found) < _MOST_REGIONS:
            inside, common = waiting.pop(0)
            rest = {key: common.intersection(outline) for key, outline in outlines.items() if key not in inside}
            cutting = {key: part for key, part in rest.items() if part.area > 0.0}
            printing = whole.copy()
            for key in inside:
                printing[users[key]] = True
            if printing.any():
                found += self._ground(printing, common, {key: (users[key], part) for key, part in cutting.items()})
            last = list(outlines).index(inside[-1]) if inside else -1
            waiting += [((*inside, key), part) for key, part in cutting.items() if list(outlines).index(key) > last]
        return tuple(found)

    @staticmethod
    def _ground(printing: BoolArray, common: Any, cutting: dict[int, tuple[list[int], Any]]) -> list[_Region]:
        """The ground that `printing` have to themselves, and the whole overlap where others cut into it."""
        import shapely

        alone = common.difference(shapely.union_all([part for _, part in cutting.values()])) if cutting else common
        share = printing.astype(float)
        regions = [_Region(printing, share, alone.bounds, alone)] if alone.area > 0.0 else []
        if cutting:
            share = share.copy()
            for who, part in cutting.values():
                share[who] = part.area / common.area
            regions.append(_Region(printing, share, common.bounds, common))
        return regions

    def samples(self, *, window_mm: float) -> FloatArray:
        """Plate tones (m, n) as they are at points of the sheet, averaged over the window, 0 where a screen is not."""
        return self._rows([(region, self._sampled(region, window_mm)) for region in self._own]).plate

    @property
    def _own(self) -> list[_Region]:
        return [region for region in self._regions if _to_itself(region)]

    def rows(self, *, window_mm: float) -> TonesTogether:
        """Tones that occur together over windows of `window_mm`, told apart in steps."""
        pictures = np.array([screen.tone.constant is None for screen in self.screens], dtype=bool)
        return self._rows(
            [
                (region, _fewer(self._sampled(region, window_mm), np.flatnonzero(pictures & (region.share > 0))))
                for region in self._regions
            ]
        )

    def _rows(self, found: Sequence[tuple[_Region, FloatArray]]) -> TonesTogether:
        parts = [TonesTogether.none(len(self.screens))]
        for region, tones in found:
            like = np.ones((len(tones), 1))
            parts.append(TonesTogether(tones, like * region.share, (like * region.printing) > 0))
        return _split_never(TonesTogether.joined(parts), self.screens, self.overprints)

    def heaviest(self) -> tuple[float, FloatArray]:
        """(largest sum of printed tones in one place, the printed tones (n,) there).

        Screens of one ink overlap and do not add up.
        """
        samples = np.unique(self.samples(window_mm=0.0), axis=0)
        if not len(samples):
            return 0.0, np.zeros(len(self.screens))
        printed = np.column_stack([screen.printed_tone(samples[:, i]) for i, screen in enumerate(self.screens)])
        open_paper: dict[str, FloatArray] = {}
        for i, screen in enumerate(self.screens):
            open_paper[screen.ink] = open_paper.get(screen.ink, np.ones(len(samples))) * (1.0 - printed[:, i])
        sums = np.sum([1.0 - left for left in open_paper.values()], axis=0)
        worst = int(np.argmax(sums))
        return float(sums[worst]), printed[worst]

    def meeting_though_never(self) -> tuple[tuple[str, str], ...]:
        """Pairs of inks that are said never to meet and whose screens print on common ground all the same."""
        found = []
        printing = {
            frozenset(screen.ink for screen, prints in zip(self.screens, region.printing, strict=True) if prints)
            for region in self._own
        }
        for overprint in self.overprints:
            for pair in combinations(sorted(overprint.inks), 2) if overprint.never else ():
                if any(set(pair) <= inks for inks in printing):
                    found.append(pair)
        return tuple(dict.fromkeys(found))

    def _sampled(self, region: _Region, window_mm: float) -> FloatArray:
        core = region.core(window_mm)
        there = region.share > 0
        if core is None:
            return np.zeros((0, len(self.screens)))
        constant = [screen.tone.constant for screen in self.screens]
        if all(tone is not None or not prints for tone, prints in zip(constant, there, strict=True)):
            return np.array([[t if p else 0.0 for t, p in zip(constant, there, strict=True)]], dtype=float)
        x0, y0, x1, y1 = core.box_mm
        step_mm = max(x1 - x0, y1 - y0, 1e-6) / _SAMPLES_A_SIDE
        x, y = core.points(max(step_mm, window_mm / _SAMPLES_A_WINDOW))
        tones = np.zeros((len(x), len(self.screens)))
        for i in np.flatnonzero(there):
            screen = self.screens[i]
            cell_mm = 1.0 / screen.ruling_per_mm if screen.ruling_per_mm else 0.0
            tones[:, i] = screen.tone.at(x, y, size_mm=max(window_mm, cell_mm))
        return np.clip(tones, 0.0, 1.0)


def _to_itself(region: _Region) -> bool:
    """Whether nobody else cuts into the region."""
    return bool((region.share[~region.printing] == 0.0).all())


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
    rows = Together(screens, overprints, sheet).rows(window_mm=window_mm)
    own = rows.taking_part.any(axis=1) & (rows.taking_part | (rows.share == 0.0)).all(axis=1)
    return np.unique(rows.plate[own], axis=0)


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


def _split_never(
    rows: TonesTogether, screens: Sequence[Screen], overprints: Sequence[Overprint]
) -> TonesTogether:
    """Rows in which inks that never meet both print become alternatives, one without each."""
    for overprint in overprints:
        if not overprint.never:
            continue
        for one, other in combinations(sorted(overprint.inks), 2):
            of_one = np.array([screen.ink == one for screen in screens])
            of_other = np.array([screen.ink == other for screen in screens])
            there = rows.plate * rows.share > 0
            both: BoolArray = np.logical_and(there[:, of_one].any(axis=1), there[:, of_other].any(axis=1))
            without = []
            for gone in (of_one, of_other):
                kept = rows.take(both)
                plate, share = (np.where(gone, 0.0, column) for column in (kept.plate, kept.share))
                without.append(TonesTogether(plate, share, kept.taking_part & ~gone))
            rows = TonesTogether.joined([rows.take(np.flatnonzero(~both)), *without])
    return rows.take(np.flatnonzero((rows.plate * rows.share > 0).any(axis=1)))
