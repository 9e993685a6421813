"""SVG text to filled outlines in mm.  Runs in the capped child process of `artwork`.

Only what has area is taken: paths and the basic shapes, through groups, `use` and
transforms, by their fill rule; paint and strokes do not count.  Curves become chords that
leave them by at most 0.1 um.  Whatever would change the outlines and is not understood
here (clips, masks, nested pages) is refused; what has no outline is left out with a remark.
"""

from __future__ import annotations

import xml.etree.ElementTree as ET
from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from patterngen.job.rings import SMALLEST_MM2, fill, rings_of, signed_area
from patterngen.job.svg_coordinates import length, page_length_mm, page_matrix, page_remarks, transform
from patterngen.job.svg_curves import MOST_POINTS, too_many_points
from patterngen.job.svg_remarks import OutlineError, Remarks, clip
from patterngen.job.svg_shapes import SHAPES, subpaths
from patterngen.job.svg_style import Style, Styles
from patterngen.job.svg_tree import DEEPEST, SVG, Tree, parse, reference, short
from patterngen.model.lattice import FloatArray

if TYPE_CHECKING:
    from shapely.geometry.base import BaseGeometry

__all__ = ["OutlineError", "Outlines", "read"]

_GROUPS = frozenset(["g", "a"])
# these draw nothing where they stand
_UNDRAWN = frozenset(
    [
        "title", "desc", "metadata", "view",
        "defs", "style", "symbol", "clipPath", "mask", "marker",
        "linearGradient", "radialGradient", "pattern", "filter",
    ]
)  # fmt: skip


@dataclass
class Outlines:
    """Rings in mm (outlines counter-clockwise, each followed by its holes, clockwise) and remarks."""

    rings: list[FloatArray]
    remarks: list[str]


def read(
    data: bytes,
    *,
    element: str | None,
    sheet_mm: tuple[float, float],
    box_mm: tuple[float, float, float, float],
    label: str,
) -> Outlines:
    """The outlines of a drawing, or of the element with that id, cut to `box_mm`.

    The page's top left corner lies on that of the sheet, whose width and height are
    `sheet_mm`; x right, y up from the lower left one.
    Raises `OutlineError`.
    """
    import shapely

    root = parse(data)
    drawing = _Drawing(root, label)
    page_mm = (page_length_mm(root, "width"), page_length_mm(root, "height"))
    page = page_matrix(root, page_mm=page_mm)
    drawing.remarks.sentences += page_remarks(root, page_mm=page_mm, sheet_mm=sheet_mm, label=label)
    try:
        geometry = shapely.union_all(list(drawing.filled(page, element)))
    except RecursionError:
        raise OutlineError("uses and groups are nested too deep", allowed="plainer drawings") from None
    # turn y up; that turns the rings round too, which `rings_of` sets right
    flipped = shapely.transform(geometry, lambda xy: np.column_stack([xy[:, 0], sheet_mm[1] - xy[:, 1]]))
    if flipped.area < SMALLEST_MM2:
        raise OutlineError("nothing in it has an area", allowed="closed outlines: paths or basic shapes")
    cut = shapely.intersection(flipped, shapely.box(*box_mm))
    if cut.area < SMALLEST_MM2:
        x0, y0, x1, y1 = flipped.bounds
        raise OutlineError(
            "it lies wholly outside the sheet",
            value=f"x from {x0:.4g} to {x1:.4g} mm, y from {y0:.4g} to {y1:.4g} mm",
            allowed="outlines on the sheet; the page's top left corner lies on the trim's",
        )
    if cut.area < flipped.area * (1 - 1e-9):
        drawing.remarks.sentences.append(
            f"{label}: reaches beyond the sheet and was cut there, from {flipped.area:.6g} mm2 to {cut.area:.6g} mm2"
        )
    return Outlines(list(rings_of(cut)), drawing.remarks.summary())


