"""Overrides from the command line: `screen.cyan.angle=22.5 deg`, addressed by the tables' names."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from patterngen.errors import Fault
from patterngen.job.gates import parse, parse_value
from patterngen.job.preset import TABLES
from patterngen.job.tables import nearest, shown

SET = "--set"
_PART = re.compile(r'"((?:[^"\\]|\\.)*)"|\'([^\']*)\'|([^.\[\]"\'=]+)|\[(\d{1,6})\]')
_EXAMPLE = 'KEY=VALUE, like screen.cyan.angle="22.5 deg"'


@dataclass(frozen=True, slots=True)
class Override:
    """One value to be put in: its steps into the preset's data, its path as reports write it, the value."""

    steps: tuple[str | int, ...]
    path: str
    value: Any


def table_path(name: str, index: int, table: object) -> str:
    """How reports address an entry of a listed table: by its name where it has a sound one.

    >>> table_path("screen", 0, {"name": "cyan"})
    'screen.cyan'
    """
    own = table.get("name") if isinstance(table, Mapping) else None
    if isinstance(own, str) and own and own.isprintable() and len(own) <= 60:
        return f"{name}.{own}"
    return f"{name}[{index}]"


def read_overrides(texts: Iterable[str], data: Mapping[str, Any]) -> tuple[list[Override], list[Fault]]:
    """Every override against the preset's data, and the faults of those that fit nowhere."""
    overrides: list[Override] = []
    faults: list[Fault] = []
    for text in texts:
        found = _read(text, data)
        if isinstance(found, Fault):
            faults.append(found)
        else:
            overrides.append(found)
    return overrides, faults


def written_in(text: str, overrides: Sequence[Override]) -> str:
    """The preset's text with the overrides in it, comments kept."""
    import tomlkit

    document: Any = tomlkit.parse(text)
    for override in overrides:
        here = document
        for step in override.steps[:-1]:
            if isinstance(step, str) and step not in here:
                here[step] = tomlkit.table()
            here = here[step]
        here[override.steps[-1]] = override.value
    return tomlkit.dumps(document)


def _read(text: str, data: Mapping[str, Any]) -> Override | Fault:
    address, equals, value = _halves(text)
    if not equals or not address:
        return Fault(SET, "", "not an override", shown(text), allowed=_EXAMPLE)
    parts: list[str | int] = []
    at = 0
    while at < len(address):
        match = _PART.match(address, at)
        if not match:
            return Fault(SET, address, "not the address of a value", allowed=_EXAMPLE)
        double, single, bare, index = match.groups()
        parts.append(int(index) if index is not None else (double or single or (bare or "").strip()))
        at = match.end()
        if address[at : at + 1] == "." and at + 1 < len(address):
            at += 1
        elif at < len(address) and address[at] != "[":
            return Fault(SET, address, "not the address of a value", allowed=_EXAMPLE)
    return _resolve(address, parts, parse_value(value.strip()), data)


def _halves(text: str) -> tuple[str, str, str]:
    """Split at the first equals sign outside quotes."""
    quote = ""
    for at, character in enumerate(text):
        if quote:
            quote = "" if character == quote else quote
        elif character in "\"'":
            quote = character
        elif character == "=":
            return text[:at].strip(), "=", text[at + 1 :]
    return text.strip(), "", ""


def _resolve(address: str, parts: list[str | int], value: Any, data: Mapping[str, Any]) -> Override | Fault:
    first = parts[0]
    if first in ("patterngen", "title") and len(parts) == 1:
        return Override((str(first),), str(first), value)
    if first not in TABLES:
        known = ["title", *TABLES]
        return Fault(
            SET,
            address,
            "no such table in a preset",
            allowed=", ".join(known),
            nearest=nearest(str(first), known),
        )
    name, rest = str(first), parts[1:]
    steps: tuple[str | int, ...] = (name,)
    path = name
    if TABLES[name].many:
        entries = data.get(name)
        entries = entries if isinstance(entries, list) else []
        index, used = _entry(rest, entries)
        if index is None:
            names = [str(e["name"]) for e in entries if isinstance(e, Mapping) and "name" in e]
            wanted = str(rest[0]) if rest else ""
            near = nearest(wanted, names)
            return Fault(
                SET,
                address,
                f"no [[{name}]] of that name",
                shown(wanted),
                allowed=", ".join(names) or f"[[{name}]] has no entry",
                nearest=near,
            )
        steps, path = (name, index), table_path(name, index, entries[index])
        rest = rest[used:]
    if not rest:
        return Fault(SET, address, "a whole table cannot be set", allowed=_EXAMPLE)
    for step in rest:
        steps += (step,)
        path += f"[{step}]" if isinstance(step, int) else f".{step}"
    if fault := _dead_end(address, steps, data):
        return fault
    return Override(steps, path, value)


def _entry(rest: list[str | int], entries: list[Any]) -> tuple[int | None, int]:
    """(index of the entry that the address begins with, how many parts that took); names may hold dots."""
    if rest and isinstance(rest[0], int):
        return (rest[0], 1) if rest[0] < len(entries) and isinstance(entries[rest[0]], Mapping) else (None, 0)
    words = [part for part in rest if isinstance(part, str)]
    for used in range(len(words), 0, -1):
        wanted = ".".join(words[:used])
        for index, entry in enumerate(entries):
            if isinstance(entry, Mapping) and entry.get("name") == wanted:
                return index, used
    return None, 0


def _dead_end(address: str, steps: tuple[str | int, ...], data: Mapping[str, Any]) -> Fault | None:
    """A fault where the address runs through something that is no table and no list."""
    here: Any = data
    for at, step in enumerate(steps):
        if isinstance(here, Mapping) and isinstance(step, str):
            if step not in here:
                # what is not there yet is made, one table deep: [press] may be missing altogether
                made = at == len(steps) - 1 or (at == 0 and len(steps) == 2)
                return None if made else Fault(SET, address, "the address goes too deep")
            here = here[step]
        elif isinstance(here, list) and isinstance(step, int):
            if step >= len(here):
                return Fault(SET, address, f"the list has only {len(here)} entries")
            here = here[step]
        else:
            return Fault(SET, address, "the address leads into a value that is no table", shown(here))
    return None


def as_toml(data: Mapping[str, Any]) -> str:
    """Preset data from Python as preset text, so that both go the same way."""
    import tomlkit

    text = tomlkit.dumps(data)
    parse(text, where="preset")
    return text
