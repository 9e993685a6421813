"""Screens and grids on top of each other: what takes part, at which tones, and how strongly."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from patterngen.beats._differences import Shares, Strengths
from patterngen.beats._enumerate import IndexArray, OrderArray
from patterngen.beats._lattice import distinct_rows
from patterngen.beats._spectrum import Spectrum
from patterngen.beats._tiers import octave, window_mm
from patterngen.beats.together import Together, TonesTogether
from patterngen.errors import Fault, InputError
from patterngen.model.area import BoolArray
from patterngen.model.job import Overprint, SheetSize
from patterngen.model.lattice import FloatArray
from patterngen.model.screen import ComplexArray, Grid, Screen
from patterngen.model.seeing import InkColours

SetArray = NDArray[np.int64]

_UP = 1e-9
"""Frequencies (cycles/mm) this near to the axis count as on it when k and -k are told apart."""

_LEAST = 1e-12
"""A mean below this is taken for it: contrast on perfect black has no meaning."""


@dataclass(frozen=True, slots=True, eq=False)
class ToneRows:
    """Tones that occur together: (rows, screens) on the plate and in print; which rows hold in each octave.

    `taking_part` (rows, screens): a screen that only cuts into the place averages and takes no part.
    """

    plate: FloatArray
    printed: FloatArray
    taking_part: BoolArray
    of_octave: tuple[IndexArray, ...]

    @classmethod
    def blank(cls, screens: int) -> ToneRows:
        """One row in which nothing prints."""
        nothing = np.zeros((1, screens))
        return cls(nothing, nothing, nothing > 0, (np.zeros(1, dtype=np.intp),))

    @classmethod
    def of(cls, screens: Sequence[Screen], overprints: Sequence[Overprint], sheet: SheetSize) -> ToneRows:
        """The rows of all octaves of windows up to the sheet's diagonal."""
        last = int(octave(np.array([sheet.diagonal_mm]))[0])
        together = Together(screens, overprints, sheet)
        found = [together.rows(window_mm=window_mm(number)) for number in range(last + 1)]
        rows = TonesTogether.joined(found)
        columns = np.concatenate([rows.plate, rows.share, rows.taking_part], axis=1)
        _, first, place = np.unique(columns, axis=0, return_index=True, return_inverse=True)
        place = place.ravel()
        ends = np.cumsum([len(part.plate) for part in found])
        of_octave = tuple(np.unique(place[end - len(part.plate) : end]) for part, end in zip(found, ends, strict=True))
        rows = rows.take(first)
        printed = np.empty_like(rows.plate)
        for i, screen in enumerate(screens):
            printed[:, i] = screen.printed_tone(rows.plate[:, i])
        return cls(rows.plate * rows.share, printed * rows.share, rows.taking_part, of_octave)

    def hold(self, row: int, octaves: NDArray[np.intp]) -> BoolArray:
        """Whether the row's tones hold over windows of each octave (n,)."""
        holds = np.array([bool((rows == row).any()) for rows in self.of_octave])
        return np.asarray(holds[np.minimum(octaves, len(holds) - 1)])


@dataclass(frozen=True, slots=True, eq=False)
class Hits:
    """Combinations: `orders` (h, all axes), `positions` (h, spectra), `sets` (h,) of screens as bits, F (h, 2)."""

    orders: OrderArray
    positions: IndexArray
    sets: SetArray
    frequency_per_mm: FloatArray

    def __len__(self) -> int:
        return len(self.sets)

    def take(self, rows: IndexArray | BoolArray) -> Hits:
        """Some of them."""
        return Hits(self.orders[rows], self.positions[rows], self.sets[rows], self.frequency_per_mm[rows])

    @staticmethod
    def joined(parts: Sequence[Hits]) -> Hits:
        """All of several."""
        return Hits(
            np.concatenate([part.orders for part in parts]),
            np.concatenate([part.positions for part in parts]),
            np.concatenate([part.sets for part in parts]),
            np.concatenate([part.frequency_per_mm for part in parts]),
        )


