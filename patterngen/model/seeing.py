"""Who looks, from where; and the colours of the inks: what the beat engine is handed."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np

from patterngen.model.lattice import FloatArray


def cycles_per_degree(frequency_per_mm: FloatArray, *, distance_mm: float) -> FloatArray:
    """Exact conversion of cycles/mm at a distance: 1 / (2 atan(P / 2D)) with the angle in degrees.

    >>> round(float(cycles_per_degree(np.array(1.0), distance_mm=400.0)), 6)
    6.981321
    """
    f = np.maximum(np.asarray(frequency_per_mm, dtype=float), 1e-12)
    return np.asarray(1.0 / np.rad2deg(2.0 * np.arctan(0.5 / (f * distance_mm))))


@dataclass(frozen=True, slots=True, eq=False)
class Viewer:
    """Two distances, two limits, one eye.

    `sensitivity` takes cycles per degree (n,) and gives contrast sensitivity (n,), the
    inverse of the Michelson contrast at threshold.  `limit` holds for periods up to 1 mm,
    `limit_coarse` for longer ones, both at the far distance.
    """

    distance_mm: float
    far_mm: float
    limit: float
    limit_coarse: float
    sensitivity: Callable[[FloatArray], FloatArray]

    def sensitivity_near(self, frequency_per_mm: FloatArray) -> FloatArray:
        """Sensitivity (n,) to frequencies (n,) in cycles/mm at the reading distance."""
        return self.sensitivity(cycles_per_degree(frequency_per_mm, distance_mm=self.distance_mm))

    def sensitivity_far(self, frequency_per_mm: FloatArray) -> FloatArray:
        """The same at the far distance."""
        return self.sensitivity(cycles_per_degree(frequency_per_mm, distance_mm=self.far_mm))

    def limit_at(self, frequency_per_mm: FloatArray) -> FloatArray:
        """The far limit that holds for each frequency (n,)."""
        return np.where(np.asarray(frequency_per_mm) >= 1.0 - 1e-12, self.limit, self.limit_coarse)


class InkColours(Protocol):
    """Inks and overprints in XYZ, the perfect diffuser at Y = 1."""

    @property
    def yule_nielsen(self) -> float:
        """Yule-Nielsen n."""

    def primaries(self, inks: Sequence[str]) -> FloatArray:
        """XYZ of every combination of screens, shape (2,) * n + (3,).

        `inks` names the ink of each of the n screens, repeats allowed: index 1 on an axis
        means that this screen inks the point.
        """

    def lab(self, xyz: FloatArray) -> FloatArray:
        """(n, 3) XYZ to CIELAB (D50)."""

    def difference(self, lab_a: FloatArray, lab_b: FloatArray) -> FloatArray:
        """(n, 3), (n, 3) to CIEDE2000 (n,)."""
