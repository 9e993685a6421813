"""Dot screens: one of the standard's spot functions on a square lattice."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Annotated

import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel, ConfigDict

from patterngen.model.area import BoolArray
from patterngen.model.fields import ChoiceField
from patterngen.model.job import ScreenRequest
from patterngen.model.lattice import FloatArray, Lattice, direction
from patterngen.model.screen import ComplexArray, Screen
from patterngen.model.shapes import Batch, Contour, Outline, Stamps
from patterngen.screens import _quadrant as quadrant
from patterngen.screens import _spot as spot
from patterngen.screens._ground import Ground, polygons, ring_polygons, whole_area
from patterngen.screens._ink import InkScreen
from patterngen.screens._outlines import full_cell, of_levels
from patterngen.screens._samples import PICTURE, on_panel
from patterngen.screens._steps import ToneSteps

SUMMARY = "dots on a square lattice, of any of the spot functions of ISO 32000-1; their size carries the tone"

SHAPES = tuple(sorted(spot.FUNCTIONS))
AXIS_SHAPES = frozenset(name for name in SHAPES if spot.has_axis(name))
"""Shapes whose rows and columns differ, so that the screen repeats only after half a turn."""

_BATCH = 200_000
"""Places of a picture worked on at a time."""


class Params(BaseModel):
    """`shape`: a spot function by its standard name, read in lower case."""

    model_config = ConfigDict(extra="forbid")

    shape: Annotated[str, ChoiceField("a spot function", lambda: SHAPES, any_case=True)] | None = None


class DotScreen(InkScreen):
    """Dots of one shape, rows along `angle_deg`.

    What lies at the origin: a dot's centre.  For the inverted shapes and for rhomboid, whose ink
    grows from the corners of the cell, it is the centre of the clear spot; for linex and liney
    the middle of the spot function's cell (their far edge stays half a pitch beyond it).

    In a picture every dot has the tone of its centre, averaged over about a cell, in steps of at
    most 1/512 and at most 1 um of the diameter of a disc, inked or clear.  Its cell then holds
    exactly {value > s} for that tone; simpledot and the ellipses reach over their cell's
    edge as whole figures.  `covers` follows this; the one thing that it leaves out is the
    tapering overlap of at most 0.03 of the pitch that keeps seams shut, which in even tone lies
    inside the neighbour's ink and in a picture can stick out of it where the neighbour is lighter.
    """

    kind = "dots"

    def __init__(self, request: ScreenRequest) -> None:
        """A request without a shape gets simpledot."""
        super().__init__(request)
        self.shape = request.shape or "simpledot"
        self._shape = quadrant.SHAPES[self.shape]
        self.frequencies_per_mm = self.ruling_per_mm * np.stack(
            [direction(self.angle_deg), direction(self.angle_deg + 90.0)]
        )
        self.symmetry_deg = 180.0 if self.shape in AXIS_SHAPES else 90.0
        copies = np.array(self._shape.copies)
        shift = np.array(self._shape.dot) - np.array(self._shape.anchor)
        self._dots = Lattice(self.frame.place(shift[None, :])[0], self.frame.steps_mm / copies[:, None])
        """Where the dots stand; its cell is a dot's own (smaller than the ruling's where there are several)."""
        self._sides_mm = (self.pitch_mm / self._shape.copies[0], self.pitch_mm / self._shape.copies[1])
        self._steps = ToneSteps(pitch_um=1000.0 * min(self._sides_mm))
        self._step_levels = np.full(self._steps.count + 1, np.nan)

    # --- what predicts

    def coefficients(self, tone: float, *, reach: int) -> ComplexArray:
        """The dot's own series, spread over its copies, turned by the phase of its centre."""
        nx, ny = self._shape.copies
        t = min(max(float(tone), 0.0), 1.0)
        own = quadrant.series(self._shape, t, reach=reach)
        k = np.arange(-reach, reach + 1)
        out = np.zeros((len(k), len(k)))
        on_x, on_y = np.nonzero(k % nx == 0)[0], np.nonzero(k % ny == 0)[0]
        out[np.ix_(on_x, on_y)] = own[np.ix_(np.abs(k[on_x]) // nx, np.abs(k[on_y]) // ny)]
        centre = self._dots.place(self._slide(np.array([t])))[0]
        turn = self.frequencies_per_mm @ centre
        phase = np.exp(-2j * np.pi * k[:, None] * turn[0]) * np.exp(-2j * np.pi * k[None, :] * turn[1])
        return np.asarray(out * phase)

    def tail(self, tone: float, *, radius: float) -> float:
        """For discs and ellipses that do not touch by |J1(x)| <= 0.8254 / sqrt(x), else edge length / (2 pi k).

        The latter by the divergence theorem; and no coefficient of a pattern that is inked or not
        exceeds sin(pi t) / pi.
        """
        if not 0.0 < tone < 1.0:
            return 0.0
        radius = max(float(radius), 1.0)
        edge = self.edge_per_mm(tone) * self.pitch_mm
        bounds = [edge / (2 * np.pi * radius), np.sin(np.pi * tone) / np.pi]
        whole = self._shape.whole
        reach = quadrant.extent(self.shape, tone)
        if whole is not None and max(reach.along, reach.across) < 1.0:
            # c = area 2 J1(2 pi q) / (2 pi q), q = |(along k1, across k2)| in half cells / 2 >= least semi-axis k
            q = 0.5 * min(reach.along, reach.across) * radius
            bounds.append(tone * 2 * _BESSEL / (2 * np.pi * q) ** 1.5)
        return float(min(bounds))

    def edges_per_mm(self, tones: FloatArray) -> FloatArray:
        """Edge length of one dot over the area of its cell, integrated along the curve."""
        return quadrant.edge_lengths(self._shape, tones, sides=self._sides_mm) / self._dots.cell_mm2

    def smallest_mm(self, tone: float) -> tuple[float, float]:
        """(ink, gap) in mm.

        Ink: the largest disc about the dot's centre that fits into it, by its diameter (of a line,
        its width).  Gap: as long as dots stand apart along a direction, the clear width between
        them there, the smaller of both directions; once they are joined both ways, the largest
        disc about the middle of the hole that fits into it, by its diameter.  Exact for discs,
        squares and lines, else from edge points closer than 1/64 of each smooth stretch.
        """
        if tone <= 0.0:
            return np.inf, np.inf
        if tone >= 1.0:
            return np.inf, np.inf
        reach = quadrant.extent(self.shape, tone)
        half = 0.5 * np.array(self._sides_mm)
        ink = 2.0 * float(np.hypot(*(reach.edge * half).T).min())
        gaps = [
            2.0 * (1.0 - extent) * side
            for extent, side in zip((reach.along, reach.across), half, strict=True)
            if extent < 1.0 - 1e-9
        ]
        gap = min(gaps) if gaps else 2.0 * float(np.hypot(*((1.0 - reach.edge) * half).T).min())
        return ink, float(gap)

    # --- what is inked

    def _slide(self, tones: FloatArray) -> FloatArray:
        """(n, 2): how far the dot's centre is off its lattice place, in cells."""
        return np.outer(0.5 * (1.0 - tones), self._shape.slides)

    def _levels(self, tones: FloatArray) -> FloatArray:
        """Spot function levels of tones (n,), any from 0 to 1.  A whole figure just fills its cell at 1."""
        full, empty = self._shape.levels
        out = np.where(tones <= 0.0, empty + 1.0, full if self._shape.whole else full - 1.0)
        between = (tones > 0.0) & (tones < 1.0)
        if between.any():
            out[between] = quadrant.levels_of(self._shape, tones[between])
        return out

    def _value(self, uv: FloatArray) -> FloatArray:
        """The spot function at dot lattice coordinates (n, 2)."""
        cells = uv / np.array(self._shape.copies) + np.array(self._shape.dot)
        at = 2.0 * (cells - np.round(cells))
        return spot.value(self.shape, at[:, 0], at[:, 1])

    def covers(self, x_mm: FloatArray, y_mm: FloatArray) -> BoolArray:
        """Which points are inked: the spot function against its level, see the class."""
        x, y = np.broadcast_arrays(np.asarray(x_mm, dtype=float), np.asarray(y_mm, dtype=float))
        uv = self._dots.locate(np.stack([x.ravel(), y.ravel()], axis=1))
        if self.tone.constant is not None:
            inked = self._value(uv) > self._levels(np.array([self.tone.constant]))[0]
        else:
            cell = np.round(uv)
            inked = self._value(uv) > self._picture_levels(cell)
            if self._shape.whole is not None:
                inked |= self._reached_from_beside(uv, cell)
        return np.asarray(inked.reshape(x.shape) & self.area.contains(x, y))

    def _picture_levels(self, cell: FloatArray) -> FloatArray:
        """The level (n,) at which the dots of the cells (n, 2) are drawn."""
        steps = self._step_at(cell)
        new = np.unique(steps[np.isnan(self._step_levels[steps])])
        if len(new):
            self._step_levels[new] = self._levels(self._steps.tones(new))
        return self._step_levels[steps]

    def _step_at(self, cell: FloatArray) -> NDArray[np.int32]:
        """The tone step (n,) of the dots at lattice places (n, 2)."""
        xy = self._dots.place(cell)
        return self._steps.nearest(self.tone.at(xy[:, 0], xy[:, 1], size_mm=self.pitch_mm))

    def _reached_from_beside(self, uv: FloatArray, cell: FloatArray) -> BoolArray:
        """Where the whole figure of a neighbouring dot covers the point."""
        figure = self._shape.whole
        assert figure is not None
        out = np.zeros(len(uv), dtype=bool)
        for i in (-1, 0, 1):
            for j in (-1, 0, 1):
                if i or j:
                    beside = cell + np.array([i, j])
                    a, b = 2.0 * np.abs(uv - beside).T
                    level = self._picture_levels(beside)
                    out |= (figure.A * a * a + figure.B * b * b < figure.m(level)) & (level < self._shape.levels[1])
        return out

    # --- what is drawn

    def shapes(self) -> Iterator[Batch]:
        """Stamps for dots inside the area, polygons (in the dots' lattice) for those it cuts."""
        tone = self.tone.constant
        if tone is not None and tone >= 1.0:
            yield whole_area(self.area)
        elif tone is not None and tone > 0.0:
            yield from self._even(tone)
        elif tone is None:
            yield from self._picture()

    def _outlines(self, tones: FloatArray) -> tuple[Outline, ...]:
        """Outlines at tones (n,) above 0."""
        inner = (tones < 1.0) | (self._shape.whole is not None)
        even = self.tone.constant is not None
        contours = iter(of_levels(self._shape, self._levels(tones[inner]), even=even) if inner.any() else ())
        slides = self._slide(tones)
        out = []
        for tone, slide, drawn in zip(tones.tolist(), slides, inner.tolist(), strict=True):
            if not drawn:
                out.append(Outline((full_cell(),), 1.0))
                continue
            contour = next(contours)
            if slide.any():
                contour = Contour(contour.start + slide, contour.bends + slide, contour.straight)
            plain_disc = self.shape == "simpledot"
            out.append(Outline((contour,), tone, disc=float(contour.start[0]) if plain_disc else None))
        return tuple(out)

    def _ring(self, outline: Outline) -> FloatArray:
        """The outline as chords that stay within 0.05 um of it."""
        steps = int(np.ceil(np.pi / 4 * np.sqrt(0.7 * 1000.0 * self.pitch_mm / (8 * 0.05))))
        return outline.contours[0].points(steps=max(steps, 4))

    def _rim(
        self,
        ground: Ground,
        places: NDArray[np.int64],
        outlines: tuple[Outline, ...],
        variety: NDArray[np.int32],
    ) -> Iterator[Batch]:
        """Dots near the area's edge: whole ones as stamps, cut ones as polygons."""
        if not len(places):
            return
        rings = [self._ring(outline) for outline in outlines]
        whole, pieces, _ = ground.cut(ring_polygons(rings, variety, places.astype(float)))
        if whole.any():
            yield _stamps(self._dots, outlines, places[whole], variety[whole])
        if len(pieces):
            cut = polygons(pieces, self._dots)
            if cut.total:
                yield cut

    def _even(self, tone: float) -> Iterator[Batch]:
        outlines = self._outlines(np.array([tone]))
        ground = Ground(self.area, self._dots)
        inside, rim = ground.places(_radius(outlines))
        if len(inside.row):
            yield Stamps(
                self._dots,
                outlines,
                np.stack([inside.first, inside.row], axis=1).astype(np.int32),
                inside.count.astype(np.int32),
                np.zeros(len(inside.row), dtype=np.int32),
            )
        places = rim.places()
        yield from self._rim(ground, places, outlines, np.zeros(len(places), dtype=np.int32))

    def _picture(self) -> Iterator[Batch]:
        drawn = _Drawn(self)
        ground = Ground(self.area, self._dots)
        inside, rim = ground.places(drawn.largest_radius())
        for band in inside.bands(_BATCH):
            places = band.places()
            steps = self._step_at(places.astype(float))
            inked = steps > 0
            outlines, variety = drawn.take(steps[inked])
            if len(variety):
                yield _stamps(self._dots, outlines, places[inked], variety)
        places = rim.places()
        steps = self._step_at(places.astype(float))
        outlines, variety = drawn.take(steps[steps > 0])
        yield from self._rim(ground, places[steps > 0], outlines, variety)


class _Drawn:
    """The outlines of a picture's steps, each made when it is first met."""

    def __init__(self, screen: DotScreen) -> None:
        self._screen = screen
        self._known: dict[int, Outline] = {}

    def largest_radius(self) -> float:
        """Radius in lattice units that holds every outline the picture can need."""
        values = self._screen.tone.values
        assert values is not None
        ends = self._screen._steps.nearest(np.array([float(values.min()), float(values.max())]))
        return _radius(self.take(ends[ends > 0])[0]) if ends.any() else 0.5

    def take(self, steps: NDArray[np.int32]) -> tuple[tuple[Outline, ...], NDArray[np.int32]]:
        """(outlines, variety (n,)) for the steps (n,) of dots, all above 0."""
        screen = self._screen
        present = np.nonzero(np.bincount(steps, minlength=screen._steps.count + 1))[0]
        new = np.array([step for step in present.tolist() if step not in self._known], dtype=np.int64)
        if len(new):
            self._known.update(zip(new.tolist(), screen._outlines(screen._steps.tones(new)), strict=True))
        number = np.zeros(screen._steps.count + 1, dtype=np.int32)
        number[present] = np.arange(len(present))
        return tuple(self._known[step] for step in present.tolist()), number[steps]


def _radius(outlines: tuple[Outline, ...]) -> float:
    """Radius about the lattice place that holds every outline (by their bounds)."""
    bounds = np.abs([outline.bounds() for outline in outlines])
    discs = [outline.disc for outline in outlines if outline.disc is not None]
    if len(discs) == len(outlines):
        return max(discs)
    return float(np.hypot(np.maximum(bounds[:, 0], bounds[:, 2]), np.maximum(bounds[:, 1], bounds[:, 3])).max())


def _stamps(
    lattice: Lattice, outlines: tuple[Outline, ...], places: NDArray[np.int64], variety: NDArray[np.int32]
) -> Stamps:
    """Stamps at places (n, 2), which are sorted along rows: equal neighbours become one run."""
    new = np.ones(len(places), dtype=bool)
    new[1:] = (places[1:, 1] != places[:-1, 1]) | (places[1:, 0] != places[:-1, 0] + 1) | (variety[1:] != variety[:-1])
    start = np.nonzero(new)[0]
    count = np.diff(np.append(start, len(places)))
    return Stamps(
        lattice,
        outlines,
        places[start].astype(np.int32),
        count.astype(np.int32),
        variety[start].astype(np.int32),
    )


_BESSEL = 0.8255
"""sqrt(x) |J1(x)| is never larger (its highest point, near x = 2.17, is 0.82504...)."""


def make(request: ScreenRequest) -> Screen:
    """The dot screen asked for."""
    return DotScreen(request)


def examples() -> list[ScreenRequest]:
    """Screens for the tests that every kind must pass."""
    even = [
        (shape, (0.0, 15.0, 45.0, 67.5)[n % 4], (0.08, 0.3, 0.52, 0.81, 0.93)[n % 5]) for n, shape in enumerate(SHAPES)
    ]
    even += [
        ("simpledot", 15.0, 0.85),
        ("round", 30.0, 0.45),
        ("ellipse", 60.0, 0.45),
        ("diamond", 75.0, 0.6),
    ]
    pictures = [
        ("simpledot", 15.0),
        ("round", 45.0),
        ("ellipse", 60.0),
        ("ellipseb", 0.0),
        ("double", 15.0),
        ("linex", 30.0),
    ]
    return [
        on_panel("dots", shape, ruling_per_mm=3.0 + 0.5 * (n % 3), angle_deg=angle, tone=tone)
        for n, (shape, angle, tone) in enumerate(even)
    ] + [on_panel("dots", shape, ruling_per_mm=4.0, angle_deg=angle, tone=PICTURE) for shape, angle in pictures]
