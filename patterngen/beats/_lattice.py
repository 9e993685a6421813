"""Integer relations between order vectors: a basis for them, and sums over free phases."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from patterngen.model.lattice import FloatArray
from patterngen.model.screen import ComplexArray

IntegerArray = NDArray[np.int64]

_TORUS = {1: 256, 2: 48, 3: 20}
_REFINE = 9


def integer_basis(vectors: NDArray[np.integer]) -> IntegerArray:
    """A basis (r, d) of all integer combinations of the rows, short rows preferred.

    >>> integer_basis(np.array([[2, 0], [3, 0], [5, 5]])).tolist()
    [[1, 0], [0, 5]]
    """
    rows = np.unique(np.asarray(vectors, dtype=np.int64), axis=0)
    rows = rows[rows.any(axis=1)]
    if not len(rows):
        return np.zeros((0, np.shape(vectors)[1]), dtype=np.int64)
    rows = rows[np.argsort(np.abs(rows).sum(axis=1), kind="stable")]
    basis = np.zeros((0, rows.shape[1]), dtype=np.int64)
    while len(rows):
        basis = _reduced(np.concatenate([basis, rows[:1]]))
        _, inside = coordinates(basis, rows)
        rows = rows[~inside]
    return basis


def coordinates(basis: IntegerArray, vectors: NDArray[np.integer]) -> tuple[IntegerArray, NDArray[np.bool_]]:
    """(n, r) coordinates of the rows in the basis, and which rows are integer combinations of it."""
    solved = np.rint(np.asarray(vectors, dtype=float) @ np.linalg.pinv(basis.astype(float))).astype(np.int64)
    return solved, (solved @ basis == vectors).all(axis=1)


def _reduced(rows: IntegerArray) -> IntegerArray:
    """Row echelon form over the integers (Hermite, exact), then shortened pair by pair."""
    table = [[int(v) for v in row] for row in rows]
    done: list[list[int]] = []
    for column in range(rows.shape[1]):
        active = [row for row in table if row[column]]
        rest = [row for row in table if not row[column]]
        while len(active) > 1:
            active.sort(key=lambda row: abs(row[column]))
            head = active[0]
            reduced = []
            for row in active[1:]:
                factor = row[column] // head[column]
                row = [a - factor * b for a, b in zip(row, head, strict=True)]
                (reduced if row[column] else rest).append(row)
            active = [head, *reduced]
        done += active
        table = [row for row in rest if any(row)]
    return _shortened(np.array(done, dtype=np.int64))


def _shortened(basis: IntegerArray) -> IntegerArray:
    """The same lattice with shorter rows: whole multiples of one row taken from another while it helps."""
    basis = basis.copy()
    for _ in range(100):
        changed = False
        for i in range(len(basis)):
            for j in range(len(basis)):
                if i != j:
                    times = int(np.rint(float(basis[i] @ basis[j]) / float(basis[j] @ basis[j])))
                    shorter = basis[i] - times * basis[j]
                    if times and shorter @ shorter < basis[i] @ basis[i]:
                        basis[i] = shorter
                        changed = True
        if not changed:
            break
    lead = basis[np.arange(len(basis)), np.argmax(basis != 0, axis=1)]
    return np.asarray(basis * np.sign(lead)[:, None])


def modulus_extremes(amplitudes: Sequence[ComplexArray], orders: Sequence[NDArray[np.integer]]) -> FloatArray:
    """(groups, 2): least and largest modulus of each group's sum over all register phases.

    Component j of a group has amplitude a_j and turns by k_j . phi, with one free phase phi
    for every axis of every participant.  Independent differences of orders turn freely: the
    largest is the sum of moduli and the least that of a polygon (the longest side less all
    others, or 0).  Up to three dependent phases are searched on a grid and refined; with more
    the polygon's bounds are given, which the truth cannot exceed.
    """
    out = np.empty((len(amplitudes), 2))
    for i, amplitude in enumerate(amplitudes):
        moduli = np.abs(amplitude)
        total = float(moduli.sum())
        out[i] = max(0.0, 2.0 * float(moduli.max()) - total), total
    many = [i for i, amplitude in enumerate(amplitudes) if len(amplitude) > 2]
    if not many:
        return out
    differences = [orders[i].astype(np.int64) - orders[i][0] for i in many]
    basis = integer_basis(np.concatenate(differences))
    for i, difference in zip(many, differences, strict=True):
        turns, _ = coordinates(basis, difference)
        used = np.flatnonzero(turns.any(axis=0))
        if np.linalg.matrix_rank(turns) == len(turns) - 1:
            continue
        if len(used) > 3:
            own = integer_basis(difference)
            turns, _ = coordinates(own, difference)
            used = np.arange(len(own))
            if len(used) > 3:
                continue
        out[i] = _search(amplitudes[i], turns[:, used])
    return out


def _search(amplitude: ComplexArray, turns: IntegerArray) -> tuple[float, float]:
    """Least and largest |sum a_j exp(2 pi i n_j . theta)| on a grid over the torus, then refined."""
    rank = turns.shape[1]
    size = _TORUS[rank]
    grid = np.zeros((size,) * rank, dtype=complex)
    np.add.at(grid, tuple((turns % size).T), amplitude)
    modulus = np.abs(np.fft.ifftn(grid, norm="forward"))
    ends = []
    for sign in (-1.0, 1.0):
        at = np.array(np.unravel_index(int(np.argmax(sign * modulus)), modulus.shape)) / size
        best = float(modulus.ravel()[int(np.argmax(sign * modulus))])
        step = 0.5 / size
        around = np.stack(np.meshgrid(*[[-1.0, 0.0, 1.0]] * rank, indexing="ij"), axis=-1).reshape(-1, rank)
        for _ in range(_REFINE):
            trial = at + step * around
            value = np.abs(np.exp(2j * np.pi * (trial @ turns.T)) @ amplitude)
            k = int(np.argmax(sign * value))
            if sign * float(value[k]) > sign * best:
                at, best = trial[k], float(value[k])
            step *= 0.5
        ends.append(best)
    return ends[0], ends[1]
