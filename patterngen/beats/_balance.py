"""Combinations that do not move across the sheet: the mean colour then depends on register.

Over all registers the mean colour is mean + sum 2 Re(A exp(2 pi i k.phi)), one free phase
for every axis of every participant: dot-centred and clear-centred rosettes are two such
states.  Press tolerances turn balance into a slow drift.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from patterngen.beats._enumerate import OrderArray
from patterngen.beats._joined import JoinedBeats
from patterngen.beats._lattice import IntegerArray, coordinates, free_phases, modulus_extremes
from patterngen.beats._superposition import Hits, Superposition, michelson
from patterngen.beats._swing import PhaseMean, scattered
from patterngen.beats._tiers import COARSE_PER_MM
from patterngen.model.area import BoolArray
from patterngen.model.job import Press
from patterngen.model.lattice import FloatArray
from patterngen.model.screen import ComplexArray
from patterngen.model.seeing import InkColours
from patterngen.model.verdict import Balance

_WINDOW_MM = 2.0
"""Over so much tones must hold for their mean colour to be seen as one."""

_MULTIPLES = {1: 60, 2: 24, 3: 6}
"""By rank: how far along its lattice a balance is followed beyond what the search found."""

_STRONGEST = 300
"""Components of a balance of higher rank that are kept."""

_TONE_ROWS = 4
"""Rows of tones (of the largest sum of amplitudes, as they are and as they count) for which colours are searched."""

_FAINT = 3e-6
"""Components below this part of the mean are not carried along."""

_REGISTERS = 2000
_LEAST_SWING = 0.1
"""CIEDE2000 below which a balance is not worth a word."""

_EXACT_PER_MM = 1e-9


def balances(
    over: Superposition, hits: Hits, press: Press, *, slowest_per_mm: float
) -> tuple[JoinedBeats, tuple[Balance, ...]]:
    """Every group of participants whose combinations are slower than `slowest_per_mm`, widest swing first.

    Groups are the sets of participants whose combinations those of smaller sets do not
    explain, and all that hang together through them as one.  A group holds every slow
    combination of its participants.  The table rows stand in the same order.
    """
    found = []
    if len(hits):
        plates = Plates.of(over, press)
        for members in _groups(over, hits.orders):
            inside = np.flatnonzero(~(over.taking_part(hits.orders) & ~members).any(axis=1))
            item = _weigh(over, hits.take(inside), members, plates, slowest_per_mm)
            if item is not None:
                found.append(item)
    found.sort(key=lambda item: -item[1].colour_swing)
    rows = JoinedBeats.none(over)
    for row, _ in found:
        rows = rows.with_more(row)
    return rows, tuple(balance for _, balance in found)


def _groups(over: Superposition, orders: OrderArray) -> list[BoolArray]:
    """The sets of participants (slots,) to report on."""
    taking = over.taking_part(orders)
    sets = np.unique(taking, axis=0)
    sets = sets[np.argsort(sets.sum(axis=1), kind="stable")]
    primitive: list[BoolArray] = []
    for members in sets:
        own = (taking == members).all(axis=1)
        smaller = ~(taking & ~members).any(axis=1) & ~own
        if smaller.any():
            known = np.linalg.matrix_rank(orders[smaller])
            if np.linalg.matrix_rank(orders[smaller | own]) == known:
                continue
        primitive.append(members)
    together: list[BoolArray] = []
    for members in primitive:
        touching = [other for other in together if (other & members).any()]
        together = [other for other in together if not (other & members).any()]
        together.append(np.logical_or.reduce([members, *touching]))
    return [*primitive, *[m for m in together if not any((m == p).all() for p in primitive)]]


def _weigh(
    over: Superposition, hits: Hits, members: BoolArray, plates: Plates, slowest_per_mm: float
) -> tuple[JoinedBeats, Balance] | None:
    """One group at the tones where its colour moves most; None where nothing can move or it is too little."""
    names = tuple(name for (name, _), part in zip(over.slots, members, strict=True) if part)
    exact = bool((np.hypot(hits.frequency_per_mm[:, 0], hits.frequency_per_mm[:, 1]) < _EXACT_PER_MM).all())
    grids = any(grid.name in names for grid in over.grids)
    if exact and not grids and len({screen.ink for screen in over.screens if screen.name in names}) < 2:
        return None  # screens of one plate never move against each other
    basis = free_phases(hits.orders)
    if len(basis) in _MULTIPLES:
        # harmonics of a slow drift are faster, and move the same colour
        hits = _followed(over, hits, basis, max(slowest_per_mm, COARSE_PER_MM))
    best = None
    judged = 0.0
    for amplitude, hits_kept, row in _promising(over, hits, len(basis)):
        turns, _ = coordinates(basis, hits_kept.orders)
        model = PhaseMean(over.mean[row], amplitude, turns, yule_nielsen=over.colours.yule_nielsen)
        theta, xyz = model.spread()
        dark, light, swing = model.widest_pair(over.colours, theta, xyz, refine=True)
        judged = max(judged, swing * float(over.weight[row]))
        if best is None or swing > best[0]:
            best = (swing, dark, light, model.luminance_extremes(theta, xyz), model, amplitude, hits_kept, row)
    if best is None or best[0] < _LEAST_SWING:
        return None
    swing, dark, light, (least_y, most_y), model, amplitude, hits, row = best
    head = int(np.argmax(np.abs(amplitude[:, 1])))
    frequency = hits.frequency_per_mm[head]
    drift = plates.drift_per_mm(hits.orders[head], frequency)
    taking = zip(over.slots, over.taking_part(hits.orders[head : head + 1])[0], strict=True)
    balance = Balance(
        names=names,
        orders={name: [int(k) for k in hits.orders[head, over.columns[name]]] for (name, _), part in taking if part},
        frequency_per_mm=(float(frequency[0]), float(frequency[1])),
        exact=exact,
        drift_period_mm=1.0 / drift if drift > _EXACT_PER_MM else float("inf"),
        lab_low=_three(dark),
        lab_high=_three(light),
        mean_y=(least_y, float(over.mean[row, 1]), most_y),
        colour_swing=swing,
        colour_swing_register=min(swing, _within_register(model, basis, plates, over.colours)),
        colour_swing_judged=judged,
        tones={
            screen.name: float(over.rows.plate[row, i]) for i, screen in enumerate(over.screens) if screen.name in names
        },
    )
    contrasts = amplitude[:, 1] * michelson(np.ones(1), over.mean[row : row + 1, 1])
    extremes = modulus_extremes([contrasts], [hits.orders])[0]
    one = slice(head, head + 1)
    line = JoinedBeats(
        hits.orders[one],
        hits.frequency_per_mm[one],
        amplitude[one],
        np.sqrt((np.abs(amplitude) ** 2).sum(axis=0, keepdims=True)),
        over.mean[row : row + 1],
        extremes[:1],
        extremes[1:],
        np.array([len(hits)], dtype=np.int32),
        over.rows.plate[row : row + 1],
        np.array([swing]),
        michelson(np.sqrt((np.abs(amplitude[:, 1]) ** 2).sum(keepdims=True)), over.mean[row : row + 1, 1])
        * over.weight[row],
        np.array([judged]),
    )
    return line, balance


def _three(lab: FloatArray) -> tuple[float, float, float]:
    return float(lab[0]), float(lab[1]), float(lab[2])


def _promising(over: Superposition, hits: Hits, rank: int) -> list[tuple[ComplexArray, Hits, int]]:
    """(amplitudes, components, row) for the rows of tones in which the most can move."""
    octaves = [n for n, rows in enumerate(over.rows.of_octave) if len(rows)]
    wanted = max((n for n in octaves if 0.25 * 2.0**n <= _WINDOW_MM), default=octaves[0])
    ranked = []
    for row in over.rows.of_octave[wanted]:
        amplitude = over.amplitudes(hits, int(row))
        relative = np.abs(amplitude).sum(axis=0) / np.maximum(over.mean[row], 1e-12)
        ranked.append((float(relative.max()), int(row), amplitude))
    ranked.sort(key=lambda item: (-item[0], item[1]))
    counting = sorted(ranked, key=lambda item: (-item[0] * over.weight[item[1]], item[1]))
    chosen = {item[1]: item for item in ranked[:_TONE_ROWS] + counting[:_TONE_ROWS]}
    out = []
    for strength, row, amplitude in chosen.values():
        if strength > 0.0:
            relative = np.abs(amplitude) / np.maximum(over.mean[row], 1e-12)
            kept = np.flatnonzero(relative.max(axis=1) >= _FAINT)
            if rank not in _MULTIPLES and len(hits) > _STRONGEST:
                kept = np.sort(np.argsort(-np.abs(amplitude).max(axis=1), kind="stable")[:_STRONGEST])
            out.append((amplitude[kept], hits.take(kept), row))
    return out


def _followed(over: Superposition, hits: Hits, basis: IntegerArray, slowest_per_mm: float) -> Hits:
    """The hits and every other small integer combination of their basis that is as slow, within reach."""
    rank = len(basis)
    axis = np.arange(-_MULTIPLES[rank], _MULTIPLES[rank] + 1)
    turns = np.stack(np.meshgrid(*[axis] * rank, indexing="ij"), axis=-1).reshape(-1, rank)
    known, _ = coordinates(basis, hits.orders)
    steps = np.linalg.lstsq(known.astype(float), hits.frequency_per_mm, rcond=None)[0]
    turns = turns[np.hypot(*(turns @ steps).T) < slowest_per_mm]
    turns = turns[turns.any(axis=1)]
    lead = turns[np.arange(len(turns)), np.argmax(turns != 0, axis=1)]
    turns = turns[lead > 0]
    present = {tuple(row) for row in known.tolist()} | {tuple(row) for row in (-known).tolist()}
    new = [tuple(row) not in present for row in turns.tolist()]
    turns = turns[np.array(new, dtype=bool)]
    orders = (turns @ basis).astype(np.int32)
    # one participant alone is its own harmonic, never balance
    fits = over.within_reach(orders) & (over.taking_part(orders).sum(axis=1) >= 2)
    return Hits.joined([hits, over.hits(orders[fits], (turns @ steps)[fits])])


def _within_register(model: PhaseMean, basis: IntegerArray, plates: Plates, colours: InkColours) -> float:
    """CIEDE2000 between the extremes that occur while every plate stays within the register of its place."""
    if plates.register_mm <= 0.0:
        return 0.0
    parts = plates.parts_per_mm(basis)
    points = scattered(_REGISTERS, 2 * len(plates.inks))
    radius = plates.register_mm * np.sqrt(points[:, 0::2])
    # half of them with every plate at its full register: there the extremes lie while it is small
    radius[::2] = plates.register_mm
    angle = 2.0 * np.pi * points[:, 1::2]
    shift = np.stack([radius * np.cos(angle), radius * np.sin(angle)], axis=-1)
    theta = np.einsum("npx,rpx->nr", shift, parts)
    theta = np.concatenate([np.zeros((1, len(basis))), theta])
    return model.widest_pair(colours, theta, model.at(theta), refine=False)[2]


# --- what the press does to it -------------------------------------------------------------


@dataclass(frozen=True, slots=True, eq=False)
class Plates:
    """What moves as one piece: all screens of an ink.  Grids belong to no plate.

    `vectors_per_mm` (plates, all order columns, 2), zero on the columns of other plates.
    """

    inks: tuple[str, ...]
    vectors_per_mm: FloatArray
    register_mm: float
    angle_error_deg: float
    size_error: float

    @classmethod
    def of(cls, over: Superposition, press: Press) -> Plates:
        """The plates of a job, with the press's tolerances."""
        inks = tuple(dict.fromkeys(screen.ink for screen in over.screens))
        vectors = np.zeros((len(inks), over.width, 2))
        for screen in over.screens:
            vectors[inks.index(screen.ink), over.columns[screen.name]] = np.reshape(screen.frequencies_per_mm, (-1, 2))
        return cls(inks, vectors, press.register_mm, press.angle_error_deg, press.size_error)

    def parts_per_mm(self, orders: OrderArray | IntegerArray) -> FloatArray:
        """What each plate contributes to the frequency of orders (..., columns): (..., plates, 2)."""
        return np.asarray(np.einsum("...c,pcx->...px", orders, self.vectors_per_mm))

    def drift_per_mm(self, orders: OrderArray, frequency_per_mm: FloatArray) -> float:
        """The largest frequency that the tolerances make of one combination."""
        parts = self.parts_per_mm(orders)
        same = np.ones(len(parts))
        return fastest_drift_per_mm(
            frequency_per_mm, parts, angle_error_deg=self.angle_error_deg * same, size_error=self.size_error * same
        )


