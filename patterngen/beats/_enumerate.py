"""All combinations of orders whose frequencies nearly cancel: exact, by meeting in the middle.

Each participant offers order vectors, each with a frequency vector and a *weight* (a bound
on what it multiplies the amplitude by).  Wanted is every choice of one vector a participant
(or none: weight 1) with |sum of frequencies| <= f and product of weights >= floor.

Two ideas keep this small.  A partial sum is only worth keeping while what is still to come
can bring its frequency back near zero *and* leave enough weight: `_outweigh` tabulates the
largest weight with which a set of participants can still travel a given length.  And the
two halves of the participants meet in cells of the frequency plane, strongest first.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from patterngen.model.lattice import FloatArray

IndexArray = NDArray[np.intp]
OrderArray = NDArray[np.int32]

_LENGTH_STEPS = 160
_WEIGHT_BUCKET = 4.0


@dataclass(frozen=True, slots=True, eq=False)
class Candidates:
    """What one participant may contribute, without "nothing" (order zero, weight 1).

    `orders` (m, d), `frequency_per_mm` (m, 2), `weight` (m,) > 0; k and -k both listed.
    `unlisted` (r, 2) holds rows (length, weight): no order that is not listed and is at
    least `length` cycles/mm long weighs more than `weight`; first row: the shortest.
    """

    orders: OrderArray
    frequency_per_mm: FloatArray
    weight: FloatArray
    unlisted: FloatArray


@dataclass(frozen=True, slots=True)
class Tier:
    """Combinations with low < |frequency| <= high (cycles/mm) and a weight of at least `floor`."""

    low_per_mm: float
    high_per_mm: float
    floor: float


@dataclass(frozen=True, slots=True, eq=False)
class Combinations:
    """`choice` (h, participants): row of each participant's candidates, -1 for none.

    k and -k are one: the first participant that takes part has a positive leading order.
    `comb_order` (h, 2) is filled when sums were folded by a comb.  `floors` are those that
    were kept to, one a tier (raised when the work would have passed the budget).
    """

    choice: NDArray[np.int32]
    frequency_per_mm: FloatArray
    weight: FloatArray
    comb_order: OrderArray | None
    floors: tuple[float, ...]


class _TooMuchError(Exception):
    """More partial sums than the budget allows."""


# --- how far a set of participants can travel, and with what weight ------------------------


class Travel:
    """Tables of the largest weight with which participants can travel at least a length.

    Lengths are in steps of `step_per_mm`; entry g of a table bounds the product of weights
    of any choice whose lengths add up to g steps or more.  Tables are decreasing.
    """

    def __init__(self, participants: Sequence[Candidates]) -> None:
        lengths = [np.hypot(p.frequency_per_mm[:, 0], p.frequency_per_mm[:, 1]) for p in participants]
        longest = max((float(length.max()) for length in lengths if len(length)), default=1.0)
        self.step_per_mm = max(longest, 1e-9) / (_LENGTH_STEPS - 2)
        g = np.arange(_LENGTH_STEPS)
        self._back = np.maximum(g[:, None] - g[None, :], 0)
        self.single = [self._survival(p, length) for p, length in zip(participants, lengths, strict=True)]
        self.none = np.zeros(_LENGTH_STEPS)
        self.none[0] = 1.0

    def _survival(self, candidates: Candidates, length: FloatArray) -> FloatArray:
        table = np.zeros(_LENGTH_STEPS)
        table[0] = 1.0
        at = np.minimum(np.ceil(length / self.step_per_mm), _LENGTH_STEPS - 1).astype(np.intp)
        np.maximum.at(table, at, candidates.weight)
        if len(candidates.unlisted):
            # from one bound's length on to the next the earlier, larger one holds
            starts = candidates.unlisted[:, 0]
            ends = np.append(starts[1:], np.inf)
            last = np.minimum(np.ceil(ends / self.step_per_mm), _LENGTH_STEPS - 1).astype(np.intp)
            np.maximum.at(table, last, candidates.unlisted[:, 1])
        return np.maximum.accumulate(table[::-1])[::-1]

    def join(self, a: FloatArray, b: FloatArray) -> FloatArray:
        """The table of two sets together."""
        return np.asarray((a[None, :] * b[self._back]).max(axis=1))

    def all_but(self) -> list[FloatArray]:
        """For each participant, the table of all the others."""
        n = len(self.single)
        before, after = [self.none], [self.none]
        for i in range(n):
            before.append(self.join(before[-1], self.single[i]))
            after.append(self.join(after[-1], self.single[n - 1 - i]))
        return [self.join(before[i], after[n - 1 - i]) for i in range(n)]

    def at(self, table: FloatArray, length_per_mm: ArrayLike) -> FloatArray:
        """Table values for lengths (never too small)."""
        g = np.clip(np.asarray(length_per_mm) / self.step_per_mm, 0, _LENGTH_STEPS - 1)
        return np.asarray(table[g.astype(np.intp)])

    def need(self, table: FloatArray, tiers: Sequence[Tier]) -> FloatArray:
        """For a partial sum of length g steps: 1 / the weight it must have to matter in some tier."""
        g = np.arange(_LENGTH_STEPS) * self.step_per_mm
        return np.asarray(np.maximum.reduce([self.at(table, g - tier.high_per_mm) / tier.floor for tier in tiers]))


# --- partial sums --------------------------------------------------------------------------


@dataclass(frozen=True, slots=True, eq=False)
class _Sums:
    """Partial sums of one half, with the way back to the choices that made them."""

    x: FloatArray
    y: FloatArray
    weight: FloatArray
    sign: NDArray[np.int8]
    parents: tuple[NDArray[np.int32], ...]
    elements: tuple[NDArray[np.int32], ...]

    def choices(self, rows: IndexArray) -> NDArray[np.int32]:
        """(len(rows), participants of this half): candidate rows, -1 for none."""
        out = np.empty((len(rows), len(self.parents)), dtype=np.int32)
        at = rows.astype(np.int32)
        for step in range(len(self.parents) - 1, -1, -1):
            out[:, step] = self.elements[step][at]
            at = self.parents[step][at]
        return out


def _spread(count: NDArray[np.intp]) -> tuple[IndexArray, IndexArray]:
    """Row i repeated count[i] times, and 0..count[i]-1 beside it."""
    ends = np.cumsum(count)
    row = np.repeat(np.arange(len(count)), count)
    return row, np.arange(len(row)) - np.repeat(ends - count, count)


def _leading_sign(orders: OrderArray) -> NDArray[np.int8]:
    """Sign of the first order that is not zero, for each row."""
    first = np.argmax(orders != 0, axis=1)
    return np.asarray(np.sign(orders[np.arange(len(orders)), first]), dtype=np.int8)


def _grow(
    half: Sequence[Candidates], needs: Sequence[FloatArray], *, step_per_mm: float, one_sign: bool, budget: int
) -> _Sums:
    x, y, weight = np.zeros(1), np.zeros(1), np.ones(1)
    sign = np.zeros(1, dtype=np.int8)
    parents: list[NDArray[np.int32]] = []
    elements: list[NDArray[np.int32]] = []
    for candidates, need in zip(half, needs, strict=True):
        order = np.argsort(-candidates.weight, kind="stable")
        offered = candidates.weight[order]
        cx, cy = candidates.frequency_per_mm[order, 0], candidates.frequency_per_mm[order, 1]
        csign = _leading_sign(candidates.orders)[order] if len(order) else np.zeros(0, dtype=np.int8)
        # with a comb a longer sum may need less
        enough = weight * need.max()
        count = _how_many(offered, enough)
        if int(count.sum()) > 8 * budget:
            raise _TooMuchError
        row, at = _spread(count)
        new_x, new_y, new_weight = x[row] + cx[at], y[row] + cy[at], weight[row] * offered[at]
        length = np.minimum(np.sqrt(new_x**2 + new_y**2) / step_per_mm, _LENGTH_STEPS - 1).astype(np.intp)
        keep = new_weight * need[length] >= 1.0
        new_sign = np.where(sign[row] != 0, sign[row], csign[at])
        if one_sign:
            keep &= new_sign > 0
        kept = np.flatnonzero(keep)
        length = np.minimum(np.sqrt(x**2 + y**2) / step_per_mm, _LENGTH_STEPS - 1).astype(np.intp)
        stay = np.flatnonzero(weight * need[length] >= 1.0)
        x, y = np.concatenate([x[stay], new_x[kept]]), np.concatenate([y[stay], new_y[kept]])
        weight = np.concatenate([weight[stay], new_weight[kept]])
        sign = np.concatenate([sign[stay], new_sign[kept]])
        parents.append(np.concatenate([stay, row[kept]]).astype(np.int32))
        elements.append(np.concatenate([np.full(len(stay), -1), order[at[kept]]]).astype(np.int32))
        if len(x) > budget:
            raise _TooMuchError
    return _Sums(x, y, weight, sign, tuple(parents), tuple(elements))


def _how_many(offered: FloatArray, enough: FloatArray) -> NDArray[np.intp]:
    """How many of the weights (decreasing) times `enough` reach 1."""
    with np.errstate(divide="ignore"):
        least = np.where(enough > 0, 1.0 / enough, np.inf)
    return np.asarray(np.searchsorted(-offered, -least * (1 - 1e-12), side="right"))


# --- the halves meet -----------------------------------------------------------------------


class _Cells:
    """Points sorted into square cells of the plane, for range searches."""

    def __init__(self, x: FloatArray, y: FloatArray, *, radius: float) -> None:
        self.x0, self.y0 = float(x.min()), float(y.min())
        wide, high = float(x.max()) - self.x0, float(y.max()) - self.y0
        self.cell = max(radius, (max(wide, radius) * max(high, radius) / (2.0 * len(x) + 64.0)) ** 0.5, 1e-300)
        self.columns = int(wide / self.cell) + 4
        self.rows = int(high / self.cell) + 4
        key = self._index(y, self.y0) * self.columns + self._index(x, self.x0)
        self.order = np.argsort(key, kind="stable")
        self.key = key[self.order]
        self.x, self.y = x[self.order], y[self.order]

    def _index(self, v: FloatArray, v0: float) -> IndexArray:
        return np.asarray((v - v0) / self.cell + 1.0).astype(np.intp)

    def pairs(
        self, x: FloatArray, y: FloatArray, *, radius: float, chosen: NDArray[np.bool_] | None, budget: int
    ) -> tuple[IndexArray, IndexArray]:
        """(query row, point row) with |query - point| <= radius; `chosen` points (sorted order) only."""
        if chosen is None:
            key, px, py, back = self.key, self.x, self.y, self.order
        else:
            key, px, py, back = self.key[chosen], self.x[chosen], self.y[chosen], self.order[chosen]
        start = np.zeros(self.rows * self.columns + 1, dtype=np.intp)
        np.cumsum(np.bincount(key, minlength=self.rows * self.columns), out=start[1:])
        u, v = (x - self.x0) / self.cell + 1.0, (y - self.y0) / self.cell + 1.0
        near = np.flatnonzero((u >= 0) & (u < self.columns - 1) & (v >= 0) & (v < self.rows - 1))
        i, j = u[near].astype(np.intp), v[near].astype(np.intp)
        query, lows, counts = [], [], []
        for step in (-1, 0, 1):
            base = (j + step) * self.columns + i
            low = start[np.maximum(base - 1, 0)]
            high = start[np.clip(base + 2, 0, len(start) - 1)]
            some = np.flatnonzero(high > low)
            query.append(near[some])
            lows.append(low[some])
            counts.append((high - low)[some])
        count = np.concatenate(counts)
        if int(count.sum()) > 16 * budget:
            raise _TooMuchError
        row, at = _spread(count)
        q = np.concatenate(query)[row]
        p = np.concatenate(lows)[row] + at
        close = np.flatnonzero((x[q] - px[p]) ** 2 + (y[q] - py[p]) ** 2 <= radius * radius)
        return q[close], back[p[close]]


def near_pairs(a: FloatArray, b: FloatArray, *, radius: float, budget: int = 1 << 24) -> tuple[IndexArray, IndexArray]:
    """Rows (i, j) with |a[i] - b[j]| <= radius, for points (n, 2) and (m, 2)."""
    if not len(a) or not len(b):
        return np.zeros(0, dtype=np.intp), np.zeros(0, dtype=np.intp)
    cells = _Cells(b[:, 0], b[:, 1], radius=radius)
    return cells.pairs(a[:, 0], a[:, 1], radius=radius, chosen=None, budget=budget)


def _fold(x: FloatArray, y: FloatArray, comb: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Sums moved into the comb's cell about zero."""
    inverse = np.linalg.inv(comb)
    points = np.column_stack([x, y])
    points = points - np.rint(points @ inverse) @ comb
    return points[:, 0], points[:, 1]


