"""Quantities with their units, as text in and plain numbers out.

The only place where text becomes a number.  Inside the program lengths are mm,
frequencies cycles/mm, angles degrees, shares 0 to 1.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

_NUMBER = re.compile(r"[+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d{1,3})?", re.ASCII)


@dataclass(frozen=True, slots=True)
class Quantity:
    """A kind of quantity: its name in words, its units as factors to the inner unit, an example."""

    name: str
    units: dict[str, float]
    example: str


LENGTH = Quantity("a length", {"mm": 1.0, "um": 1e-3, "cm": 10.0, "m": 1000.0, "in": 25.4, "pt": 25.4 / 72}, "0.2 mm")
RULING = Quantity("a ruling", {"lpi": 1 / 25.4, "/cm": 0.1, "/mm": 1.0, "/in": 1 / 25.4}, "150 lpi")
RESOLUTION = Quantity("a resolution", {"dpi": 1 / 25.4, "/cm": 0.1, "/mm": 1.0, "/in": 1 / 25.4}, "2400 dpi")
ANGLE = Quantity("an angle", {"deg": 1.0}, "15 deg")
SHARE = Quantity("a share", {"%": 0.01, "ppm": 1e-6}, "40 %")
ILLUMINANCE = Quantity("an illuminance", {"lx": 1.0}, "500 lx")
FREQUENCY_LPI = 25.4


class QuantityError(ValueError):
    """A text is not the wanted quantity: `problem`, `allowed`, `nearest` are ready for a fault."""

    def __init__(self, problem: str, *, allowed: str, nearest: str = "") -> None:
        super().__init__(problem)
        self.problem, self.allowed, self.nearest = problem, allowed, nearest


def parse(value: object, quantity: Quantity) -> float:
    """A value from a preset ("150 lpi") to the inner unit.  Raises `QuantityError`.

    >>> round(parse("150 lpi", RULING), 6)
    5.905512
    """
    allowed = f'{quantity.name} as a text with its unit, like "{quantity.example}"'
    unit = quantity.example.split()[-1]
    if isinstance(value, bool) or not isinstance(value, str):
        if isinstance(value, int | float) and not isinstance(value, bool) and math.isfinite(value):
            raise QuantityError("a number without its unit", allowed=allowed, nearest=f'"{plain(value)} {unit}"')
        raise QuantityError(f"not {quantity.name}", allowed=allowed)
    text = value.strip()
    match = _NUMBER.match(text)
    if not match:
        mended = text.replace("\u2212", "-")
        mended = "".join(str(int(c)) if c.isdigit() and not c.isascii() and c.isdecimal() else c for c in mended)
        nearest = f'"{mended}"' if mended != text and _NUMBER.match(mended) else ""
        raise QuantityError(f"not {quantity.name}", allowed=allowed, nearest=nearest)
    digits, rest = match.group(), text[match.end() :].strip()
    if rest[:1] == "," and rest[1:2].isdigit():
        mended = text.replace(",", ".", 1)
        raise QuantityError("a decimal comma", allowed=allowed, nearest=f'"{mended}"')
    if not rest:
        raise QuantityError("a number without its unit", allowed=allowed, nearest=f'"{digits} {unit}"')
    factor = quantity.units.get(rest) or quantity.units.get(rest.lower()) or quantity.units.get(rest.replace(" ", ""))
    if factor is None:
        from difflib import get_close_matches

        close = get_close_matches(rest.lower(), list(quantity.units), n=1, cutoff=0.1)
        known = ", ".join(quantity.units)
        raise QuantityError(
            f"unknown unit {rest[:40]!r}", allowed=f"{quantity.name} in {known}", nearest=f'"{digits} {(close or [unit])[0]}"'
        )
    number = float(digits)
    if not math.isfinite(number) or (number != 0 and not 1e-12 <= abs(number) <= 1e12):
        raise QuantityError("a number out of all range", allowed=allowed)
    return number * factor + 0.0


def plain(value: float) -> str:
    """A number for a message: no exponent for everyday sizes, no minus zero."""
    text = f"{value:.10g}"
    return "0" if text in ("-0", "0") else text
