"""Processor time: what a machine that is busy with other things does not change."""

from __future__ import annotations

import os
import time
from collections.abc import Iterator
from contextlib import contextmanager


@contextmanager
def at_most(seconds: float) -> Iterator[None]:
    """Fails when this process and its finished children spend more processor time than that."""
    before = _spent()
    yield
    spent = _spent() - before
    assert spent < seconds, f"{spent:.2f} s of processor time, at most {seconds:g} s"


def _spent() -> float:
    times = os.times()
    return time.process_time() + times.children_user + times.children_system
