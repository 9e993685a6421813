"""Shapes to rings of points: paths, polygons, rectangles, circles and ellipses."""

from __future__ import annotations

import math
import xml.etree.ElementTree as ET
from collections.abc import Iterator

import numpy as np

from patterngen.job.svg_coordinates import all_numbers, apply, length
from patterngen.job.svg_curves import arc_points, path_points
from patterngen.job.svg_remarks import OutlineError, clip
from patterngen.job.svg_tree import Tree
from patterngen.model.lattice import FloatArray

SHAPES = frozenset(["path", "rect", "circle", "ellipse", "polygon", "polyline", "line"])


def subpaths(tree: Tree, element: ET.Element, tag: str, matrix: FloatArray) -> Iterator[tuple[FloatArray, bool]]:
    """(points in mm, whether closed by the drawing itself) of every subpath of a shape.  Raises `OutlineError`."""
    if tag == "path":
        try:
            yield from path_points(element.get("d", ""), matrix)
        except OutlineError as error:
            raise tree.error(element, error.problem, value=error.value, allowed=error.allowed) from None
    elif tag in ("polygon", "polyline"):
        numbers = all_numbers(element.get("points", ""), None)
        if numbers is None or len(numbers) % 2:
            raise tree.error(
                element,
                "has points that are no pairs of numbers",
                value=clip(element.get("points", "")),
                allowed="pairs of numbers",
            )
        if numbers:
            yield apply(matrix, np.array(numbers).reshape(-1, 2)), tag == "polygon"
    elif tag == "rect":
        yield from _rectangle(tree, element, matrix)
    elif tag in ("circle", "ellipse"):
        names = ("r", "r") if tag == "circle" else ("rx", "ry")
        rx, ry = (length(tree, element, name) for name in names)
        if rx < 0 or ry < 0:
            raise tree.error(element, "has a negative radius")
        if rx and ry:
            centre = np.array([length(tree, element, "cx"), length(tree, element, "cy")])
            yield arc_points(matrix, centre, rx, ry, 0.0, 0.0, 2 * math.pi)[:-1], True


def _rectangle(tree: Tree, element: ET.Element, matrix: FloatArray) -> Iterator[tuple[FloatArray, bool]]:
    x, y, wide, high = (length(tree, element, name) for name in ("x", "y", "width", "height"))
    if wide < 0 or high < 0:
        raise tree.error(element, "has a negative size")
    given = [element.get(name) not in (None, "auto") for name in ("rx", "ry")]
    rx = length(tree, element, "rx" if given[0] else "ry") if any(given) else 0.0
    ry = length(tree, element, "ry" if given[1] else "rx") if any(given) else 0.0
    if rx < 0 or ry < 0:
        raise tree.error(element, "has a negative radius")
    rx, ry = min(rx, wide / 2), min(ry, high / 2)
    if not wide or not high:
        return
    if not rx or not ry:
        yield apply(matrix, np.array([[x, y], [x + wide, y], [x + wide, y + high], [x, y + high]])), True
        return
    quarter = math.pi / 2
    corners = [
        ((x + wide - rx, y + ry), -1),
        ((x + wide - rx, y + high - ry), 0),
        ((x + rx, y + high - ry), 1),
        ((x + rx, y + ry), 2),
    ]
    pieces = [arc_points(matrix, np.array(c), rx, ry, 0.0, n * quarter, quarter) for c, n in corners]
    yield np.concatenate(pieces), True
