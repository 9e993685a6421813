"""Finds every beat that could matter, says how strong the rest can be, and how balance moves colour."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from patterngen.beats._balance import Plates, balances
from patterngen.beats._differences import Strengths, product_bound
from patterngen.beats._enumerate import Candidates, Combinations, Tier, Travel, combinations, near_pairs
from patterngen.beats._lattice import modulus_extremes
from patterngen.beats._spectrum import Spectrum
from patterngen.beats._swing import crest_to_trough
from patterngen.beats._tiers import (
    COARSE_PER_MM,
    LISTED_FAR,
    LISTED_NEAR,
    bands,
    least_contrast,
    octave,
    window_mm,
)
from patterngen.beats.together import tones_together
from patterngen.errors import Fault, InputError
from patterngen.model.job import Overprint, Press, SheetSize
from patterngen.model.lattice import FloatArray
from patterngen.model.screen import ComplexArray, Grid, Screen
from patterngen.model.seeing import InkColours, Viewer
from patterngen.model.verdict import Balance, BeatTable, Grade

_FIRST_REACH = {1: 24, 2: 10}
_LAST_REACH = {1: 1536, 2: 80}
_COLOUR_FLOOR = 2e-3
"""Relative amplitude in any of X, Y, Z from which slow beats and balance are looked at."""
_COLOUR_LISTED = 1.0
"""CIEDE2000 from which a slow beat is listed whatever its contrast in luminance."""
_BALANCE_WINDOW_MM = 2.0


@dataclass(frozen=True, slots=True, eq=False)
class _Rows:
    """Tones that occur together: plate and printed (rows, screens), and which rows hold in each octave."""

    plate: FloatArray
    printed: FloatArray
    of_octave: tuple[NDArray[np.intp], ...]


@dataclass(frozen=True, slots=True, eq=False)
class _Hits:
    """Combinations found: orders (h, all axes), positions in each spectrum (h, p), set of screens (h,), F (h, 2)."""

    orders: NDArray[np.int32]
    positions: NDArray[np.intp]
    sets: NDArray[np.int64]
    frequency_per_mm: FloatArray

    def take(self, rows: NDArray[np.intp]) -> _Hits:
        return _Hits(self.orders[rows], self.positions[rows], self.sets[rows], self.frequency_per_mm[rows])


def find_beats(
    *, screens: Sequence[Screen], grids: Sequence[Grid], colours: InkColours, viewer: Viewer,
    sheet: SheetSize, press: Press, overprints: Sequence[Overprint],
) -> tuple[BeatTable, tuple[Balance, ...]]:  # fmt: skip
    """Every listed beat of two or more screens or grids, of any order, and every balance.

    `screens` print (their gain and tones are asked of them), `grids` multiply the print; one
    grid may sample it.  A combination is listed from half the threshold at the reading
    distance or a tenth of the limit at the far one; combinations whose orders lie beyond what
    was worked out are bounded by the decay of the coefficients (they need partners of like
    length to cancel), and the bounds stand in the table.  With a sampling grid every order of
    it has coefficient 1, so only the screens' own decay bounds the rest, and that bound is
    weaker.  A period longer than the sheet's diagonal is balance: one row a group in the
    table, and a `Balance` beside it.  Raises `InputError` when more than one grid samples.
    """
    finder = _Finder(screens, grids, colours, viewer, sheet, press, overprints)
    return finder.run()


class _Finder:
    def __init__(
        self, screens: Sequence[Screen], grids: Sequence[Grid], colours: InkColours, viewer: Viewer,
        sheet: SheetSize, press: Press, overprints: Sequence[Overprint],
    ) -> None:  # fmt: skip
        self.screens, self.grids, self.colours = list(screens), list(grids), colours
        self.viewer, self.sheet, self.press = viewer, sheet, press
        self.combs = [grid for grid in grids if grid.samples]
        if len(self.combs) > 1:
            names = ", ".join(grid.name for grid in self.combs)
            raise InputError(Fault("grid", "kind", f"more than one grid samples the print: {names}", allowed="one"))
        self.rows = self._tone_rows(overprints)
        inks = [screen.ink for screen in screens]
        self.strengths = Strengths(
            colours.primaries(inks), self.rows.printed, yule_nielsen=colours.yule_nielsen
        )
        self.spectra: list[Spectrum] = []
        self.screen_of: list[int] = []
        """For each spectrum the screen it belongs to, -1 for a grid."""
        for i, screen in enumerate(screens):
            axes = len(screen.frequencies_per_mm)
            if axes and ((self.rows.printed[:, i] > 0) & (self.rows.printed[:, i] < 1)).any():
                self.spectra.append(Spectrum.of_screen(screen, self.rows.printed[:, i], reach=_FIRST_REACH[axes]))
                self.screen_of.append(i)
        for grid in grids:
            if not grid.samples and len(grid.frequencies_per_mm):
                reach = _FIRST_REACH[len(grid.frequencies_per_mm)]
                self.spectra.append(Spectrum.of_grid(grid, len(self.rows.plate), reach=reach))
                self.screen_of.append(-1)
        self.slots = tuple(
            [(screen.name, len(screen.frequencies_per_mm)) for screen in screens]
            + [(grid.name, len(grid.frequencies_per_mm)) for grid in grids]
        )
        starts = np.concatenate([[0], np.cumsum([size for _, size in self.slots])])
        self.columns = {name: slice(int(a), int(b)) for (name, _), a, b in zip(self.slots, starts, starts[1:], strict=False)}
        self.width = int(starts[-1])
        self.diagonal_mm = sheet.diagonal_mm

    def _tone_rows(self, overprints: Sequence[Overprint]) -> _Rows:
        last = int(octave(np.array([self.sheet.diagonal_mm]))[0])
        found: list[FloatArray] = []
        for number in range(last + 1):
            rows = tones_together(self.screens, overprints, self.sheet, window_mm=window_mm(number))
            found.append(rows.reshape(-1, len(self.screens)))
        plate, place = np.unique(np.concatenate(found), axis=0, return_inverse=True)
        place = place.ravel()
        if not len(plate):
            plate = np.zeros((1, len(self.screens)))
        ends = np.cumsum([len(rows) for rows in found])
        of_octave = tuple(np.unique(place[end - len(rows) : end]) for rows, end in zip(found, ends, strict=True))
        printed = np.empty_like(plate)
        for i, screen in enumerate(self.screens):
            printed[:, i] = screen.printed_tone(plate[:, i])
        return _Rows(plate, printed, of_octave)

    # --- what there is to find ---------------------------------------------------------------

    def run(self) -> tuple[BeatTable, tuple[Balance, ...]]:
        if len(self.spectra) + len(self.combs) < 2:
            return self._table([], (0.0, 0.0)), ()
        luminance = self._shares((1,))
        any_channel = self._shares((0, 1, 2))
        tiers = bands(self.viewer, start_per_mm=1.0 / self.diagonal_mm, strongest=self._strongest(luminance))
        slow = [Tier(-1.0, COARSE_PER_MM, _COLOUR_FLOOR)]
        self._widen(luminance, tiers)
        found = [self._search(luminance, tiers, comb=None), self._search(any_channel, slow, comb=None)]
        for grid in self.combs:
            found.append(self._search(luminance, tiers, comb=grid))
            found.append(self._search(any_channel, slow, comb=grid))
        bounds = self._bounds(luminance, tiers, [floors for _, floors in found[::2]])
        hits = self._merged([hits for hits, _ in found])
        speed = np.hypot(hits.frequency_per_mm[:, 0], hits.frequency_per_mm[:, 1])
        still = speed < 1.0 / self.diagonal_mm
        table_rows = self._beats(hits.take(np.flatnonzero(~still)))
        balance = self._balances(hits.take(np.flatnonzero(still)))
        return self._table([*table_rows, *[row for row, _ in balance]], bounds), tuple(found for _, found in balance)

    def _shares(self, channels: tuple[int, ...]) -> tuple[float, FloatArray, FloatArray]:
        """(whole, share of each spectrum, contrast of each set of screens) in the given channels."""
        contrasts = self.strengths.contrasts(channels)
        whole, each = product_bound(contrasts)
        return whole, np.array([each[i] if i >= 0 else 1.0 for i in self.screen_of]), contrasts

    def _candidates(self, share: FloatArray) -> list[tuple[Candidates, NDArray[np.intp]]]:
        return [spectrum.candidates(float(s)) for spectrum, s in zip(self.spectra, share, strict=True)]

    def _strongest(self, shares: tuple[float, FloatArray, FloatArray]) -> float:
        """The largest contrast any combination can have."""
        whole, share, _ = shares
        peaks = [max(1.0, float(c.weight.max(initial=0.0))) for c, _ in self._candidates(share)]
        first = sorted((float(c.weight.max(initial=0.0)) for c, _ in self._candidates(share)), reverse=True)
        pair = first[0] * (first[1] if len(first) > 1 and not self.combs else 1.0)
        return whole * pair * float(np.prod([p for p in peaks]))

    def _widen(self, shares: tuple[float, FloatArray, FloatArray], tiers: Sequence[Tier]) -> None:
        """Grow every reach until what lies beyond it cannot be listed, or to the cap."""
        whole, share, _ = shares
        while True:
            lists = [candidates for candidates, _ in self._candidates(share)]
            travel = Travel(lists)
            others = travel.all_but()
            grown = False
            for spectrum, candidates, rest in zip(self.spectra, lists, others, strict=True):
                if spectrum.reach >= _LAST_REACH[spectrum.axes]:
                    continue
                strong = any(
                    whole * _beyond(travel, rest, candidates.unlisted, tier.high_per_mm) >= tier.floor
                    for tier in tiers
                )
                if strong:
                    spectrum.widen(min(spectrum.reach * 2, _LAST_REACH[spectrum.axes]))
                    grown = True
            if not grown:
                return

    def _bounds(
        self, shares: tuple[float, FloatArray, FloatArray], tiers: Sequence[Tier], floors: Sequence[Sequence[float]]
    ) -> tuple[float, float]:
        """Largest visibility (near, far) that anything not listed can have."""
        whole, share, _ = shares
        lists = [candidates for candidates, _ in self._candidates(share)]
        travel = Travel(lists)
        others = travel.all_but()
        near, far = LISTED_NEAR, LISTED_FAR * max(self.viewer.limit, self.viewer.limit_coarse)
        for number, tier in enumerate(tiers):
            beyond = [
                _beyond(travel, rest, c.unlisted, np.inf if self.combs else tier.high_per_mm)
                for c, rest in zip(lists, others, strict=True)
            ]
            left = max(whole * max(beyond, default=0.0), *(f[number] for f in floors))
            if left <= tier.floor * (1.0 + 1e-9):
                continue
            inside = np.geomspace(max(tier.low_per_mm, 1e-9), tier.high_per_mm, 24)
            near = max(near, left * float(self.viewer.sensitivity_near(inside).max()))
            far = max(far, left * float(self.viewer.sensitivity_far(inside).max()))
        return near, far

    def _search(
        self, shares: tuple[float, FloatArray, FloatArray], tiers: Sequence[Tier], *, comb: Grid | None
    ) -> tuple[_Hits, tuple[float, ...]]:
        whole, share, contrasts = shares
        lists = self._candidates(share)
        travel = Travel([c for c, _ in lists])
        scaled = [Tier(t.low_per_mm, t.high_per_mm, t.floor / whole) for t in tiers]
        kept = []
        for (candidates, positions), rest in zip(lists, travel.all_but(), strict=True):
            useful = np.arange(len(positions))
            if comb is None:
                need = travel.need(rest, scaled)
                length = np.hypot(candidates.frequency_per_mm[:, 0], candidates.frequency_per_mm[:, 1])
                useful = np.flatnonzero(candidates.weight * travel.at(need, length) >= 1.0)
            kept.append(
                (
                    Candidates(
                        candidates.orders[useful], candidates.frequency_per_mm[useful],
                        candidates.weight[useful], np.zeros((0, 2)),
                    ),
                    positions[useful],
                )
            )  # fmt: skip
        vectors = None if comb is None else _plane(comb.frequencies_per_mm)
        found = combinations([c for c, _ in kept], scaled, comb=vectors)
        hits = self._hits(found, kept, comb)
        # the product bound may be above the true strength of a set: the true one decides
        product = found.weight / np.where(found.choice >= 0, share[None, :], 1.0).prod(axis=1)
        floor = min(scaled, key=lambda t: t.floor).floor * whole
        true = product * contrasts[hits.sets]
        return hits.take(np.flatnonzero(true >= floor)), tuple(f * whole for f in found.floors)

    def _hits(
        self, found: Combinations, lists: Sequence[tuple[Candidates, NDArray[np.intp]]], comb: Grid | None
    ) -> _Hits:
        count = len(found.choice)
        orders = np.zeros((count, self.width), dtype=np.int32)
        positions = np.empty((count, len(self.spectra)), dtype=np.intp)
        sets = np.zeros(count, dtype=np.int64)
        for p, (spectrum, (candidates, flat)) in enumerate(zip(self.spectra, lists, strict=True)):
            part = np.flatnonzero(found.choice[:, p] >= 0)
            row = found.choice[part, p]
            orders[part, self.columns[spectrum.name]] = candidates.orders[row]
            positions[:, p] = spectrum.nothing
            positions[part, p] = flat[row]
            if self.screen_of[p] >= 0:
                sets[part] |= 1 << self.screen_of[p]
        if comb is not None and found.comb_order is not None:
            columns = self.columns[comb.name]
            orders[:, columns] = found.comb_order[:, : columns.stop - columns.start]
        return _Hits(orders, positions, sets, found.frequency_per_mm)

    def _merged(self, found: Sequence[_Hits]) -> _Hits:
        """All hits once, k and -k being one, turned so that the frequency points up (or right)."""
        orders = np.concatenate([hits.orders for hits in found])
        positions = np.concatenate([hits.positions for hits in found])
        frequency = np.concatenate([hits.frequency_per_mm for hits in found])
        sets = np.concatenate([hits.sets for hits in found])
        small = 1e-9
        down = (frequency[:, 1] < -small) | ((np.abs(frequency[:, 1]) <= small) & (frequency[:, 0] < -small))
        still = np.hypot(frequency[:, 0], frequency[:, 1]) <= small
        if len(orders):
            lead = orders[np.arange(len(orders)), np.argmax(orders != 0, axis=1)]
            down = np.where(still, lead < 0, down)
        sign = np.where(down, -1, 1)
        orders = orders * sign[:, None].astype(np.int32)
        for p, spectrum in enumerate(self.spectra):
            # the box of orders is symmetric: -k stands mirrored about the middle
            positions[:, p] = np.where(sign < 0, 2 * spectrum.nothing - positions[:, p], positions[:, p])
        key = np.ascontiguousarray(orders).view(np.dtype((np.void, orders.dtype.itemsize * max(self.width, 1))))
        _, first = np.unique(key.ravel(), return_index=True)
        first = np.sort(first)
        return _Hits(orders[first], positions[first], sets[first], (frequency * sign[:, None])[first])

    # --- how strong it is ----------------------------------------------------------------------

    def contrasts(self, hits: _Hits, row: int) -> FloatArray:
        """Contrast (h,) of each hit in one row of tones."""
        product = np.ones(len(hits.sets))
        for p, spectrum in enumerate(self.spectra):
            product *= spectrum.at_row(row)[1][hits.positions[:, p]]
        strength = np.abs(self.strengths.at(row, hits.sets)[:, 1])
        return np.asarray(2.0 * product * strength / max(float(self.strengths.mean[row, 1]), 1e-12))

    def amplitudes(self, hits: _Hits, row: int) -> ComplexArray:
        """XYZ amplitude (h, 3) of each hit in one row of tones, without what grids transfer."""
        product = np.ones(len(hits.sets), dtype=complex)
        for p, spectrum in enumerate(self.spectra):
            product *= spectrum.at_row(row)[0][hits.positions[:, p]]
        return np.asarray(product[:, None] * self.strengths.at(row, hits.sets))

    def transfer(self, frequency_per_mm: FloatArray) -> FloatArray:
        """(n,) what all grids let through."""
        out = np.ones(len(frequency_per_mm))
        for grid in self.grids:
            out = out * np.abs(grid.transfer(frequency_per_mm))
        return out

    def _beats(self, hits: _Hits) -> list[_Row]:
        if not len(hits.sets):
            return []
        group, count = _grouped(hits.frequency_per_mm, tolerance_per_mm=0.1 / self.diagonal_mm)
        transfer = self.transfer(hits.frequency_per_mm)
        speed = np.hypot(hits.frequency_per_mm[:, 0], hits.frequency_per_mm[:, 1])
        slowest = np.full(count, np.inf)
        np.minimum.at(slowest, group, speed)
        numbers = octave(1.0 / slowest).astype(int)
        best, best_row = np.zeros(count), np.full(count, -1, dtype=np.intp)
        for row in range(len(self.rows.plate)):
            holds = np.array([row in rows for rows in map(set, self.rows.of_octave)])
            allowed = holds[np.minimum(numbers, len(holds) - 1)]
            if not allowed.any():
                continue
            contrast = self.contrasts(hits, row) * transfer
            joined = np.sqrt(np.bincount(group, contrast**2, minlength=count))
            better = allowed & (joined > best)
            best[better], best_row[better] = joined[better], row
        listed = best >= 0.999 * least_contrast(self.viewer, np.maximum(slowest, 1e-9))
        coloured = (slowest <= COARSE_PER_MM) & (best_row >= 0)
        chosen = np.flatnonzero((listed & (best_row >= 0)) | coloured)
        if not len(chosen):
            return []
        members = np.flatnonzero(np.isin(group, chosen))
        members = members[np.argsort(group[members], kind="stable")]
        part = hits.take(members)
        number = np.searchsorted(chosen, group[members])
        amplitude = np.zeros((len(members), 3), dtype=complex)
        for row in np.unique(best_row[chosen]):
            rows = np.flatnonzero(best_row[chosen][number] == row)
            amplitude[rows] = self.amplitudes(part.take(rows), int(row))
        amplitude *= transfer[members][:, None]
        mean = self.strengths.mean[best_row[chosen]]
        modulus = np.abs(amplitude)
        power = np.sqrt(np.stack([np.bincount(number, modulus[:, c] ** 2, minlength=len(chosen)) for c in range(3)], axis=1))
        starts = np.searchsorted(number, np.arange(len(chosen) + 1))
        by_strength = np.lexsort((-modulus[:, 1], number))
        strongest = by_strength[starts[:-1]]
        relative = amplitude[:, 1] * (2.0 / np.maximum(mean[number, 1], 1e-12))
        swing = np.full(len(chosen), np.nan)
        long = np.flatnonzero(slowest[chosen] <= COARSE_PER_MM)
        if len(long):
            # all three channels of one component share a phase: it is a real colour, up to that phase
            head = amplitude[strongest[long]]
            phase = head[np.arange(len(long)), np.argmax(np.abs(head), axis=1)]
            direction = np.sign((head * np.conj(phase)[:, None]).real)
            swing[long] = crest_to_trough(self.colours, mean[long], direction * power[long])
        keep = np.flatnonzero(listed[chosen] | (np.nan_to_num(swing) >= _COLOUR_LISTED))
        ranges = [slice(int(starts[g]), int(starts[g + 1])) for g in keep]
        extremes = modulus_extremes([relative[r] for r in ranges], [part.orders[r] for r in ranges])
        out = []
        for g, ends in zip(keep, extremes, strict=True):
            head_row = strongest[g]
            out.append(
                _Row(
                    part.orders[head_row], part.frequency_per_mm[head_row], amplitude[head_row], power[g], mean[g],
                    float(ends[0]), float(ends[1]), int(starts[g + 1] - starts[g]),
                    self.rows.plate[best_row[chosen[g]]], float(swing[g]),
                )
            )  # fmt: skip
        return out

    def _balances(self, hits: _Hits) -> list[tuple[_Row, Balance]]:
        if not len(hits.sets):
            return []
        number = min(int(octave(np.array([_BALANCE_WINDOW_MM]))[0]), len(self.rows.of_octave) - 1)
        plates = Plates.of(self.screens, self.grids, self.columns, self.press)
        found = balances(
            hits=hits, evaluate=self.amplitudes, spectra=self.spectra, screen_of=self.screen_of,
            columns=self.columns, slots=self.slots, tone_rows=self.rows.of_octave[number],
            mean=self.strengths.mean, plate_tones=self.rows.plate, screens=self.screens,
            colours=self.colours, plates=plates, slowest_per_mm=1.0 / self.diagonal_mm,
            make_hits=_Hits,
        )  # fmt: skip
        out = []
        for item in found:
            relative = item.amplitude[:, 1] * (2.0 / max(float(item.mean[1]), 1e-12))
            ends = modulus_extremes([relative], [item.orders])[0]
            head = int(np.argmax(np.abs(item.amplitude[:, 1])))
            row = _Row(
                item.orders[head], item.frequency_per_mm[head], item.amplitude[head],
                np.sqrt((np.abs(item.amplitude) ** 2).sum(axis=0)), item.mean, float(ends[0]), float(ends[1]),
                len(item.orders), item.tones, item.balance.colour_swing,
            )  # fmt: skip
            out.append((row, item.balance))
        return out

    # --- the table -----------------------------------------------------------------------------

    def _table(self, rows: Sequence[_Row], bounds: tuple[float, float]) -> BeatTable:
        n = len(rows)
        frequency = np.array([row.frequency_per_mm for row in rows]).reshape(n, 2)
        speed = np.hypot(frequency[:, 0], frequency[:, 1])
        mean = np.array([row.mean for row in rows]).reshape(n, 3)
        power = np.array([row.power for row in rows]).reshape(n, 3)
        contrast = 2.0 * power[:, 1] / np.maximum(mean[:, 1], 1e-12)
        near, far = self.viewer.sensitivity_near(speed), self.viewer.sensitivity_far(speed)
        with np.errstate(divide="ignore", over="ignore"):
            threshold = 1.0 / near
        visibility, visibility_far = contrast * near, contrast * far
        order = np.lexsort((-visibility, -visibility_far))
        limits = self.viewer.limit_at(speed)
        grades: list[Grade] = []
        for i in order:
            if visibility_far[i] >= limits[i]:
                grades.append("visible")
            elif visibility[i] < 1.0 and visibility_far[i] < 1.0:
                grades.append("unseen")
            else:
                grades.append("texture")
        return BeatTable(
            slots=self.slots,
            orders=np.array([row.orders for row in rows], dtype=np.int32).reshape(n, self.width)[order],
            frequency_per_mm=frequency[order],
            amplitude=np.array([row.amplitude for row in rows], dtype=complex).reshape(n, 3)[order],
            power=power[order],
            mean=mean[order],
            contrast=contrast[order],
            contrast_min=np.array([row.contrast_min for row in rows])[order],
            contrast_max=np.array([row.contrast_max for row in rows])[order],
            threshold=threshold[order],
            visibility=visibility[order],
            visibility_far=visibility_far[order],
            components=np.array([row.components for row in rows], dtype=np.int32)[order],
            tones=np.array([row.tones for row in rows]).reshape(n, len(self.screens))[order],
            colour_swing=np.array([row.colour_swing for row in rows], dtype=float)[order],
            grade=tuple(grades),
            bound_visibility=bounds[0],
            bound_visibility_far=bounds[1],
        )


@dataclass(frozen=True, slots=True, eq=False)
class _Row:
    """One row of the table before it is sorted in."""

    orders: NDArray[np.int32]
    frequency_per_mm: FloatArray
    amplitude: ComplexArray
    power: FloatArray
    mean: FloatArray
    contrast_min: float
    contrast_max: float
    components: int
    tones: FloatArray
    colour_swing: float


def _beyond(travel: Travel, rest: FloatArray, unlisted: FloatArray, high_per_mm: float) -> float:
    """The largest weight of a combination with an order beyond the reach, that cancels to `high_per_mm`."""
    return float((unlisted[:, 1] * travel.at(rest, unlisted[:, 0] - high_per_mm)).max())


def _plane(frequencies_per_mm: FloatArray) -> FloatArray:
    """Two frequency vectors of a comb; a comb of lines gets a second one far beyond any beat."""
    if len(frequencies_per_mm) == 2:
        return np.asarray(frequencies_per_mm, dtype=float)
    x, y = frequencies_per_mm[0]
    return np.array([[x, y], [-1e6 * y, 1e6 * x]])


def _grouped(frequency_per_mm: FloatArray, *, tolerance_per_mm: float) -> tuple[NDArray[np.intp], int]:
    """Group number (n,) of each frequency, and how many groups: closer than the tolerance is one, F and -F alike.

    Frequencies must point up (or right).
    """
    cell = tolerance_per_mm / np.sqrt(2.0)
    keys = np.floor(frequency_per_mm / cell).astype(np.int64)
    _, first, inverse = np.unique(keys, axis=0, return_index=True, return_inverse=True)
    inverse = inverse.ravel()
    heads = frequency_per_mm[first]
    both = np.concatenate([heads, -heads])
    a, b = near_pairs(heads, both, radius=tolerance_per_mm)
    b = b % len(heads)
    label = np.arange(len(heads))
    while True:
        lower = label.copy()
        np.minimum.at(lower, a, label[b])
        np.minimum.at(lower, b, label[a])
        if (lower == label).all():
            break
        label = lower
    _, number = np.unique(label, return_inverse=True)
    number = number.ravel()
    return number[inverse], int(number.max()) + 1
