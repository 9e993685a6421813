"""What every ink screen takes from its request, and its gain."""

from __future__ import annotations

from abc import abstractmethod
from functools import cached_property

import numpy as np

from patterngen.errors import Fault, InputError
from patterngen.model.area import Area, ToneField
from patterngen.model.gain import PrintedTone
from patterngen.model.job import ScreenRequest
from patterngen.model.lattice import FloatArray, Lattice
from patterngen.model.screen import Screen


class InkScreen(Screen):
    """A screen of one ink, from a request whose ruling and angle are settled."""

    def __init__(self, request: ScreenRequest) -> None:
        """Raises `InputError` while ruling or angle are open."""
        if request.ruling_per_mm is None or request.angle_deg is None:
            raise InputError(Fault("", f"screen.{request.name}", "ruling and angle must be settled first"))
        self.name, self.ink = request.name, request.ink
        self.ruling_per_mm, self.angle_deg = request.ruling_per_mm, request.angle_deg
        self.pitch_mm = 1.0 / request.ruling_per_mm
        self.origin_mm = np.asarray(request.origin_mm, dtype=float)
        self.area: Area = request.area
        self.tone: ToneField = request.tone.averaged(size_mm=self.pitch_mm)
        self.frame = Lattice.square(pitch_mm=self.pitch_mm, angle_deg=self.angle_deg, origin_mm=self.origin_mm)
        """One cell of the ruling a step, the first step along the lines or dot rows."""
        self._gain = request.gain
        self._edges: dict[float, float] = {}

    @abstractmethod
    def edges_per_mm(self, tones: FloatArray) -> FloatArray:
        """`edge_per_mm` for tones (n,), all between 0 and 1."""

    def edge_per_mm(self, tone: float) -> float:
        """Length of inked edge for each mm2 of sheet (mm / mm2); 0 where nothing or everything is inked."""
        if not 0.0 < tone < 1.0:
            return 0.0
        if tone not in self._edges:
            self._edges[tone] = float(self.edges_per_mm(np.array([tone]))[0])
        return self._edges[tone]

    @cached_property
    def _printed(self) -> PrintedTone:
        return PrintedTone(self._gain, edge_per_mm=self.edges_per_mm)

    def printed_tone(self, tone: FloatArray | float) -> FloatArray:
        """Plate tone to printed tone: tone value increase, then edge growth."""
        return self._printed(tone)
