"""Components that fall on one frequency are one beat."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from patterngen.beats._enumerate import IndexArray, OrderArray, near_pairs
from patterngen.beats._lattice import coordinates, free_phases, modulus_extremes
from patterngen.beats._superposition import Hits, Superposition, michelson
from patterngen.beats._swing import PhaseMean, crest_to_trough
from patterngen.beats._tiers import COARSE_PER_MM, least_contrast, octave
from patterngen.model.lattice import FloatArray
from patterngen.model.screen import ComplexArray
from patterngen.model.seeing import Viewer

_COLOUR_LISTED = 1.0
"""CIEDE2000 from crest to trough from which a slow beat is listed whatever its contrast in luminance."""

_WIDENED_FROM, _WIDENED_SETS, _WIDENED_PARTS = 0.4, 12, 200
"""From which CIEDE2000 a slow beat is looked at with its partners, for how many sets, with how many components."""

_NEGLIGIBLE = 0.01
"""Components below this part of the strongest are left out of the extremes over register."""


@dataclass(frozen=True, slots=True, eq=False)
class JoinedBeats:
    """Beats as columns (n rows), not sorted: the fields of `BeatTable` that do not need the eye."""

    orders: OrderArray
    frequency_per_mm: FloatArray
    amplitude: ComplexArray
    power: FloatArray
    mean: FloatArray
    contrast_min: FloatArray
    contrast_max: FloatArray
    components: NDArray[np.int32]
    tones: FloatArray
    colour_swing: FloatArray
    contrast_judged: FloatArray
    colour_swing_judged: FloatArray

    @classmethod
    def none(cls, over: Superposition) -> JoinedBeats:
        """No beat at all."""
        return cls(
            np.zeros((0, over.width), dtype=np.int32), np.zeros((0, 2)), np.zeros((0, 3), dtype=complex),
            np.zeros((0, 3)), np.zeros((0, 3)), np.zeros(0), np.zeros(0), np.zeros(0, dtype=np.int32),
            np.zeros((0, len(over.screens))), np.zeros(0), np.zeros(0), np.zeros(0),
        )  # fmt: skip

    def with_more(self, other: JoinedBeats) -> JoinedBeats:
        """Both, one below the other."""
        return JoinedBeats(
            *(np.concatenate([getattr(self, name), getattr(other, name)]) for name in self.__dataclass_fields__)
        )


def join(over: Superposition, hits: Hits, viewer: Viewer, *, tolerance_per_mm: float) -> JoinedBeats:
    """Hits that are one within the tolerance joined, each at the tones where it is strongest, weak ones left out.

    Contrast is the root of the sum of squares over components (their phases are register);
    its extremes are those of the sum with phases.
    """
    if not len(hits):
        return JoinedBeats.none(over)
    group, count = _groups(hits.frequency_per_mm, tolerance_per_mm=tolerance_per_mm)
    speed = np.hypot(hits.frequency_per_mm[:, 0], hits.frequency_per_mm[:, 1])
    slowest = np.full(count, np.inf)
    np.minimum.at(slowest, group, speed)
    worst = _worst_rows(over, hits, group, octave(1.0 / slowest).astype(np.intp))
    row_of = worst.row
    coarse = slowest <= COARSE_PER_MM
    listed = worst.contrast >= least_contrast(viewer, slowest) * (1.0 - 1e-9)
    chosen = np.flatnonzero((row_of >= 0) & (listed | coarse))
    if not len(chosen):
        return JoinedBeats.none(over)

    members = np.flatnonzero(np.isin(group, chosen))
    members = members[np.argsort(group[members], kind="stable")]
    part = hits.take(members)
    number = np.searchsorted(chosen, group[members])
    starts = np.searchsorted(number, np.arange(len(chosen) + 1))
    rows = row_of[chosen]
    amplitude = _amplitudes(over, part, rows[number])
    orders, frequency = _aligned(part, amplitude, starts, number)
    mean = over.mean[rows]
    power = _power(amplitude, starts)
    strongest = np.lexsort((-np.abs(amplitude[:, 1]), number))[starts[:-1]]
    long = np.flatnonzero(coarse[chosen])
    slow = hits.take(speed <= COARSE_PER_MM)
    swing = _swing(over, mean, amplitude[strongest], power, long)
    _widened(over, swing, orders[strongest], rows, long, slow)
    # the tones at which it is judged may be others: a picture's shadows show most and count least
    judged_rows = worst.judged_row[chosen]
    swing_judged = swing * over.weight[rows]
    if (judged_rows != rows)[long].any():
        there = _amplitudes(over, part, judged_rows[number])
        swing_there = _swing(over, over.mean[judged_rows], there[strongest], _power(there, starts), long)
        _widened(over, swing_there, orders[strongest], judged_rows, long, slow)
        swing_judged = np.fmax(swing_judged, swing_there * over.weight[judged_rows])

    kept = np.flatnonzero(listed[chosen] | (np.nan_to_num(swing) >= _COLOUR_LISTED))
    contrasts = (amplitude[:, 1] * michelson(np.ones(len(number)), mean[number, 1])).astype(complex)
    pieces = [slice(int(starts[g]), int(starts[g + 1])) for g in kept]
    told = [np.abs(contrasts[p]) >= _NEGLIGIBLE * np.abs(contrasts[p]).max() for p in pieces]
    extremes = modulus_extremes(
        [contrasts[p][t] for p, t in zip(pieces, told, strict=True)],
        [orders[p][t] for p, t in zip(pieces, told, strict=True)],
    )
    head = strongest[kept]
    return JoinedBeats(
        orders[head], frequency[head], amplitude[head], power[kept], mean[kept], extremes[:, 0], extremes[:, 1],
        np.diff(starts)[kept].astype(np.int32), over.rows.plate[rows[kept]], swing[kept],
        worst.judged[chosen][kept], swing_judged[kept],
    )  # fmt: skip


@dataclass(frozen=True, slots=True, eq=False)
class _Worst:
    """Per group: the row of tones where it is strongest (-1: none) with its contrast, and where it counts most."""

    row: IndexArray
    contrast: FloatArray
    judged_row: IndexArray
    judged: FloatArray


def _worst_rows(over: Superposition, hits: Hits, group: IndexArray, octaves: IndexArray) -> _Worst:
    """The rows of tones, among those that hold over the beat's period, where each group is strongest."""
    count = len(octaves)
    transfer = over.transfer(hits.frequency_per_mm)
    best = _Worst(
        np.full(count, -1, dtype=np.intp), np.zeros(count), np.full(count, -1, dtype=np.intp), np.zeros(count)
    )
    for row in range(len(over.rows.plate)):
        allowed = over.rows.hold(row, octaves)
        here = np.flatnonzero(allowed[group])
        strength = over.contrasts(hits.take(here), row) * transfer[here]
        joined = np.sqrt(np.bincount(group[here], strength**2, minlength=count))
        for rows, values, now in (
            (best.row, best.contrast, joined),
            (best.judged_row, best.judged, joined * over.weight[row]),
        ):
            better = allowed & ((now > values) | (rows < 0))
            values[better], rows[better] = now[better], row
    return best


