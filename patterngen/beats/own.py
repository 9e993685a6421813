"""How visible a screen is by itself: no beat, but the texture that every beat is seen beside."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from patterngen.beats._differences import Strengths
from patterngen.model.lattice import FloatArray
from patterngen.model.screen import Screen
from patterngen.model.seeing import InkColours, Viewer

_REACH = 3
"""Orders looked at: a screen is never more visible by an order higher than this."""


@dataclass(frozen=True, slots=True)
class OwnTexture:
    """Contrast and visibility of a screen's most visible order, at the tones where it is strongest."""

    contrast: float
    visibility: float
    visibility_far: float


def own_textures(
    screens: Sequence[Screen], together: FloatArray, *, colours: InkColours, viewer: Viewer
) -> dict[str, OwnTexture]:
    """For each screen its own texture, by name.

    `together` (m, n) are the plate tones that occur together: a screen shows less on a ground
    that another ink has darkened alike, more beside one that leaves the paper.
    """
    if not len(together):
        return {screen.name: OwnTexture(0.0, 0.0, 0.0) for screen in screens}
    printed = np.column_stack([screen.printed_tone(together[:, i]) for i, screen in enumerate(screens)])
    primaries = colours.primaries([screen.ink for screen in screens])
    strengths = Strengths(primaries, printed, yule_nielsen=colours.yule_nielsen)
    out = {}
    for i, screen in enumerate(screens):
        alone = np.array([1 << i], dtype=np.int64)
        share = np.array(
            [2.0 * abs(strengths.at(row, alone)[0, 1]) / strengths.mean[row, 1] for row in range(len(printed))]
        )
        out[screen.name] = _strongest(screen, printed[:, i], share, viewer)
    return out


def _strongest(screen: Screen, printed: FloatArray, share: FloatArray, viewer: Viewer) -> OwnTexture:
    """The order and tone with the largest visibility at the far distance, then at the reading distance."""
    axes = len(screen.frequencies_per_mm)
    orders = np.stack(np.meshgrid(*[np.arange(-_REACH, _REACH + 1)] * axes, indexing="ij"), axis=-1)
    length = np.hypot(*np.moveaxis(orders.reshape(-1, axes) @ screen.frequencies_per_mm, -1, 0))
    kept = length > 0
    near, far = viewer.sensitivity_near(length[kept]), viewer.sensitivity_far(length[kept])
    best = OwnTexture(0.0, 0.0, 0.0)
    for tone in np.unique(printed):
        if not 0.0 < tone < 1.0:
            continue
        modulus = np.abs(screen.coefficients(float(tone), reach=_REACH)).ravel()[kept]
        contrast = modulus * share[printed == tone].max()
        at = int(np.argmax(contrast * far + 1e-9 * contrast * near))
        found = OwnTexture(float(contrast[at]), float(contrast[at] * near[at]), float(contrast[at] * far[at]))
        if (found.visibility_far, found.visibility) > (best.visibility_far, best.visibility):
            best = found
    return best
