"""SVG text to filled outlines in mm.  Runs in the capped child process of `artwork`.

Only what has area is taken: paths and the basic shapes, through groups, `use` and
transforms, by their fill rule; paint and strokes do not count.  Curves become chords that
leave them by at most 0.1 um.  Whatever would change the outlines and is not understood
here (clips, masks, nested pages) is refused; what has no outline is left out with a remark.
"""

from __future__ import annotations

import math
import re
import xml.etree.ElementTree as ET
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from difflib import get_close_matches
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from patterngen.units import plain

if TYPE_CHECKING:
    from shapely.geometry.base import BaseGeometry

FloatArray = NDArray[np.float64]

DEEPEST = 64
MOST_ELEMENTS = 50_000
MOST_POINTS = 1_000_000
CHORD_ERROR_MM = 1e-4
_SMALLEST_MM2 = 1e-8
_SAME_SIZE_MM = 0.5
"""A page within this of the sheet is the sheet: sizes are often rounded to whole mm or points."""
_MOST_WORK = 2_000_000_000
_LARGEST = 1e7
_MM_PER_PX = 25.4 / 96
_SVG = "{http://www.w3.org/2000/svg}"
_HREF = ("href", "{http://www.w3.org/1999/xlink}href")
_UNITS_MM = {
    "": _MM_PER_PX,
    "px": _MM_PER_PX,
    "mm": 1.0,
    "cm": 10.0,
    "in": 25.4,
    "pt": 25.4 / 72,
    "pc": 25.4 / 6,
    "q": 0.25,
}
# atomic, so that a long row of digits is not tried as two numbers in every possible way
_NUMBER = r"(?>[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]{1,3})?)"
_NUMBERS = re.compile(_NUMBER, re.ASCII)

_SHAPES = frozenset(["path", "rect", "circle", "ellipse", "polygon", "polyline", "line"])
_GROUPS = frozenset(["g", "a"])
# these draw nothing where they stand
_UNDRAWN = frozenset(
    [
        "title", "desc", "metadata", "view",
        "defs", "style", "symbol", "clipPath", "mask", "marker",
        "linearGradient", "radialGradient", "pattern", "filter",
    ]
)  # fmt: skip


class OutlineError(ValueError):
    """The drawing cannot be used: `problem`, and what is `allowed` or `nearest`."""

    def __init__(self, problem: str, *, value: str = "", allowed: str = "", nearest: str = "") -> None:
        super().__init__(problem)
        self.problem, self.value, self.allowed, self.nearest = problem, value, allowed, nearest


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

    root = _parse(data)
    drawing = _Drawing(root, label)
    page_mm = (_page_length(root, "width"), _page_length(root, "height"))
    page = _page_matrix(root, page_mm)
    drawing.remarks += _page_remarks(root, page_mm, sheet_mm, label)
    try:
        geometry = shapely.union_all(list(drawing.filled(page, element)))
    except RecursionError:
        raise OutlineError("uses and groups are nested too deep", allowed="plainer drawings") from None
    # turn y up; that turns the rings round too, which `orient` below sets right
    flipped = shapely.transform(geometry, lambda xy: np.column_stack([xy[:, 0], sheet_mm[1] - xy[:, 1]]))
    if flipped.area < _SMALLEST_MM2:
        raise OutlineError("nothing in it has an area", allowed="closed outlines: paths or basic shapes")
    cut = shapely.intersection(flipped, shapely.box(*box_mm))
    if cut.area < _SMALLEST_MM2:
        x0, y0, x1, y1 = flipped.bounds
        raise OutlineError(
            "it lies wholly outside the sheet",
            value=f"x from {x0:.4g} to {x1:.4g} mm, y from {y0:.4g} to {y1:.4g} mm",
            allowed="outlines on the sheet; the page's top left corner lies on the trim's",
        )
    if cut.area < flipped.area * (1 - 1e-9):
        drawing.remarks.append(
            f"{label}: reaches beyond the sheet and was cut there, from {flipped.area:.6g} mm2 to {cut.area:.6g} mm2"
        )
    return Outlines(list(_rings(cut)), drawing.summary())


def _rings(geometry: BaseGeometry) -> Iterator[FloatArray]:
    import shapely
    from shapely.geometry.polygon import orient

    polygons = [p for p in shapely.get_parts(shapely.get_parts(geometry)) if p.geom_type == "Polygon"]
    for polygon in polygons:
        if polygon.area < _SMALLEST_MM2:
            continue
        turned = orient(polygon, sign=1.0)
        for ring in (turned.exterior, *turned.interiors):
            yield np.asarray(ring.coords, dtype=float)[:-1, :2]


