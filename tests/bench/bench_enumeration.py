"""How much quicker combinations are found than by trying all of them with numpy."""

from __future__ import annotations

import gc
from collections.abc import Callable
from time import perf_counter

import numpy as np

from tests.orders import combinations_by_order, combinations_in_box

F_MAX_PER_MM = 1.2
GOALS = {"four screens, order 4 an axis": 30.0, "seven screens, total order 8": 15.0}


def vectors(count: int) -> list[np.ndarray]:
    """Frequency vectors of `count` dot screens at 150 to 175 lpi, no two alike."""
    rng = np.random.default_rng(20)
    out = []
    for angle in np.deg2rad(np.linspace(3.0, 87.0, count) + rng.uniform(-2, 2, count)):
        ruling = rng.uniform(150, 175) / 25.4
        out.append(ruling * np.array([[np.cos(angle), np.sin(angle)], [-np.sin(angle), np.cos(angle)]]))
    return out


def every_in_box(frequencies: list[np.ndarray], *, reach: int, f_max_per_mm: float) -> np.ndarray:
    """All combinations of a box by trying each: half sums of both halves, added up in blocks."""
    axis = np.arange(-reach, reach + 1)
    half = len(frequencies) // 2
    sides = []
    for part in (frequencies[:half], frequencies[half:]):
        axes = sum(map(len, part))
        orders = np.stack(np.meshgrid(*[axis] * axes, indexing="ij"), axis=-1).reshape(-1, axes)
        sides.append((orders, orders @ np.concatenate(part)))
    (left, f_left), (right, f_right) = sides
    found = []
    for at in range(0, len(left), 64):
        x = f_left[at : at + 64, 0, None] + f_right[:, 0]
        y = f_left[at : at + 64, 1, None] + f_right[:, 1]
        i, j = np.nonzero(x * x + y * y <= f_max_per_mm**2)
        found.append(np.concatenate([left[at + i], right[j]], axis=1))
    return np.concatenate(found)


def every_by_order(frequencies: list[np.ndarray], *, total: int, f_max_per_mm: float) -> np.ndarray:
    """All combinations up to a total order by trying each: every vector of the ball, its frequency by one product."""
    axes = np.concatenate(frequencies)
    orders = _ball(len(axes), total)
    found = []
    for block in np.array_split(orders, max(1, len(orders) // 500_000)):
        f = block @ axes
        found.append(block[f[:, 0] ** 2 + f[:, 1] ** 2 <= f_max_per_mm**2])
    return np.concatenate(found).astype(np.int64)


def _ball(axes: int, total: int) -> np.ndarray:
    """All integer vectors whose moduli add up to at most `total`."""
    rows = np.zeros((1, 0), dtype=np.int8)
    left = np.array([total])
    for _ in range(axes):
        count = 2 * left + 1
        parent = np.repeat(np.arange(len(rows)), count)
        value = np.arange(len(parent)) - np.repeat(np.cumsum(count) - count, count) - left[parent]
        rows = np.concatenate([rows[parent], value[:, None].astype(np.int8)], axis=1)
        left = left[parent] - np.abs(value)
    return rows


def once(orders: np.ndarray) -> np.ndarray:
    """Sorted, k and -k as one, without zero."""
    orders = orders[orders.any(axis=1)]
    lead = orders[np.arange(len(orders)), np.argmax(orders != 0, axis=1)]
    return np.unique(orders * np.sign(lead)[:, None], axis=0)


def seconds(work: Callable[[], np.ndarray]) -> float:
    times = []
    for _ in range(5):
        gc.collect()
        start = perf_counter()
        work()
        times.append(perf_counter() - start)
    return float(np.median(times))


def run() -> list[tuple[str, ...]]:
    """Rows: what, combinations found, seconds each way, ratio, goal."""
    four, seven = vectors(4), vectors(7)
    cases: list[tuple[str, Callable[[], np.ndarray], Callable[[], np.ndarray]]] = [
        (
            "four screens, order 4 an axis",
            lambda: combinations_in_box(four, reach=4, f_max_per_mm=F_MAX_PER_MM),
            lambda: every_in_box(four, reach=4, f_max_per_mm=F_MAX_PER_MM),
        ),
        (
            "seven screens, total order 8",
            lambda: combinations_by_order(seven, total=8, f_max_per_mm=F_MAX_PER_MM),
            lambda: every_by_order(seven, total=8, f_max_per_mm=F_MAX_PER_MM),
        ),
    ]
    rows = []
    for name, quick, plain in cases:
        found = once(quick())
        if not np.array_equal(found, once(plain())):
            raise AssertionError(f"{name}: the two ways find different combinations")
        ours, theirs = seconds(quick), seconds(plain)
        rows.append(
            (
                name,
                f"{len(found)} combinations",
                f"{1000 * ours:.1f} ms against {1000 * theirs:.0f} ms",
                f"{theirs / ours:.0f} x",
                f"goal {GOALS[name]:.0f} x",
            )
        )
    return rows
