"""Numbers, lengths, transforms and the page: from the units of a drawing to mm.

A matrix is 3 x 3, for columns (x, y, 1); y points down as it does in SVG.
"""

from __future__ import annotations

import math
import re
import xml.etree.ElementTree as ET
from collections.abc import Iterator

import numpy as np

from patterngen.job.svg_remarks import OutlineError, clip
from patterngen.job.svg_tree import DEEPEST, Tree
from patterngen.model.lattice import FloatArray
from patterngen.units import plain

LARGEST = 1e7
"""Numbers of path data, lengths and transforms lie no further from zero."""
_SAME_SIZE_MM = 0.5
"""A page within this of the sheet is the sheet: sizes are often rounded to whole mm or points."""
_MM_PER_PX = 25.4 / 96
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
NUMBER = r"(?>[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]{1,3})?)"
_NUMBERS = re.compile(NUMBER, re.ASCII)
_LENGTH = re.compile(rf"\s*({NUMBER})\s*([a-zA-Z%]*)\s*", re.ASCII)
_TRANSFORM = re.compile(r"[\s,]*(matrix|translate|scale|rotate|skewX|skewY)\s*\(([^()]*)\)[\s,]*", re.ASCII)


def all_numbers(text: str, count: int | None) -> list[float] | None:
    """Every number of a text of numbers, blanks and commas; None where anything else stands in it."""
    if _NUMBERS.sub("", text).strip(" \t\r\n\f,"):
        return None
    numbers = [float(number) for number in _NUMBERS.findall(text)]
    if (count is not None and len(numbers) != count) or not all(map(math.isfinite, numbers)):
        return None
    return numbers


def length(tree: Tree, element: ET.Element, name: str) -> float:
    """An attribute in user units, 0 where it is missing.  Raises `OutlineError`."""
    text = element.get(name)
    if text is None:
        return 0.0
    match = _LENGTH.fullmatch(text)
    factor = _UNITS_MM.get(match[2].lower()) if match else None
    if match is None or factor is None or abs(float(match[1])) > LARGEST:
        raise tree.error(
            element,
            f"has {name} that is no length here",
            value=clip(text),
            allowed="a number, or one in mm, cm, in, pt, px",
        )
    return float(match[1]) * factor / _MM_PER_PX


def apply(matrix: FloatArray, points: FloatArray) -> FloatArray:
    """Points (n, 2) under a matrix."""
    return np.asarray(points @ matrix[:2, :2].T + matrix[:2, 2])


def transform(tree: Tree, element: ET.Element) -> FloatArray:
    """The matrix of an element's attribute `transform`.  Raises `OutlineError`."""
    text = element.get("transform")
    if text is None or not text.strip():
        return np.eye(3)
    matrix = np.eye(3)
    at, count = 0, 0
    while at < len(text):
        match = _TRANSFORM.match(text, at)
        numbers = all_numbers(match[2], None) if match else None
        one = _transform_matrix(match[1], numbers) if match and numbers is not None else None
        count += 1
        if match is None or one is None or count > DEEPEST:
            raise tree.error(
                element,
                "has a transform that cannot be read",
                value=clip(text),
                allowed="matrix, translate, scale, rotate, skewX, skewY with numbers",
            )
        matrix = matrix @ one
        at = match.end()
    size = float(np.abs(matrix).max())
    if not math.isfinite(size) or size > LARGEST or abs(np.linalg.det(matrix[:2, :2])) < 1e-12:
        raise tree.error(element, "has a transform that flattens or blows up its content", value=clip(text))
    return matrix


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
    if len(v) not in counts[kind] or any(abs(number) > LARGEST for number in v):
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


def page_length_mm(root: ET.Element, name: str) -> float:
    """The page's width or height.  Raises `OutlineError`: missing, in percent, out of range."""
    text = root.get(name)
    allowed = f'{name} in mm, cm, in, pt or px on the <svg> element, like {name}="90mm"'
    if text is None:
        raise OutlineError(f"its page has no {name}", allowed=allowed)
    match = _LENGTH.fullmatch(text)
    factor = _UNITS_MM.get(match[2].lower()) if match else None
    if match is None or factor is None:
        raise OutlineError(f"its page's {name} is no real size", value=clip(text), allowed=allowed)
    length_mm = float(match[1]) * factor
    if not 0 < length_mm <= 100_000:
        raise OutlineError(f"its page's {name} is out of range", value=clip(text), allowed=f"{allowed}, above zero")
    return length_mm


def page_matrix(root: ET.Element, *, page_mm: tuple[float, float]) -> FloatArray:
    """User units of the page to mm, y down, by size, viewBox and preserveAspectRatio.  Raises `OutlineError`."""
    box = root.get("viewBox")
    if box is None:
        return np.array([[_MM_PER_PX, 0.0, 0.0], [0.0, _MM_PER_PX, 0.0], [0.0, 0.0, 1.0]])
    numbers = all_numbers(box, 4)
    if numbers is None or numbers[2] <= 0 or numbers[3] <= 0:
        raise OutlineError(
            "its viewBox is none",
            value=clip(box),
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
                value=clip(" ".join(words)),
                allowed='like "xMidYMid meet"',
            )
        one = max(sx, sy) if words[1:] == ["slice"] else min(sx, sy)
        part = {"Min": 0.0, "Mid": 0.5, "Max": 1.0}
        dx = part[match[1]] * (page_mm[0] - one * wide)
        dy = part[match[2]] * (page_mm[1] - one * high)
        sx = sy = one
    return np.array([[sx, 0.0, dx - sx * x], [0.0, sy, dy - sy * y], [0.0, 0.0, 1.0]])


def page_remarks(
    root: ET.Element, *, page_mm: tuple[float, float], sheet_mm: tuple[float, float], label: str
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
    wide, high = (plain(round(side, 2)) for side in size_mm)
    return f"{wide} x {high} mm"


def _page_unit(root: ET.Element, name: str) -> str:
    match = _LENGTH.fullmatch(root.get(name, ""))
    return match[2].lower() if match else ""