class _Counting(ET.TreeBuilder):
    """Builds the tree and stops at too deep or too many."""

    def __init__(self) -> None:
        super().__init__()
        self._depth = self._count = 0

    def start(self, tag: Any, attrs: Any) -> Any:
        self._depth += 1
        self._count += 1
        if self._depth > DEEPEST:
            raise OutlineError("elements nested too deep", allowed=f"at most {DEEPEST} levels")
        if self._count > MOST_ELEMENTS:
            raise OutlineError("too many elements", allowed=f"at most {MOST_ELEMENTS}")
        return super().start(tag, attrs)

    def end(self, tag: Any) -> Any:
        self._depth -= 1
        return super().end(tag)


def _parse(data: bytes) -> ET.Element:
    from defusedxml.common import DefusedXmlException, DTDForbidden
    from defusedxml.ElementTree import DefusedXMLParser

    parser = DefusedXMLParser(target=_Counting(), forbid_dtd=True)
    try:
        for at in range(0, len(data), 1 << 16):
            parser.feed(data[at : at + (1 << 16)])
        root = parser.close()
    except DTDForbidden:
        raise OutlineError(
            "it has a document type declaration", allowed="SVG without <!DOCTYPE ...>: take that line out"
        ) from None
    except DefusedXmlException:
        raise OutlineError("it has entities of its own", allowed="plain SVG") from None
    except ET.ParseError as error:
        line, column = error.position
        raise OutlineError(f"it is not well-formed XML (line {line}, column {column + 1})", allowed="SVG") from None
    except (LookupError, ValueError) as error:
        if isinstance(error, OutlineError):
            raise
        raise OutlineError("its text encoding is not known", allowed="UTF-8") from None
    if root.tag != f"{_SVG}svg":
        raise OutlineError(
            "it is XML but no SVG",
            value=f"<{_short(root.tag)}>",
            allowed='<svg xmlns="http://www.w3.org/2000/svg" ...>',
        )
    assert isinstance(root, ET.Element)
    return root


def _page_remarks(
    root: ET.Element, page_mm: tuple[float, float], sheet_mm: tuple[float, float], label: str
) -> Iterator[str]:
    """What is odd about the page: lengths whose size in mm is a convention, a size that is not the sheet's."""
    units = {_page_unit(root, name) for name in ("width", "height")}
    if units & {"", "px"}:
        words = "have no unit" if units == {""} else "are in px" if units == {"px"} else "are in part in px"
        yield (
            f"{label}: its page's width and height {words}; px were read as 1/96 in, "
            f"so that the page is {_size(page_mm)}"
        )
    elif root.get("viewBox") is None:
        yield f"{label}: its page has no viewBox, so its numbers without a unit are px, which were read as 1/96 in"
    if any(abs(page - sheet) > _SAME_SIZE_MM for page, sheet in zip(page_mm, sheet_mm, strict=True)):
        yield (
            f"{label}: its page is {_size(page_mm)}, but the sheet {_size(sheet_mm)}; "
            "the page's top left corner was put on the sheet's"
        )


def _size(size_mm: tuple[float, float]) -> str:
    wide, high = (plain(round(length, 2)) for length in size_mm)
    return f"{wide} x {high} mm"


def _page_matrix(root: ET.Element, page_mm: tuple[float, float]) -> FloatArray:
    """User units of the page to mm, y down, by size, viewBox and preserveAspectRatio."""
    box = root.get("viewBox")
    if box is None:
        return np.array([[_MM_PER_PX, 0.0, 0.0], [0.0, _MM_PER_PX, 0.0], [0.0, 0.0, 1.0]])
    numbers = _all_numbers(box, 4)
    if numbers is None or numbers[2] <= 0 or numbers[3] <= 0:
        raise OutlineError(
            "its viewBox is none",
            value=_clip(box),
            allowed='four numbers, the last two above zero, like "0 0 90 60"',
        )
    x, y, wide, high = numbers
    sx, sy = page_mm[0] / wide, page_mm[1] / high
    words = root.get("preserveAspectRatio", "xMidYMid meet").split()
    align = words[0] if words else "xMidYMid"
    dx = dy = 0.0
    if align != "none":
        match = re.fullmatch(r"x(Min|Mid|Max)Y(Min|Mid|Max)", align)
        if not match or len(words) > 2 or (len(words) == 2 and words[1] not in ("meet", "slice")):
            raise OutlineError(
                "its preserveAspectRatio is none",
                value=_clip(" ".join(words)),
                allowed='like "xMidYMid meet"',
            )
        one = max(sx, sy) if words[1:] == ["slice"] else min(sx, sy)
        part = {"Min": 0.0, "Mid": 0.5, "Max": 1.0}
        dx = part[match[1]] * (page_mm[0] - one * wide)
        dy = part[match[2]] * (page_mm[1] - one * high)
        sx = sy = one
    return np.array([[sx, 0.0, dx - sx * x], [0.0, sy, dy - sy * y], [0.0, 0.0, 1.0]])


_PAGE_LENGTH = re.compile(rf"\s*({_NUMBER})\s*([a-zA-Z%]*)\s*", re.ASCII)


