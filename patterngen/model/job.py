"""The validated request: plain numbers in mm, cycles per mm, degrees and 0 to 1."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from patterngen.model.area import Area, ToneField
from patterngen.model.verdict import Derived, Limit

Lab = tuple[float, float, float]


@dataclass(frozen=True, slots=True)
class SheetSize:
    """Trimmed size and bleed in mm; `marks` asks for register and trim marks."""

    width_mm: float
    height_mm: float
    bleed_mm: float = 0.0
    marks: bool = False

    @property
    def diagonal_mm(self) -> float:
        """Diagonal of the trimmed sheet in mm."""
        return float((self.width_mm**2 + self.height_mm**2) ** 0.5)

    @property
    def box_mm(self) -> tuple[float, float, float, float]:
        """The inked box: trim and bleed, from the trim's lower left corner."""
        b = self.bleed_mm
        return (-b, -b, self.width_mm + b, self.height_mm + b)


@dataclass(frozen=True, slots=True)
class Viewing:
    """Distances in mm, limits of visibility, light in lux, eye model by registry name."""

    distance_mm: float = 350.0
    far_mm: float = 700.0
    limit: float = 4.0
    limit_coarse: float = 1.0
    light_lx: float = 500.0
    eye: str = "barten1999"


@dataclass(frozen=True, slots=True)
class Gain:
    """How shapes grow in print.

    `half_tone` is the tone value increase at 0.5 (0 to 1), or `edge_mm` the growth of every edge.
    """

    half_tone: float = 0.0
    edge_mm: float = 0.0


@dataclass(frozen=True, slots=True)
class Press:
    """Process by name (None: only limits that need none), imager, tolerances, gain, Yule-Nielsen n."""

    process: str | None = None
    imager_per_mm: float | None = None
    register_mm: float = 0.0
    angle_error_deg: float = 0.0
    size_error: float = 0.0
    yule_nielsen: float = 1.0
    gain: Gain = Gain()
    limits: Mapping[str, Limit] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Ink:
    """A printing ink: its solid on this paper in CIELAB (D50, 2 degrees)."""

    name: str
    lab: Lab
    opaque: bool = False


@dataclass(frozen=True, slots=True)
class Overprint:
    """Inks on top of each other: the measured colour, or that they `never` meet."""

    inks: frozenset[str]
    lab: Lab | None = None
    never: bool = False


@dataclass(frozen=True, slots=True, eq=False)
class ScreenRequest:
    """One screen as asked for; None is left open for a rule to derive.

    `params` holds the kind's own validated parameters.
    """

    name: str
    ink: str
    kind: str
    shape: str | None
    ruling_per_mm: float | None
    angle_deg: float | None
    tone: ToneField
    area: Area
    origin_mm: tuple[float, float]
    gain: Gain
    params: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True, slots=True, eq=False)
class GridRequest:
    """One grid as asked for."""

    name: str
    kind: str
    ruling_per_mm: float
    angle_deg: float
    params: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Waiver:
    """A rule whose failure is accepted, and why."""

    rule: str
    reason: str


@dataclass(frozen=True, slots=True, eq=False)
class Job:
    """One validated job.

    `origin` maps a preset path ("screen.cyan.angle") to where its value came from
    ("preset", "default", "process sheetfed-offset", "rule usual-angles", "--set").
    `text` is the preset as it was read (with overrides written in), for digest and saving.
    """

    name: str
    title: str
    text: str
    folder: Path | None
    sheet: SheetSize
    viewing: Viewing
    press: Press
    paper_lab: Lab
    inks: tuple[Ink, ...]
    overprints: tuple[Overprint, ...]
    screens: tuple[ScreenRequest, ...]
    grids: tuple[GridRequest, ...] = ()
    waivers: tuple[Waiver, ...] = ()
    origin: Mapping[str, str] = field(default_factory=dict)
    derived: tuple[Derived, ...] = ()
    remarks: tuple[str, ...] = ()
    """What the gates normalised or found odd, one sentence each; they become warnings."""
    artwork: Mapping[str, str] = field(default_factory=dict)
    """SHA-256 (hex) of the bytes that were used of every picture and outline, by its path as in the preset."""

    def ink(self, name: str) -> Ink:
        """The ink of that name."""
        return next(ink for ink in self.inks if ink.name == name)
