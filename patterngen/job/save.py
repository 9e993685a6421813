"""A job back to a preset file, with the comments of the one it was read from."""

from __future__ import annotations

import os
from pathlib import Path
from typing import Any

from patterngen.errors import Fault, InputError
from patterngen.files import write_atomically
from patterngen.job.preset import TABLES
from patterngen.model.job import Job
from patterngen.units import ANGLE, LENGTH, RULING, SHARE, Quantity, plain, spell

# how a derived value is written, by the last part of its path
_WRITTEN_AS: dict[str, tuple[Quantity, str]] = {
    "angle": (ANGLE, "deg"),
    "ruling": (RULING, "lpi"),
    "register": (LENGTH, "mm"),
    "edge_gain": (LENGTH, "um"),
    "gain": (SHARE, "%"),
}


def save(job: Job, path: str | os.PathLike[str], *, derived: bool = False) -> Path:
    """Write the job's preset (overrides in it, comments kept) to `path`; returns the path.

    With `derived` the values that rules chose are written in as well, so that the preset
    then stands on its own.  Art paths stay relative: keep the file in the folder of its art.
    Raises `InputError` where something that is no file stands at `path`, `MachineError`
    where it cannot be written.
    """
    target = Path(path)
    write_atomically(target, preset_text(job, derived=derived).encode("utf-8"))
    return target


def preset_text(job: Job, *, derived: bool = False) -> str:
    """The text that `save` writes."""
    if not derived or not job.derived:
        return job.text
    import tomlkit

    document: Any = tomlkit.parse(job.text)
    for item in job.derived:
        table, key = _place(document, item.value)
        table[key] = _written(key, item.chosen)
    return tomlkit.dumps(document)


def _place(document: Any, path: str) -> tuple[Any, str]:
    """(the table that a derived value belongs in, its key); names in a path may hold dots."""
    import tomlkit

    first, _, rest = path.partition(".")
    if first in TABLES and rest:
        if not TABLES[first].many:
            if first not in document:
                document[first] = tomlkit.table()
            return document[first], rest
        name, _, key = rest.rpartition(".")
        for entry in document.get(first, ()):
            if entry.get("name") == name and key:
                return entry, key
    raise InputError(Fault("save", path, "a derived value that has no place in this preset"))


def _written(key: str, value: Any) -> Any:
    if isinstance(value, bool | str):
        return value
    if isinstance(value, int | float):
        if key not in _WRITTEN_AS:
            return float(plain(value)) if isinstance(value, float) else value
        quantity, unit = _WRITTEN_AS[key]
        return spell(float(value), quantity, unit)
    raise InputError(Fault("save", key, "a derived value that no preset can hold", str(value)))