def _page_unit(root: ET.Element, name: str) -> str:
    match = _PAGE_LENGTH.fullmatch(root.get(name, ""))
    return match[2].lower() if match else ""


def _page_length(root: ET.Element, name: str) -> float:
    text = root.get(name)
    allowed = f'{name} in mm, cm, in, pt or px on the <svg> element, like {name}="90mm"'
    if text is None:
        raise OutlineError(f"its page has no {name}", allowed=allowed)
    match = _PAGE_LENGTH.fullmatch(text)
    factor = _UNITS_MM.get(match[2].lower()) if match else None
    if match is None or factor is None:
        raise OutlineError(f"its page's {name} is no real size", value=_clip(text), allowed=allowed)
    length = float(match[1]) * factor
    if not 0 < length <= 100_000:
        raise OutlineError(f"its page's {name} is out of range", value=_clip(text), allowed=f"{allowed}, above zero")
    return length


@dataclass
class _Style:
    fill_rule: str = "nonzero"
    visible: bool = True


@dataclass
class _Drawing:
    """One SVG tree being walked."""

    root: ET.Element
    label: str
    remarks: list[str] = field(default_factory=list)

    def __post_init__(self) -> None:
        self._left_out: dict[str, int] = {}
        self._points = 0
        self._open = self._flat = 0
        self._by_id: dict[str, ET.Element] = {}
        self._twice: set[str] = set()
        self._parents: dict[ET.Element, ET.Element] = {}
        for parent in self.root.iter():
            for child in parent:
                self._parents[child] = parent
        for element in self.root.iter():
            if identity := element.get("id"):
                if identity in self._by_id:
                    self._twice.add(identity)
                self._by_id.setdefault(identity, element)
            for name in element.keys():  # noqa: SIM118 (an element, not a dict)
                if name.lower().startswith("on") and "}" not in name:
                    self._leave_out("event handlers")
        self._sheet = self._style_sheet()

    def summary(self) -> list[str]:
        """Remarks, what was left out and mended among them."""
        out = list(self.remarks)
        if self._left_out:
            words = ", ".join(f"{what} ({n})" if n > 1 else what for what, n in sorted(self._left_out.items()))
            out.append(f"{self.label}: left out, as it holds no outline: {words}")
        if self._open:
            out.append(
                f"{self.label}: {self._open} open outline{'s were' if self._open > 1 else ' was'}"
                " closed by a straight line"
            )
        if self._flat:
            out.append(f"{self.label}: {self._flat} outline{'s' if self._flat > 1 else ''} without area left out")
        return out

    def filled(self, page: FloatArray, identity: str | None) -> Iterator[BaseGeometry]:
        """Filled geometry in mm, y down, of the whole drawing or of one element."""
        if identity is None:
            if self._spelt_out(self.root, {}) > MOST_ELEMENTS:
                raise _too_many_uses()
            style = self._inherit(self.root, _Style())
            for child in self.root:
                yield from self._walk(child, page, style, ())
            return
        if identity in self._twice:
            raise OutlineError("more than one element has this id", value=_clip(identity), allowed="an id of its own")
        element = self._by_id.get(identity)
        if element is None:
            close = get_close_matches(identity, self._by_id, n=1, cutoff=0.3)
            raise OutlineError(
                "no element has this id",
                value=_clip(identity),
                allowed=_clip(", ".join(self._by_id) or "the drawing has no ids"),
                nearest=close[0] if close else "",
            )
        if self._spelt_out(element, {}) > MOST_ELEMENTS:
            raise _too_many_uses()
        chain = [element]
        while chain[-1] in self._parents:
            chain.append(self._parents[chain[-1]])
        matrix, style = page, _Style()
        for ancestor in reversed(chain[1:]):
            style = self._inherit(ancestor, style)
            if ancestor is not self.root:
                if _short(ancestor.tag) == "svg":
                    raise self._error(ancestor, "is a page within the page", allowed="one page; flatten it first")
                matrix = matrix @ self._transform(ancestor)
        if element is self.root:
            yield from self.filled(page, None)
        elif _short(element.tag) == "symbol":
            yield from self._content(element, matrix, self._inherit(element, style), (identity,))
        else:
            yield from self._walk(element, matrix, style, ())

    def _spelt_out(self, element: ET.Element, known: dict[ET.Element, int]) -> int:
        """How many elements there are with every use spelt out; a circle counts once, as drawing refuses it."""
        if element not in known:
            known[element] = 0
            parts = list(element)
            if _short(element.tag) == "use":
                target = next((element.get(name) for name in _HREF if element.get(name)), None) or ""
                parts += [self._by_id[target[1:]]] if target[1:] in self._by_id else []
            known[element] = 1 + sum(self._spelt_out(part, known) for part in parts)
        return known[element]

    def _walk(
        self, element: ET.Element, matrix: FloatArray, style: _Style, used: tuple[str, ...]
    ) -> Iterator[BaseGeometry]:
        if not isinstance(element.tag, str) or not element.tag.startswith(_SVG):
            return  # another program's own notes
        tag = _short(element.tag)
        if tag in _UNDRAWN:
            return
        if tag == "svg":
            raise self._error(element, "is a page within the page", allowed="one page; flatten it first")
        if tag not in _SHAPES and tag not in _GROUPS and tag != "use":
            self._leave_out(f"<{tag}>")
            return
        if self._property(element, "display") == "none":
            return
        style = self._inherit(element, style)
        matrix = matrix @ self._transform(element)
        if tag == "a" and any(element.get(name) for name in _HREF):
            self._leave_out("links")
        if tag in _GROUPS:
            yield from self._content(element, matrix, style, used)
        elif tag == "use":
            yield from self._used(element, matrix, style, used)
        elif style.visible:
            yield from self._shape(element, tag, matrix, style)

    def _content(
        self, element: ET.Element, matrix: FloatArray, style: _Style, used: tuple[str, ...]
    ) -> Iterator[BaseGeometry]:
        for child in element:
            yield from self._walk(child, matrix, style, used)

    def _used(
        self, element: ET.Element, matrix: FloatArray, style: _Style, used: tuple[str, ...]
    ) -> Iterator[BaseGeometry]:
        target = next((element.get(name) for name in _HREF if element.get(name)), None)
        if not target or not target.startswith("#"):
            raise self._error(
                element,
                "refers to something outside the file",
                value=_clip(target or ""),
                allowed='href="#..." of an element in the same file',
            )
        identity = target[1:]
        if identity in used:
            raise self._error(element, f"refers to itself through #{_clip(identity)}", allowed="no circles")
        if len(used) >= DEEPEST:
            raise self._error(element, "is a use within too many uses", allowed=f"at most {DEEPEST} levels")
        found = self._by_id.get(identity)
        if found is None:
            raise self._error(element, "refers to an element that is not there", value=_clip(target))
        shift = np.eye(3)
        shift[:2, 2] = self._length(element, "x"), self._length(element, "y")
        if _short(found.tag) == "symbol":
            if found.get("viewBox") is not None:
                raise self._error(
                    found,
                    "is a symbol with a page of its own",
                    allowed="symbols without viewBox; flatten it first",
                )
            self._refuse_cut(found)
            yield from self._content(found, matrix @ shift, self._inherit(found, style), (*used, identity))
        else:
            yield from self._walk(found, matrix @ shift, style, (*used, identity))

    def _shape(self, element: ET.Element, tag: str, matrix: FloatArray, style: _Style) -> Iterator[BaseGeometry]:
        rings: list[FloatArray] = []
        for ring, closed in self._subpaths(element, tag, matrix):
            self._points += len(ring)
            if self._points > MOST_POINTS:
                raise _too_many_points()
            if len(ring) < 3 or np.ptp(ring, axis=0).max() < 1e-9:
                self._flat += 1
                continue
            if not closed and np.hypot(*(ring[0] - ring[-1])) > 1e-6 and tag != "line":
                self._open += 1
            rings.append(ring)
        if not rings:
            return
        geometry, crossing = fill(rings, even_odd=style.fill_rule == "evenodd")
        if crossing:
            rule = "even-odd" if style.fill_rule == "evenodd" else "non-zero"
            alone = sum(abs(_signed_area(ring)) for ring in rings)
            self.remarks.append(
                f"{self.label}: {self._name(element)} crosses itself; "
                f"filled by its {rule} rule it has {geometry.area:.6g} mm2 "
                f"(its outlines, taken as drawn, enclose {alone:.6g} mm2)"
            )
        if geometry.area < _SMALLEST_MM2:
            self._flat += 1
            return
        yield geometry

    def _subpaths(self, element: ET.Element, tag: str, matrix: FloatArray) -> Iterator[tuple[FloatArray, bool]]:
        """(points in mm, whether closed by the drawing itself) of every subpath of a shape."""
        if tag == "path":
            try:
                yield from path_points(element.get("d", ""), matrix)
            except OutlineError as error:
                raise self._error(element, error.problem, value=error.value, allowed=error.allowed) from None
        elif tag in ("polygon", "polyline"):
            numbers = _all_numbers(element.get("points", ""), None)
            if numbers is None or len(numbers) % 2:
                raise self._error(
                    element,
                    "has points that are no pairs of numbers",
                    value=_clip(element.get("points", "")),
                    allowed="pairs of numbers",
                )
            if numbers:
                yield _apply(matrix, np.array(numbers).reshape(-1, 2)), tag == "polygon"
        elif tag == "rect":
            yield from self._rectangle(element, matrix)
        elif tag in ("circle", "ellipse"):
            names = ("r", "r") if tag == "circle" else ("rx", "ry")
            rx, ry = (self._length(element, name) for name in names)
            if rx < 0 or ry < 0:
                raise self._error(element, "has a negative radius")
            if rx and ry:
                centre = np.array([self._length(element, "cx"), self._length(element, "cy")])
                yield _arc_points(matrix, centre, rx, ry, 0.0, 0.0, 2 * math.pi)[:-1], True

    def _rectangle(self, element: ET.Element, matrix: FloatArray) -> Iterator[tuple[FloatArray, bool]]:
        x, y, wide, high = (self._length(element, name) for name in ("x", "y", "width", "height"))
        if wide < 0 or high < 0:
            raise self._error(element, "has a negative size")
        given = [element.get(name) not in (None, "auto") for name in ("rx", "ry")]
        rx = self._length(element, "rx" if given[0] else "ry") if any(given) else 0.0
        ry = self._length(element, "ry" if given[1] else "rx") if any(given) else 0.0
        if rx < 0 or ry < 0:
            raise self._error(element, "has a negative radius")
        rx, ry = min(rx, wide / 2), min(ry, high / 2)
        if not wide or not high:
            return
        if not rx or not ry:
            yield _apply(matrix, np.array([[x, y], [x + wide, y], [x + wide, y + high], [x, y + high]])), True
            return
        quarter = math.pi / 2
        corners = [
            ((x + wide - rx, y + ry), -1),
            ((x + wide - rx, y + high - ry), 0),
            ((x + rx, y + high - ry), 1),
            ((x + rx, y + ry), 2),
        ]
        pieces = [_arc_points(matrix, np.array(c), rx, ry, 0.0, n * quarter, quarter) for c, n in corners]
        yield np.concatenate(pieces), True

    def _length(self, element: ET.Element, name: str) -> float:
        """An attribute in user units."""
        text = element.get(name)
        if text is None:
            return 0.0
        match = re.fullmatch(rf"\s*({_NUMBER})\s*([a-zA-Z%]*)\s*", text, re.ASCII)
        factor = _UNITS_MM.get(match[2].lower()) if match else None
        if match is None or factor is None or abs(float(match[1])) > _LARGEST:
            raise self._error(
                element,
                f"has {name} that is no length here",
                value=_clip(text),
                allowed="a number, or one in mm, cm, in, pt, px",
            )
        return float(match[1]) * factor / _MM_PER_PX

    def _transform(self, element: ET.Element) -> FloatArray:
        self._refuse_cut(element)
        text = element.get("transform")
        if self._property(element, "transform", attribute=False) not in (None, "none"):
            raise self._error(element, "has a transform in its style", allowed="the attribute transform")
        if text is None or not text.strip():
            return np.eye(3)
        matrix = np.eye(3)
        at, count = 0, 0
        pattern = re.compile(r"[\s,]*(matrix|translate|scale|rotate|skewX|skewY)\s*\(([^()]*)\)[\s,]*", re.ASCII)
        while at < len(text):
            match = pattern.match(text, at)
            numbers = _all_numbers(match[2], None) if match else None
            one = _transform_matrix(match[1], numbers) if match and numbers is not None else None
            count += 1
            if match is None or one is None or count > DEEPEST:
                raise self._error(
                    element,
                    "has a transform that cannot be read",
                    value=_clip(text),
                    allowed="matrix, translate, scale, rotate, skewX, skewY with numbers",
                )
            matrix = matrix @ one
            at = match.end()
        size = float(np.abs(matrix).max())
        if not math.isfinite(size) or size > _LARGEST or abs(np.linalg.det(matrix[:2, :2])) < 1e-12:
            raise self._error(element, "has a transform that flattens or blows up its content", value=_clip(text))
        return matrix

    def _refuse_cut(self, element: ET.Element) -> None:
        for name in ("clip-path", "mask"):
            if self._property(element, name) not in (None, "none"):
                raise self._error(
                    element,
                    f"is cut by a {name}",
                    allowed="outlines that are already cut: apply it in the drawing program",
                )

    def _inherit(self, element: ET.Element, style: _Style) -> _Style:
        rule, visibility = self._property(element, "fill-rule"), self._property(element, "visibility")
        return _Style(
            rule if rule in ("nonzero", "evenodd") else style.fill_rule,
            style.visible if visibility in (None, "inherit") else visibility == "visible",
        )

    def _property(self, element: ET.Element, name: str, *, attribute: bool = True) -> str | None:
        """A style property: the element's own style over the style sheet over the attribute."""
        own = _declarations(element.get("style", ""))
        if name in own:
            return own[name]
        classes = element.get("class", "").split()
        keys = (f"#{element.get('id', '')}", *(f".{c}" for c in classes), _short(element.tag), "*")
        for key in keys:
            if name in self._sheet.get(key, {}):
                return self._sheet[key][name]
        value = element.get(name) if attribute else None
        return value.strip() if value is not None else None

    def _style_sheet(self) -> dict[str, dict[str, str]]:
        """Simple selectors (element, .class, #id, *) of the style sheets; anything else is left out."""
        out: dict[str, dict[str, str]] = {}
        for style in self.root.iter(f"{_SVG}style"):
            text = re.sub(r"/\*.*?\*/", " ", style.text or "", flags=re.DOTALL)
            for at_rule in re.findall(r"@[\w-]+", text):
                self._leave_out(f"style rule {at_rule}")
            text = re.sub(r"@[^{};]*;", " ", text)
            for selectors, body in re.findall(r"([^{}]+)\{([^{}]*)\}", text):
                for selector in selectors.split(","):
                    key = selector.strip()
                    if re.fullmatch(r"[.#]?[\w-]+|\*", key):
                        out.setdefault(key, {}).update(_declarations(body))
                    elif set(_declarations(body)) & {
                        "fill-rule",
                        "display",
                        "visibility",
                        "clip-path",
                        "mask",
                        "transform",
                    }:
                        raise OutlineError(
                            "its style sheet has a selector that is not understood",
                            value=_clip(key),
                            allowed="element, .class or #id",
                        )
        return out

    def _leave_out(self, what: str) -> None:
        self._left_out[what] = self._left_out.get(what, 0) + 1

    def _name(self, element: ET.Element) -> str:
        tag = _short(element.tag)
        if identity := element.get("id"):
            return f'<{tag} id="{_clip(identity)}">'
        same = list(self.root.iter(element.tag))
        return f"<{tag}> number {same.index(element) + 1}"

    def _error(self, element: ET.Element, problem: str, *, value: str = "", allowed: str = "") -> OutlineError:
        return OutlineError(f"{self._name(element)} {problem}", value=value, allowed=allowed)


