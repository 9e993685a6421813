"""Honest timing for every bench: the median of several rounds."""

from __future__ import annotations

import statistics
import time
from collections.abc import Callable

ROUNDS = 5


def median_seconds(work: Callable[[], object], rounds: int = ROUNDS) -> float:
    """Median wall-clock seconds of `work` over some rounds."""
    times = []
    for _ in range(rounds):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return statistics.median(times)
