"""What cells an imager's pixel grid can hold: rational tangents and supercells.

A cell whose row runs a pixels along and b pixels up repeats on the pixel grid; its angle is
atan(b / a).  A supercell of m by m dots gives finer steps.  The pixels of a cell can be
laid out as one brick of rows that is repeated with a shift (Holladay 1980).
"""

from __future__ import annotations

import math
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class PixelCell:
    """A square cell of `multiple` by `multiple` dots whose row is the pixel vector (a, b)."""

    a: int
    b: int
    multiple: int = 1

    @property
    def angle_deg(self) -> float:
        """Angle of the rows.

        >>> round(PixelCell(15, 4).angle_deg, 5)
        14.93142
        """
        return math.degrees(math.atan2(self.b, self.a))

    def ruling(self, resolution: float) -> float:
        """Ruling in the unit of `resolution` (pixels per the same length).

        >>> round(PixelCell(15, 4).ruling(2400), 4)
        154.5976
        """
        return resolution * self.multiple / math.hypot(self.a, self.b)

    @property
    def brick(self) -> tuple[int, int, int]:
        """(width, height, shift) of the brick in pixels; the next course lies `shift` to the right.

        >>> PixelCell(15, 4).brick
        (241, 1, 64)
        """
        height, up, along = _bezout(self.b, self.a)
        width = (self.a**2 + self.b**2) // height
        return width, height, (up * self.a - along * self.b) % width


def nearest_cell(*, cells: float, angle_deg: float, multiple: int = 1) -> PixelCell:
    """The cell nearest to a wish; `cells` is resolution / ruling, the wanted pixels a dot.

    Both parts are rounded to whole pixels, so the row's end is off by 0.7071 pixels at the
    most and the angle by atan(0.7071 / (multiple * cells)).
    """
    length = multiple * cells
    angle = math.radians(angle_deg)
    return PixelCell(round(length * math.cos(angle)), round(length * math.sin(angle)), multiple)


def smallest_supercell(
    *, cells: float, angle_deg: float, angle_error_deg: float, ruling_error: float, largest: int = 256
) -> PixelCell | None:
    """The smallest supercell within both errors (`ruling_error` as a share), None up to `largest`."""
    for multiple in range(1, largest + 1):
        cell = nearest_cell(cells=cells, angle_deg=angle_deg, multiple=multiple)
        turn = (cell.angle_deg - angle_deg + 180.0) % 360.0 - 180.0
        if abs(turn) < angle_error_deg and abs(cell.ruling(cells) - 1.0) < ruling_error:
            return cell
    return None


def guaranteeing_multiple(*, cells: float, angle_error_deg: float) -> int:
    """The supercell size from which any angle is met within the error."""
    return math.ceil(math.sqrt(0.5) / (cells * math.tan(math.radians(angle_error_deg))))


def _bezout(b: int, a: int) -> tuple[int, int, int]:
    """(g, p, q) with p b + q a = g, the greatest common divisor."""
    old, new = (b, 1, 0), (a, 0, 1)
    while new[0]:
        times = old[0] // new[0]
        old, new = new, (old[0] - times * new[0], old[1] - times * new[1], old[2] - times * new[2])
    return old if old[0] > 0 else (-old[0], -old[1], -old[2])
