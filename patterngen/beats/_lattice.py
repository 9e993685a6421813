"""Integer relations between order vectors: a basis for them, and sums over free phases."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from patterngen.model.lattice import FloatArray
from patterngen.model.screen import ComplexArray

IntegerArray = NDArray[np.int64]

_TORUS = {1: 256, 2: 48, 3: 20}
"""Points an axis of the first search over so many free phases."""
_REFINE = 16
_STARTS = 6
_SHARED_RANK = 4
_BATCH = 32


def distinct_rows(rows: NDArray[np.int32]) -> NDArray[np.intp]:
    """Places (m,) of the first of each different row of small integers (n, d), in the order of the rows' values.

    Rows are packed into machine words first: sorting whole rows is ten times as slow.
    """
    if not len(rows):
        return np.zeros(0, dtype=np.intp)
    small = rows.astype(np.int16)
    if (small != rows).any():
        return np.asarray(np.unique(rows, axis=0, return_index=True)[1])
    padded = np.zeros((len(rows), -(-rows.shape[1] // 4) * 4), dtype=np.uint16)
    padded[:, : rows.shape[1]] = small.view(np.uint16)
    words = padded.view(np.uint64)
    order = np.lexsort(words.T)
    moved = (words[order[1:]] != words[order[:-1]]).any(axis=1)
    return np.asarray(order[np.concatenate([[True], moved])])


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


def free_phases(orders: NDArray[np.integer]) -> IntegerArray:
    """Rows of which all orders are whole combinations, each with a phase of its own.

    A basis while that is small; of many combinations every axis that takes part stands for itself.
    """
    if np.linalg.matrix_rank(orders) <= max(_TORUS):
        return integer_basis(orders)
    return np.eye(orders.shape[1], dtype=np.int64)[orders.any(axis=0)]


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
            reduced: list[list[int]] = []
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
    others, or 0).  Up to three dependent phases are searched on a grid and refined (the least
    right to a hundredth of the sum of moduli, the largest to a thousandth); with more the
    polygon's bounds are given, which the truth cannot exceed.
    """
    out = np.empty((len(amplitudes), 2))
    for i, amplitude in enumerate(amplitudes):
        moduli = np.abs(amplitude)
        total = float(moduli.sum())
        out[i] = max(0.0, 2.0 * float(moduli.max()) - total), total
    dependent: dict[int, list[tuple[int, IntegerArray]]] = {}
    small: list[tuple[int, IntegerArray]] = []
    for i, amplitude in enumerate(amplitudes):
        if len(amplitude) > 2:
            difference = orders[i][1:].astype(np.int64) - orders[i][0]
            rank = np.linalg.matrix_rank(difference)
            if rank <= min(max(_TORUS), len(difference) - 1):
                small.append((i, difference))
    if not small:
        return out
    # one basis for all where that is small too: on the usual sets all differences are balances
    stacked = np.concatenate([difference for _, difference in small])
    shared = integer_basis(stacked) if np.linalg.matrix_rank(stacked) <= _SHARED_RANK else None
    for i, difference in small:
        basis = shared
        if basis is not None:
            turns, _ = coordinates(basis, difference)
            used = np.flatnonzero(turns.any(axis=0))
        if basis is None or len(used) > max(_TORUS):
            turns, _ = coordinates(integer_basis(difference), difference)
            used = np.arange(turns.shape[1])
        first = np.zeros((1, len(used)), dtype=np.int64)
        dependent.setdefault(len(used), []).append((i, np.concatenate([first, turns[:, used]])))
    for found in dependent.values():
        # like sizes together, so that little is padded
        found.sort(key=lambda item: len(item[1]))
        for at in range(0, len(found), _BATCH):
            batch = found[at : at + _BATCH]
            rows = [i for i, _ in batch]
            out[rows] = _search([amplitudes[i] for i in rows], [n for _, n in batch])
    return out


def _search(amplitudes: Sequence[ComplexArray], turns: Sequence[IntegerArray]) -> FloatArray:
    """(groups, 2): least and largest |sum a_j exp(2 pi i n_j . theta)| on a grid over the torus, then refined."""
    groups, rank = len(turns), turns[0].shape[1]
    size, longest = _TORUS[rank], max(map(len, turns))
    amplitude = np.zeros((groups, longest), dtype=complex)
    turn = np.zeros((groups, longest, rank), dtype=np.int64)
    for g in range(groups):
        amplitude[g, : len(turns[g])] = amplitudes[g]
        turn[g, : len(turns[g])] = turns[g]
    grid = np.zeros((groups,) + (size,) * rank, dtype=complex)
    place = np.broadcast_to(np.arange(groups)[:, None], (groups, longest))
    np.add.at(grid, (place, *np.moveaxis(turn % size, -1, 0)), amplitude)
    axes = tuple(range(1, rank + 1))
    modulus = np.abs(np.fft.ifftn(grid, axes=axes, norm="forward"))
    around = np.stack(np.meshgrid(*[[-1.0, 0.0, 1.0]] * rank, indexing="ij"), axis=-1).reshape(-1, rank)
    out = np.empty((groups, 2))
    for end, sign in enumerate((-1.0, 1.0)):
        at = _local_tops(sign * modulus, axes) / size
        best = np.full(at.shape[:2], -np.inf)
        step = np.full(at.shape[:2], 0.5 / size)
        for _ in range(_REFINE):
            trial = at[:, :, None, :] + step[:, :, None, None] * around
            phase = np.exp(2j * np.pi * np.einsum("gstr,gjr->gstj", trial, turn))
            value = sign * np.abs(np.einsum("gstj,gj->gst", phase, amplitude))
            k = np.argmax(value, axis=2)[:, :, None]
            top = np.take_along_axis(value, k, axis=2)[:, :, 0]
            moved = np.take_along_axis(trial, k[:, :, :, None], axis=2)[:, :, 0]
            # a step is halved where it leads no further
            better = top > best + 1e-12
            at, best = np.where(better[:, :, None], moved, at), np.maximum(top, best)
            step = np.where(better & (k[:, :, 0] != len(around) // 2), step, 0.5 * step)
        out[:, end] = sign * best.max(axis=1)
    return out


def _local_tops(value: FloatArray, axes: tuple[int, ...]) -> IntegerArray:
    """(groups, starts, rank) places of the highest points that no neighbour along an axis exceeds."""
    top = np.ones(value.shape, dtype=bool)
    for axis in axes:
        for way in (-1, 1):
            top &= value >= np.roll(value, way, axis=axis)
    flat = np.where(top, value, -np.inf).reshape(len(value), -1)
    first = np.argpartition(-flat, _STARTS, axis=1)[:, :_STARTS]
    return np.stack(np.unravel_index(first, value.shape[1:]), axis=-1)
