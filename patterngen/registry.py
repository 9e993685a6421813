"""Finds the modules of a folder: to add a kind, a rule, an eye model or a writer is to add a file.

Names come from the file names (`void_width.py` is `void-width`), so a folder cannot hold
two of one name, and nothing is imported before it is asked for.  A module that serves its
folder without being one of its kinds begins with an underscore.
"""

from __future__ import annotations

from difflib import get_close_matches
from functools import cache
from importlib import import_module, resources
from types import ModuleType

from patterngen.errors import Fault, InputError


@cache
def names(package: str) -> tuple[str, ...]:
    """The public names in a package ("patterngen.rules"), sorted."""
    found = []
    for entry in resources.files(package).iterdir():
        stem, dot, end = entry.name.rpartition(".")
        if dot and end == "py" and not stem.startswith("_"):
            found.append(stem.replace("_", "-"))
    return tuple(sorted(found))


def load(package: str, name: str) -> ModuleType:
    """The module of that name.  Raises `InputError` with the nearest name."""
    if name not in names(package):
        near = get_close_matches(name, names(package), n=1, cutoff=0.3)
        raise InputError(
            Fault(
                package.rpartition(".")[2],
                "",
                f"nothing is called {name!r}",
                allowed=", ".join(names(package)),
                nearest=near[0] if near else "",
            )
        )
    return import_module(f"{package}.{name.replace('-', '_')}")


def modules(package: str) -> dict[str, ModuleType]:
    """Every module of a package by its name."""
    return {name: load(package, name) for name in names(package)}
