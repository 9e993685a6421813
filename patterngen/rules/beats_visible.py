"""Beats that are seen where nobody wants them."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from patterngen.model.evidence import Evidence
from patterngen.model.screen import Screen
from patterngen.model.verdict import BeatTable, Measurement
from patterngen.rules._angles import screens_apart_deg
from patterngen.rules._beats import far_limits, patterns, slower_than_sheet
from patterngen.rules._examples import dots, preset, usual_set
from patterngen.rules._words import degrees, listed, percent, rounded, width
from patterngen.sources import source

SUMMARY = "screens together make a pattern that is seen from where the print must look even"
REASON = """Two or more screens make every sum and difference of their frequencies, and the coarse ones
are seen as bands, patches or a coarse rosette. At the reading distance the rosette that everybody
accepts stands as far above threshold as a beat that spoils the job; at twice that distance dots and
rosettes have melted and what is still seen is a fault. So a beat is judged there: up to 1 mm it may
reach four times the threshold of the eye model, longer ones may only reach the threshold itself."""
MEASURES = """Contrast of each beat over the threshold contrast of the eye model, at the far distance of
[viewing]; limit and limit_coarse stand there too. Combinations that are not listed are bounded, and the
bound is judged as well. Contrast is that of infinite extent, with the screens exactly as designed."""
SOURCES = (
    "calibration-on-practice",
    "barten-1999",
    "beat-period-formula",
    "shadow-calibration",
    "trade-textbook-midtones",
)
LIMITS = ("shadow",)
_SAME_RULING, _LARGEST_TURN_DEG = 1e-3, 8.0
"""A cure keeps the ruling, and turns a screen by so much at the most."""
IDLE = "Fewer than two screens or grids: nothing can beat."

EXAMPLE_PASS = preset(*usual_set())
EXAMPLE_FAIL = preset(dots("Cyan", angle="15 deg"), dots("Black", angle="20 deg", tone="30 %"))


def measure(evidence: Evidence) -> Iterator[Measurement]:
    """Each visible pattern, or else the strongest beat, in times the threshold at the far distance."""
    table = evidence.beats
    viewing = evidence.design.job.viewing
    said = source("calibration-on-practice")
    limits, slow = far_limits(evidence), slower_than_sheet(evidence)
    seen = [row for row in range(len(table)) if table.grade[row] == "visible" and not slow[row]]
    if len(table.slots) < 2:
        return
    for rows in patterns(table, seen, table.visibility_far / limits):
        row = rows[0]
        limit, judged = float(limits[row]), float(table.visibility_far_judged[row])
        spared, measured = judged < limit, float(table.visibility_far[row])
        remark = _in_shadow(evidence, row, judged) if judged < 0.98 * measured else ""
        yield Measurement(
            measured,
            limit,
            "times threshold",
            listed(list(table.participants(row))),
            " ".join(filter(None, (_sentence(evidence, rows, measured / limit), remark, _advice(evidence, row)))),
            source("shadow-calibration") if spared else said,
            worst="warn" if spared else "fail",
        )
    if seen:
        return
    calm = [row for row in range(len(table)) if not slow[row]]
    if calm:
        row = max(calm, key=lambda r: table.visibility_far[r] / limits[r])
        who = listed(list(table.participants(row)))
        yield Measurement(
            float(table.visibility_far[row]),
            float(limits[row]),
            "times threshold",
            who,
            f"The strongest beat is that of {who}, {width(float(table.period_mm[row]))} wide: "
            f"{rounded(float(table.visibility_far[row]))} times the threshold at "
            f"{rounded(viewing.far_mm, digits=3)} mm, "
            f"{rounded(float(table.visibility_far[row] / limits[row]))} of the limit.",
            said,
        )
    for bound, limit, which in (
        (table.bound_visibility_far, viewing.limit, "up to 1 mm"),
        (table.bound_visibility_far_coarse, viewing.limit_coarse, "over 1 mm"),
    ):
        yield Measurement(
            bound,
            limit,
            "times threshold",
            f"beats {which} that are not listed",
            f"No combination with a period {which} that is not listed can exceed {rounded(bound)} times the "
            f"threshold at {rounded(viewing.far_mm, digits=3)} mm.",
            said,
            worst="warn",
        )


def _in_shadow(evidence: Evidence, row: int, judged: float) -> str:
    """Why a beat counts less than it is strong."""
    table = evidence.beats
    share = float(table.mean[row, 1]) / evidence.paper_y
    return (
        f"That is at its strongest, in tones of {rounded(100 * share)} % of the paper's luminance; shadows below "
        f"{rounded(100 * evidence.limits['shadow'].value)} % count less in proportion, so it is judged as "
        f"{rounded(judged)} times the threshold."
    )


def _sentence(evidence: Evidence, rows: list[int], over: float) -> str:
    table = evidence.beats
    row = rows[0]
    order = {screen.name: place for place, screen in enumerate(evidence.design.base.screens)}
    tones = [percent(float(table.tones[row, order[name]])) for name in table.participants(row) if name in order]
    who = listed(list(table.participants(row)))
    where = listed([degrees(_band_deg(table, r)) for r in sorted(rows, key=lambda r: _band_deg(table, r))])
    much = f"{rounded(over)} times over the limit" if over >= 1.05 else "just over the limit"
    return (
        f"{who} make bands {width(float(table.period_mm[row]))} wide, running at {where}, {much} "
        f"(at {listed(tones)})."
    )


def _band_deg(table: BeatTable, row: int) -> float:
    """Direction of the bands, at right angles to the frequency vector, 0 to 180."""
    fx, fy = table.frequency_per_mm[row]
    turned = float(np.rad2deg(np.arctan2(fy, fx)) + 90.0) % 180.0
    return 0.0 if round(turned, 1) >= 180.0 else turned


def _advice(evidence: Evidence, row: int) -> str:
    """What to change in general."""
    names = list(evidence.beats.participants(row))
    grids = {grid.name for grid in evidence.design.grids}
    of = {screen.name: screen for screen in evidence.design.base.screens}
    inked = [of[name] for name in names if name in of]
    if any(name in grids for name in names):
        return (
            f"{listed([n for n in names if n in grids])} takes part, which cannot be turned: "
            f"turn {listed([screen.name for screen in inked])} by 7.5 degrees or change the ruling."
        )
    if len(inked) == 2:
        a, b = inked
        off = screens_apart_deg(a, b)
        if off < 29.5:
            return (
                f"They stand {degrees(off)} apart: bring them to 30 degrees (two inks alone: 45), "
                "or give them clearly different rulings."
            )
        if min(abs(off - usual) for usual in (30.0, 45.0)) > 0.5:
            return f"They stand {degrees(off)} apart and meet in a higher order: 30 or 45 degrees keep clear of it."
        return (
            f"They stand {degrees(off)} apart and meet in a higher order. {_HIGHER_ORDER}"
        )
    return _cure(evidence, row, inked)


_HIGHER_ORDER = (
    "Such beats are strong only in tones like these: lighten one of the inks there, or change one ruling and "
    "look again."
)


def _cure(evidence: Evidence, row: int, inked: list[Screen]) -> str:
    """The one screen whose turn would make the combination cancel exactly, where there is one."""
    names = {screen.name for screen in inked}
    if any(balance.exact and set(balance.names) == names for balance in evidence.balance):
        return f"These are in exact balance as they should be; this is a higher order of them. {_HIGHER_ORDER}"
    part = evidence.beats.participants(row)
    total = evidence.beats.frequency_per_mm[row]
    changes = []
    for screen in inked:
        own = np.array(part[screen.name]) @ screen.frequencies_per_mm
        wanted = own - total
        ratio = complex(*wanted) / complex(*own)
        changes.append((float(np.rad2deg(np.angle(ratio))), abs(ratio), screen))
    turn_deg, stretch, screen = min(changes, key=lambda change: abs(change[1] - 1.0))
    if abs(turn_deg) > _LARGEST_TURN_DEG or abs(stretch - 1.0) > _SAME_RULING:
        return (
            "Three screens or more that nearly cancel make slow bands. Move one of them well away, by angle or by "
            "ruling; or set all three so that they cancel exactly, as 15, 45 and 75 degrees at one ruling do."
        )
    return (
        "Three screens or more that nearly cancel make slow bands. "
        f"They would cancel exactly, and leave only balance, with {screen.name} at "
        f"{degrees((screen.angle_deg + turn_deg) % 180.0)}; "
        "or move one of them well away, by angle or by ruling."
    )
