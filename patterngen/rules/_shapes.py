"""Which spot functions of ISO 32000-1 have an axis, so that their screens repeat only every 180 degrees."""

from __future__ import annotations

AXIS_SHAPES = frozenset(
    {
        "double", "inverteddouble", "line", "linex", "liney", "ellipse", "ellipsea", "invertedellipsea",
        "ellipseb", "ellipsec", "invertedellipsec", "rhomboid", "diamond",
    }
)  # fmt: skip
