"""Limits by process: data files in `limits/`, every number with its source and so with its standing.

`limits/_every.toml` holds what needs no process; each other file is a process and adds to it.
The names are also keys of a preset's [press] table, where a shop sets its own.
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from difflib import get_close_matches
from functools import cache
from importlib import resources

from patterngen.errors import Fault, InputError
from patterngen.model.job import Job
from patterngen.model.verdict import Limit, Status
from patterngen.sources import source
from patterngen.units import ANGLE, COLOUR_DIFFERENCE, LENGTH, RULING, SHARE, TONE_STEPS, Quantity, parse

_EVERY = "_every"
OWN_SOURCE = "preset-limit"


@dataclass(frozen=True, slots=True)
class LimitKind:
    """What a limit is: its quantity and its meaning in words."""

    quantity: Quantity
    meaning: str

    @property
    def unit(self) -> str:
        """The inner unit, in which `Limit.value` stands ("share" for 0 to 1)."""
        return next((name for name, factor in self.quantity.units.items() if factor == 1.0), "share")


KINDS: Mapping[str, LimitKind] = {
    "smallest_dot": LimitKind(LENGTH, "least width of an inked dot that holds"),
    "smallest_gap": LimitKind(LENGTH, "least width of an open gap between dots that stays open"),
    "line_minimum": LimitKind(LENGTH, "least width of a line that holds at all"),
    "line_advised": LimitKind(LENGTH, "least width of a line that holds in everyday work"),
    "gap_minimum": LimitKind(LENGTH, "least width of a gap between lines that stays open"),
    "tone_minimum": LimitKind(SHARE, "least tone that prints"),
    "tone_maximum": LimitKind(SHARE, "highest tone that stays open, short of the solid"),
    "total_ink": LimitKind(SHARE, "highest sum of the printed tones in one place"),
    "tone_steps": LimitKind(TONE_STEPS, "least number of tones an imager's pixels must allow in one cell"),
    "angle_apart": LimitKind(ANGLE, "least distance of two drawing inks"),
    "angle_apart_light": LimitKind(ANGLE, "least distance of the lightest ink from any other"),
    "angle_apart_axis": LimitKind(ANGLE, "least distance of two drawing inks whose dots have an axis"),
    "angle_taken": LimitKind(ANGLE, "a tint nearer than this to another screened ink stands on its angle"),
    "ruling_lowest": LimitKind(RULING, "coarsest ruling in use"),
    "ruling_highest": LimitKind(RULING, "finest ruling in use"),
    "ruling_usual": LimitKind(RULING, "ruling taken where the preset leaves it open"),
    "register_usual": LimitKind(LENGTH, "best register the process is trusted to hold"),
    "shadow": LimitKind(SHARE, "share of the paper's luminance below which a pattern counts less in proportion"),
    "drift_warn": LimitKind(COLOUR_DIFFERENCE, "colour that moves with register: worth a warning"),
    "drift_fail": LimitKind(COLOUR_DIFFERENCE, "colour that moves with register: too much"),
}


def quantities() -> dict[str, Quantity]:
    """Limit names, which are keys of [press], and how their values are written."""
    return {name: kind.quantity for name, kind in KINDS.items()}


@cache
def processes() -> tuple[str, ...]:
    """Names of the processes that have limits, sorted."""
    folder = resources.files(__package__).joinpath("limits")
    stems = (entry.name.removesuffix(".toml") for entry in folder.iterdir() if entry.name.endswith(".toml"))
    return tuple(sorted(stem for stem in stems if not stem.startswith("_")))


@dataclass(frozen=True, slots=True)
class LimitRow:
    """One limit as the file writes it, for pages that people read."""

    name: str
    written: str
    source_key: str
    note: str


@cache
def rows(process: str | None) -> tuple[LimitRow, ...]:
    """The limits of one file alone, in its order; None for those that need no process.

    Raises `InputError` with the nearest name for a process without a file.
    """
    if process is not None and process not in processes():
        near = get_close_matches(process, processes(), n=1, cutoff=0.3)
        raise InputError(
            Fault(
                "",
                "press.process",
                "no limits are known for this process",
                value=repr(process),
                allowed=", ".join(processes()),
                nearest=near[0] if near else "",
            )
        )
    path = resources.files(__package__).joinpath("limits", f"{process or _EVERY}.toml")
    table = tomllib.loads(path.read_text(encoding="utf-8"))["limit"]
    return tuple(LimitRow(name, row["is"], row["source"], row.get("note", "")) for name, row in table.items())


@cache
def _limits(process: str | None) -> dict[str, Limit]:
    parts: list[tuple[str | None, str]] = [(None, "default")]
    if process is not None:
        parts.append((process, f"process {process}"))
    out: dict[str, Limit] = {}
    for part, origin in parts:
        for row in rows(part):
            kind = KINDS[row.name]
            value = parse(row.written, kind.quantity)
            out[row.name] = Limit(row.name, value, kind.unit, source(row.source_key), origin)
    return out


def limits(process: str | None) -> dict[str, Limit]:
    """Limits by name for a process; for None those that need none.  Values in inner units."""
    return dict(_limits(process))


def own_limit(name: str, value: float, *, origin: str = "preset") -> Limit:
    """A limit that a preset sets itself; `value` in the inner unit of that limit."""
    return Limit(name, value, KINDS[name].unit, source(OWN_SOURCE), origin)


def in_force(job: Job) -> dict[str, Limit]:
    """The limits that hold for a job: its process, and over them its own."""
    return {**_limits(job.press.process), **job.press.limits}


def is_own(limit: Limit) -> bool:
    """Whether the preset set this limit itself."""
    return limit.origin != "default" and not limit.origin.startswith("process ")


def worst(limit: Limit) -> Status:
    """How hard a breach counts: what is only practice or memory warns, unless a shop set it itself."""
    return "fail" if is_own(limit) or limit.source.standing in ("published", "derived") else "warn"
