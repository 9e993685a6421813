"""Proves and draws superposed print screens.

`load` reads a preset, `verify` computes its verdict, `build` also writes the printing
files; the other names are what the command line calls, one for each command.

>>> import patterngen
>>> verdict = patterngen.verify(patterngen.load("presets/carton.toml"))  # doctest: +SKIP
>>> verdict.status  # doctest: +SKIP
'pass'
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

__version__ = "0.1.0"

# Heavy libraries load when a name is first used, so that importing the package is quick.
_HOME = {
    "load": "patterngen.job.read",
    "save": "patterngen.job.save",
    "schema": "patterngen.job.schema",
    "presets": "patterngen.job.shipped",
    "new": "patterngen.job.shipped",
    "why": "patterngen.rules._engine",
    "verify": "patterngen.pipeline",
    "build": "patterngen.pipeline",
    "Job": "patterngen.model.job",
    "Verdict": "patterngen.model.verdict",
    "InputError": "patterngen.errors",
    "MachineError": "patterngen.errors",
}

__all__ = [
    "InputError",
    "Job",
    "MachineError",
    "Verdict",
    "__version__",
    "build",
    "load",
    "new",
    "presets",
    "save",
    "schema",
    "verify",
    "why",
]

if TYPE_CHECKING:
    from patterngen.errors import InputError, MachineError
    from patterngen.job.read import load
    from patterngen.job.save import save
    from patterngen.job.schema import schema
    from patterngen.job.shipped import new, presets
    from patterngen.model.job import Job
    from patterngen.model.verdict import Verdict
    from patterngen.pipeline import build, verify
    from patterngen.rules._engine import why


def __getattr__(name: str) -> Any:
    if name in _HOME:
        return getattr(import_module(_HOME[name]), name)
    raise AttributeError(f"module 'patterngen' has no attribute {name!r}")


def __dir__() -> list[str]:
    return list(__all__)
