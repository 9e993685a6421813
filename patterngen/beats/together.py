"""Which tones meet somewhere on the sheet, over an area at least as wide as a beat."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations

import numpy as np

from patterngen.model.area import Area, BoolArray
from patterngen.model.job import Overprint, SheetSize
from patterngen.model.lattice import FloatArray
from patterngen.model.screen import Screen

_SAMPLES_A_SIDE = 320
_SAMPLES_A_WINDOW = 4
_ROWS = 200
_LEVELS = (16, 8, 4)
_FINE = 64


def tones_together(
    screens: Sequence[Screen], overprints: Sequence[Overprint], sheet: SheetSize, *, window_mm: float
) -> FloatArray:
    """Plate tones (m, n) that occur together over windows of `window_mm`, one column a screen.

    0 where a screen does not print.  Windows lie wholly inside every area that prints there.
    Constant tones over the whole sheet give one row.  Pictures are averaged over the window,
    sampled, and rounded to 1/16, 1/8 or 1/4 so that at most about 200 rows remain; the rows in
    which a screen is at its darkest and lightest are kept beside them, to 1/64.  Inks that never meet are split into
    alternatives.  No row means that no two tones hold over such a window (a sheet that is
    smaller than the window counts as one window).
    """
    if not screens:
        return np.zeros((0, 0))
    constant = [screen.tone.constant for screen in screens]
    whole = [_is_whole_sheet(screen.area, sheet) for screen in screens]
    if all(whole) and all(tone is not None for tone in constant):
        rows = np.array([constant], dtype=float)
    else:
        rows = _sampled(screens, sheet, window_mm)
    rows = _split_never(rows, screens, overprints)
    rows = rows[(rows > 0).any(axis=1)]
    return np.unique(rows, axis=0) if len(rows) else rows


def _is_whole_sheet(area: Area, sheet: SheetSize) -> bool:
    x0, y0, x1, y1 = area.box_mm
    return area.rings is None and x0 <= 0 and y0 <= 0 and x1 >= sheet.width_mm and y1 >= sheet.height_mm


def _sampled(screens: Sequence[Screen], sheet: SheetSize, window_mm: float) -> FloatArray:
    x0, y0, x1, y1 = sheet.box_mm
    window_mm = min(window_mm, x1 - x0, y1 - y0)
    step = max(max(x1 - x0, y1 - y0) / _SAMPLES_A_SIDE, window_mm / _SAMPLES_A_WINDOW)
    columns, rows = max(int((x1 - x0) / step), 1), max(int((y1 - y0) / step), 1)
    x = x0 + (np.arange(columns) + 0.5) * (x1 - x0) / columns
    y = y0 + (np.arange(rows) + 0.5) * (y1 - y0) / rows
    grid_x, grid_y = np.meshgrid(x, y)
    across, down = _window(window_mm, (x1 - x0) / columns), _window(window_mm, (y1 - y0) / rows)
    inside: dict[int, BoolArray] = {}
    tones = np.empty((rows * columns, len(screens)))
    for i, screen in enumerate(screens):
        if id(screen.area) not in inside:
            whole = _is_whole_sheet(screen.area, sheet)
            within = np.ones(grid_x.shape, dtype=bool) if whole else screen.area.contains(grid_x, grid_y)
            inside[id(screen.area)] = _eroded(within, across, down)
        cell_mm = 1.0 / screen.ruling_per_mm if screen.ruling_per_mm else 0.0
        tone = screen.tone.at(grid_x, grid_y, size_mm=max(window_mm, cell_mm))
        tones[:, i] = np.where(inside[id(screen.area)], tone, 0.0).ravel()
    return _fewer(np.clip(tones, 0.0, 1.0), [screen.tone.constant is not None for screen in screens])


def _window(window_mm: float, step_mm: float) -> int:
    return max(int(np.floor(window_mm / step_mm + 1e-9)), 1)


def _eroded(inside: BoolArray, across: int, down: int) -> BoolArray:
    """Where a window of so many samples about the sample lies wholly inside (and on the sheet)."""
    for axis, size in ((1, across), (0, down)):
        size = min(size, inside.shape[axis])
        if size > 1:
            total = np.cumsum(inside, axis=axis, dtype=np.int64)
            zero = np.zeros_like(np.take(total, [0], axis=axis))
            total = np.concatenate([zero, total], axis=axis)
            n = inside.shape[axis]
            low = np.clip(np.arange(n) - (size - 1) // 2, 0, n - size)
            full = np.take(total, low + size, axis=axis) - np.take(total, low, axis=axis) == size
            inside = full & inside
    return inside


def _fewer(tones: FloatArray, exact: Sequence[bool]) -> FloatArray:
    """Rows rounded (pictures only) until few remain, with every screen's extremes rounded less."""
    pictures = np.flatnonzero(~np.asarray(exact))
    if not len(pictures):
        return np.unique(tones, axis=0)
    kept = []
    for i in pictures:
        printing = np.flatnonzero(tones[:, i] > 0)
        if len(printing):
            kept += [printing[np.argmax(tones[printing, i])], printing[np.argmin(tones[printing, i])]]
    extremes = tones[sorted(set(map(int, kept)))]
    # no tone that prints is rounded away, none that does not reach a solid becomes one
    fine = np.clip(np.rint(extremes[:, pictures] * _FINE) / _FINE, 1.0 / _FINE, 1.0 - 1.0 / _FINE)
    whole = (extremes[:, pictures] <= 0.0) | (extremes[:, pictures] >= 1.0)
    extremes[:, pictures] = np.where(whole, extremes[:, pictures], fine)
    rounded = tones
    for levels in _LEVELS:
        rounded = tones.copy()
        rounded[:, pictures] = np.rint(tones[:, pictures] * levels) / levels
        rounded = np.unique(rounded, axis=0)
        if len(rounded) <= _ROWS:
            break
    return np.concatenate([rounded, extremes])


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
