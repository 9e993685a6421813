"""What was found: findings, beats, and the verdict that sums them up."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from patterngen.model.lattice import FloatArray
from patterngen.model.screen import ComplexArray
from patterngen.sources import Source

Status = Literal["pass", "warn", "fail", "waived", "not-applicable"]
Grade = Literal["unseen", "texture", "visible"]


@dataclass(frozen=True, slots=True)
class Limit:
    """One limit of a process: value in `unit`, its source, and where the job got it."""

    name: str
    value: float
    unit: str
    source: Source
    origin: str = "default"


@dataclass(frozen=True, slots=True)
class Measurement:
    """What a rule measured.  The engine works out margin and status, never the rule.

    `bad_when` is "above" or "below" the limit.  `warn_at` is a second, milder limit, and
    `warn_source` its source where that is another one.  Without `measured` the status is `worst`.
    `applies` False makes it not-applicable with `message` as the reason.
    """

    measured: float | None
    limit: float | None
    unit: str
    where: str
    message: str
    source: Source
    bad_when: Literal["above", "below"] = "above"
    warn_at: float | None = None
    worst: Status = "fail"
    applies: bool = True
    warn_source: Source | None = None


@dataclass(frozen=True, slots=True)
class Finding:
    """One row of the verdict."""

    rule: str
    status: Status
    measured: float | None
    limit: float | None
    margin: float | None
    unit: str
    source: Source
    where: str
    message: str
    waiver: str = ""


@dataclass(frozen=True, slots=True)
class Derived:
    """A value the preset left open, who chose it, and why."""

    value: str
    chosen: Any
    by: str
    because: str


@dataclass(frozen=True, slots=True, eq=False)
class BeatTable:
    """Every listed beat as columns (n rows), strongest first.

    `slots` names the participants in order, with the number of order columns of each;
    `orders` (n, sum of slots) int.  `amplitude` (n, 3) complex is that of the strongest
    component in XYZ (Y of the perfect diffuser = 1); `power` (n, 3) is the root of the
    sum of squares over joined components.  Contrasts are Michelson in Y.
    `tones` (n, screens) are the plate tones at which the row was found.
    `bound_*` say how strong any combination that is not listed can be at the most: at the reading
    distance, from far for periods up to 1 mm, from far for longer ones.
    """

    slots: tuple[tuple[str, int], ...]
    orders: NDArray[np.int32]
    frequency_per_mm: FloatArray
    amplitude: ComplexArray
    power: FloatArray
    mean: FloatArray
    contrast: FloatArray
    contrast_min: FloatArray
    contrast_max: FloatArray
    threshold: FloatArray
    visibility: FloatArray
    visibility_far: FloatArray
    components: NDArray[np.int32]
    tones: FloatArray
    colour_swing: FloatArray
    """CIEDE2000 between the extremes over register, NaN where it was not worked out (periods up to 2 mm)."""
    visibility_far_judged: FloatArray
    """`visibility_far` where it counts most: shadows (see the limit of that name) count less in proportion."""
    colour_swing_judged: FloatArray
    """`colour_swing` in the same way."""
    grade: tuple[Grade, ...]
    bound_visibility: float
    bound_visibility_far: float
    bound_visibility_far_coarse: float

    def __len__(self) -> int:
        return len(self.contrast)

    @property
    def period_mm(self) -> FloatArray:
        """(n,) periods, inf for a frequency of zero."""
        f = np.hypot(self.frequency_per_mm[:, 0], self.frequency_per_mm[:, 1])
        with np.errstate(divide="ignore"):
            return np.where(f > 0, 1.0 / np.maximum(f, 1e-300), np.inf)

    def taking_part(self) -> NDArray[np.bool_]:
        """(n, slots): who takes part in each row."""
        starts = np.cumsum([0, *(size for _, size in self.slots)])[:-1]
        if not len(self.orders) or not len(starts):
            return np.zeros((len(self.orders), len(starts)), dtype=bool)
        return np.asarray(np.add.reduceat(self.orders != 0, starts, axis=1) > 0)

    def participants(self, row: int) -> dict[str, list[int]]:
        """Names and orders of those taking part in a row."""
        out: dict[str, list[int]] = {}
        at = 0
        for name, size in self.slots:
            part = self.orders[row, at : at + size]
            at += size
            if part.any():
                out[name] = [int(k) for k in part]
        return out


@dataclass(frozen=True, slots=True, eq=False)
class Balance:
    """Combinations whose period is longer than the sheet's diagonal: colour that moves with register.

    One row a group of screens (`names`): `orders` of its strongest combination,
    `frequency_per_mm` as designed (zero in exact balance), `drift_period_mm` the shortest
    period that the press tolerances can make of it, `lab_low`, `lab_high` the colours of the
    extremes over register, `colour_swing` the CIEDE2000 between them and
    `colour_swing_register` the part that the press's register tolerance can reach.
    """

    names: tuple[str, ...]
    orders: Mapping[str, list[int]]
    frequency_per_mm: tuple[float, float]
    exact: bool
    drift_period_mm: float
    lab_low: tuple[float, float, float]
    lab_high: tuple[float, float, float]
    mean_y: tuple[float, float, float]
    """Y (0 to 1) at the darkest register, on average, and at the lightest."""
    colour_swing: float
    colour_swing_register: float
    colour_swing_judged: float
    """The swing where it counts most: shadows count less in proportion."""
    tones: Mapping[str, float]


@dataclass(frozen=True, slots=True, eq=False)
class Verdict:
    """The outcome of one job."""

    job: str
    title: str
    status: Literal["pass", "warn", "fail"]
    screens: tuple[Mapping[str, Any], ...]
    beats: BeatTable
    balance: tuple[Balance, ...]
    findings: tuple[Finding, ...]
    derived: tuple[Derived, ...]
    notes: Mapping[str, Any] = field(default_factory=dict)
