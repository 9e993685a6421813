"""A screen: one object with four faces that agree; and a grid, the same without ink."""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from patterngen.model.area import Area, BoolArray, ToneField
from patterngen.model.lattice import FloatArray
from patterngen.model.shapes import Batch

ComplexArray = NDArray[np.complex128]


class Screen(ABC):
    """One ink's pattern of shapes.

    Faces: `frequencies_per_mm` and `coefficients` (what predicts), `shapes` (what
    prints), `covers` (what simulates).  Shapes and `covers` are at the *plate* tone;
    `coefficients` takes whatever tone it is asked for, so the caller passes the printed
    tone, see `printed_tone`.
    """

    name: str
    kind: str
    ink: str
    ruling_per_mm: float
    angle_deg: float
    shape: str
    origin_mm: FloatArray
    area: Area
    tone: ToneField
    frequencies_per_mm: FloatArray
    """(m, 2): m = 1 for lines, 2 for dots (along the rows, then at right angles)."""
    symmetry_deg: float
    """Turn after which the directions repeat, for angle rules: 180 for lines and dots with an axis, 90 for dots."""

    @abstractmethod
    def coefficients(self, tone: float, *, reach: int) -> ComplexArray:
        """Fourier coefficients of the coverage at `tone`, orders -reach..reach on each axis.

        Shape (2 reach + 1,) * m; index [k1 + reach, k2 + reach]; about the sheet's origin,
        so `origin_mm` is in the phase: coverage(x) = sum c(k) exp(2 pi i k.f.x).
        The entry of order zero is the tone.
        """

    @abstractmethod
    def tail(self, tone: float, *, radius: float) -> float:
        """A bound: no coefficient of order |k| >= radius (Euclidean) is larger in modulus."""

    @abstractmethod
    def edge_per_mm(self, tone: float) -> float:
        """Length of inked edge for each mm2 of sheet (mm / mm2)."""

    @abstractmethod
    def smallest_mm(self, tone: float) -> tuple[float, float]:
        """(least width of an inked shape, least width of a gap) in mm at `tone`; inf where there is none."""

    @abstractmethod
    def printed_tone(self, tone: FloatArray | float) -> FloatArray:
        """Plate tone to printed tone (gain)."""

    @abstractmethod
    def shapes(self) -> Iterator[Batch]:
        """Exact geometry at the plate tone, cut at the area's edge, in batches."""

    @abstractmethod
    def covers(self, x_mm: FloatArray, y_mm: FloatArray) -> BoolArray:
        """Which points are inked on the plate."""


class Grid(ABC):
    """A periodic structure that is not ink and multiplies or samples the whole print."""

    name: str
    kind: str
    frequencies_per_mm: FloatArray
    samples: bool
    """True for a comb: every order has coefficient 1 and none may be left out."""

    @abstractmethod
    def coefficients(self, *, reach: int) -> ComplexArray:
        """As for a screen, divided by the mean, so that order zero is 1."""

    def tail(self, *, radius: float) -> float:
        """A bound: no coefficient of order |k| >= radius is larger; 1 holds for anything that only transmits."""
        return 1.0

    @abstractmethod
    def transfer(self, frequency_per_mm: FloatArray) -> FloatArray:
        """(n, 2) frequencies to (n,) amplitude factors of what the grid does after sampling."""
