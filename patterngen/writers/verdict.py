"""The verdict as JSON: the same document for `verdict.json` and for `--json`."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from typing import Any

import numpy as np

from patterngen.model.verdict import Balance, BeatTable, Derived, Finding, Verdict

FORMAT = 1
_SIGNIFICANT = 12
"""Digits kept: beyond them machines differ in the last bits of a logarithm or a cosine."""


def document(verdict: Verdict) -> dict[str, Any]:
    """The verdict as plain dicts, lists, numbers and texts; what is infinite or unknown is None."""
    screens = [str(screen["name"]) for screen in verdict.screens]
    out = plain(
        {
            "patterngen": FORMAT,
            "job": verdict.job,
            "title": verdict.title,
            "verdict": verdict.status,
            "screens": verdict.screens,
            "beats": _beats(verdict.beats, screens),
            "beats_bound": {
                "visibility": verdict.beats.bound_visibility,
                "visibility_far": verdict.beats.bound_visibility_far,
                "visibility_far_over_1_mm": verdict.beats.bound_visibility_far_coarse,
            },
            "balance": [_balance(row) for row in verdict.balance],
            "keys": [],
            "findings": [_finding(row) for row in verdict.findings],
            "derived": [_derived(row) for row in verdict.derived],
            "notes": verdict.notes,
        }
    )
    assert isinstance(out, dict)
    return out


def dumps(verdict: Verdict) -> bytes:
    """The document as UTF-8 text; the same verdict gives the same bytes, and never NaN."""
    return encode(document(verdict))


def encode(data: Mapping[str, Any]) -> bytes:
    """Plain data as indented JSON with a last line end.  Raises ValueError for NaN."""
    return (json.dumps(data, indent=2, ensure_ascii=False, allow_nan=False) + "\n").encode()


def plain(value: Any) -> Any:
    """Arrays and mappings to lists and dicts, numbers to `_SIGNIFICANT` digits, NaN and infinity to None.

    >>> plain({"period": np.inf, "orders": np.array([1, -2]), "tone": np.float64(-0.0)})
    {'period': None, 'orders': [1, -2], 'tone': 0.0}
    """
    if isinstance(value, Mapping):
        return {str(key): plain(item) for key, item in value.items()}
    if isinstance(value, np.ndarray):
        return plain(value.tolist())
    if isinstance(value, list | tuple):
        return [plain(item) for item in value]
    if value is None or isinstance(value, str | bool | np.bool_):
        return bool(value) if isinstance(value, np.bool_) else value
    if isinstance(value, int | np.integer):
        return int(value)
    if isinstance(value, float | np.floating):
        # adding zero turns minus zero into zero
        return float(f"{float(value):.{_SIGNIFICANT}g}") + 0.0 if math.isfinite(value) else None
    raise TypeError(f"{type(value).__name__} has no place in a verdict")


def _beats(beats: BeatTable, screens: list[str]) -> list[dict[str, Any]]:
    period_mm = beats.period_mm
    return [
        {
            "orders": beats.participants(row),
            "frequency_per_mm": beats.frequency_per_mm[row],
            "period_mm": period_mm[row],
            "contrast": beats.contrast[row],
            "threshold": beats.threshold[row],
            "visibility": beats.visibility[row],
            "visibility_far": beats.visibility_far[row],
            "contrast_min": beats.contrast_min[row],
            "contrast_max": beats.contrast_max[row],
            "grade": beats.grade[row],
            "tones": dict(zip(screens, beats.tones[row], strict=True)),
            "components": beats.components[row],
            "colour_difference": beats.colour_swing[row],
            "judged": {
                "visibility_far": beats.visibility_far_judged[row],
                "colour_difference": beats.colour_swing_judged[row],
            },
        }
        for row in range(len(beats))
    ]


def _balance(row: Balance) -> dict[str, Any]:
    return {
        "screens": row.names,
        "orders": row.orders,
        "frequency_per_mm": row.frequency_per_mm,
        "exact": row.exact,
        "drift_period_mm": row.drift_period_mm,
        "lab_low": row.lab_low,
        "lab_high": row.lab_high,
        "mean_y": dict(zip(("darkest", "average", "lightest"), row.mean_y, strict=True)),
        "colour_difference": row.colour_swing,
        "colour_difference_in_register": row.colour_swing_register,
        "judged": {"colour_difference": row.colour_swing_judged},
        "tones": row.tones,
    }


def _finding(row: Finding) -> dict[str, Any]:
    out: dict[str, Any] = {
        "rule": row.rule,
        "status": row.status,
        "measured": row.measured,
        "limit": row.limit,
        "margin": row.margin,
        "unit": row.unit,
        "source": {"text": row.source.text, "standing": row.source.standing},
        "where": row.where,
        "message": row.message,
    }
    if row.waiver:
        out["reason"] = row.waiver
    return out


def _derived(row: Derived) -> dict[str, Any]:
    return {"value": row.value, "is": row.chosen, "by": row.by, "because": row.because}
