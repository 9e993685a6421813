"""What will be printed: one sheet as ordered ink layers of screens."""

from __future__ import annotations

from dataclasses import dataclass

from patterngen.model.job import Ink, Job
from patterngen.model.screen import Grid, Screen


@dataclass(frozen=True, slots=True, eq=False)
class Layer:
    """One ink and the screens it prints."""

    ink: Ink
    screens: tuple[Screen, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Sheet:
    """One physical sheet: layers in the order of the ink tables."""

    layers: tuple[Layer, ...]

    @property
    def screens(self) -> tuple[Screen, ...]:
        """Every screen of the sheet, in layer order."""
        return tuple(screen for layer in self.layers for screen in layer.screens)


@dataclass(frozen=True, slots=True, eq=False)
class Design:
    """The job with everything derived, its base sheet, and the grids it meets."""

    job: Job
    base: Sheet
    grids: tuple[Grid, ...] = ()
