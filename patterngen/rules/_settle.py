"""Writes a derived value into a job, with its origin and its reason."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from patterngen.model.job import Job, ScreenRequest
from patterngen.model.verdict import Derived

WITHOUT_LATTICE = frozenset({"stochastic"})
"""Screen kinds that have neither ruling nor angle."""


def is_open(screen: ScreenRequest, key: str, value: object) -> bool:
    """Whether a rule may derive that preset key: it is missing, and not left to the search by "choose"."""
    return value is None and key not in screen.params.get("choose", ())


def has_lattice(screen: ScreenRequest) -> bool:
    """Whether the kind of screen has a ruling and an angle."""
    return screen.kind not in WITHOUT_LATTICE


def settle(
    job: Job, screen: ScreenRequest, field: str, *, value: Any, shown: str, key: str, by: str, because: str
) -> Job:
    """The job with `field` of one screen set to `value`; `shown` is how a preset would write it under "
    "`key`."""
    path = f"screen.{screen.name}.{key}"
    screens = tuple(replace(s, **{field: value}) if s.name == screen.name else s for s in job.screens)
    return replace(
        job,
        screens=screens,
        origin={**job.origin, path: f"rule {by}"},
        derived=(*job.derived, Derived(path, shown, by, because)),
    )