def fill(rings: list[FloatArray], *, even_odd: bool) -> tuple[BaseGeometry, bool]:
    """(what rings (n, 2) fill by the even-odd or the non-zero rule, whether any ring crosses itself)."""
    import shapely

    polygons = np.array([shapely.Polygon(ring) for ring in rings])
    valid = shapely.is_valid(polygons)
    if len(rings) == 1 and valid[0]:
        return polygons[0], False
    lines = shapely.union_all(shapely.get_exterior_ring(polygons))
    faces = shapely.get_parts(shapely.polygonize(shapely.get_parts(lines)))
    inside = shapely.get_coordinates(shapely.point_on_surface(faces))
    turns = np.zeros(len(faces), dtype=np.int64)
    work = 0
    for ring, polygon, sound in zip(rings, polygons, valid, strict=True):
        low, high = ring.min(axis=0), ring.max(axis=0)
        near = np.flatnonzero(((inside >= low) & (inside <= high)).all(axis=1))
        if sound:
            # a ring that does not cross itself turns once around what it holds
            shapely.prepare(polygon)
            turns[near] += shapely.contains_xy(polygon, inside[near]) * (1 if _signed_area(ring) > 0 else -1)
            continue
        work += len(near) * len(ring)
        if work > _MOST_WORK:
            raise OutlineError("its outlines cross too often", allowed="simpler outlines: unite them first")
        turns[near] += [_winding(ring, point) for point in inside[near]]
    kept = faces[turns % 2 == 1] if even_odd else faces[turns != 0]
    # a ring that touches itself in a point is not "valid" but crosses nothing
    crossing = not shapely.is_simple(shapely.get_exterior_ring(polygons[~valid])).all()
    return shapely.union_all(kept), bool(crossing)