def _amplitudes(over: Superposition, part: Hits, rows: IndexArray) -> ComplexArray:
    """XYZ amplitudes (n, 3) of hits (n), each at its own row of tones (n,)."""
    amplitude = np.zeros((len(rows), 3), dtype=complex)
    for row in np.unique(rows):
        here = np.flatnonzero(rows == row)
        amplitude[here] = over.amplitudes(part.take(here), int(row))
    return amplitude


def _power(amplitude: ComplexArray, starts: IndexArray) -> FloatArray:
    """Root of the sum of squares over each group's components (groups, 3)."""
    return np.sqrt(np.add.reduceat(np.abs(amplitude) ** 2, starts[:-1], axis=0))


def _swing(
    over: Superposition, mean: FloatArray, strongest: ComplexArray, power: FloatArray, long: IndexArray
) -> FloatArray:
    """CIEDE2000 (groups,) from crest to trough of the groups `long`, NaN for the others."""
    swing = np.full(len(mean), np.nan)
    swing[long] = crest_to_trough(over.colours, mean[long], _real(strongest[long]) * power[long])
    return swing


def _widened(
    over: Superposition, swing: FloatArray, orders: OrderArray, rows: IndexArray, long: IndexArray, slow: Hits
) -> None:
    """Raise `swing` in place to what all slow combinations of the same participants make together.

    Across the sheet, and with register, they run through all their phases: crossed partners and
    harmonics move the same colour.  Worked out where it can matter, for the strongest sets.
    """
    taking = over.taking_part(orders)
    of_slow = over.taking_part(slow.orders)
    done: set[bytes] = set()
    for g in sorted(long.tolist(), key=lambda g: -swing[g]):
        if swing[g] < _WIDENED_FROM or len(done) >= _WIDENED_SETS:
            break
        members = taking[g]
        if members.tobytes() in done:
            continue
        done.add(members.tobytes())
        inside = slow.take(~(of_slow & ~members).any(axis=1))
        amplitude = over.amplitudes(inside, int(rows[g]))
        strongest = np.sort(np.argsort(-np.abs(amplitude).max(axis=1), kind="stable")[:_WIDENED_PARTS])
        inside, amplitude = inside.take(strongest), amplitude[strongest]
        turns, _ = coordinates(free_phases(inside.orders), inside.orders)
        model = PhaseMean(over.mean[rows[g]], amplitude, turns, yule_nielsen=over.colours.yule_nielsen)
        wide = model.widest_pair(over.colours, *model.spread(), refine=True)[2]
        alike = long[(taking[long] == members).all(axis=1)]
        # a weaker beat of the same screens is part of the same shading
        swing[alike] = np.maximum(swing[alike], np.where(swing[alike] >= _WIDENED_FROM, wide, swing[alike]))


