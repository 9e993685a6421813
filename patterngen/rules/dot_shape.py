"""The shape of dots that the preset leaves open."""

from __future__ import annotations

from patterngen.model.job import Job
from patterngen.rules._examples import Example, dots, lines, preset
from patterngen.rules._settle import is_open, settle

SUMMARY = "dots without a shape are round"
REASON = """A round dot has no axis: its screen repeats every 90 degrees, three drawing inks fit into
that at 30 degrees, and its gain is even all round. Dots with an axis join more gently in the middle
tones but need 60 degrees between inks, so they are for those who ask for them."""
DERIVES = """`shape` of every screen of kind "dots": "round", the spot function of that name in ISO
32000-1, which turns at half tone from inked dots to open ones."""
SOURCES = ("iso-32000-1", "trade-axis-dots")
LIMITS: tuple[str, ...] = ()
AFTER: tuple[str, ...] = ()

EXAMPLES: tuple[Example, ...] = (
    (preset(dots("Cyan", shape=None, angle="45 deg")), {"screen.cyan.shape": "round"}),
    (preset(dots("Cyan", shape="diamond", angle="45 deg")), {}),
    (preset(lines("Cyan", angle="45 deg")), {}),
)


def derive(job: Job) -> Job:
    """Round dots wherever no shape is given."""
    for screen in job.screens:
        if screen.kind == "dots" and is_open(screen, "shape", screen.shape):
            job = settle(
                job,
                screen,
                "shape",
                value="round",
                shown="round",
                key="shape",
                by="dot-shape",
                because="Round dots have no axis, so the usual angles hold and gain is even all round.",
            )
    return job
