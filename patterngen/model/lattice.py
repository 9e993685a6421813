"""A plane lattice: where repeated shapes stand."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Lattice:
    """`origin_mm` (2,) and `steps_mm` (2, 2): row 0 is one step of i, row 1 one step of j.

    The same object serves as a *frame* for coordinates: (u, v) stands for
    origin + u * steps[0] + v * steps[1], in mm, x right and y up, measured from the
    trim's lower left corner.
    """

    origin_mm: FloatArray
    steps_mm: FloatArray

    def place(self, uv: FloatArray) -> FloatArray:
        """(n, 2) frame coordinates to (n, 2) mm."""
        return np.asarray(uv, dtype=float) @ self.steps_mm + self.origin_mm

    def locate(self, xy_mm: FloatArray) -> FloatArray:
        """(n, 2) mm to (n, 2) frame coordinates."""
        return (np.asarray(xy_mm, dtype=float) - self.origin_mm) @ np.linalg.inv(self.steps_mm)

    @property
    def cell_mm2(self) -> float:
        """Area of one cell in mm2."""
        return float(abs(np.linalg.det(self.steps_mm)))

    @classmethod
    def millimetres(cls) -> Lattice:
        """The frame in which frame coordinates are mm."""
        return cls(np.zeros(2), np.eye(2))

    @classmethod
    def square(cls, *, pitch_mm: float, angle_deg: float, origin_mm: FloatArray) -> Lattice:
        """Rows along `angle_deg`, `pitch_mm` apart both ways."""
        c, s = _cos_sin(angle_deg)
        return cls(np.asarray(origin_mm, dtype=float), pitch_mm * np.array([[c, s], [-s, c]]))


def _cos_sin(angle_deg: float) -> tuple[float, float]:
    """Cosine and sine, exact at multiples of 90 degrees so that upright screens stay upright."""
    quarter, rest = divmod(angle_deg, 90.0)
    c, s = float(np.cos(np.deg2rad(rest))), float(np.sin(np.deg2rad(rest)))
    for _ in range(int(quarter) % 4):
        c, s = -s, c
    return c, s


def direction(angle_deg: float) -> FloatArray:
    """Unit vector (2,) at `angle_deg`, counter-clockwise from the sheet's horizontal."""
    return np.array(_cos_sin(angle_deg))
