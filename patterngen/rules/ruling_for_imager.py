"""Rulings that the preset leaves open."""

from __future__ import annotations

import math
from collections import Counter

from patterngen.model.job import Job, ScreenRequest
from patterngen.rules import _limits
from patterngen.rules._examples import Example, dots, preset
from patterngen.rules._settle import has_lattice, is_open, settle
from patterngen.rules._words import rounded
from patterngen.units import RESOLUTION, RULING, parse

SUMMARY = "a ruling left open is that of the other screens, or the usual one that the imager can still draw"
REASON = """The usual angles presume one ruling for all inks, so an open ruling follows those that are
given. Where none is given it is the ruling in everyday use for the process, unless the imager's pixels
are too coarse for it: a cell of (imager / ruling)^2 pixels gives that many tones and the paper, and at
least 150 steps are wanted."""
DERIVES = """`ruling` of every screen with a lattice: the commonest of the given ones of its kind (the
coarser of equals), else the smaller of the usual ruling and imager / sqrt(steps - 1), in whole lines per
inch."""
SOURCES = ("tone-steps-formula", "grey-levels", "trade-tone-steps", "trade-rulings-by-process")
LIMITS = ("ruling_usual", "tone_steps")
AFTER: tuple[str, ...] = ()

EXAMPLES: tuple[Example, ...] = (
    (preset(dots("Cyan", ruling=None, angle="45 deg")), {"screen.cyan.ruling": "150 lpi"}),
    (
        preset(dots("Cyan", ruling=None, angle="45 deg"), press={"imager": "1200 dpi"}),
        {"screen.cyan.ruling": "98 lpi"},
    ),
    (
        preset(dots("Cyan", ruling="60 /cm", angle="15 deg"), dots("Black", ruling=None, angle="45 deg")),
        {"screen.black.ruling": "152.4 lpi"},
    ),
    (
        preset(dots("Cyan", ruling=None, angle="45 deg"), press={"process": "metal-decoration"}),
        {"screen.cyan.ruling": "175 lpi"},
    ),
)

_BY = "ruling-for-imager"
_LPI = parse("1 lpi", RULING)
_DPI = parse("1 dpi", RESOLUTION)


def derive(job: Job) -> Job:
    """A ruling for every lattice that has none."""
    asked = job
    for screen in asked.screens:
        if has_lattice(screen) and is_open(screen, "ruling", screen.ruling_per_mm):
            value, because = _ruling(asked, screen)
            job = settle(
                job,
                screen,
                "ruling_per_mm",
                value=value,
                shown=f"{rounded(value / _LPI, digits=6)} lpi",
                key="ruling",
                by=_BY,
                because=because,
            )
    return job


def _ruling(job: Job, screen: ScreenRequest) -> tuple[float, str]:
    given = Counter(s.ruling_per_mm for s in job.screens if s.kind == screen.kind and s.ruling_per_mm)
    if given:
        value = min(given, key=lambda ruling: (-given[ruling], ruling))
        return (
            value,
            "The other screens of its kind have this ruling, and the usual angles presume one for all.",
        )
    limits = _limits.in_force(job)
    usual, steps = limits["ruling_usual"], limits["tone_steps"].value
    usual_lpi = float(round(usual.value / _LPI))
    of = "the preset's own usual ruling" if _limits.is_own(usual) else f"the usual ruling ({usual.origin})"
    if usual.origin == "default":
        of = "the usual ruling"
    imager = job.press.imager_per_mm
    if imager is None:
        return usual_lpi * _LPI, f"It is {of}; no imager is stated that could be too coarse for it."
    most_lpi = imager / _LPI / math.sqrt(steps - 1)
    dpi = rounded(imager / _DPI, digits=5)
    if usual_lpi <= most_lpi:
        return (
            usual_lpi * _LPI,
            f"It is {of}; {dpi} dpi could draw {rounded(steps, digits=4)} tone steps up to "
            f"{math.floor(most_lpi)} lpi.",
        )
    return (
        math.floor(most_lpi) * _LPI,
        f"{dpi} dpi draws {rounded(steps, digits=4)} tone steps up to this ruling and no finer; "
        f"{of} would be {rounded(usual_lpi, digits=4)} lpi.",
    )
