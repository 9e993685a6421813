"""The page around a sheet, and its register and trim marks, the same in every file."""

from __future__ import annotations

from dataclasses import dataclass

from patterngen.model.job import SheetSize

MARK_ROOM_MM = 9.0
"""Paper outside the bleed that marks need."""
MARK_WIDTH_MM = 0.1
_GAP_MM = 2.0
_CORNER_MM = 5.0
_CROSS_MM = 6.0

Segment = tuple[float, float, float, float]


@dataclass(frozen=True, slots=True)
class Page:
    """Boxes (x low, y low, x high, y high) in mm from the trim's lower left corner, and the marks."""

    media_mm: tuple[float, float, float, float]
    bleed_mm: tuple[float, float, float, float]
    trim_mm: tuple[float, float, float, float]
    marks_mm: tuple[Segment, ...]

    @property
    def width_mm(self) -> float:
        """Width of the whole page in mm."""
        return self.media_mm[2] - self.media_mm[0]

    @property
    def height_mm(self) -> float:
        """Height of the whole page in mm."""
        return self.media_mm[3] - self.media_mm[1]


def page_of(sheet: SheetSize) -> Page:
    """The page of a sheet: its bleed, and room for marks where they are asked for.

    Without bleed and marks the page is the sheet itself.
    """
    width, height = sheet.width_mm, sheet.height_mm
    room = sheet.bleed_mm + (MARK_ROOM_MM if sheet.marks else 0.0)
    return Page(
        media_mm=(-room, -room, width + room, height + room),
        bleed_mm=sheet.box_mm,
        trim_mm=(0.0, 0.0, width, height),
        marks_mm=_marks(sheet) if sheet.marks else (),
    )


def _marks(sheet: SheetSize) -> tuple[Segment, ...]:
    """Corner lines on the trim's edges and a cross at the middle of each side, all outside the bleed."""
    width, height = sheet.width_mm, sheet.height_mm
    near = sheet.bleed_mm + _GAP_MM
    far = near + _CORNER_MM
    out: list[Segment] = []
    for x, outward_x in ((0.0, -1.0), (width, 1.0)):
        for y, outward_y in ((0.0, -1.0), (height, 1.0)):
            out.append((x + outward_x * near, y, x + outward_x * far, y))
            out.append((x, y + outward_y * near, x, y + outward_y * far))
    arm = 0.5 * _CROSS_MM
    middle = near + arm
    centres = []
    if width > 2 * _CROSS_MM:
        centres += [(0.5 * width, -middle), (0.5 * width, height + middle)]
    if height > 2 * _CROSS_MM:
        centres += [(-middle, 0.5 * height), (width + middle, 0.5 * height)]
    for x, y in centres:
        out.append((x - arm, y, x + arm, y))
        out.append((x, y - arm, x, y + arm))
    return tuple(out)