def _aligned(
    part: Hits, amplitude: ComplexArray, starts: IndexArray, number: IndexArray
) -> tuple[OrderArray, FloatArray]:
    """Orders and frequencies, those that point against their group's first turned round (amplitudes in place)."""
    heads = part.frequency_per_mm[starts[:-1]][number]
    against = (part.frequency_per_mm * heads).sum(axis=1) < 0
    amplitude[against] = np.conj(amplitude[against])
    sign = np.where(against, -1, 1)
    return part.orders * sign[:, None].astype(np.int32), part.frequency_per_mm * sign[:, None]


def _real(amplitude: ComplexArray) -> FloatArray:
    """Signs (n, 3): the channels of one component share a phase, so up to it they are real."""
    lead = amplitude[np.arange(len(amplitude)), np.argmax(np.abs(amplitude), axis=1)]
    return np.asarray(np.where((amplitude * np.conj(lead)[:, None]).real < 0, -1.0, 1.0))


def _groups(frequency_per_mm: FloatArray, *, tolerance_per_mm: float) -> tuple[IndexArray, int]:
    """Group number (n,) of each frequency, and how many: closer than the tolerance is one, F and -F alike."""
    cell = tolerance_per_mm / np.sqrt(2.0)
    keys = np.floor(frequency_per_mm / cell).astype(np.int64)
    _, first, cell_of = np.unique(keys, axis=0, return_index=True, return_inverse=True)
    heads = frequency_per_mm[first]
    a, b = near_pairs(heads, np.concatenate([heads, -heads]), radius=tolerance_per_mm)
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
    return number.ravel()[cell_of.ravel()], int(number.max()) + 1