def _images(x: FloatArray, y: FloatArray, comb: FloatArray, radius: float) -> tuple[FloatArray, FloatArray, IndexArray]:
    """Folded points with the copies of those that lie within `radius` of the cell's edge."""
    inverse = np.linalg.inv(comb)
    margin = radius * np.sqrt((inverse**2).sum(axis=0)) + 1e-9
    reach = np.ceil(margin + 0.5).astype(int)
    u = np.column_stack([x, y]) @ inverse
    rows, xs, ys = [], [], []
    for m in range(-reach[0], reach[0] + 1):
        for n in range(-reach[1], reach[1] + 1):
            inside = np.flatnonzero((np.abs(u[:, 0] + m) <= 0.5 + margin[0]) & (np.abs(u[:, 1] + n) <= 0.5 + margin[1]))
            moved = (u[inside] + (m, n)) @ comb
            rows.append(inside)
            xs.append(moved[:, 0])
            ys.append(moved[:, 1])
    return np.concatenate(xs), np.concatenate(ys), np.concatenate(rows)


def _meet(
    left: _Sums, right: _Sums, tier: Tier, needs: tuple[FloatArray, FloatArray], *,
    step_per_mm: float, comb: FloatArray | None, budget: int,
) -> tuple[IndexArray, IndexArray, FloatArray]:  # fmt: skip
    """Pairs of half sums of one tier: (left rows, right rows, frequencies (h, 2))."""
    kept = []
    for sums, need in ((left, needs[0]), (right, needs[1])):
        length = np.minimum(np.sqrt(sums.x**2 + sums.y**2) / step_per_mm, _LENGTH_STEPS - 1).astype(np.intp)
        kept.append(np.flatnonzero(sums.weight * need[length] >= 1.0))
    a, b = kept
    empty = np.zeros(0, dtype=np.intp)
    if not len(a) or not len(b):
        return empty, empty, np.zeros((0, 2))
    radius = tier.high_per_mm
    ax, ay, bx, by = left.x[a], left.y[a], right.x[b], right.y[b]
    if comb is not None:
        ax, ay = _fold(ax, ay, comb)
        bx, by = _fold(bx, by, comb)
        ax, ay, again = _images(ax, ay, comb, radius)
        a = a[again]
    cells = _Cells(bx, by, radius=radius)
    weight_a, weight_b = left.weight[a], right.weight[b]
    sorted_weight_b = weight_b[cells.order]
    by_weight = np.argsort(-weight_a, kind="stable")
    descending = weight_a[by_weight]
    heaviest, lightest = float(weight_b.max()), float(weight_b.min())
    rows_a, rows_b, frequency = [], [], []
    at = 0
    while at < len(by_weight):
        top = float(descending[at])
        if top * heaviest < tier.floor * (1 - 1e-12):
            break
        # down to floor / lightest every right sum is allowed: no need for a smaller bucket
        bottom = min(tier.floor / lightest, top / _WEIGHT_BUCKET)
        end = max(int(np.searchsorted(-descending, -bottom, side="right")), at + 1)
        bucket = by_weight[at:end]
        at = end
        chosen = sorted_weight_b * top >= tier.floor * (1 - 1e-12)
        if not chosen.any():
            continue
        q, p = cells.pairs(
            -ax[bucket], -ay[bucket], radius=radius, chosen=None if chosen.all() else chosen, budget=budget
        )
        q = bucket[q]
        fx, fy = ax[q] + bx[p], ay[q] + by[p]
        inside = fx**2 + fy**2 > tier.low_per_mm * abs(tier.low_per_mm)
        # with nothing on the left the right alone decides which of k and -k is kept
        inside &= (left.sign[a[q]] != 0) | (right.sign[b[p]] > 0)
        good = np.flatnonzero(inside & (weight_a[q] * weight_b[p] >= tier.floor * (1 - 1e-12)))
        rows_a.append(a[q[good]])
        rows_b.append(b[p[good]])
        frequency.append(np.column_stack([fx[good], fy[good]]))
        if sum(map(len, rows_a)) > budget:
            raise _TooMuchError
    if not rows_a:
        return empty, empty, np.zeros((0, 2))
    return np.concatenate(rows_a), np.concatenate(rows_b), np.concatenate(frequency)


