"""Quantities with their units, as text in and plain numbers out.

The only place where text becomes a number.  Inside the program lengths are mm,
frequencies cycles/mm, angles degrees, shares 0 to 1.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

_NUMBER = re.compile(r"[+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d{1,3})?", re.ASCII)
_COMMA = re.compile(r"([+-]?\d+),(\d+)(?=[\s%/a-zA-Z]|$)", re.ASCII)
_SMALLEST, _LARGEST = 1e-12, 1e12
_LOOKALIKES = str.maketrans({"\u2212": "-", "\u2013": "-", "\u00b5": "u", "\u03bc": "u", "\u00a0": " ", "\u202f": " "})


@dataclass(frozen=True, slots=True)
class Quantity:
    """A kind of quantity: its name in words, its units as factors to the inner unit, an example."""

    name: str
    units: dict[str, float]
    example: str

    @property
    def unit(self) -> str:
        """The unit of the example: the one that a message proposes."""
        return self.example.split()[-1]


LENGTH = Quantity("a length", {"mm": 1.0, "um": 1e-3, "cm": 10.0, "m": 1000.0, "in": 25.4, "pt": 25.4 / 72}, "0.2 mm")
RULING = Quantity("a ruling", {"lpi": 1 / 25.4, "/cm": 0.1, "/mm": 1.0, "/in": 1 / 25.4}, "150 lpi")
RESOLUTION = Quantity("a resolution", {"dpi": 1 / 25.4, "/cm": 0.1, "/mm": 1.0, "/in": 1 / 25.4}, "2400 dpi")
ANGLE = Quantity("an angle", {"deg": 1.0}, "15 deg")
SHARE = Quantity("a share", {"%": 0.01, "ppm": 1e-6}, "40 %")
ILLUMINANCE = Quantity("an illuminance", {"lx": 1.0}, "500 lx")
TONE_STEPS = Quantity("a count of tone steps", {"steps": 1.0}, "150 steps")
COLOUR_DIFFERENCE = Quantity("a colour difference", {"CIEDE2000": 1.0}, "3 CIEDE2000")

# Spellings of units that are clear in words but are not the one of the preset.
_OTHER_SPELLINGS = {
    "°": "deg", "degree": "deg", "degrees": "deg", "percent": "%", "per cent": "%", "lux": "lx",
    "lines/cm": "/cm", "l/cm": "/cm", "lpcm": "/cm", "1/cm": "/cm", "ppi": "dpi",
    "lines/mm": "/mm", "l/mm": "/mm", "1/mm": "/mm", "lines/in": "lpi", "lines per inch": "lpi",
    "inch": "in", '"': "in", "micron": "um", "microns": "um", "points": "pt",
    "millimetre": "mm", "millimetres": "mm",
}  # fmt: skip


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
    if not isinstance(value, str):
        if isinstance(value, int | float) and not isinstance(value, bool) and math.isfinite(value):
            raise _without_unit(float(value), quantity, allowed)
        raise QuantityError(f"not {quantity.name}", allowed=allowed)
    if len(value) > 100:
        raise QuantityError(f"not {quantity.name}, far too long for one", allowed=allowed)
    text = value.strip(" \t")
    match = _NUMBER.match(text)
    if not match or _COMMA.match(text):
        raise _mendable(text, quantity, allowed)
    digits, rest = match.group(), text[match.end() :].strip(" \t")
    number = float(digits)
    if not rest:
        raise _without_unit(number, quantity, allowed)
    factor = _factor(rest, quantity)
    if factor is None:
        known = ", ".join(quantity.units)
        raise QuantityError(
            _unit_problem(rest, quantity),
            allowed=f"{quantity.name} in {known}",
            nearest=f'"{digits} {_nearest_unit(rest, quantity)}"',
        )
    vanished = number == 0 and any(digit in "123456789" for digit in re.split("[eE]", digits)[0])
    if vanished or not math.isfinite(number) or (number != 0 and not _SMALLEST <= abs(number) <= _LARGEST):
        raise QuantityError("a number out of all range", allowed=allowed)
    return number * factor + 0.0


def spell(number: float, quantity: Quantity, unit: str) -> str:
    """A number in the inner unit as preset text in `unit`; reading it gives the number back to 1e-15.

    >>> spell(60 / 10, RULING, "/cm")
    '60 /cm'
    """
    outer = number / quantity.units[unit]
    short = plain(outer)
    exact = math.isclose(float(short) * quantity.units[unit], number, rel_tol=1e-15, abs_tol=1e-15)
    return f"{short if exact else f'{outer:.17g}'} {unit}"


def plain(value: float) -> str:
    """A number for a message: no exponent for everyday sizes, no minus zero."""
    text = f"{value:.10g}"
    return "0" if text in ("-0", "0") else text


def _without_unit(number: float, quantity: Quantity, allowed: str) -> QuantityError:
    # a bare 0.5 where a share is wanted surely means one half
    share = quantity is SHARE and 0 < abs(number) <= 1
    meant = number / quantity.units["%"] if share else number
    sound = meant == 0 or _SMALLEST <= abs(meant) <= _LARGEST
    nearest = f'"{plain(meant)} {quantity.unit}"' if sound else ""
    return QuantityError("a number without its unit", allowed=allowed, nearest=nearest)


def _mendable(text: str, quantity: Quantity, allowed: str) -> QuantityError:
    """What was probably meant: a decimal comma, a typographic minus, digits of another script."""
    mended = text.translate(_LOOKALIKES)
    mended = "".join(str(int(c)) if c.isdecimal() and not c.isascii() else c for c in mended)
    comma = _COMMA.match(mended)
    mended = _COMMA.sub(r"\1.\2", mended, count=1)
    problem = "a decimal comma" if comma else f"not {quantity.name}"
    if mended == text:
        return QuantityError(problem, allowed=allowed)
    try:
        parse(mended, quantity)
    except QuantityError as error:
        return QuantityError(problem, allowed=allowed, nearest=error.nearest)
    return QuantityError(problem, allowed=allowed, nearest=f'"{mended}"')


def _factor(unit: str, quantity: Quantity) -> float | None:
    # "um" is often typed with one of the two Greek letters
    word = re.sub(r"[ \t]+", " ", unit.translate(_LOOKALIKES))
    for spelling in (word, word.lower(), word.replace("/ ", "/")):
        if spelling in quantity.units:
            return quantity.units[spelling]
    return None


def _unit_problem(unit: str, quantity: Quantity) -> str:
    words = [word for word in re.split(r"[\s(),;=]+", unit) if word]
    if len(words) > 1 and sum(_factor(word, quantity) is not None for word in words) > 1:
        return f"two units at once ({unit[:40]})"
    return f"unknown unit {unit[:40]!r}"


def _nearest_unit(unit: str, quantity: Quantity) -> str:
    word = unit.lower().strip()
    meant = _OTHER_SPELLINGS.get(word, word)
    if meant in quantity.units:
        return meant
    from difflib import get_close_matches

    first = re.split(r"[\s(),;=]+", word)[0]
    if first in quantity.units:
        return first
    close = get_close_matches(word, list(quantity.units), n=1, cutoff=0.4)
    return close[0] if close else quantity.unit
