"""invariant: the verdict is plain JSON with the agreed keys, never NaN, the same bytes for the same verdict."""

from __future__ import annotations

import json
from typing import Any

import numpy as np

from patterngen.model.verdict import Balance, BeatTable, Derived, Finding, Verdict
from patterngen.sources import Source
from patterngen.writers import verdict as writer

SOURCE = Source("our own calibration", "derived")


def verdict(**changes: Any) -> Verdict:
    two = np.array
    beats = BeatTable(
        slots=(("cyan", 2), ("black", 2), ("imager", 2)),
        orders=two([[1, 0, -1, 0, 0, 0], [0, 0, 2, -1, 1, 0]], dtype=np.int32),
        frequency_per_mm=two([[0.0, 0.0], [0.3, -0.4]]),
        amplitude=np.zeros((2, 3), complex), power=np.zeros((2, 3)), mean=np.ones((2, 3)),
        contrast=two([0.12345678901234567, 0.01]), contrast_min=two([0.0, -0.0]), contrast_max=two([0.2, 0.02]),
        threshold=two([np.inf, 0.002]), visibility=two([0.0, 5.0]), visibility_far=two([0.0, 3.0]),
        components=two([2, 1], dtype=np.int32), tones=two([[0.4, 0.4], [0.4, 0.7]]),
        colour_swing=two([6.5, np.nan]),
        visibility_far_judged=two([0.0, 3.0]), colour_swing_judged=two([6.5, np.nan]), grade=("unseen", "texture"),
        bound_visibility=0.4, bound_visibility_far=0.3, bound_visibility_far_coarse=0.1,
    )  # fmt: skip
    balance = Balance(
        names=("cyan", "black"), orders={"cyan": [1, 0], "black": [-1, 0]}, frequency_per_mm=(0.0, 0.0), exact=True,
        drift_period_mm=float("inf"), lab_low=(50, 0, 0), lab_high=(56, 0, 0), mean_y=(0.2, 0.25, 0.3),
        colour_swing=6.5, colour_swing_register=1.0, colour_swing_judged=6.5, tones={"cyan": 0.4, "black": 0.4},
    )  # fmt: skip
    given: dict[str, Any] = {
        "job": "carton", "title": "Carton", "status": "warn",
        "screens": ({"name": "cyan", "tone": np.float64(0.4), "frequencies_per_mm": np.eye(2)}, {"name": "black"}),
        "beats": beats, "balance": (balance,),
        "findings": (
            Finding("beats-visible", "pass", np.float64(0.5), 1.0, 0.5, "", SOURCE, "cyan", "quiet"),
            Finding("line-minimum", "waived", 0.01, 0.02, float("-inf"), "mm", SOURCE, "", "thin", waiver="proofed"),
        ),
        "derived": (Derived("screen.cyan.angle", 15.0, "usual-angles", "as usual"),),
        "notes": {"remarks": ["a byte order mark was left out"]},
    }  # fmt: skip
    return Verdict(**{**given, **changes})


def test_agreed_keys() -> None:
    data = json.loads(writer.dumps(verdict()), parse_constant=lambda name: 1 / 0)
    assert list(data)[:4] == ["patterngen", "job", "title", "verdict"]
    assert (data["patterngen"], data["verdict"]) == (1, "warn")
    assert set(data["beats"][0]) >= {
        "orders", "frequency_per_mm", "period_mm", "contrast", "threshold", "visibility", "visibility_far",
        "contrast_min", "contrast_max", "grade", "tones",
    }  # fmt: skip
    assert set(data["findings"][0]) == {
        "rule", "status", "measured", "limit", "margin", "unit", "source", "where", "message",
    }  # fmt: skip
    assert data["findings"][0]["source"] == {"text": "our own calibration", "standing": "derived"}
    assert data["findings"][1]["reason"] == "proofed"
    assert data["derived"] == [{"value": "screen.cyan.angle", "is": 15.0, "by": "usual-angles", "because": "as usual"}]
    assert data["screens"][0] == {"name": "cyan", "tone": 0.4, "frequencies_per_mm": [[1.0, 0.0], [0.0, 1.0]]}
    assert data["notes"] == {"remarks": ["a byte order mark was left out"]}
    assert data["beats_bound"] == {"visibility": 0.4, "visibility_far": 0.3, "visibility_far_over_1_mm": 0.1}


def test_beats_name_only_those_taking_part() -> None:
    first, second = writer.document(verdict())["beats"]
    assert first["orders"] == {"cyan": [1, 0], "black": [-1, 0]}
    assert second["orders"] == {"black": [2, -1], "imager": [1, 0]}
    assert second["tones"] == {"cyan": 0.4, "black": 0.7}
    assert second["period_mm"] == 2.0


def test_infinite_and_unknown_become_null() -> None:
    data = writer.document(verdict())
    assert data["beats"][0]["period_mm"] is None
    assert data["beats"][0]["threshold"] is None
    assert data["beats"][1]["colour_difference"] is None
    assert data["balance"][0]["drift_period_mm"] is None
    assert data["findings"][1]["margin"] is None


def test_numbers_are_rounded_to_what_machines_agree_on() -> None:
    text = writer.dumps(verdict())
    assert b"0.123456789012," in text
    assert b"-0.0" not in text
    assert b"NaN" not in text
    assert text == writer.dumps(verdict())


def test_text_of_any_script_is_kept() -> None:
    assert "Käse ❧ 干酪" in writer.dumps(verdict(title="Käse ❧ 干酪")).decode()