def _winding(ring: FloatArray, point: FloatArray) -> int:
    """How often a ring (n, 2) turns around a point, counted along the ray to its right."""
    x, y = point
    x0, y0 = ring.T
    x1, y1 = np.roll(ring, -1, axis=0).T
    left = (x1 - x0) * (y - y0) - (x - x0) * (y1 - y0)
    rising, falling = (y0 <= y) & (y1 > y), (y0 > y) & (y1 <= y)
    return int(np.count_nonzero(rising & (left > 0)) - np.count_nonzero(falling & (left < 0)))


_COMMAND = re.compile(r"([MmZzLlHhVvCcSsQqTtAa])")
_SIZES = {"M": 2, "L": 2, "H": 1, "V": 1, "C": 6, "S": 4, "Q": 4, "T": 2, "A": 7, "Z": 0}
_ARC = re.compile(
    rf"[\s,]*({_NUMBER})[\s,]*({_NUMBER})[\s,]*({_NUMBER})[\s,]*([01])[\s,]*([01])"
    rf"[\s,]*({_NUMBER})[\s,]*({_NUMBER})[\s,]*",
    re.ASCII,
)


def path_points(text: str, matrix: FloatArray) -> Iterator[tuple[FloatArray, bool]]:
    """Subpaths of path data as points in mm and whether each is closed."""
    pieces = _COMMAND.split(text)
    if pieces[0].strip():
        raise _bad_path(pieces[0])
    if len(pieces) > 1 and pieces[1] not in "Mm":
        raise _bad_path(text)
    if len(pieces) // 2 > MOST_POINTS:
        raise _too_many_points()
    here = start = np.zeros(2)
    run: list[FloatArray] = []
    before, control = "", here
    for letter, texts in _runs(pieces[1::2], pieces[2::2]):
        command = letter.upper()
        values = np.array([row for words in texts for row in _arguments(command, words)], dtype=float)
        base = letter.islower()
        if command == "M":
            if run:
                yield np.concatenate(run), False
            here = values[0] + (here if base else 0.0)
            start, run, before = here, [_apply(matrix, here[None, :])], "M"
            values, command = values[1:], "L"
        if command == "Z":
            if run:
                yield np.concatenate(run), True
            here, run, before = start, [], "Z"
            continue
        if not len(values):
            continue
        if not run:
            # after a closed subpath the next one begins where that began
            run = [_apply(matrix, here[None, :])]
            start = here
        if command in "LHV":
            points = _corners(command, values, here, base)
            run.append(_apply(matrix, points))
            here, before = points[-1], "L"
            continue
        for row in values:
            if command == "A":
                end = row[5:7] + (here if base else 0.0)
                run.append(_arc(matrix, here, row, end))
                here, before = end, "A"
                continue
            corners = row.reshape(-1, 2) + (here if base else 0.0)
            if command in "ST":
                smooth = before in ("CS" if command == "S" else "QT") and before != ""
                corners = np.concatenate([(2 * here - control if smooth else here)[None, :], corners])
            cubic = corners if command in "CS" else _raised(here, corners)
            run.append(_chords(_apply(matrix, np.concatenate([here[None, :], cubic]))))
            control, here, before = corners[-2], corners[-1], command
    if run:
        yield np.concatenate(run), False


