"""The predefined spot functions, exactly as the standard's PostScript code has them.

Source: ISO 32000-1:2008, Table 130 (from memory; names in lower case here).  A function gives
a value to every place of the cell -1..1 by -1..1, x along the dot rows.  As a tint lightens,
the lowest value whitens first, so what is inked at tone t is {value > s} with the one s that
leaves the area t.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from patterngen.model.area import BoolArray
from patterngen.model.lattice import FloatArray

SpotFunction = Callable[[FloatArray, FloatArray], FloatArray]


def _corner(x: FloatArray, y: FloatArray) -> FloatArray:
    return np.asarray((np.abs(x) - 1) ** 2 + (np.abs(y) - 1) ** 2 - 1)


def _round(x: FloatArray, y: FloatArray) -> FloatArray:
    return np.where(np.abs(x) + np.abs(y) <= 1, 1 - (x * x + y * y), _corner(x, y))


def _ellipse(x: FloatArray, y: FloatArray) -> FloatArray:
    x, y = np.abs(x), np.abs(y)
    w = 3 * x + 4 * y - 3
    dot = 1 - (x * x + (y / 0.75) ** 2) / 4
    hole = ((1 - x) ** 2 + ((1 - y) / 0.75) ** 2) / 4 - 1
    return np.where(w < 0, dot, np.where(w > 1, hole, 0.5 - w))


def _diamond(x: FloatArray, y: FloatArray) -> FloatArray:
    x, y = np.abs(x), np.abs(y)
    return np.where(x + y <= 0.75, 1 - (x * x + y * y), np.where(x + y <= 1.23, 1 - (0.85 * x + y), _corner(x, y)))


def _sine(cycles: FloatArray) -> FloatArray:
    return np.asarray(np.sin(2 * np.pi * cycles))


FUNCTIONS: dict[str, SpotFunction] = {
    "simpledot": lambda x, y: 1 - (x * x + y * y),
    "invertedsimpledot": lambda x, y: x * x + y * y - 1,
    "doubledot": lambda x, y: _sine(x) / 2 + _sine(y) / 2,
    "inverteddoubledot": lambda x, y: -(_sine(x) / 2 + _sine(y) / 2),
    "cosinedot": lambda x, y: np.cos(np.pi * x) / 2 + np.cos(np.pi * y) / 2,
    "double": lambda x, y: _sine(x / 2) / 2 + _sine(y) / 2,
    "inverteddouble": lambda x, y: -(_sine(x / 2) / 2 + _sine(y) / 2),
    "line": lambda x, y: -np.abs(y) + 0 * x,
    "linex": lambda x, y: x + 0 * y,
    "liney": lambda x, y: y + 0 * x,
    "round": _round,
    "ellipse": _ellipse,
    "ellipsea": lambda x, y: 1 - (x * x + 0.9 * y * y),
    "invertedellipsea": lambda x, y: x * x + 0.9 * y * y - 1,
    "ellipseb": lambda x, y: 1 - np.sqrt(x * x + 0.625 * y * y),
    "ellipsec": lambda x, y: 1 - (0.9 * x * x + y * y),
    "invertedellipsec": lambda x, y: 0.9 * x * x + y * y - 1,
    "square": lambda x, y: -np.maximum(np.abs(x), np.abs(y)),
    "cross": lambda x, y: -np.minimum(np.abs(x), np.abs(y)),
    "rhomboid": lambda x, y: (0.9 * np.abs(x) + np.abs(y)) / 2,
    "diamond": _diamond,
}


def value(name: str, x: FloatArray, y: FloatArray) -> FloatArray:
    """The spot function at (x, y), both -1 to 1 over the cell.

    >>> float(value("simpledot", np.array(0.5), np.array(0.5)))
    0.5
    """
    return FUNCTIONS[name](np.asarray(x, dtype=float), np.asarray(y, dtype=float))


def inked(name: str, x: FloatArray, y: FloatArray, level: FloatArray | float) -> BoolArray:
    """Where the value lies above the level."""
    return np.asarray(value(name, x, y) > level)


def has_axis(name: str) -> bool:
    """Whether rows and columns of the shape differ, so that it repeats only after half a turn."""
    at = (np.arange(24) + 0.5) / 12 - 1
    x, y = np.meshgrid(at, at)
    return not np.allclose(value(name, x, y), value(name, y, x))