def combinations(
    participants: Sequence[Candidates], tiers: Sequence[Tier], *, comb: FloatArray | None = None,
    budget: int = 1_500_000, least: int = 2,
) -> Combinations:  # fmt: skip
    """Every combination of at least `least` participants that belongs to a tier.

    With `comb` (2, 2), the comb's two frequency vectors, sums are folded into its cell and
    only combinations in which the comb takes part (as one of the `least`) are returned.
    A tier's floor is doubled while it would take more than `budget` partial sums or hits.
    """
    if not participants or not tiers:
        return Combinations(
            np.zeros((0, len(participants)), dtype=np.int32), np.zeros((0, 2)), np.zeros(0),
            None if comb is None else np.zeros((0, 2), dtype=np.int32), tuple(t.floor for t in tiers),
        )  # fmt: skip
    tiers = list(tiers)
    by_size = sorted(range(len(participants)), key=lambda i: -len(participants[i].weight))
    sides: tuple[list[int], list[int]] = ([], [])
    sizes = [0.0, 0.0]
    for i in by_size:
        side = int(sizes[1] < sizes[0])
        sides[side].append(i)
        sizes[side] += float(np.log(len(participants[i].weight) + 1.0))
    # inside a half the short lists first: less is carried along
    halves = [sorted(side, key=lambda i: len(participants[i].weight)) for side in sides]
    # the first to take part decides the sign, so the left half must hold what is named first
    travel = Travel(participants)
    totals = [travel.none, travel.none]
    for side in (0, 1):
        for i in halves[side]:
            totals[side] = travel.join(totals[side], travel.single[i])
    rest: tuple[list[FloatArray], list[FloatArray]] = ([], [])
    for side in (0, 1):
        after = totals[1 - side]
        tables = []
        for i in reversed(halves[side]):
            tables.append(after)
            after = travel.join(after, travel.single[i])
        rest[side].extend(reversed(tables))

    while True:
        try:
            needs = [[_need(travel, table, tiers, comb) for table in rest[side]] for side in (0, 1)]
            left = _grow(
                [participants[i] for i in halves[0]], needs[0],
                step_per_mm=travel.step_per_mm, one_sign=True, budget=budget,
            )  # fmt: skip
            right = _grow(
                [participants[i] for i in halves[1]], needs[1],
                step_per_mm=travel.step_per_mm, one_sign=False, budget=budget,
            )  # fmt: skip
            break
        except _TooMuchError:
            lowest = min(tier.floor for tier in tiers)
            tiers = [replace(tier, floor=max(tier.floor, 2.0 * lowest)) for tier in tiers]
    choices, frequency, weights = [], [], []
    for number, tier in enumerate(tiers):
        while True:
            pair = (_need(travel, totals[1], [tier], comb), _need(travel, totals[0], [tier], comb))
            try:
                a, b, f = _meet(left, right, tier, pair, step_per_mm=travel.step_per_mm, comb=comb, budget=budget)
                break
            except _TooMuchError:
                tier = tiers[number] = replace(tier, floor=2.0 * tier.floor)
        choice = np.full((len(a), len(participants)), -1, dtype=np.int32)
        choice[:, halves[0]] = left.choices(a)
        choice[:, halves[1]] = right.choices(b)
        choices.append(choice)
        frequency.append(f)
        weights.append(left.weight[a] * right.weight[b])
    choice, f, weight = np.concatenate(choices), np.concatenate(frequency), np.concatenate(weights)
    taking_part = (choice >= 0).sum(axis=1)
    comb_order = None
    if comb is None:
        keep = taking_part >= least
    else:
        total = np.zeros_like(f)
        for i, candidates in enumerate(participants):
            rows = np.flatnonzero(choice[:, i] >= 0)
            total[rows] += candidates.frequency_per_mm[choice[rows, i]]
        comb_order = np.rint((f - total) @ np.linalg.inv(comb)).astype(np.int32)
        keep = (taking_part + 1 >= least) & comb_order.any(axis=1) & (taking_part >= 1)
        comb_order = comb_order[keep]
    return Combinations(choice[keep], f[keep], weight[keep], comb_order, tuple(t.floor for t in tiers))


def _need(travel: Travel, table: FloatArray, tiers: Sequence[Tier], comb: FloatArray | None) -> FloatArray:
    """What a partial sum must weigh; a comb brings any sum back, so with one only the weight counts."""
    if comb is None:
        return travel.need(table, tiers)
    near = np.array([comb[0], comb[1], comb[0] + comb[1], comb[0] - comb[1]])
    shortest = float(np.hypot(near[:, 0], near[:, 1]).min())
    g = np.arange(_LENGTH_STEPS)
    # a sum must first get as far as the nearest comb point; g + 1: the sum may be that much longer
    to_go = np.stack([shortest - tier.high_per_mm - (g + 1) * travel.step_per_mm for tier in tiers])
    floors = np.array([tier.floor for tier in tiers])[:, None]
    return np.asarray((travel.at(table, to_go) / floors).max(axis=0))
