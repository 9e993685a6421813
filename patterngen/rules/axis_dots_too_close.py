"""Dots with an axis whose inks stand too close."""

from __future__ import annotations

from collections.abc import Iterator

from patterngen.model.evidence import Evidence
from patterngen.model.verdict import Measurement
from patterngen.rules._angles import apart_deg, lightest_ink, like_rulings, meeting
from patterngen.rules._examples import dots, preset
from patterngen.rules._measuring import against
from patterngen.rules._words import degrees, rounded

SUMMARY = "dots with an axis stand less than 60 degrees apart"
REASON = """Elliptical dots and others that join along one axis first repeat only every 180 degrees.
Their chains act like a line screen, so three drawing inks use the whole half turn, 60 degrees apart, as
15, 75 and 135, with the lightest ink at 0."""
MEASURES = """The angle between the axes of two inks that are both screened in one place with dots that
have an axis; the lightest ink needs only its own distance. Warns and never fails:
beats are judged for themselves."""
SOURCES = ("trade-axis-dots", "iso-12647-2-angles")
LIMITS = ("angle_apart_axis", "angle_apart_light")
IDLE = "No two inks with axis dots of like ruling are screened in one place."

EXAMPLE_PASS = preset(
    dots("Cyan", angle="15 deg", shape="ellipse"),
    dots("Magenta", angle="75 deg", shape="ellipse"),
    dots("Yellow", angle="0 deg", shape="ellipse"),
    dots("Black", angle="135 deg", shape="ellipse"),
)
EXAMPLE_FAIL = preset(
    dots("Cyan", angle="15 deg", shape="ellipse"),
    dots("Yellow", angle="0 deg", shape="ellipse"),
    dots("Black", angle="45 deg", shape="ellipse"),
)


def measure(evidence: Evidence) -> Iterator[Measurement]:
    """One measurement for each pair of axis-dot screens that meet."""
    light = lightest_ink(evidence.design.job)
    for a, b in meeting(evidence):
        lattices = len(a.frequencies_per_mm) == 2 == len(b.frequencies_per_mm)
        axes = a.symmetry_deg == 180.0 == b.symmetry_deg
        if not (lattices and axes and like_rulings(a.ruling_per_mm, b.ruling_per_mm)):
            continue
        limit = evidence.limits["angle_apart_light" if light in (a.ink, b.ink) else "angle_apart_axis"]
        off = apart_deg(a.angle_deg, b.angle_deg, repeat_deg=180.0)
        yield against(
            limit,
            round(off, 2),
            where=f"{a.name} and {b.name}",
            message=(
                f"{a.name} and {b.name} have dots with an axis, {degrees(off)} apart; "
                f"they keep {rounded(limit.value)} degrees, counted over the half turn."
            ),
            bad_when="below",
            worst="warn",
        )
