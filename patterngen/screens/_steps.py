"""The tones that pictures are drawn in."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from patterngen.model.lattice import FloatArray

_SMALLEST_TONE = 1e-5
"""Lighter tones of a picture draw no dot (a disc a 280th of the pitch wide); the same for holes."""


class ToneSteps:
    """The tones that pictures are drawn in: numbered steps from 0 (nothing) to `count` (everything).

    A step is at most 1/512, and at most 1 um of the diameter of a small disc, inked or clear.
    """

    def __init__(self, *, pitch_um: float) -> None:
        """Steps for dots that stand `pitch_um` apart."""
        self._um = 2.0 * pitch_um / np.sqrt(np.pi)  # diameter in um is this times sqrt(tone)
        # below this tone a micrometre of diameter is the smaller step
        self._turn = min((self._um / 1024.0) ** 2, 0.5)
        self.half = int(np.ceil(self._measure(np.array(0.5))))
        self._scale = self.half / float(self._measure(np.array(0.5)))
        self.count = 2 * self.half

    def _measure(self, tone: FloatArray) -> FloatArray:
        small = np.minimum(tone, self._turn)
        return np.asarray(self._um * np.sqrt(small) + 512.0 * (tone - small))

    def nearest(self, tones: FloatArray) -> NDArray[np.int32]:
        """The step (n,) nearest to each tone (n,)."""
        dark = tones > 0.5
        light = np.where(dark, 1.0 - tones, tones)
        light[light < _SMALLEST_TONE] = 0.0
        step = np.rint(self._scale * self._measure(light)).astype(np.int32)
        return np.where(dark, self.count - step, step)

    def tones(self, steps: NDArray[Any]) -> FloatArray:
        """The tone (n,) of each step (n,)."""
        steps = np.asarray(steps)
        dark = steps > self.half
        m = np.where(dark, self.count - steps, steps) / self._scale
        turn = self._um * np.sqrt(self._turn)
        light = np.where(m <= turn, (m / self._um) ** 2, self._turn + (m - turn) / 512.0)
        return np.asarray(np.where(dark, 1.0 - light, light))
