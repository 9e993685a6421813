"""Requests for the tests that every screen kind must pass: a panel with a hole, even tones, one small picture."""

from __future__ import annotations

import numpy as np

from patterngen.model.area import Area, ToneField
from patterngen.model.job import Gain, ScreenRequest

_BOX_MM = (0.0, 0.0, 6.0, 5.0)
_OUTLINE = np.array([[0.3, 0.4], [5.6, 0.2], [5.8, 3.1], [4.4, 4.7], [2.0, 4.2], [0.2, 4.8]])
_HOLE = np.array([[2.0, 1.4], [1.8, 2.6], [3.1, 3.2], [3.6, 1.9]])

PANEL = Area(_BOX_MM, (_OUTLINE, _HOLE), "a panel with a hole")


def _picture() -> ToneField:
    """A smooth hill of tone with a dark band (all inked) and a light one (nothing inked)."""
    y, x = np.mgrid[0:50, 0:60] / 10.0
    tone = 0.5 + 0.55 * np.sin(1.1 * x + 0.4) * np.cos(0.9 * (5 - y))
    return ToneField(values=np.clip(tone, 0, 1).astype(np.float32), box_mm=_BOX_MM, label="a hill")


PICTURE = _picture()


def on_panel(
    kind: str, shape: str | None, *, ruling_per_mm: float, angle_deg: float, tone: float | ToneField
) -> ScreenRequest:
    """A request on the panel, the origin off its corner."""
    field = tone if isinstance(tone, ToneField) else ToneField(constant=tone)
    return ScreenRequest(
        name=f"{kind}-{shape or 'plain'}",
        ink="Slate",
        kind=kind,
        shape=shape,
        ruling_per_mm=ruling_per_mm,
        angle_deg=angle_deg,
        tone=field,
        area=PANEL,
        origin_mm=(0.13, -0.07),
        gain=Gain(),
    )
