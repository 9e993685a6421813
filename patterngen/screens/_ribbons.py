"""Lines of changing width: stations half a pitch apart, strips of paper between them."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from patterngen.model.area import BoolArray
from patterngen.model.lattice import FloatArray, Lattice
from patterngen.model.shapes import Polygons
from patterngen.screens._ground import Geometries, Ranges

_SEAM = 0.06
"""Pitches over which two lines that have grown together are covered once more."""

_BATCH = 400_000
"""Half pitches of line worked on at a time."""


@dataclass(frozen=True, slots=True, eq=False)
class Ribbons:
    """Strips of changing width about lines, as flat columns over all their stations.

    `u` along, `line` where the middle lies across, `width`: all in pitches.  Ribbon r has the
    stations start[r] to start[r + 1] - 1.
    """

    u: FloatArray
    line: FloatArray
    width: FloatArray
    start: NDArray[np.int64]

    def __len__(self) -> int:
        return len(self.start) - 1

    @classmethod
    def joined(cls, first: Ribbons, second: Ribbons) -> Ribbons:
        """Both, one after the other."""
        return cls(
            np.concatenate([first.u, second.u]),
            np.concatenate([first.line, second.line]),
            np.concatenate([first.width, second.width]),
            np.concatenate([first.start, first.start[-1] + second.start[1:]]),
        )

    @classmethod
    def on(cls, cells: BoolArray, widths: FloatArray, *, low: int, line: float) -> Ribbons:
        """One ribbon for each run of cells (rows, n) along a row, between stations of `widths` (rows, n + 1).

        Station 0 has number `low`; row 0 lies at `line`.  A ribbon that pinches to nothing
        ends, and another begins; stations amid an even width are left out.
        """
        pinch = widths == 0.0
        begins, ends = cells.copy(), cells.copy()
        begins[:, 1:] &= ~cells[:, :-1] | pinch[:, 1:-1]
        ends[:, :-1] &= ~cells[:, 1:] | pinch[:, 1:-1]
        row, first = np.nonzero(begins)
        last = np.nonzero(ends)[1] + 1
        count = last - first + 1
        start = np.cumsum(count) - count
        ribbon = np.repeat(np.arange(len(row)), count)
        station = first[ribbon] + np.arange(len(ribbon)) - start[ribbon]
        width = widths[row[ribbon], station]
        even = np.zeros(len(width), dtype=bool)
        even[1:-1] = (width[1:-1] == width[:-2]) & (width[1:-1] == width[2:])
        keep = ~even | (station == first[ribbon]) | (station == last[ribbon])
        left = np.bincount(ribbon[keep], minlength=len(row))
        return cls(
            0.5 * (low + station[keep]),
            line + row[ribbon[keep]].astype(float),
            width[keep],
            np.concatenate([[0], np.cumsum(left)]),
        )

    def take(self, which: BoolArray) -> Ribbons:
        """Only the ribbons (n,) marked."""
        count = np.diff(self.start)
        station = np.repeat(which, count)
        return Ribbons(
            self.u[station],
            self.line[station],
            self.width[station],
            np.concatenate([[0], np.cumsum(count[which])]),
        )

    def rings(self) -> tuple[FloatArray, NDArray[np.int64]]:
        """(uv (m, 2), ring start (n + 1,)): out along the lower side, back along the upper, tips once."""
        count = np.diff(self.start)
        ribbon = np.repeat(np.arange(len(self)), count)
        along = np.arange(len(self.u)) - self.start[ribbon]
        out = 2 * self.start[ribbon] + along
        back = 2 * (self.start[ribbon] + count[ribbon]) - 1 - along
        uv = np.empty((2 * len(self.u), 2))
        uv[out, 0], uv[back, 0] = self.u, self.u
        uv[out, 1], uv[back, 1] = self.line - 0.5 * self.width, self.line + 0.5 * self.width
        keep = np.ones(len(uv), dtype=bool)
        keep[back[self.width == 0.0]] = False
        kept = np.concatenate([[0], np.cumsum(keep)])
        return uv[keep], kept[2 * self.start]

    def polygons(self, frame: Lattice) -> Polygons:
        """As loose polygons of one ring each."""
        uv, start = self.rings()
        return Polygons(frame, uv, start.astype(np.int32), np.arange(len(self) + 1, dtype=np.int32))

    def geometries(self) -> Geometries:
        """As shapely polygons (n,)."""
        import shapely

        uv, start = self.rings()
        if not len(self):
            return np.empty(0, dtype=object)
        return np.atleast_1d(
            shapely.polygons(shapely.linearrings(uv, indices=np.repeat(np.arange(len(self)), np.diff(start))))
        )


@dataclass(frozen=True, slots=True, eq=False)
class Band:
    """Neighbouring lines: which half pitches (lines, n) lie inside the area, and which at its rim.

    Half pitch 0 begins at station number `low`; row 0 is line number `line`.  The last row is
    the next band's first line, there for the joint between the two.
    """

    low: int
    line: int
    inside: BoolArray
    rim: BoolArray

    def stations(self) -> tuple[FloatArray, FloatArray]:
        """(station numbers, line numbers), both (lines, n + 1)."""
        rows, columns = self.inside.shape
        station, line = np.meshgrid(
            np.arange(self.low, self.low + columns + 1, dtype=float),
            np.arange(self.line, self.line + rows, dtype=float),
        )
        return station, line

    def ribbons(self, widths: FloatArray) -> tuple[Ribbons, Ribbons]:
        """(ribbons inside the area, ribbons to be cut by it), with the covers of joints between full lines."""
        inked = (widths[:, :-1] > 0) | (widths[:, 1:] > 0)
        inside = Ribbons.on((self.inside & inked)[:-1], widths[:-1], low=self.low, line=self.line)
        rim = Ribbons.on((_longer(self.rim) & inked)[:-1], widths[:-1], low=self.low, line=self.line)
        # where two lines are both full, their joint is covered, or it would show as a hair line
        full = widths >= 1.0
        full_half = full[:, :-1] & full[:, 1:]
        joint = full_half[:-1] & full_half[1:]
        known = self.inside | self.rim
        at_rim = joint & (self.rim[:-1] | self.rim[1:]) & known[:-1] & known[1:]
        within = joint & self.inside[:-1] & self.inside[1:]
        cover = np.full((len(joint), widths.shape[1]), _SEAM)
        middle = self.line + 0.5
        return (
            Ribbons.joined(inside, Ribbons.on(within, cover, low=self.low, line=middle)),
            Ribbons.joined(rim, Ribbons.on(_longer(at_rim) & joint, cover, low=self.low, line=middle)),
        )


def _longer(cells: BoolArray) -> BoolArray:
    """The cells and those beside them along the rows."""
    out = cells.copy()
    out[:, 1:] |= cells[:, :-1]
    out[:, :-1] |= cells[:, 1:]
    return out


def bands(inside: Ranges, rim: Ranges) -> Iterator[Band]:
    """All half pitches of the area, a band of lines at a time."""
    row = np.concatenate([inside.row, rim.row])
    if not len(row):
        return
    lowest = int(row.min())
    per_row = np.bincount(row - lowest, np.concatenate([inside.count, rim.count]))
    part = np.cumsum(per_row) // _BATCH
    starts = np.concatenate([[0], np.nonzero(np.diff(part))[0] + 1, [len(per_row)]]) + lowest
    for first, stop in zip(starts[:-1].tolist(), starts[1:].tolist(), strict=True):
        own = [_rows(runs, first, stop + 1) for runs in (inside, rim)]
        some = [runs for runs in own if len(runs.row)]
        if not some:
            continue
        low = min(int(runs.first.min()) for runs in some) - 1
        high = max(int(runs.last.max()) for runs in some) + 1
        shape = (stop + 1 - first, high - low + 1)
        yield Band(low, first, *(_marked(runs, first, low, shape) for runs in own))


def _rows(runs: Ranges, first: int, stop: int) -> Ranges:
    a, b = np.searchsorted(runs.row, [first, stop])
    return Ranges(runs.row[a:b], runs.first[a:b], runs.last[a:b])


def _marked(runs: Ranges, line: int, low: int, shape: tuple[int, int]) -> BoolArray:
    step = np.zeros((shape[0], shape[1] + 1), dtype=np.int32)
    np.add.at(step, (runs.row - line, runs.first - low), 1)
    np.add.at(step, (runs.row - line, runs.last - low + 1), -1)
    return np.asarray(np.cumsum(step, axis=1)[:, :-1] > 0)
