"""Components that fall on one frequency are one beat."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from patterngen.beats._enumerate import IndexArray, OrderArray, near_pairs
from patterngen.beats._lattice import modulus_extremes
from patterngen.beats._superposition import Hits, Superposition, michelson
from patterngen.beats._swing import crest_to_trough
from patterngen.beats._tiers import COARSE_PER_MM, least_contrast, octave
from patterngen.model.lattice import FloatArray
from patterngen.model.screen import ComplexArray
from patterngen.model.seeing import Viewer

_COLOUR_LISTED = 1.0
"""CIEDE2000 from crest to trough from which a slow beat is listed whatever its contrast in luminance."""


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

    @classmethod
    def none(cls, over: Superposition) -> JoinedBeats:
        """No beat at all."""
        return cls(
            np.zeros((0, over.width), dtype=np.int32), np.zeros((0, 2)), np.zeros((0, 3), dtype=complex),
            np.zeros((0, 3)), np.zeros((0, 3)), np.zeros(0), np.zeros(0), np.zeros(0, dtype=np.int32),
            np.zeros((0, len(over.screens))), np.zeros(0),
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
    row_of = _worst_rows(over, hits, group, octave(1.0 / slowest).astype(np.intp))
    coarse = slowest <= COARSE_PER_MM
    contrast = np.zeros(count)
    for row in np.unique(row_of[row_of >= 0]):
        here = np.flatnonzero(row_of[group] == row)
        strength = over.contrasts(hits.take(here), int(row)) * over.transfer(hits.frequency_per_mm[here])
        contrast += np.bincount(group[here], strength**2, minlength=count)
    listed = np.sqrt(contrast) >= least_contrast(viewer, slowest) * (1.0 - 1e-9)
    chosen = np.flatnonzero((row_of >= 0) & (listed | coarse))
    if not len(chosen):
        return JoinedBeats.none(over)

    members = np.flatnonzero(np.isin(group, chosen))
    members = members[np.argsort(group[members], kind="stable")]
    part = hits.take(members)
    number = np.searchsorted(chosen, group[members])
    starts = np.searchsorted(number, np.arange(len(chosen) + 1))
    rows = row_of[chosen]
    amplitude = np.zeros((len(members), 3), dtype=complex)
    for row in np.unique(rows):
        here = np.flatnonzero(rows[number] == row)
        amplitude[here] = over.amplitudes(part.take(here), int(row))
    orders, frequency = _aligned(part, amplitude, starts, number)
    mean = over.mean[rows]
    modulus = np.abs(amplitude)
    power = np.sqrt(np.add.reduceat(modulus**2, starts[:-1], axis=0))
    strongest = np.lexsort((-modulus[:, 1], number))[starts[:-1]]
    swing = np.full(len(chosen), np.nan)
    long = np.flatnonzero(coarse[chosen])
    swing[long] = crest_to_trough(over.colours, mean[long], _real(amplitude[strongest[long]]) * power[long])

    kept = np.flatnonzero(listed[chosen] | (np.nan_to_num(swing) >= _COLOUR_LISTED))
    contrasts = (amplitude[:, 1] * michelson(np.ones(len(number)), mean[number, 1])).astype(complex)
    pieces = [slice(int(starts[g]), int(starts[g + 1])) for g in kept]
    extremes = modulus_extremes([contrasts[p] for p in pieces], [orders[p] for p in pieces])
    head = strongest[kept]
    return JoinedBeats(
        orders[head], frequency[head], amplitude[head], power[kept], mean[kept], extremes[:, 0], extremes[:, 1],
        np.diff(starts)[kept].astype(np.int32), over.rows.plate[rows[kept]], swing[kept],
    )  # fmt: skip


def _worst_rows(over: Superposition, hits: Hits, group: IndexArray, octaves: IndexArray) -> IndexArray:
    """(groups,) the row of tones, among those that hold over the beat's period, where each is strongest (-1: none)."""
    count = len(octaves)
    if len(over.rows.plate) == 1:
        return np.where(over.rows.hold(0, octaves), 0, -1)
    best, best_row = np.zeros(count), np.full(count, -1, dtype=np.intp)
    for row in range(len(over.rows.plate)):
        allowed = over.rows.hold(row, octaves)
        here = np.flatnonzero(allowed[group])
        strength = over.contrasts(hits.take(here), row)
        joined = np.bincount(group[here], strength**2, minlength=count)
        better = allowed & (joined > best)
        best[better], best_row[better] = joined[better], row
    return best_row


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
