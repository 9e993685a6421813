"""Colour that moves with register."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from patterngen.model.evidence import Evidence
from patterngen.model.verdict import Balance, Measurement
from patterngen.rules._beats import patterns, slower_than_sheet
from patterngen.rules._examples import dots, preset
from patterngen.rules._words import listed, rounded, width

SUMMARY = "the mean colour moves with register, from sheet to sheet or across the sheet"
REASON = """Where frequencies of several screens cancel, as in 15/45/75 at one ruling, there are no
bands: the mean colour itself depends on how the screens lie on each other, dot-centred or clear-centred,
and it moves whenever register moves. Two inks at one angle and ruling are the same case, dot on dot or
dot beside dot, only far stronger. A beat slower than the sheet, and any beat over 2 mm, shows as
shading: the eye model forgives slow shading, but it is colour that moves from sheet to sheet."""
MEASURES = """CIEDE2000 between the extremes over all registers, for each group of screens in balance and
for each beat longer than 2 mm. What the press's register can reach of it and how slowly its angle and
size errors make it drift stand beside it."""
SOURCES = (
    "colour-swing-limits",
    "balance-drift",
    "trade-same-angle",
    "trade-rosette-centres",
    "amidror-stability",
    "shadow-calibration",
)
LIMITS = ("drift_warn", "drift_fail", "shadow")
IDLE = "Fewer than two screens: nothing can move against anything."

EXAMPLE_PASS = preset(
    dots("Cyan", angle="45 deg", tone="20 %"), dots("Yellow", angle="0 deg"), dots("Black", angle="75 deg")
)
EXAMPLE_FAIL = preset(dots("Magenta", angle="45 deg"), dots("Black", angle="45 deg"))


def measure(evidence: Evidence) -> Iterator[Measurement]:
    """Colour swing of every balance and of every slow beat."""
    for balance in evidence.balance:
        sentence = _balance_sentence(evidence, balance)
        swings = (balance.colour_swing, balance.colour_swing_judged)
        yield _against_both(evidence, *swings, listed(balance.names), sentence)
    table = evidence.beats
    slow = [
        int(row) for row in np.flatnonzero(np.isfinite(table.colour_swing) & ~slower_than_sheet(evidence))
    ]
    for rows in patterns(table, slow, table.colour_swing_judged):
        who = listed(list(table.participants(rows[0])))
        swing, judged = float(table.colour_swing[rows[0]]), float(table.colour_swing_judged[rows[0]])
        yield _against_both(
            evidence,
            swing,
            judged,
            who,
            f"{who} shade the print in waves {width(float(table.period_mm[rows[0]]))} long; "
            f"from crest to trough the colour moves by {rounded(swing)} CIEDE2000{_counted(swing, judged)}.",
        )
    if len(table.slots) > 1 and not evidence.balance and not slow:
        text = (
            "No screens are in balance and no beat is longer than 2 mm: colour does not move with register."
        )
        yield _against_both(evidence, 0.0, 0.0, "all screens", text)


def _against_both(evidence: Evidence, swing: float, judged: float, where: str, message: str) -> Measurement:
    """The swing against both limits; it fails only where it does so as it counts in shadows."""
    warn, fail = evidence.limits["drift_warn"], evidence.limits["drift_fail"]
    return Measurement(
        swing,
        fail.value,
        fail.unit,
        where,
        message,
        fail.source,
        warn_at=warn.value,
        warn_source=warn.source,
        worst="fail" if judged >= fail.value else "warn",
    )


def _balance_sentence(evidence: Evidence, balance: Balance) -> str:
    who = listed(balance.names)
    press = evidence.design.job.press
    state = _state(balance)
    dark, _, light = balance.mean_y
    such = (
        "dot beside dot against dot on dot"
        if len(balance.names) == 2
        else "dot-centred against clear-centred"
    )
    parts = [
        f"{who} {state}: as register moves ({such}), the colour moves by {rounded(balance.colour_swing)} "
        f"CIEDE2000{_counted(balance.colour_swing, balance.colour_swing_judged)}; "
        f"Y is {rounded(dark, digits=3)} at the darkest register and {rounded(light, digits=3)} at the "
        "lightest."
    ]
    if press.register_mm > 0:
        parts.append(
            f"The press's register of {width(press.register_mm)} reaches "
            f"{rounded(balance.colour_swing_register)} of it."
        )
    if math.isfinite(balance.drift_period_mm):
        parts.append(
            "Its angle and size errors turn this into shading with waves of "
            f"{width(balance.drift_period_mm)} or longer."
        )
    else:
        parts.append("State angle_error and size_error in [press] to learn how it drifts across a sheet.")
    return " ".join(parts)


def _counted(swing: float, judged: float) -> str:
    """What is said where the tones that move most are shadows."""
    return f" in the shadows, which count less in proportion (as {rounded(judged)})" if judged < 0.98 * swing else ""


def _state(balance: Balance) -> str:
    if not balance.exact:
        length_mm = 1.0 / math.hypot(*balance.frequency_per_mm)
        return f"beat more slowly than the sheet is long (waves of {width(length_mm)})"
    first_orders = all(sum(abs(k) for k in orders) == 1 for orders in balance.orders.values())
    if len(balance.names) == 2 and first_orders:
        return "share one angle and ruling"
    return "are in exact balance"
