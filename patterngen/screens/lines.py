"""Line screens: parallel lines whose width carries the tone."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from pydantic import BaseModel, ConfigDict

from patterngen.model.area import BoolArray
from patterngen.model.job import ScreenRequest
from patterngen.model.lattice import FloatArray, Lattice, direction
from patterngen.model.screen import ComplexArray, Screen
from patterngen.model.shapes import Batch
from patterngen.screens._ground import Ground, polygons, whole_area
from patterngen.screens._ink import InkScreen
from patterngen.screens._ribbons import bands
from patterngen.screens._samples import PICTURE, on_panel

SUMMARY = "parallel lines; their width carries the tone"


class Params(BaseModel):
    """Lines have no settings of their own."""

    model_config = ConfigDict(extra="forbid")


class LineScreen(InkScreen):
    """Lines along `angle_deg`, one through the origin; a line's width is the tone times the pitch.

    In a picture the width is that of the tone (averaged over a pitch) at points half a pitch
    apart along the middle of the line, and changes evenly between them; `covers` and `shapes`
    follow the same points.
    """

    kind = "lines"
    shape = "line"
    symmetry_deg = 180.0

    def __init__(self, request: ScreenRequest) -> None:
        """Lines have no shape to choose."""
        super().__init__(request)
        self.frequencies_per_mm = (self.ruling_per_mm * direction(self.angle_deg + 90.0))[None, :]

    def coefficients(self, tone: float, *, reach: int) -> ComplexArray:
        """sin(pi k t) / (pi k), turned by the origin's phase."""
        k = np.arange(-reach, reach + 1)
        phase = np.exp(-2j * np.pi * k * float(self.frequencies_per_mm[0] @ self.origin_mm))
        t = min(max(float(tone), 0.0), 1.0)
        out: ComplexArray = t * np.sinc(k * t) * phase
        if t == 1.0:
            out[k != 0] = 0.0
        return out

    def tail(self, tone: float, *, radius: float) -> float:
        """1 / (pi k), the modulus never being larger; and never more than the first order's."""
        if not 0.0 < tone < 1.0:
            return 0.0
        k = max(1.0, float(np.ceil(radius - 1e-9)))
        return min(1.0 / (np.pi * k), tone, 1.0 - tone)

    def edges_per_mm(self, tones: FloatArray) -> FloatArray:
        """Two edges a line."""
        return np.full_like(tones, 2.0 * self.ruling_per_mm)

    def smallest_mm(self, tone: float) -> tuple[float, float]:
        """The line's width and the clear width between lines."""
        line = tone * self.pitch_mm if tone > 0 else np.inf
        gap = (1.0 - tone) * self.pitch_mm if tone < 1 else np.inf
        return float(line), float(gap)

    # --- geometry

    def covers(self, x_mm: FloatArray, y_mm: FloatArray) -> BoolArray:
        """Which points lie within half a line's width of its middle, see the class."""
        x, y = np.broadcast_arrays(np.asarray(x_mm, dtype=float), np.asarray(y_mm, dtype=float))
        uv = self.frame.locate(np.stack([x.ravel(), y.ravel()], axis=1))
        u, v = uv[:, 0], uv[:, 1]
        line = np.round(v)
        if self.tone.constant is not None:
            width = np.full(u.shape, self.tone.constant)
        else:
            sample = np.floor(2 * u)
            share = 2 * u - sample
            width = (1 - share) * self._widths(sample, line) + share * self._widths(sample + 1, line)
        inked = (np.abs(v - line) < 0.5 * width) | (width >= 1.0)
        return inked.reshape(x.shape) & self.area.contains(x, y)

    def _widths(self, sample: FloatArray, line: FloatArray) -> FloatArray:
        """Width in pitches at sample numbers (half pitches along the line) of lines."""
        xy = self.frame.place(np.stack([0.5 * sample, line], axis=-1).reshape(-1, 2))
        width = self.tone.at(xy[:, 0], xy[:, 1], size_mm=self.pitch_mm)
        width = np.where(width < _THINNEST, 0.0, np.where(width > 1.0 - _THINNEST, 1.0, width))
        return width.reshape(np.shape(sample))

    def shapes(self) -> Iterator[Batch]:
        """Polygons in the frame of the lines (u along, v across, in pitches), cut exactly by the area."""
        if self.tone.constant is None:
            yield from self._ribbons()
        elif self.tone.constant >= 1.0:
            yield whole_area(self.area)
        elif self.tone.constant > 0.0:
            yield from self._strips(self.tone.constant)

    def _strips(self, tone: float) -> Iterator[Batch]:
        import shapely

        ground = Ground(self.area, self.frame)
        low_u, low_v, high_u, high_v = shapely.bounds(ground.geometry)
        line = np.arange(np.ceil(low_v - 0.5 * tone), np.floor(high_v + 0.5 * tone) + 1)
        strips = np.atleast_1d(shapely.box(low_u - 1, line - 0.5 * tone, high_u + 1, line + 0.5 * tone))
        _, pieces, _ = ground.cut(strips)
        yield polygons(pieces, self.frame)

    def _ribbons(self) -> Iterator[Batch]:
        """Lines of changing width: long ribbons inside the area, and cut ones along its edge.

        A cut ribbon goes on for half a pitch under the whole one beside it, so that no seam shows.
        """
        # a place of this lattice is half a pitch of one line, seen from its middle
        halves = Lattice(self.frame.place(np.array([[0.25, 0.0]]))[0], np.array([[0.5], [1.0]]) * self.frame.steps_mm)
        inside, rim = Ground(self.area, halves).places(0.7072)
        ground = Ground(self.area, self.frame)
        for band in bands(inside, rim):
            widths = self._widths(*band.stations())
            lone, shared = band.ribbons(widths)
            if len(lone):
                yield lone.polygons(self.frame)
            whole, pieces, _ = ground.cut(shared.geometries())
            if whole.any():
                yield shared.take(whole).polygons(self.frame)
            cut = polygons(pieces, self.frame)
            if cut.total:
                yield cut


_THINNEST = 5e-4
"""In a picture, lines thinner than this share of the pitch are not drawn, and gaps thinner are closed."""


def make(request: ScreenRequest) -> Screen:
    """The line screen asked for."""
    return LineScreen(request)


def examples() -> list[ScreenRequest]:
    """Screens for the tests that every kind must pass."""
    return [
        on_panel("lines", None, ruling_per_mm=ruling, angle_deg=angle, tone=tone)
        for ruling, angle, tone in (
            (4.0, 0.0, 0.3),
            (5.0, 15.0, 0.5),
            (3.7, 67.5, 0.85),
            (6.0, 15.0, PICTURE),
            (5.0, 105.0, PICTURE),
        )
    ]
