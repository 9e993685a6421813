"""Combinations that do not move across the sheet: the mean colour then depends on register.

Over all registers the mean colour is mean + sum 2 Re(A exp(i k.phi)), one free phase for
every axis of every participant: dot-centred and clear-centred rosettes are two such states.
Press tolerances turn balance into a slow drift.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from patterngen.beats._lattice import IntegerArray, coordinates, integer_basis
from patterngen.beats._spectrum import Spectrum
from patterngen.beats._swing import PhaseMean, scattered
from patterngen.model.job import Press
from patterngen.model.lattice import FloatArray
from patterngen.model.screen import ComplexArray, Grid, Screen
from patterngen.model.seeing import InkColours
from patterngen.model.verdict import Balance

_MULTIPLES = {1: 24, 2: 12, 3: 4}
_TONE_ROWS = 4
_REGISTERS = 3000
_LEAST_SWING = 0.1


@dataclass(frozen=True, slots=True, eq=False)
class Found:
    """One balance with the components it was made from."""

    balance: Balance
    orders: NDArray[np.int32]
    frequency_per_mm: FloatArray
    amplitude: ComplexArray
    mean: FloatArray
    tones: FloatArray


@dataclass(frozen=True, slots=True, eq=False)
class Plates:
    """What moves as one piece: the inks, each with its frequency vectors (axes, 2), zero on other inks' axes."""

    inks: tuple[str, ...]
    vectors_per_mm: FloatArray
    """(inks, all order columns, 2); grids belong to no plate."""
    grid_columns: tuple[int, ...]
    register_mm: float
    angle_error_deg: float
    size_error: float

    @classmethod
    def of(cls, screens: Sequence[Screen], grids: Sequence[Grid], columns: Mapping[str, slice], press: Press) -> Plates:
        """The plates of a job."""
        inks = tuple(dict.fromkeys(screen.ink for screen in screens))
        width = max((c.stop for c in columns.values()), default=0)
        vectors = np.zeros((len(inks), width, 2))
        for screen in screens:
            vectors[inks.index(screen.ink), columns[screen.name]] = screen.frequencies_per_mm.reshape(-1, 2)
        on_grids = tuple(i for grid in grids for i in range(columns[grid.name].start, columns[grid.name].stop))
        return cls(inks, vectors, on_grids, press.register_mm, press.angle_error_deg, press.size_error)

    def parts_per_mm(self, orders: NDArray[np.integer]) -> FloatArray:
        """(n, inks, 2) or (inks, 2): what each plate contributes to the frequency of order vectors."""
        return np.einsum("...c,pcx->...px", orders, self.vectors_per_mm)


def fastest_drift_per_mm(
    frequency_per_mm: FloatArray, parts_per_mm: FloatArray, *, angle_error_deg: FloatArray, size_error: FloatArray
) -> float:
    """The largest frequency that errors of the plates can make of a combination, in cycles/mm.

    `parts_per_mm` (p, 2) is what each plate contributes, errors (p,) are the most that each
    plate turns or grows, either way.  The modulus is convex in the errors, so the worst lies
    where every plate is at one of its extremes; all such corners that some direction singles
    out are tried, exactly (turned and scaled, not linearised).
    """
    v = parts_per_mm[:, 0] + 1j * parts_per_mm[:, 1]
    rest = complex(*frequency_per_mm) - complex(v.sum())
    turn, grow = np.deg2rad(np.asarray(angle_error_deg, dtype=float)), np.asarray(size_error, dtype=float)
    generators = np.concatenate([1j * v * turn, v * grow])
    moving = generators[np.abs(generators) > 0]
    if not len(moving):
        return abs(rest + complex(v.sum()))
    # between the directions at right angles to the generators the signs do not change
    normals = np.sort(np.concatenate([np.angle(1j * moving), np.angle(-1j * moving)]) % (2 * np.pi))
    middles = 0.5 * (normals + np.append(normals[1:], normals[0] + 2 * np.pi))
    worst = 0.0
    for u in np.exp(1j * middles):
        turns = np.where(np.real(1j * v * turn * np.conj(u)) >= 0, turn, -turn)
        sizes = np.where(np.real(v * grow * np.conj(u)) >= 0, grow, -grow)
        # a plate that is e larger has frequencies 1 / (1 + e) as large
        worst = max(worst, abs(rest + complex((v / (1.0 - sizes) * np.exp(1j * turns)).sum())))
    return worst


