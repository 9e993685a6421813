"""A ruling that the process does not usually print."""

from __future__ import annotations

from collections.abc import Iterator

from patterngen.model.evidence import Evidence
from patterngen.model.verdict import Measurement
from patterngen.rules._examples import dots, preset
from patterngen.rules._measuring import against, no_limit
from patterngen.rules._words import ruling

SUMMARY = "a ruling coarser or finer than the process usually prints"
REASON = """Each process and stock has rulings in everyday use. A coarser one shows its dots, a finer one
fills in and grows more; often the number is right and its unit is not. It warns and never fails: a
ruling is a choice."""
MEASURES = "The ruling of each screen with a lattice against the coarsest and the finest in use."
SOURCES = ("trade-rulings-by-paper", "trade-newsprint-rulings", "iso-12647-9-2021")
LIMITS = ("ruling_lowest", "ruling_highest")
IDLE = "No screen has a lattice."

EXAMPLE_PASS = preset(dots("Cyan", angle="45 deg"), press={"process": "sheetfed-offset"})
EXAMPLE_FAIL = preset(dots("Cyan", angle="45 deg", ruling="85 lpi"), press={"process": "metal-decoration"})


def measure(evidence: Evidence) -> Iterator[Measurement]:
    """Both ends for every screen with a lattice; the nearer end is reported."""
    lowest, highest = evidence.limits.get("ruling_lowest"), evidence.limits.get("ruling_highest")
    for screen in evidence.design.base.screens:
        if not len(screen.frequencies_per_mm):
            continue
        if lowest is None or highest is None:
            yield no_limit(evidence, "ruling_lowest" if lowest is None else "ruling_highest")
            return
        here = screen.ruling_per_mm
        low = here / lowest.value < highest.value / here
        text = (
            f"{screen.name} has {ruling(here)}; the process usually prints {ruling(lowest.value)} to "
            f"{ruling(highest.value)}."
        )
        yield against(
            lowest if low else highest,
            here,
            where=screen.name,
            message=text,
            bad_when="below" if low else "above",
            worst="warn",
        )
