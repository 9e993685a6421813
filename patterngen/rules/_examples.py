"""Whole small presets for the examples of rules, so that each rule shows only what it is about."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

Example = tuple[dict[str, Any], dict[str, str]]
"""A preset, and what a deriving rule must make of it: {path: value}."""

INKS: Mapping[str, list[float]] = {
    "Cyan": [55, -37, -50],
    "Magenta": [48, 74, -3],
    "Yellow": [89, -5, 93],
    "Black": [16, 0, 0],
    "Orange": [66, 50, 75],
    "Green": [55, -67, 20],
    "Violet": [30, 45, -55],
    "Grey": [60, 0, 1],
}


def dots(ink: str, **keys: Any) -> dict[str, Any]:
    """A dot screen of an ink at 150 lpi and 40 %, named after it; `keys` replace or add, None takes out."""
    return _table(
        {
            "name": ink.lower(),
            "ink": ink,
            "kind": "dots",
            "shape": "simpledot",
            "ruling": "150 lpi",
            "tone": "40 %",
        },
        keys,
    )


def lines(ink: str, **keys: Any) -> dict[str, Any]:
    """A line screen of an ink at 150 lpi and 40 %, named after it; `keys` replace or add, None takes out."""
    return _table(
        {"name": ink.lower(), "ink": ink, "kind": "lines", "ruling": "150 lpi", "tone": "40 %"}, keys
    )


def preset(
    *screens: Mapping[str, Any], press: Mapping[str, Any] | None = None, **tables: Any
) -> dict[str, Any]:
    """A preset of 30 by 20 mm with those screens and the inks they name, in their order."""
    inks = dict.fromkeys(screen["ink"] for screen in screens)
    out: dict[str, Any] = {
        "patterngen": 1,
        "title": "Fennick & Oake, test tile",
        "sheet": {"size": ["30 mm", "20 mm"]},
        "ink": [{"name": ink, "lab": INKS[ink]} for ink in inks],
        "screen": [dict(screen) for screen in screens],
    }
    if press is not None:
        out["press"] = dict(press)
    return {**out, **tables}


def usual_set(**keys: Any) -> list[dict[str, Any]]:
    """Cyan, magenta, yellow and black at 15, 75, 0 and 45 degrees; `keys` go to every screen."""
    angles = {"Cyan": "15 deg", "Magenta": "75 deg", "Yellow": "0 deg", "Black": "45 deg"}
    return [dots(ink, **{"angle": angle, **keys}) for ink, angle in angles.items()]


def _table(base: dict[str, Any], keys: Mapping[str, Any]) -> dict[str, Any]:
    return {key: value for key, value in {**base, **keys}.items() if value is not None}
