"""Beats judged by an eye model outside the range it was published for."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from patterngen.model.evidence import Evidence
from patterngen.model.seeing import cycles_per_degree
from patterngen.model.verdict import Measurement
from patterngen.rules._beats import far_limits, slower_than_sheet
from patterngen.rules._examples import dots, preset
from patterngen.rules._measuring import idle
from patterngen.rules._words import listed, rounded, width
from patterngen.sources import source

SUMMARY = "the eye model was used where nobody published it"
REASON = """Every model of the eye was fitted to measurements between certain spatial frequencies.
Outside them its curve still gives a number, and that number is extrapolated. Where it decides about a
beat, this is said."""
MEASURES = """Cycles per degree, at the far distance, of every listed beat that is seen or nearly seen
there (a tenth of its limit and more), against the range that the model's file states."""
SOURCES = ("barten-1999", "watson-ahumada-2005", "mannos-sakrison-1974", "viewing-geometry")
LIMITS: tuple[str, ...] = ()
IDLE = "No beat is strong enough for the model's range to matter."

EXAMPLE_PASS = preset(dots("Cyan", angle="15 deg"), dots("Black", angle="25 deg"))
EXAMPLE_FAIL = preset(
    dots("Cyan", angle="15 deg"),
    dots("Black", angle="15.3 deg"),
    sheet={"size": ["70 mm", "50 mm"]},
    viewing={"distance": "350 mm", "far": "700 mm", "eye": "mannos-sakrison1974"},
)
_MATTERS = 0.1


def measure(evidence: Evidence) -> Iterator[Measurement]:
    """The beat that lies furthest below and the one furthest above the range, or the nearest to an end."""
    job = evidence.design.job
    if not evidence.eye_takes_light and job.origin.get("viewing.light", "default") != "default":
        yield idle(f"The eye model {job.viewing.eye} knows no luminance: viewing.light has no effect on it.")
    if evidence.eye_valid_cpd is None:
        yield idle(f"The range of the eye model {job.viewing.eye} is not known.")
        return
    table = evidence.beats
    frequency_per_mm = np.hypot(table.frequency_per_mm[:, 0], table.frequency_per_mm[:, 1])
    strong = table.visibility_far >= _MATTERS * far_limits(evidence)
    matters = np.flatnonzero(strong & ~slower_than_sheet(evidence))
    if not len(matters):
        return
    cpd = cycles_per_degree(frequency_per_mm[matters], distance_mm=job.viewing.far_mm)
    low, high = evidence.eye_valid_cpd
    for end, limit, at, worse in (
        ("below", low, int(np.argmin(cpd)), "slower"),
        ("above", high, int(np.argmax(cpd)), "finer"),
    ):
        row, value = int(matters[at]), float(cpd[at])
        who = listed(list(table.participants(row)))
        yield Measurement(
            value,
            limit,
            "cycles per degree",
            who,
            f"The beat of {who}, {width(float(table.period_mm[row]))} long, stands at {rounded(value)} "
            "cycles per degree; "
            f"{job.viewing.eye} is published from {rounded(low)} to {rounded(high)}, and no beat that "
            f"matters is {worse}.",
            source("viewing-geometry"),
            bad_when="below" if end == "below" else "above",
            worst="warn",
        )
