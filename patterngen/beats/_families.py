"""Combinations that exact balance puts on one frequency.

Where orders s cancel exactly, k, k + s, k + 2 s ... all have the frequency of k.  Each may be
too weak to be found by itself while together they count: they are followed from the ones
that were found.
"""

from __future__ import annotations

import numpy as np

from patterngen.beats._lattice import integer_basis
from patterngen.beats._superposition import Hits, Superposition
from patterngen.beats._tiers import least_contrast
from patterngen.model.seeing import Viewer

_EXACT_PER_MM = 1e-9
_MULTIPLES = {1: 16, 2: 6, 3: 2}
"""By rank of the balance: how far along its lattice a family is followed."""

_LEAST_SHARE = 0.08
"""Members that cannot reach this part of the contrast that is listed are left out."""

_AT_ONCE = 200_000


def with_families(over: Superposition, hits: Hits, viewer: Viewer) -> Hits:
    """The hits and all members of their families that are within reach and not negligible."""
    speed = np.hypot(hits.frequency_per_mm[:, 0], hits.frequency_per_mm[:, 1])
    balanced = hits.orders[speed < _EXACT_PER_MM]
    if not len(balanced) or np.linalg.matrix_rank(balanced) not in _MULTIPLES:
        return hits
    basis = integer_basis(balanced)
    axis = np.arange(-_MULTIPLES[len(basis)], _MULTIPLES[len(basis)] + 1)
    turns = np.stack(np.meshgrid(*[axis] * len(basis), indexing="ij"), axis=-1).reshape(-1, len(basis))
    shifts = (turns[turns.any(axis=1)] @ basis).astype(np.int32)
    moving = hits.take(speed >= _EXACT_PER_MM)
    shares = over.shares((1,))
    envelopes = [spectrum.envelope for spectrum in over.spectra]
    found = [hits]
    for start in range(0, len(moving), max(1, _AT_ONCE // len(shifts))):
        part = moving.take(np.arange(start, min(start + max(1, _AT_ONCE // len(shifts)), len(moving))))
        orders = (part.orders[:, None, :] + shifts[None, :, :]).reshape(-1, over.width)
        frequency = np.repeat(part.frequency_per_mm, len(shifts), axis=0)
        fits = over.within_reach(orders) & (over.taking_part(orders).sum(axis=1) >= 2)
        new = over.hits(orders[fits], frequency[fits])
        weight = np.full(len(new), shares.whole)
        for p, envelope in enumerate(envelopes):
            taking = new.positions[:, p] != over.spectra[p].nothing
            weight *= np.where(taking, envelope[new.positions[:, p]] * shares.each[:, p].max(), 1.0)
        floor = _LEAST_SHARE * least_contrast(viewer, np.hypot(*new.frequency_per_mm.T))
        found.append(new.take(weight >= floor))
    return over.upright(Hits.joined(found))