class _Drawing:
    """One SVG tree being walked."""

    def __init__(self, root: ET.Element, label: str) -> None:
        self.remarks = Remarks(label)
        self._tree = Tree(root)
        self._points = 0
        for element in root.iter():
            for name in element.keys():  # noqa: SIM118 (an element, not a dict)
                if name.lower().startswith("on") and "}" not in name:
                    self.remarks.leave_out("event handlers")
        self._styles = Styles(self._tree, self.remarks)

    def filled(self, page: FloatArray, identity: str | None) -> Iterator[BaseGeometry]:
        """Filled geometry in mm, y down, of the whole drawing or of one element."""
        root = self._tree.root
        if identity is None:
            self._tree.refuse_too_many_uses(root)
            style = self._styles.inherit(root, Style())
            for child in root:
                yield from self._walk(child, page, style, ())
            return
        element = self._tree.find(identity)
        self._tree.refuse_too_many_uses(element)
        matrix, style = page, Style()
        for ancestor in self._tree.ancestors(element):
            style = self._styles.inherit(ancestor, style)
            if ancestor is not root:
                if short(ancestor.tag) == "svg":
                    raise self._tree.error(ancestor, "is a page within the page", allowed="one page; flatten it first")
                matrix = self._placed(ancestor, matrix)
        if element is root:
            yield from self.filled(page, None)
        elif short(element.tag) == "symbol":
            yield from self._content(element, matrix, self._styles.inherit(element, style), (identity,))
        else:
            yield from self._walk(element, matrix, style, ())

    def _placed(self, element: ET.Element, matrix: FloatArray) -> FloatArray:
        """The matrix for what an element holds, where `matrix` is the one around it."""
        self._styles.refuse_cut(element)
        self._styles.refuse_transform(element)
        return matrix @ transform(self._tree, element)

    def _walk(
        self, element: ET.Element, matrix: FloatArray, style: Style, used: tuple[str, ...]
    ) -> Iterator[BaseGeometry]:
        if not isinstance(element.tag, str) or not element.tag.startswith(SVG):
            return  # another program's own notes
        tag = short(element.tag)
        if tag in _UNDRAWN:
            return
        if tag == "svg":
            raise self._tree.error(element, "is a page within the page", allowed="one page; flatten it first")
        if tag not in SHAPES and tag not in _GROUPS and tag != "use":
            self.remarks.leave_out(f"<{tag}>")
            return
        if self._styles.value(element, "display") == "none":
            return
        style = self._styles.inherit(element, style)
        matrix = self._placed(element, matrix)
        if tag == "a" and reference(element):
            self.remarks.leave_out("links")
        if tag in _GROUPS:
            yield from self._content(element, matrix, style, used)
        elif tag == "use":
            yield from self._used(element, matrix, style, used)
        elif style.visible:
            yield from self._shape(element, tag, matrix, style)

    def _content(
        self, element: ET.Element, matrix: FloatArray, style: Style, used: tuple[str, ...]
    ) -> Iterator[BaseGeometry]:
        for child in element:
            yield from self._walk(child, matrix, style, used)

    def _used(
        self, element: ET.Element, matrix: FloatArray, style: Style, used: tuple[str, ...]
    ) -> Iterator[BaseGeometry]:
        target = reference(element)
        if not target or not target.startswith("#"):
            raise self._tree.error(
                element,
                "refers to something outside the file",
                value=clip(target or ""),
                allowed='href="#..." of an element in the same file',
            )
        identity = target[1:]
        if identity in used:
            raise self._tree.error(element, f"refers to itself through #{clip(identity)}", allowed="no circles")
        if len(used) >= DEEPEST:
            raise self._tree.error(element, "is a use within too many uses", allowed=f"at most {DEEPEST} levels")
        found = self._tree.by_id.get(identity)
        if found is None:
            raise self._tree.error(element, "refers to an element that is not there", value=clip(target))
        shift = np.eye(3)
        shift[:2, 2] = length(self._tree, element, "x"), length(self._tree, element, "y")
        if short(found.tag) == "symbol":
            if found.get("viewBox") is not None:
                raise self._tree.error(
                    found,
                    "is a symbol with a page of its own",
                    allowed="symbols without viewBox; flatten it first",
                )
            self._styles.refuse_cut(found)
            yield from self._content(found, matrix @ shift, self._styles.inherit(found, style), (*used, identity))
        else:
            yield from self._walk(found, matrix @ shift, style, (*used, identity))

    def _shape(self, element: ET.Element, tag: str, matrix: FloatArray, style: Style) -> Iterator[BaseGeometry]:
        rings: list[FloatArray] = []
        for ring, closed in subpaths(self._tree, element, tag, matrix):
            self._points += len(ring)
            if self._points > MOST_POINTS:
                raise too_many_points()
            if len(ring) < 3 or np.ptp(ring, axis=0).max() < 1e-9:
                self.remarks.flat += 1
                continue
            if not closed and np.hypot(*(ring[0] - ring[-1])) > 1e-6 and tag != "line":
                self.remarks.open += 1
            rings.append(ring)
        if not rings:
            return
        geometry, crossing = fill(rings, even_odd=style.fill_rule == "evenodd")
        if crossing:
            rule = "even-odd" if style.fill_rule == "evenodd" else "non-zero"
            alone = sum(abs(signed_area(ring)) for ring in rings)
            self.remarks.sentences.append(
                f"{self.remarks.label}: {self._tree.name(element)} crosses itself; "
                f"filled by its {rule} rule it has {geometry.area:.6g} mm2 "
                f"(its outlines, taken as drawn, enclose {alone:.6g} mm2)"
            )
        if geometry.area < SMALLEST_MM2:
            self.remarks.flat += 1
            return
        yield geometry