def balances(
    *, hits: Any, evaluate: Callable[[Any, int], ComplexArray], spectra: Sequence[Spectrum], screen_of: Sequence[int],
    columns: Mapping[str, slice], slots: Sequence[tuple[str, int]], tone_rows: NDArray[np.intp], mean: FloatArray,
    plate_tones: FloatArray, screens: Sequence[Screen], colours: InkColours, plates: Plates, slowest_per_mm: float,
    make_hits: Callable[..., Any],
) -> list[Found]:  # fmt: skip
    """Every group of participants that balance, strongest first.

    A group is a set of participants in which a combination occurs that subsets do not explain,
    or a set that no other contains; it holds all combinations of its participants.
    """
    taking = _participation(hits.orders, slots, columns)
    sets = np.unique(taking, axis=0)
    out = []
    for members in sets:
        inside = ~(taking & ~members).any(axis=1)
        own = (taking == members).all(axis=1)
        smaller = inside & ~own
        contained = bool(((sets & members) == members).all(axis=1).sum() > 1)
        if contained and smaller.any():
            _, explained = coordinates(integer_basis(hits.orders[smaller]), hits.orders[own])
            if explained.all():
                continue
        found = _group(
            hits.take(np.flatnonzero(inside)), members, evaluate, spectra, screen_of, columns, slots, tone_rows,
            mean, plate_tones, screens, colours, plates, slowest_per_mm, make_hits,
        )  # fmt: skip
        if found is not None:
            out.append(found)
    return sorted(out, key=lambda found: -found.balance.colour_swing)


def _participation(orders: NDArray[np.int32], slots: Sequence[tuple[str, int]], columns: Mapping[str, slice]) -> NDArray[np.bool_]:
    return np.stack([orders[:, columns[name]].any(axis=1) for name, _ in slots], axis=1)


def _group(
    hits: Any, members: NDArray[np.bool_], evaluate: Callable[[Any, int], ComplexArray], spectra: Sequence[Spectrum],
    screen_of: Sequence[int], columns: Mapping[str, slice], slots: Sequence[tuple[str, int]],
    tone_rows: NDArray[np.intp], mean: FloatArray, plate_tones: FloatArray, screens: Sequence[Screen],
    colours: InkColours, plates: Plates, slowest_per_mm: float, make_hits: Callable[..., Any],
) -> Found | None:  # fmt: skip
    names = tuple(name for (name, _), part in zip(slots, members, strict=True) if part)
    inks = {screen.ink for screen in screens if screen.name in names}
    on_grids = bool(hits.orders[:, list(plates.grid_columns)].any()) if plates.grid_columns else False
    exact = bool((np.hypot(hits.frequency_per_mm[:, 0], hits.frequency_per_mm[:, 1]) < 1e-9).all())
    if exact and len(inks) < 2 and not on_grids:
        return None  # one plate: nothing moves against anything
    basis = integer_basis(hits.orders)
    hits = _all_multiples(hits, basis, spectra, screen_of, columns, slowest_per_mm, make_hits)
    turns, _ = coordinates(basis, hits.orders)
    ranked = []
    for row in tone_rows:
        amplitude = evaluate(hits, int(row))
        strength = float((np.abs(amplitude) / np.maximum(mean[row], 1e-12)).sum(axis=0).max())
        ranked.append((strength, int(row), amplitude))
    ranked.sort(key=lambda item: -item[0])
    best: tuple[float, int, ComplexArray, PhaseMean, FloatArray, FloatArray, FloatArray, FloatArray] | None = None
    for strength, row, amplitude in ranked[:_TONE_ROWS]:
        if strength <= 0.0:
            continue
        model = PhaseMean(mean[row], amplitude, turns)
        theta, xyz = model.spread()
        dark, light, swing = model.widest_pair(colours, theta, xyz, refine=True)
        if best is None or swing > best[0]:
            best = (swing, row, amplitude, model, theta, xyz, dark, light)
    if best is None or best[0] < _LEAST_SWING:
        return None
    swing, row, amplitude, model, theta, xyz, dark, light = best
    head = int(np.argmax(np.abs(amplitude[:, 1])))
    frequency = hits.frequency_per_mm[head]
    parts = plates.parts_per_mm(hits.orders[head])
    errors = np.ones(len(parts))
    drift = fastest_drift_per_mm(
        frequency, parts, angle_error_deg=plates.angle_error_deg * errors, size_error=plates.size_error * errors
    )
    least_y, most_y = model.luminance_extremes(theta, xyz)
    balance = Balance(
        names=names,
        orders={name: [int(k) for k in hits.orders[head, columns[name]]] for name in names if hits.orders[head, columns[name]].any()},
        frequency_per_mm=(float(frequency[0]), float(frequency[1])),
        exact=exact,
        drift_period_mm=1.0 / drift if drift > 1e-12 else float("inf"),
        lab_low=(float(dark[0]), float(dark[1]), float(dark[2])),
        lab_high=(float(light[0]), float(light[1]), float(light[2])),
        mean_y=(least_y, float(mean[row, 1]), most_y),
        colour_swing=swing,
        colour_swing_register=min(swing, _within_register(model, basis, plates, colours)),
        tones={screen.name: float(plate_tones[row, i]) for i, screen in enumerate(screens) if screen.name in names},
    )
    return Found(balance, hits.orders, hits.frequency_per_mm, amplitude, mean[row], plate_tones[row])


