"""Which combinations there are, and how strong those can be that were not worked out."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from patterngen.beats._differences import Shares
from patterngen.beats._enumerate import Candidates, Tier, Travel, combinations
from patterngen.beats._superposition import Hits, Superposition
from patterngen.beats._tiers import COARSE_PER_MM, JOINING, LISTED_FAR, LISTED_NEAR, bands
from patterngen.model.area import BoolArray
from patterngen.model.lattice import FloatArray
from patterngen.model.screen import Grid
from patterngen.model.seeing import Viewer

_COLOUR_FLOOR = 2e-3
"""Relative amplitude in any of X, Y, Z from which slow beats and balance are looked at."""

_LUMINANCE = (1,)
_ANY = (0, 1, 2)


@dataclass(frozen=True, slots=True, eq=False)
class Search:
    """The hits, and the largest visibility that anything not listed can have.

    `bound_far` is for periods up to 1 mm, `bound_far_coarse` for longer ones.
    """

    hits: Hits
    bound_near: float
    bound_far: float
    bound_far_coarse: float


def search(over: Superposition, viewer: Viewer, *, diagonal_mm: float) -> Search:
    """All combinations that might be listed, or that move colour slowly.

    Reaches are widened until no combination with an order beyond them can be strong enough
    to be listed, or to a cap; what is left then is in the bounds.
    """
    seen = over.shares(_LUMINANCE)
    casts = over.casts
    strongest = max(_strongest(over, seen, cast) for cast in casts)
    tiers = bands(viewer, start_per_mm=1.0 / diagonal_mm, strongest=strongest)
    _widen(over, seen, tiers)
    slow = [Tier(-1.0, max(COARSE_PER_MM, 1.0 / diagonal_mm), _COLOUR_FLOOR)]
    found: list[Hits] = []
    floors = [tier.floor for tier in tiers]
    # those who never print in one place need not be tried together
    for cast in casts:
        for comb in (None, *over.combs):
            hits, kept = in_tiers(over, _LUMINANCE, tiers, comb, cast=cast)
            found.append(hits)
            floors = [max(a, b) for a, b in zip(floors, kept, strict=True)]
            found.append(in_tiers(over, _ANY, slow, comb, cast=cast)[0])
    near, far, far_coarse = _bounds(over, viewer, seen, tiers, floors)
    return Search(over.upright(Hits.joined(found)), near, far, far_coarse)


def _candidates(over: Superposition, shares: Shares, cast: BoolArray) -> list[Candidates]:
    """What each spectrum of the cast (spectra,) may contribute; the others nothing."""
    return [
        s.candidates(share) if plays else s.nobody()
        for s, share, plays in zip(over.spectra, shares.each.T, cast, strict=True)
    ]


def _strongest(over: Superposition, shares: Shares, cast: BoolArray) -> float:
    """No combination of two or more has a larger contrast."""
    peaks = sorted((float(c.weight.max(initial=0.0)) for c in _candidates(over, shares, cast)), reverse=True)
    if not peaks:
        return shares.whole
    certain = 1 if over.combs else 2
    first, others = peaks[:certain], peaks[certain:]
    return shares.whole * float(np.prod(first)) * float(np.prod(np.maximum(others, 1.0)))


def _beyond(travel: Travel, rest: FloatArray, candidates: Candidates, high_per_mm: float) -> float:
    """The largest weight of a combination with an order beyond the reach that cancels down to `high_per_mm`."""
    unlisted = candidates.unlisted
    return float((unlisted[:, 1] * travel.at(rest, unlisted[:, 0] - high_per_mm)).max())


def _beyond_each(over: Superposition, shares: Shares, tiers: Sequence[Tier]) -> FloatArray:
    """(tiers, spectra) the largest contrast of a combination with an order beyond that spectrum's reach."""
    return np.asarray(np.maximum.reduce([_beyond_in(over, shares, tiers, cast) for cast in over.casts]))


def _beyond_in(over: Superposition, shares: Shares, tiers: Sequence[Tier], cast: BoolArray) -> FloatArray:
    lists = _candidates(over, shares, cast)
    travel = Travel(lists)
    rests = travel.all_but()
    # a comb cancels any length, so with one only the decay of the coefficients bounds
    highs = [np.inf if over.combs else tier.high_per_mm for tier in tiers]
    return np.array(
        [
            [shares.whole * _beyond(travel, rest, c, high) for c, rest in zip(lists, rests, strict=True)]
            for high in highs
        ]
    ).reshape(len(tiers), len(lists))


