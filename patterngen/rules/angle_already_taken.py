"""A tint on the angle of another screened ink."""

from __future__ import annotations

from collections.abc import Iterator

from patterngen.model.evidence import Evidence
from patterngen.model.screen import Screen
from patterngen.model.verdict import Measurement
from patterngen.rules._angles import lightest_ink, like_rulings, meeting, screens_apart_deg
from patterngen.rules._examples import dots, preset, usual_set
from patterngen.rules._measuring import against
from patterngen.rules._words import degrees, listed

SUMMARY = "a flat tint was left on the angle where another screened ink already sits"
REASON = """A spot ink that is added to a job late is easily left at 45 degrees, where the black already
sits. A flat tint shows what a picture hides: on one angle with an ink that it overprints, its colour
moves with every slip of register, and a few degrees off it makes wide bands."""
MEASURES = """For each flat tint, the least angle to any other ink of like ruling that is screened in the
same place (of two tints the later in the tables counts as the one added); the message names the angles
that would be free."""
SOURCES = ("trade-spot-tint", "trade-same-angle", "trade-extra-inks")
LIMITS = ("angle_taken", "angle_apart")
IDLE = "No flat tint meets another screened ink of like ruling."

EXAMPLE_PASS = preset(*usual_set())
EXAMPLE_FAIL = preset(dots("Black", angle="45 deg"), dots("Orange", angle="45 deg", tone="20 %"))


def measure(evidence: Evidence) -> Iterator[Measurement]:
    """One measurement for each tint: its nearest neighbour in angle."""
    neighbours: dict[str, list[Screen]] = {}
    screens = {screen.name: screen for screen in evidence.design.base.screens}
    for a, b in meeting(evidence):
        # of two tints the one that stands later in the tables was added to the other
        tint, other = (b, a) if b.tone.constant is not None else (a, b)
        if tint.tone.constant is not None and like_rulings(a.ruling_per_mm, b.ruling_per_mm):
            neighbours.setdefault(tint.name, []).append(other)
    limit = evidence.limits["angle_taken"]
    for name, others in neighbours.items():
        tint = screens[name]
        nearest = min(others, key=lambda other: screens_apart_deg(tint, other))
        off = screens_apart_deg(tint, nearest)
        stands = f"stands {degrees(off)} from" if off >= 0.05 else "stands at the angle of"
        text = f"The tint {name} {stands} {nearest.name}, which it overprints"
        if off < limit.value:
            met = [a if b is tint else b for a, b in meeting(evidence) if tint in (a, b)]
            text += f": that angle is taken. {_free(evidence, tint, met)}"
        yield against(
            limit,
            off,
            where=name,
            message=text if text.endswith(".") else f"{text}.",
            bad_when="below",
            worst="warn",
        )


def _free(evidence: Evidence, tint: Screen, others: list[Screen]) -> str:
    """Which of the usual angles keep their distance from all the others, the lightest ink its smaller one."""
    light = lightest_ink(evidence.design.job)

    def wanted(other: Screen) -> float:
        limit = "angle_apart_light" if light in (tint.ink, other.ink) else "angle_apart"
        return evidence.limits[limit].value - 0.5

    free = [
        f"{angle:g}"
        for angle in (0.0, 15.0, 45.0, 75.0)
        if all(_off_deg(angle, other) >= wanted(other) for other in others)
    ]
    if not free:
        return "No usual angle is free: change its ruling clearly."
    return f"Free, far enough from all it meets: {listed(free)}."


def _off_deg(angle_deg: float, other: Screen) -> float:
    off = abs(angle_deg - other.angle_deg) % 90.0
    return min(off, 90.0 - off)
