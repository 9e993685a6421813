"""Too much ink in one place."""

from __future__ import annotations

from collections.abc import Iterator

from patterngen.model.evidence import Evidence
from patterngen.model.verdict import Measurement
from patterngen.rules._examples import dots, preset, usual_set
from patterngen.rules._measuring import against, idle, no_limit
from patterngen.rules._words import listed, percent

SUMMARY = "more ink in one place than the sheet takes"
REASON = """Where the tones of all inks add up to too much, ink does not trap, does not dry and sets off
on the next sheet."""
MEASURES = """The sum of the printed tones (gain included) of all screens that print in one place, at the
worst place of the sheet."""
SOURCES = ("trade-total-ink",)
LIMITS = ("total_ink",)
IDLE = "No screen prints anything."

EXAMPLE_PASS = preset(*usual_set(), press={"process": "web-offset"})
EXAMPLE_FAIL = preset(
    dots("Cyan", angle="15 deg", tone="95 %"),
    dots("Magenta", angle="75 deg", tone="95 %"),
    dots("Yellow", angle="0 deg", tone="95 %"),
    dots("Black", angle="45 deg", tone="95 %"),
    press={"process": "web-offset"},
)


def measure(evidence: Evidence) -> Iterator[Measurement]:
    """The worst place."""
    if evidence.most_ink <= 0:
        yield idle(IDLE)
        return
    limit = evidence.limits.get("total_ink")
    if limit is None:
        yield no_limit(evidence, "total_ink")
        return
    names = [screen.name for screen in evidence.design.base.screens]
    parts = [
        f"{name} {percent(float(tone))}"
        for name, tone in zip(names, evidence.heaviest, strict=True)
        if tone > 0
    ]
    total = evidence.most_ink
    sum_of = f"{listed(parts)} make {percent(total)} in print" if len(parts) > 1 else f"{parts[0]} in print"
    yield against(
        limit,
        total,
        where="the heaviest place",
        message=f"At the heaviest place {sum_of}; the sheet takes {percent(limit.value)}.",
        bad_when="above",
    )