def _widen(over: Superposition, shares: Shares, tiers: Sequence[Tier]) -> None:
    """Grow every reach until what lies beyond it cannot be listed, or to the cap."""
    floors = np.array([tier.floor / JOINING for tier in tiers])
    while True:
        strong = (_beyond_each(over, shares, tiers) >= floors[:, None]).any(axis=0)
        widened = [over.spectra[p].widen() for p in np.flatnonzero(strong)]
        if not any(widened):
            return


def _bounds(
    over: Superposition, viewer: Viewer, shares: Shares, tiers: Sequence[Tier], floors: Sequence[float]
) -> tuple[float, float, float]:
    near, far = LISTED_NEAR, {False: LISTED_FAR * viewer.limit, True: LISTED_FAR * viewer.limit_coarse}
    beyond = _beyond_each(over, shares, tiers).max(axis=1, initial=0.0)
    for tier, floor, left in zip(tiers, floors, beyond.tolist(), strict=True):
        if floor > tier.floor * (1.0 + 1e-9):
            left = max(left, floor)
        inside = np.geomspace(max(tier.low_per_mm, 1e-9), tier.high_per_mm, 24)
        near = max(near, left * float(viewer.sensitivity_near(inside).max()))
        coarse = tier.high_per_mm <= 1.0 + 1e-9
        far[coarse] = max(far[coarse], left * float(viewer.sensitivity_far(inside).max()))
    return near, far[False], far[True]


def in_tiers(
    over: Superposition, channels: tuple[int, ...], tiers: Sequence[Tier], comb: Grid | None, *, cast: BoolArray
) -> tuple[Hits, tuple[float, ...]]:
    """Combinations of the tiers (without any comb, or with this one) among a cast, and the floors that were kept to.

    `cast` (spectra,) says which spectra may take part.  A tier's floor is of the contrast in the
    strongest of the channels of XYZ.
    """
    shares = over.shares(channels)
    lists = _candidates(over, shares, cast)
    scaled = [replace(tier, floor=tier.floor / shares.whole) for tier in tiers]
    if comb is None and tiers:
        travel = Travel(lists)
        lists = [_useful(c, travel, rest, scaled) for c, rest in zip(lists, travel.all_but(), strict=True)]
    found = combinations(lists, scaled, comb=None if comb is None else _plane(comb.frequencies_per_mm))
    orders = np.zeros((len(found.choice), over.width), dtype=np.int32)
    for p, candidates in enumerate(lists):
        part = np.flatnonzero(found.choice[:, p] >= 0)
        orders[part, over.columns[over.spectra[p].name]] = candidates.orders[found.choice[part, p]]
    if comb is not None and found.comb_order is not None:
        orders[:, over.columns[comb.name]] = found.comb_order[:, : len(comb.frequencies_per_mm)]
    hits = over.hits(orders, found.frequency_per_mm)
    floors = tuple(floor * shares.whole for floor in found.floors)
    # weights only bound contrast; the true one in every row of tones decides
    strong = np.zeros(len(hits), dtype=bool)
    for row in range(len(over.rows.plate)):
        strong |= over.contrasts(hits, row, channels=channels) >= min(floors, default=0.0) * (1.0 - 1e-9)
    return hits.take(strong), floors


def _useful(candidates: Candidates, travel: Travel, rest: FloatArray, tiers: Sequence[Tier]) -> Candidates:
    """Those orders that the other participants can still cancel with enough weight left."""
    length = np.hypot(candidates.frequency_per_mm[:, 0], candidates.frequency_per_mm[:, 1])
    kept = candidates.weight * travel.at(travel.need(rest, tiers), length) >= 1.0
    return Candidates(
        candidates.orders[kept], candidates.frequency_per_mm[kept], candidates.weight[kept], np.zeros((0, 2))
    )


def _plane(frequencies_per_mm: FloatArray) -> FloatArray:
    """Two frequency vectors of a comb; a comb of lines gets a second one far beyond any beat."""
    if len(frequencies_per_mm) == 2:
        return np.asarray(frequencies_per_mm, dtype=float)
    x, y = frequencies_per_mm[0]
    return np.array([[x, y], [-1e6 * y, 1e6 * x]])
