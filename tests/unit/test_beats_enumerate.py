"""second way: enumeration against every combination of a box tried one by one."""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from patterngen.beats._enumerate import Candidates, Tier, combinations, near_pairs
from tests.orders import combinations_by_order, combinations_in_box

NONE = np.zeros((0, 2))


def square(ruling: float, angle_deg: float) -> np.ndarray:
    a = np.deg2rad(angle_deg)
    return ruling * np.array([[np.cos(a), np.sin(a)], [-np.sin(a), np.cos(a)]])


def canonical(orders: np.ndarray) -> set[tuple[int, ...]]:
    """k and -k as one."""
    out = set()
    for row in orders.tolist():
        lead = next(k for k in row if k)
        out.add(tuple(k if lead > 0 else -k for k in row))
    return out


def box(frequencies: list[np.ndarray], reach: int) -> tuple[np.ndarray, np.ndarray]:
    axes = sum(map(len, frequencies))
    k = np.stack(np.meshgrid(*[np.arange(-reach, reach + 1)] * axes, indexing="ij"), axis=-1).reshape(-1, axes)
    k = k[k.any(axis=1)]
    return k, k @ np.concatenate(frequencies)


@settings(deadline=None, max_examples=25)
@given(
    st.lists(st.tuples(st.floats(2, 9), st.floats(0, 90), st.booleans()), min_size=1, max_size=3),
    st.floats(0.05, 4.0),
)
def test_box_is_complete(screens: list[tuple[float, float, bool]], f_max: float) -> None:
    frequencies = [square(r, a)[: 1 if lines else 2] for r, a, lines in screens]
    k, f = box(frequencies, 3)
    speed = np.hypot(*f.T)
    # hits on the circle itself may fall either way by rounding
    sure, possible = canonical(k[speed <= f_max - 1e-9]), canonical(k[speed <= f_max + 1e-9])
    found = canonical(combinations_in_box(frequencies, reach=3, f_max_per_mm=f_max))
    assert sure <= found <= possible


@settings(deadline=None, max_examples=15)
@given(st.lists(st.tuples(st.floats(2, 9), st.floats(0, 90)), min_size=2, max_size=3), st.integers(2, 6))
def test_order_bound_is_complete(screens: list[tuple[float, float]], total: int) -> None:
    frequencies = [square(r, a) for r, a in screens]
    k, f = box(frequencies, min(total, 4))
    inside = (np.abs(k).sum(axis=1) <= total) & (np.abs(np.hypot(*f.T) - 1.3) > 1e-9)
    k, f = k[inside], f[inside]
    found = combinations_by_order(frequencies, total=total, f_max_per_mm=1.3)
    found = found[np.abs(found).max(axis=1) <= 4]
    assert canonical(found) == canonical(k[np.hypot(*f.T) <= 1.3])


def test_nothing_is_found_twice() -> None:
    frequencies = [square(5.9, a) for a in (15.0, 75.0, 0.0, 45.0)]
    found = combinations_in_box(frequencies, reach=3, f_max_per_mm=1.2)
    assert len(canonical(found)) == len(found)


def random_candidates(rng: np.random.Generator, *, reach: int = 3) -> tuple[np.ndarray, Candidates]:
    vectors = square(rng.uniform(3, 8), rng.uniform(0, 90))
    k, f = box([vectors], reach)
    # symmetric weights, some above one
    weight = rng.uniform(0.001, 1.3) * np.exp(-rng.uniform(0.3, 1.0) * np.hypot(*k.T))
    return vectors, Candidates(k.astype(np.int32), f, weight, NONE)


def everything(participants: list[Candidates]) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """(choice, F, weight) of every combination."""
    rows = []
    for choice in product(*[range(-1, len(p.weight)) for p in participants]):
        f, w = np.zeros(2), 1.0
        for i, p in zip(choice, participants, strict=True):
            if i >= 0:
                f = f + p.frequency_per_mm[i]
                w *= p.weight[i]
        rows.append((choice, f, w))
    return tuple(np.array([row[i] for row in rows]) for i in range(3))  # type: ignore[return-value]


