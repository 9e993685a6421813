"""The imager's pixels: the print is sampled at their centres and drawn again in squares."""

from __future__ import annotations

import numpy as np
from pydantic import BaseModel, ConfigDict

from patterngen.model.job import GridRequest
from patterngen.model.lattice import FloatArray, direction
from patterngen.model.screen import ComplexArray, Grid

SUMMARY = "an imager's square pixels; the ruling is the resolution"


class Params(BaseModel):
    """Pixels have no settings of their own."""

    model_config = ConfigDict(extra="forbid")


class PixelGrid(Grid):
    """A comb of sampling points, then a square aperture that fills the pixel.

    The comb repeats every frequency of the print about every multiple of the resolution, all
    at full strength (`coefficients`); the square then weakens what has become of them
    (`transfer`).
    """

    kind = "pixels"
    samples = True

    def __init__(self, request: GridRequest) -> None:
        """The request's ruling is the resolution."""
        self.name = request.name
        self.ruling_per_mm, self.angle_deg = request.ruling_per_mm, request.angle_deg
        self.frequencies_per_mm = self.ruling_per_mm * np.stack(
            [direction(self.angle_deg), direction(self.angle_deg + 90.0)]
        )

    def coefficients(self, *, reach: int) -> ComplexArray:
        """One for every order: a sampling point stands in the sheet's origin."""
        return np.ones((2 * reach + 1, 2 * reach + 1), dtype=complex)

    def transfer(self, frequency_per_mm: FloatArray) -> FloatArray:
        """sinc along both sides of the pixel, (n, 2) to (n,)."""
        along = np.asarray(frequency_per_mm, dtype=float) @ self.frequencies_per_mm.T / self.ruling_per_mm**2
        return np.asarray(np.sinc(along[..., 0]) * np.sinc(along[..., 1]))


def make(request: GridRequest) -> Grid:
    """The pixel grid asked for."""
    return PixelGrid(request)


def examples() -> list[GridRequest]:
    """Grids for the tests that every kind must pass."""
    return [GridRequest("imager", "pixels", 2400 / 25.4, angle) for angle in (0.0, 15.0)]
