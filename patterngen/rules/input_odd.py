"""What the gates put right or found odd in the preset and its artwork."""

from __future__ import annotations

from collections.abc import Iterator

from patterngen.model.evidence import Evidence
from patterngen.model.verdict import Measurement
from patterngen.rules._examples import dots, preset
from patterngen.sources import source

SUMMARY = "the preset or its artwork was odd, and was put right or taken as it stands"
REASON = """Some input is legal but seldom meant: a ruling that is plausible only in another unit, an
outline that crosses itself and was repaired, a picture that is blank. It is accepted, and said."""
MEASURES = "Each remark of the checks that read the preset and its artwork."
SOURCES = ("own-rule",)
LIMITS: tuple[str, ...] = ()
IDLE = "There is no input."

EXAMPLE_PASS = preset(dots("Cyan", angle="45 deg"))
EXAMPLE_FAIL = preset(dots("Cyan", angle="45 deg", ruling="150 /cm"))


def measure(evidence: Evidence) -> Iterator[Measurement]:
    """One warning for each remark."""
    remarks = evidence.design.job.remarks
    for remark in remarks:
        sentence = f"{remark.rstrip('.')}."
        yield Measurement(None, None, "", "the preset", sentence, source("own-rule"), worst="warn")
    if not remarks:
        yield Measurement(
            None,
            None,
            "",
            "the preset",
            "The preset and its artwork needed no remark.",
            source("own-rule"),
            worst="pass",
        )