def _runs(letters: list[str], texts: list[str]) -> Iterator[tuple[str, list[str]]]:
    """Commands of one letter in a row together: what comes from drawing programs then goes in few steps."""
    at = 0
    while at < len(letters):
        end = at + 1
        while letters[at] not in "MmZz" and end < len(letters) and letters[end] == letters[at]:
            end += 1
        yield letters[at], texts[at:end]
        at = end


def _arguments(command: str, text: str) -> list[list[float]]:
    """Numbers of one command, in rows of as many as it takes; whatever is no number is refused."""
    size = _SIZES[command]
    if command == "A":
        rows, at = [], 0
        while at < len(text):
            match = _ARC.match(text, at)
            if not match:
                break
            rows.append([float(part) for part in match.groups()])
            at = match.end()
        if at < len(text.rstrip()) or not rows:
            raise _bad_path(f"A{text}")
    else:
        numbers = _all_numbers(text, None)
        if numbers is None or (size and (len(numbers) % size or not numbers)) or (not size and numbers):
            raise _bad_path(f"{command}{text}")
        rows = [numbers[at : at + size] for at in range(0, len(numbers), size)] if size else []
    if any(not -_LARGEST <= number <= _LARGEST for row in rows for number in row):
        raise _bad_path(f"{command}{text}")
    return rows


