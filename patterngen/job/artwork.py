"""Pictures and outlines that a preset names, read in a child process with caps."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path

from patterngen.errors import Fault
from patterngen.job.tables import TableReading
from patterngen.model.area import Area, ToneField


@dataclass(frozen=True)
class Artwork:
    """What was read, by the path of the screen that asked for it."""

    areas: Mapping[str, Area] = field(default_factory=dict)
    remarks: tuple[str, ...] = ()

    def tone(self, path: str, area: Area) -> ToneField:
        """The picture of that screen, fitted into its area's box."""
        raise KeyError(path)


def read(tables: Mapping[str, Sequence[TableReading]], *, folder: Path | None, where: str) -> tuple[Artwork, list[Fault]]:
    """Every picture and outline of the preset, and the faults of those that cannot be used."""
    return Artwork(), []