def _all_multiples(
    hits: Any, basis: IntegerArray, spectra: Sequence[Spectrum], screen_of: Sequence[int],
    columns: Mapping[str, slice], slowest_per_mm: float, make_hits: Callable[..., Any],
) -> Any:  # fmt: skip
    """The hits and every other small integer combination of their basis that is as slow, within reach."""
    rank = len(basis)
    if rank not in _MULTIPLES:
        return hits
    axis = np.arange(-_MULTIPLES[rank], _MULTIPLES[rank] + 1)
    turns = np.stack(np.meshgrid(*[axis] * rank, indexing="ij"), axis=-1).reshape(-1, rank)
    lead = turns[np.arange(len(turns)), np.argmax(turns != 0, axis=1)]
    known, _ = coordinates(basis, hits.orders)
    steps = np.linalg.lstsq(known.astype(float), hits.frequency_per_mm, rcond=None)[0]
    turns = turns[(lead > 0) & (np.hypot(*(turns @ steps).T) < slowest_per_mm)]
    present = {tuple(row) for row in known.tolist()} | {tuple(row) for row in (-known).tolist()}
    turns = turns[[tuple(row) not in present for row in turns.tolist()]] if len(turns) else turns
    orders = (turns @ basis).astype(np.int32)
    positions = np.empty((len(orders), len(spectra)), dtype=np.intp)
    sets = np.zeros(len(orders), dtype=np.int64)
    fits = np.ones(len(orders), dtype=bool)
    for p, spectrum in enumerate(spectra):
        part = orders[:, columns[spectrum.name]]
        fits &= (np.abs(part) <= spectrum.reach).all(axis=1)
        positions[:, p] = spectrum.positions(np.clip(part, -spectrum.reach, spectrum.reach))
        if screen_of[p] >= 0:
            sets |= np.where(part.any(axis=1), 1 << screen_of[p], 0)
    # one participant alone is its own harmonic, never balance
    fits &= (positions != np.array([s.nothing for s in spectra])).sum(axis=1) + _on_comb(orders, spectra, columns) >= 2
    return make_hits(
        np.concatenate([hits.orders, orders[fits]]), np.concatenate([hits.positions, positions[fits]]),
        np.concatenate([hits.sets, sets[fits]]), np.concatenate([hits.frequency_per_mm, (turns @ steps)[fits]]),
    )  # fmt: skip


def _on_comb(orders: NDArray[np.int32], spectra: Sequence[Spectrum], columns: Mapping[str, slice]) -> NDArray[np.intp]:
    """How many participants without a spectrum of their own (combs) take part in each row."""
    known = {spectrum.name for spectrum in spectra}
    count = np.zeros(len(orders), dtype=np.intp)
    for name, column in columns.items():
        if name not in known:
            count += orders[:, column].any(axis=1)
    return count


def _within_register(model: PhaseMean, basis: IntegerArray, plates: Plates, colours: InkColours) -> float:
    """CIEDE2000 between the extremes that the press can reach when every ink is off by at most the register."""
    if plates.register_mm <= 0.0 or not len(basis):
        return 0.0
    parts = plates.parts_per_mm(basis)
    points = scattered(_REGISTERS, 2 * len(plates.inks))
    radius = plates.register_mm * np.sqrt(points[:, 0::2])
    # half of them with every ink at its full register: extremes lie there while it is small
    radius[::2] = plates.register_mm
    angle = 2.0 * np.pi * points[:, 1::2]
    shift = np.stack([radius * np.cos(angle), radius * np.sin(angle)], axis=-1)
    theta = np.einsum("npx,rpx->nr", shift, parts)
    theta = np.concatenate([np.zeros((1, len(basis))), theta])
    return model.widest_pair(colours, theta, model.at(theta), refine=False)[2]