def fastest_drift_per_mm(
    frequency_per_mm: FloatArray, parts_per_mm: FloatArray, *,
    angle_error_deg: Sequence[float] | FloatArray, size_error: Sequence[float] | FloatArray,
) -> float:  # fmt: skip
    """The largest frequency that errors of the plates can make of a combination, in cycles/mm.

    `parts_per_mm` (p, 2) is what each plate contributes; it may turn by up to its
    `angle_error_deg` (p,) and change its length by up to its `size_error` (p,), either way.
    The modulus is convex in small errors, so the worst lies where every plate is at one of
    its extremes; every choice of extremes that some direction of the plane singles out is
    tried, exactly (turned and scaled, not linearised).

    >>> corners = np.exp(1j * np.deg2rad([15.0, 135.0, 255.0])) * 150 / 25.4
    >>> parts = np.column_stack([corners.real, corners.imag])
    >>> fastest = fastest_drift_per_mm(np.zeros(2), parts, angle_error_deg=[0.02, 0, 0], size_error=[0, 0, 0])
    >>> round(1 / fastest, 3)
    485.104
    """
    v = parts_per_mm[:, 0] + 1j * parts_per_mm[:, 1]
    rest = complex(*frequency_per_mm) - complex(v.sum())
    turn, grow = np.deg2rad(np.asarray(angle_error_deg, dtype=float)), np.asarray(size_error, dtype=float)
    generators = np.concatenate([1j * v * turn, v * grow])
    moving = generators[np.abs(generators) > 0]
    if not len(moving):
        return abs(complex(*frequency_per_mm))
    # between the directions at right angles to the generators no sign changes
    normals = np.sort(np.concatenate([np.angle(1j * moving), np.angle(-1j * moving)]) % (2 * np.pi))
    middles = 0.5 * (normals + np.append(normals[1:], normals[0] + 2 * np.pi))
    worst = 0.0
    for u in np.exp(1j * middles):
        turns = np.where(np.real(1j * v * turn * np.conj(u)) >= 0, turn, -turn)
        smaller = np.where(np.real(v * grow * np.conj(u)) >= 0, -grow, grow)
        # a plate that is larger by e has frequencies 1 / (1 + e) times as high
        worst = max(worst, abs(rest + complex((v / (1.0 + smaller) * np.exp(1j * turns)).sum())))
    return worst
