"""Measurements against a limit of the process, and what to say where there is none."""

from __future__ import annotations

from typing import Literal

from patterngen.model.evidence import Evidence
from patterngen.model.screen import Screen
from patterngen.model.verdict import Limit, Measurement, Status
from patterngen.rules import _limits
from patterngen.sources import source


def against(
    limit: Limit,
    measured: float,
    *,
    where: str,
    message: str,
    bad_when: Literal["above", "below"],
    worst: Status | None = None,
) -> Measurement:
    """`measured` against one limit; how hard a breach counts follows from the limit's standing."""
    return Measurement(
        measured,
        limit.value,
        limit.unit,
        where,
        message,
        limit.source,
        bad_when=bad_when,
        worst=worst or _limits.worst(limit),
    )


def extremes(evidence: Evidence, screen: Screen) -> tuple[float, float]:
    """(least, largest) plate tone of a screen, zeros where it draws nothing."""
    return evidence.tone_extremes.get(screen.name) or (0.0, 0.0)


def no_limit(evidence: Evidence, name: str) -> Measurement:
    """The reason why a rule cannot judge: its limit is not known."""
    process = evidence.design.job.press.process
    meaning = _limits.KINDS[name].meaning
    reason = f"no figure is known for {process}" if process else "no process is stated"
    return idle(f"Not judged ({meaning}): {reason}. Set {name} in [press] to judge it.")


def idle(reason: str) -> Measurement:
    """The rule has nothing to judge, and says why."""
    return Measurement(None, None, "", "", reason, source("own-rule"), applies=False)