@pytest.mark.parametrize("seed", range(6))
def test_weights_and_tiers_are_kept_to(seed: int) -> None:
    rng = np.random.default_rng(seed)
    participants = [random_candidates(rng, reach=2)[1] for _ in range(3)]
    tiers = [Tier(-1.0, 0.4, 1e-4), Tier(0.4, 1.5, 3e-3), Tier(1.5, 3.0, 2e-2)]
    choice, f, weight = everything(participants)
    speed = np.hypot(*f.T)
    due = np.zeros(len(speed), dtype=bool)
    for tier in tiers:
        due |= (speed > tier.low_per_mm) & (speed <= tier.high_per_mm) & (weight >= tier.floor)
    due &= (choice >= 0).sum(axis=1) >= 2
    found = combinations(participants, tiers)
    assert found.floors == tuple(tier.floor for tier in tiers)

    def orders(choice: np.ndarray) -> np.ndarray:
        padded = [np.concatenate([p.orders, np.zeros((1, 2), dtype=np.int32)]) for p in participants]
        return np.concatenate([p[choice[:, i]] for i, p in enumerate(padded)], axis=1)

    assert due.sum() > 10
    assert canonical(orders(found.choice)) == canonical(orders(choice[due]))
    assert len(found.choice) == due.sum() / 2


@pytest.mark.parametrize("seed", range(4))
def test_comb_folds_every_sum(seed: int) -> None:
    rng = np.random.default_rng(100 + seed)
    participants = [random_candidates(rng)[1] for _ in range(2)]
    comb = square(rng.uniform(7, 13), rng.uniform(0, 90))
    tiers = [Tier(-1.0, 0.5, 1e-3), Tier(0.5, 2.0, 1e-2)]
    choice, f, weight = everything(participants)
    due = set()
    for m, n in product(range(-9, 10), repeat=2):
        if (m, n) != (0, 0):
            speed = np.hypot(*(f + (m, n) @ comb).T)
            for tier in tiers:
                hit = (speed > tier.low_per_mm) & (speed <= tier.high_per_mm) & (weight >= tier.floor)
                hit &= (choice >= 0).any(axis=1)
                for row in choice[hit].tolist():
                    due.add((*row, m, n))
    found = combinations(participants, tiers, comb=comb)
    assert found.comb_order is not None
    together = {(*row, *order) for row, order in zip(found.choice.tolist(), found.comb_order.tolist(), strict=True)}
    assert len(together) == len(found.choice)
    # every combination once in either sign: the mirrored rows of the candidates stand in reverse
    size = [len(p.weight) for p in participants]

    def mirrored(row: tuple[int, ...]) -> tuple[int, ...]:
        *rows, m, n = row
        return (*(s - 1 - r if r >= 0 else -1 for s, r in zip(size, rows, strict=True)), -m, -n)

    assert len(due) == 2 * len(together)
    assert together | {mirrored(row) for row in together} == due


def test_floor_is_raised_when_it_is_too_much_work() -> None:
    rng = np.random.default_rng(5)
    participants = [random_candidates(rng)[1] for _ in range(4)]
    tier = Tier(-1.0, 1.0, 1e-9)
    free = combinations(participants, [tier])
    tight = combinations(participants, [tier], budget=500)
    assert free.floors == (1e-9,)
    assert tight.floors[0] > 1e-9
    # what is above the raised floor is all there
    assert len(tight.weight) == (free.weight >= tight.floors[0] * (1 - 1e-12)).sum()


@settings(deadline=None)
@given(st.integers(0, 2**32 - 1), st.floats(0.001, 3.0))
def test_near_pairs(seed: int, radius: float) -> None:
    rng = np.random.default_rng(seed)
    a, b = rng.uniform(-3, 3, (40, 2)), rng.normal(size=(60, 2))
    i, j = near_pairs(a, b, radius=radius)
    apart = np.hypot(*(a[:, None] - b[None, :]).transpose(2, 0, 1))
    assert set(zip(i.tolist(), j.tolist(), strict=True)) == set(
        zip(*map(np.ndarray.tolist, np.nonzero(apart <= radius)), strict=True)
    )