class Superposition:
    """Everything that stays the same while beats are looked for and weighed.

    `slots` and `columns` say where in an order vector each screen and grid has its orders
    (screens first); `spectra` are those that can take part with coefficients of their own,
    `screen_of` the number of the screen a spectrum belongs to (-1 for a grid), `combs` the
    grids that sample.
    """

    def __init__(
        self, screens: Sequence[Screen], grids: Sequence[Grid], colours: InkColours, rows: ToneRows, *,
        shadow: float = 0.0,
    ) -> None:  # fmt: skip
        self.screens, self.grids, self.colours, self.rows = tuple(screens), tuple(grids), colours, rows
        self._shadow = shadow
        self.combs = tuple(grid for grid in grids if grid.samples)
        if len(self.combs) > 1:
            names = ", ".join(grid.name for grid in self.combs)
            raise InputError(Fault("grid", "kind", "more than one grid samples the print", value=names, allowed="one"))
        parts: tuple[Screen | Grid, ...] = (*screens, *grids)
        self.slots = tuple((part.name, len(part.frequencies_per_mm)) for part in parts)
        ends = np.cumsum([size for _, size in self.slots], dtype=int)
        self.columns: Mapping[str, slice] = {
            name: slice(int(end) - size, int(end)) for (name, size), end in zip(self.slots, ends, strict=True)
        }
        self.width = int(ends[-1]) if len(ends) else 0
        self._taking_part = [
            i
            for i, screen in enumerate(screens)
            if len(screen.frequencies_per_mm)
            and ((rows.printed[:, i] > 0) & (rows.printed[:, i] < 1) & rows.taking_part[:, i]).any()
        ]
        self._meshes = [grid for grid in grids if not grid.samples and len(grid.frequencies_per_mm)]

    @property
    def participants(self) -> int:
        """How many screens and grids can take part in a beat."""
        return len(self._taking_part) + len(self._meshes) + len(self.combs)

    @cached_property
    def screen_of(self) -> tuple[int, ...]:
        """For each spectrum the number of its screen, -1 for a grid."""
        return (*self._taking_part, *[-1] * len(self._meshes))

    @cached_property
    def spectra(self) -> tuple[Spectrum, ...]:
        """The spectra of all that take part, worked out to a first reach."""
        printed = self.rows.printed
        screens = [Spectrum.of_screen(self.screens[i], printed[:, i]) for i in self._taking_part]
        return (*screens, *[Spectrum.of_grid(grid, len(printed)) for grid in self._meshes])

    @cached_property
    def casts(self) -> tuple[BoolArray, ...]:
        """The largest sets of spectra (spectra,) that take part in one place; grids are everywhere."""
        printed = self.rows.printed
        screened = (printed > 0) & (printed < 1) & self.rows.taking_part
        plays = np.stack(
            [screened[:, i] if i >= 0 else np.ones(len(printed), dtype=bool) for i in self.screen_of], axis=1
        )
        kept: list[BoolArray] = []
        for cast in sorted(np.unique(plays, axis=0), key=lambda c: -int(c.sum())):
            if not any((cast <= other).all() for other in kept):
                kept.append(cast)
        return tuple(kept)

    @cached_property
    def strengths(self) -> Strengths:
        """Averages and mixed differences of the primaries in every row of tones."""
        primaries = self.colours.primaries([screen.ink for screen in self.screens])
        return Strengths(
            primaries, self.rows.printed, yule_nielsen=self.colours.yule_nielsen, taking_part=self.rows.taking_part
        )

    @property
    def mean(self) -> FloatArray:
        """(rows, 3) mean XYZ."""
        return self.strengths.mean

    @cached_property
    def weight(self) -> FloatArray:
        """(rows,) how much a pattern counts when it is judged: less in proportion where the mean is a shadow."""
        if self._shadow <= 0.0:
            return np.ones(len(self.mean))
        paper_y = float(np.ravel(self.colours.primaries(()))[1])
        return np.minimum(1.0, self.mean[:, 1] / (self._shadow * paper_y))

    def shares(self, channels: tuple[int, ...]) -> Shares:
        """How much of the contrast in these channels of XYZ each *spectrum* can bring, row by row."""
        of_screens = self.strengths.shares(channels)
        one = np.ones(len(self.rows.plate))
        each = [of_screens.each[:, i] if i >= 0 else one for i in self.screen_of]
        return Shares(of_screens.whole, np.stack(each, axis=1) if each else one[:, None][:, :0], of_screens.largest)

    def hits(self, orders: OrderArray, frequency_per_mm: FloatArray) -> Hits:
        """Order vectors (h, all axes) as hits; all must lie within the reach of the spectra."""
        positions = np.empty((len(orders), len(self.spectra)), dtype=np.intp)
        sets = np.zeros(len(orders), dtype=np.int64)
        for p, spectrum in enumerate(self.spectra):
            part = orders[:, self.columns[spectrum.name]]
            positions[:, p] = spectrum.positions(part)
            if self.screen_of[p] >= 0:
                sets |= np.where(part.any(axis=1), 1 << self.screen_of[p], 0)
        return Hits(orders, positions, sets, frequency_per_mm)

    def upright(self, hits: Hits) -> Hits:
        """Each once (k and -k are one), turned so that its frequency points up, or right."""
        fx, fy = hits.frequency_per_mm[:, 0], hits.frequency_per_mm[:, 1]
        down = (fy < -_UP) | ((np.abs(fy) <= _UP) & (fx < -_UP))
        still = np.hypot(fx, fy) <= _UP
        if len(hits):
            lead = hits.orders[np.arange(len(hits)), np.argmax(hits.orders != 0, axis=1)]
            down = np.where(still, lead < 0, down)
        sign = np.where(down, -1, 1).astype(np.int32)
        orders = hits.orders * sign[:, None]
        rows = distinct_rows(orders)
        return self.hits(orders[rows], hits.frequency_per_mm[rows] * sign[rows, None])

    def within_reach(self, orders: OrderArray) -> BoolArray:
        """Which order vectors (h, all axes) the spectra reach."""
        fits = np.ones(len(orders), dtype=bool)
        for spectrum in self.spectra:
            fits &= (np.abs(orders[:, self.columns[spectrum.name]]) <= spectrum.reach).all(axis=1)
        return fits

    def taking_part(self, orders: OrderArray) -> BoolArray:
        """(h, slots): which screens and grids have an order that is not zero."""
        return np.stack([orders[:, self.columns[name]].any(axis=1) for name, _ in self.slots], axis=1)

    def contrasts(self, hits: Hits, row: int, *, channels: tuple[int, ...] = (1,)) -> FloatArray:
        """Contrast (h,) in one row of tones, the largest of the channels of XYZ, before what grids let through."""
        product = np.ones(len(hits))
        for p, spectrum in enumerate(self.spectra):
            product *= spectrum.moduli(row)[hits.positions[:, p]]
        strength = np.abs(self.strengths.at(row, hits.sets)[:, channels])
        return np.asarray(2.0 * product * (strength / np.maximum(self.mean[row, channels], _LEAST)).max(axis=1))

    def amplitudes(self, hits: Hits, row: int) -> ComplexArray:
        """XYZ amplitude (h, 3) in one row of tones, with what grids let through."""
        product = self.transfer(hits.frequency_per_mm).astype(complex)
        for p, spectrum in enumerate(self.spectra):
            product *= spectrum.coefficients(row)[hits.positions[:, p]]
        return np.asarray(product[:, None] * self.strengths.at(row, hits.sets))

    def transfer(self, frequency_per_mm: FloatArray) -> FloatArray:
        """(n,) what all grids let through at frequencies (n, 2)."""
        out = np.ones(len(frequency_per_mm))
        for grid in self.grids:
            out = out * np.asarray(grid.transfer(frequency_per_mm))
        return out


def michelson(amplitude_y: FloatArray, mean_y: FloatArray) -> FloatArray:
    """Contrast 2 |A| / mean."""
    return np.asarray(2.0 * np.abs(amplitude_y) / np.maximum(mean_y, _LEAST))