def _corners(command: str, values: FloatArray, here: FloatArray, relative: bool) -> FloatArray:
    if command == "L":
        return here + np.cumsum(values, axis=0) if relative else values
    axis = 0 if command == "H" else 1
    points = np.tile(here, (len(values), 1))
    points[:, axis] = here[axis] + np.cumsum(values[:, 0]) if relative else values[:, 0]
    return points


def _raised(here: FloatArray, corners: FloatArray) -> FloatArray:
    """A quadratic curve's (control, end) as a cubic's (control, control, end)."""
    control, end = corners
    return np.array([here + 2 / 3 * (control - here), end + 2 / 3 * (control - end), end])


def _chords(cubic: FloatArray) -> FloatArray:
    """Points of a cubic (4, 2) in mm after its first; no chord leaves it by more than the error.

    The chord of a piece of length h in the parameter is off by at most h^2 / 8 times the
    largest second derivative, which for a cubic is 6 times the larger second difference.
    """
    second = np.array([cubic[0] - 2 * cubic[1] + cubic[2], cubic[1] - 2 * cubic[2] + cubic[3]])
    bend = 6 * float(np.hypot(second[:, 0], second[:, 1]).max())
    count = min(max(1, math.ceil(math.sqrt(bend / (8 * CHORD_ERROR_MM)))), MOST_POINTS)
    u = np.arange(1, count + 1)[:, None] / count
    return np.asarray(
        (1 - u) ** 3 * cubic[0] + 3 * (1 - u) ** 2 * u * cubic[1] + 3 * (1 - u) * u**2 * cubic[2] + u**3 * cubic[3]
    )


