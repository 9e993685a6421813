"""Tolerances that the press will not hold."""

from __future__ import annotations

from collections.abc import Iterator

from patterngen.model.evidence import Evidence
from patterngen.model.verdict import Measurement
from patterngen.rules._examples import dots, preset
from patterngen.rules._measuring import against, idle, no_limit
from patterngen.rules._words import width

SUMMARY = "the register that the preset states is better than the process is trusted to hold"
REASON = """How far colour moves with register is worked out from the tolerances that the preset states.
Where they are better than the press's own, the figure is too rosy."""
MEASURES = "The register tolerance of [press] against the best that the process is trusted with."
SOURCES = ("trade-register",)
LIMITS = ("register_usual",)
IDLE = "No register tolerance is stated."

EXAMPLE_PASS = preset(
    dots("Cyan", angle="45 deg"), press={"process": "sheetfed-offset", "register": "0.05 mm"}
)
EXAMPLE_FAIL = preset(dots("Cyan", angle="45 deg"), press={"process": "web-offset", "register": "0.02 mm"})


def measure(evidence: Evidence) -> Iterator[Measurement]:
    """The stated register, if any."""
    register_mm = evidence.design.job.press.register_mm
    if register_mm <= 0:
        yield idle(IDLE)
        return
    limit = evidence.limits.get("register_usual")
    if limit is None:
        yield no_limit(evidence, "register_usual")
        return
    yield against(
        limit,
        register_mm,
        where="press.register",
        message=(
            f"A register of {width(register_mm)} is stated; the process is trusted with {width(limit.value)}."
        ),
        bad_when="below",
        worst="warn",
    )