def _arc(matrix: FloatArray, here: FloatArray, row: FloatArray, end: FloatArray) -> FloatArray:
    """Points of an elliptical arc after its first (SVG 1.1, appendix F.6: end points to centre)."""
    rx, ry = abs(row[0]), abs(row[1])
    if not rx or not ry or np.array_equal(here, end):
        return _apply(matrix, end[None, :])
    turn = math.radians(row[2] % 360.0)
    c, s = math.cos(turn), math.sin(turn)
    half = (here - end) / 2
    x, y = c * half[0] + s * half[1], -s * half[0] + c * half[1]
    stretch = (x / rx) ** 2 + (y / ry) ** 2
    if stretch > 1:
        rx, ry = rx * math.sqrt(stretch), ry * math.sqrt(stretch)
        stretch = 1.0
    root = math.sqrt(max(1 / stretch - 1, 0.0)) * (-1 if row[3] == row[4] else 1)
    cx, cy = root * rx * y / ry, -root * ry * x / rx
    centre = np.array([c * cx - s * cy, s * cx + c * cy]) + (here + end) / 2
    first = math.atan2((y - cy) / ry, (x - cx) / rx)
    last = math.atan2((-y - cy) / ry, (-x - cx) / rx)
    sweep = (last - first) % (2 * math.pi)
    if not row[4]:
        sweep -= 2 * math.pi
    points = _arc_points(matrix, centre, rx, ry, turn, first, sweep)[1:]
    points[-1] = _apply(matrix, end[None, :])[0]
    return points


def _arc_points(
    matrix: FloatArray, centre: FloatArray, rx: float, ry: float, turn: float, first: float, sweep: float
) -> FloatArray:
    """Points on an elliptical arc in mm, both ends included, chords within the error."""
    largest = max(rx, ry) * float(np.linalg.norm(matrix[:2, :2], 2))
    step = 2 * math.acos(max(1 - CHORD_ERROR_MM / largest, -0.5)) if largest > 0 else math.pi
    count = min(max(2, math.ceil(abs(sweep) / step)), MOST_POINTS)
    angle = first + sweep * np.arange(count + 1) / count
    c, s = math.cos(turn), math.sin(turn)
    x, y = rx * np.cos(angle), ry * np.sin(angle)
    return _apply(matrix, np.column_stack([c * x - s * y, s * x + c * y]) + centre)


def _transform_matrix(kind: str, v: list[float]) -> FloatArray | None:
    """The 3 x 3 matrix of one transform function, None where its arguments do not fit."""
    counts = {
        "matrix": (6,),
        "translate": (1, 2),
        "scale": (1, 2),
        "rotate": (1, 3),
        "skewX": (1,),
        "skewY": (1,),
    }
    if len(v) not in counts[kind] or any(abs(number) > _LARGEST for number in v):
        return None
    out = np.eye(3)
    if kind == "matrix":
        out[:2] = np.array(v).reshape(3, 2).T
    elif kind == "translate":
        out[:2, 2] = v[0], v[1] if len(v) > 1 else 0.0
    elif kind == "scale":
        out[0, 0], out[1, 1] = v[0], v[-1]
    elif kind == "rotate":
        c, s = math.cos(math.radians(v[0])), math.sin(math.radians(v[0]))
        out[:2, :2] = [[c, -s], [s, c]]
        if len(v) == 3:
            pivot = np.array(v[1:])
            out[:2, 2] = pivot - out[:2, :2] @ pivot
    else:
        out[(0, 1) if kind == "skewX" else (1, 0)] = math.tan(math.radians(v[0]))
    return out


def _apply(matrix: FloatArray, points: FloatArray) -> FloatArray:
    return np.asarray(points @ matrix[:2, :2].T + matrix[:2, 2])


def _signed_area(ring: FloatArray) -> float:
    x, y = ring.T
    return float(0.5 * np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y))


def _all_numbers(text: str, count: int | None) -> list[float] | None:
    """Every number of a text of numbers, blanks and commas; None where anything else stands in it."""
    if _NUMBERS.sub("", text).strip(" \t\r\n\f,"):
        return None
    numbers = [float(number) for number in _NUMBERS.findall(text)]
    if (count is not None and len(numbers) != count) or not all(map(math.isfinite, numbers)):
        return None
    return numbers


def _declarations(text: str) -> Mapping[str, str]:
    pairs = (part.split(":", 1) for part in text.split(";") if ":" in part)
    return {name.strip().lower(): value.replace("!important", "").strip() for name, value in pairs}


def _too_many_uses() -> OutlineError:
    return OutlineError(
        "its uses of uses grow too many", allowed=f"at most {MOST_ELEMENTS} elements when all are spelt out"
    )


def _too_many_points() -> OutlineError:
    return OutlineError(
        "its outlines have too many points",
        allowed=f"at most {MOST_POINTS}, with curves as chords {CHORD_ERROR_MM * 1000:g} um off",
    )


def _bad_path(text: str) -> OutlineError:
    return OutlineError(
        "has path data that cannot be read",
        value=_clip(text),
        allowed="path commands with numbers, as SVG has them",
    )


def _short(tag: Any) -> str:
    return str(tag).rpartition("}")[2]


def _clip(text: str) -> str:
    text = " ".join("".join(c if c.isprintable() else " " for c in text[:400]).split())
    return text if len(text) <= 60 else text[:59] + "…"
