"""Preset fields: annotated types that turn a preset's text into plain numbers and clean text.

Each carries its range, its pattern for the JSON Schema, and errors that already hold what
is allowed and what comes nearest.  They serve the preset models and each kind's `Params`.
"""

from __future__ import annotations

import math
import re
import unicodedata
from collections.abc import Callable
from dataclasses import dataclass
from typing import Annotated, Any

from pydantic import GetCoreSchemaHandler, GetJsonSchemaHandler
from pydantic_core import CoreSchema, PydanticCustomError, core_schema

from patterngen.units import (
    ANGLE,
    ILLUMINANCE,
    LENGTH,
    RESOLUTION,
    RULING,
    SHARE,
    Quantity,
    QuantityError,
    parse,
    plain,
)

CHOOSE = "choose"
"""The word that leaves a value to the search."""
_FOR_THE_SEARCH = "for the search command `angles`, which this version does not have yet"


def refusal(problem: str, *, allowed: str = "", nearest: str = "") -> PydanticCustomError:
    """A validation error in plain words, ready to become a fault."""
    return PydanticCustomError("refused", "{problem}", {"problem": problem, "allowed": allowed, "nearest": nearest})


class _Field:
    """A field read by one function, shown in the JSON Schema by another."""

    def read(self, value: object) -> Any:
        raise NotImplementedError

    def schema(self) -> dict[str, Any]:
        raise NotImplementedError

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(self, schema: CoreSchema, handler: GetJsonSchemaHandler) -> dict[str, Any]:
        return self.schema()


@dataclass(frozen=True, eq=False)
class QuantityField(_Field):
    """A number with its unit, between `low` and `high` (inner unit; `above` leaves the low end out).

    `choose` also lets the word "choose" through, which messages do not offer: nothing can be built from it.
    """

    quantity: Quantity
    low: float = -math.inf
    high: float = math.inf
    above: bool = False
    choose: bool = False

    def read(self, value: object) -> float | str:
        """The value in the inner unit."""
        if self.choose and value == CHOOSE:
            return CHOOSE
        try:
            number = parse(value, self.quantity)
        except QuantityError as error:
            raise refusal(error.problem, allowed=error.allowed, nearest=error.nearest) from None
        if not (self.low <= number <= self.high) or (self.above and number == self.low):
            unit = str(value).strip(" \t").lstrip("+-.0123456789eE").strip()
            raise refusal(
                "out of range",
                allowed=self.range_words(),
                nearest=self._bound(number, unit),
            )
        return number

    def schema(self) -> dict[str, Any]:
        """A text with a number and one of the units."""
        units = "|".join(re.escape(unit) for unit in self.quantity.units)
        minus = "" if self.low >= 0 else "-?"
        # the editors' regular expressions know no look-ahead: the range itself stays with the program
        text = {
            "type": "string",
            "pattern": f"^\\s*[+]?{minus}([0-9]+([.][0-9]*)?|[.][0-9]+)([eE][+-]?[0-9]+)?\\s*({units})\\s*$",
            "examples": [self._example()],
            "description": f"{self.quantity.name} in {', '.join(self.quantity.units)}; {self.range_words()}",
        }
        if not self.choose:
            return text
        return {"anyOf": [text, {"const": CHOOSE, "description": _FOR_THE_SEARCH}]}

    def range_words(self) -> str:
        """The range in words, in the unit of the quantity's example."""
        low, high = self._outer(self.low), self._outer(self.high)
        if math.isinf(self.low) and math.isinf(self.high):
            return f"any {self.quantity.name.split(' ', 1)[1]}"
        if math.isinf(self.high):
            return f"{'more than' if self.above else 'at least'} {low}"
        if math.isinf(self.low):
            return f"at most {high}"
        return f"{'more than' if self.above else 'from'} {low} {'up to' if self.above else 'to'} {high}"

    def _outer(self, number: float) -> str:
        return f"{plain(number / self.quantity.units[self.quantity.unit])} {self.quantity.unit}"

    def _example(self) -> str:
        number = parse(self.quantity.example, self.quantity)
        inside = self.low <= number <= self.high
        return self.quantity.example if inside else self._outer(self.high if math.isfinite(self.high) else self.low)

    def _bound(self, number: float, unit: str) -> str:
        unit = unit if unit in self.quantity.units else self.quantity.unit
        bound = self.low if number <= self.low else self.high
        if self.above and bound == self.low:
            if number == 0 or not self.low <= -number <= self.high:
                return ""
            bound = -number  # a stray minus
        return f'"{plain(bound / self.quantity.units[unit])} {unit}"'


@dataclass(frozen=True, eq=False)
class NumberField(_Field):
    """A bare number (no unit) between `low` and `high`; `whole` numbers only where asked."""

    what: str
    low: float = -math.inf
    high: float = math.inf
    above: bool = False
    whole: bool = False

    def read(self, value: object) -> float | int:
        """The number itself."""
        kind = "a whole number" if self.whole else "a number"
        wanted = f"{self.what}: {kind} {self.range_words()}".strip()
        if isinstance(value, bool) or not isinstance(value, int if self.whole else int | float):
            raise refusal(f"not {kind}", allowed=wanted, nearest=self._from_text(value))
        assert isinstance(value, int | float)
        if not math.isfinite(value):
            raise refusal("not a finite number", allowed=wanted)
        if not self.low <= value <= self.high or (self.above and value == self.low):
            bound = self.low if value <= self.low else self.high
            raise refusal(
                "out of range",
                allowed=wanted,
                nearest="" if self.above and bound == self.low else plain(bound),
            )
        return int(value) if self.whole else float(value) + 0.0

    def schema(self) -> dict[str, Any]:
        """A number with its bounds."""
        out: dict[str, Any] = {"type": "integer" if self.whole else "number", "description": self.what}
        if math.isfinite(self.low):
            out["exclusiveMinimum" if self.above else "minimum"] = self.low
        if math.isfinite(self.high):
            out["maximum"] = self.high
        return out

    def range_words(self) -> str:
        """The range in words."""
        low = f"{'more than' if self.above else 'from'} {plain(self.low)}" if math.isfinite(self.low) else ""
        high = f"{'up to' if low else 'at most'} {plain(self.high)}" if math.isfinite(self.high) else ""
        return f"{low} {high}".strip()

    def _from_text(self, value: object) -> str:
        if not isinstance(value, str):
            return ""
        text = value.strip().replace(",", ".")
        return text if re.fullmatch(r"-?\d{1,12}(\.\d{1,12})?", text, re.ASCII) else ""


@dataclass(frozen=True, eq=False)
class TextField(_Field):
    """A line of text: no control characters, nothing that turns the reading direction, a limited length."""

    what: str
    longest: int
    empty: bool = False

    def read(self, value: object) -> str:
        """The text in composed form (NFC)."""
        allowed = f"{self.what}: one line of text, at most {self.longest} characters"
        if not isinstance(value, str):
            bare = isinstance(value, int | float) and not isinstance(value, bool)
            raise refusal("not a text", allowed=allowed, nearest=f'"{value}"' if bare else "")
        if problem := text_problem(value):
            cleaned = "".join(c for c in value if not text_problem(c)).strip()[: self.longest]
            raise refusal(problem, allowed=allowed, nearest=f'"{cleaned}"' if cleaned else "")
        text = unicodedata.normalize("NFC", value)
        if len(text) > self.longest:
            raise refusal(f"a text of {len(text)} characters, too long", allowed=allowed)
        if text != text.strip():
            raise refusal("blanks at the ends", allowed=allowed, nearest=f'"{text.strip()}"' if text.strip() else "")
        if not text and not self.empty:
            raise refusal("an empty text", allowed=allowed)
        return text

    def schema(self) -> dict[str, Any]:
        """A bounded text."""
        least = {} if self.empty else {"minLength": 1}
        return {"type": "string", "maxLength": self.longest, "description": self.what} | least


_NAME = re.compile(r"[A-Za-z0-9](?:[A-Za-z0-9_.-]*[A-Za-z0-9_-])?", re.ASCII)
_LONGEST_NAME = 64


@dataclass(frozen=True, eq=False)
class NameField(_Field):
    """A name that may become part of a file name or an address: see `name_problem`."""

    what: str

    def read(self, value: object) -> str:
        """The name itself."""
        allowed = f"{self.what}: letters a-z, digits, dash, underscore, dots inside, at most {_LONGEST_NAME}"
        if not isinstance(value, str):
            raise refusal("not a name", allowed=allowed)
        if problem := name_problem(value):
            near = nearest_name(value)
            raise refusal(problem, allowed=allowed, nearest=f'"{near}"' if near else "")
        return value

    def schema(self) -> dict[str, Any]:
        """A text with the pattern of names."""
        return {
            "type": "string",
            "pattern": f"^{_NAME.pattern.replace('?:', '')}$",
            "maxLength": _LONGEST_NAME,
            "description": self.what,
        }


@dataclass(frozen=True, eq=False)
class ChoiceField(_Field):
    """One of a few words, which `options` lists when asked (so that a registry may grow).

    With `any_case`, lower-case options may be written in capitals too.
    """

    what: str
    options: Callable[[], tuple[str, ...]]
    any_case: bool = False

    def read(self, value: object) -> str:
        """The word as `options` has it."""
        from difflib import get_close_matches

        options = self.options()
        allowed = ", ".join(options)
        if not isinstance(value, str):
            raise refusal(f"not the name of {self.what}", allowed=allowed)
        word = value.lower() if self.any_case else value
        if word not in options:
            near = get_close_matches(value.strip().lower().replace("_", "-"), options, n=1, cutoff=0.4)
            raise refusal(
                f"no such {self.what.split(' ', 1)[1]}",
                allowed=allowed,
                nearest=f'"{near[0]}"' if near else "",
            )
        return word

    def schema(self) -> dict[str, Any]:
        """An enumeration, and the same words in any case where that is open."""
        options = self.options()
        words = {"type": "string", "enum": list(options), "description": self.what}
        if not self.any_case:
            return words
        letters = ("".join(f"[{c}{c.upper()}]" if c.isalpha() else re.escape(c) for c in word) for word in options)
        # the list comes first, as it is what editors complete from
        spelt = {"type": "string", "pattern": f"^({'|'.join(letters)})$", "description": f"{self.what}, in any case"}
        return {"anyOf": [words, spelt], "description": f"{self.what}; capitals and small letters count the same"}


_LAB_BOUNDS = ((0.0, 100.0), (-200.0, 200.0), (-200.0, 200.0))


class _LabField(_Field):
    def read(self, value: object) -> tuple[float, float, float]:
        allowed = "a CIELAB colour [L, a, b]: L from 0 to 100, a and b from -200 to 200"
        if not isinstance(value, list | tuple) or len(value) != 3:
            raise refusal("not a colour", allowed=allowed, nearest="[95, 0, -2]")
        if any(isinstance(v, bool) or not isinstance(v, int | float) or not math.isfinite(v) for v in value):
            raise refusal("not three finite numbers", allowed=allowed)
        held = [min(max(float(v), low), high) + 0.0 for v, (low, high) in zip(value, _LAB_BOUNDS, strict=True)]
        if any(a != b for a, b in zip(held, value, strict=True)):
            raise refusal("out of range", allowed=allowed, nearest=f"[{', '.join(plain(v) for v in held)}]")
        return held[0], held[1], held[2]

    def schema(self) -> dict[str, Any]:
        # not by position: editors' checkers know no `prefixItems` yet
        low, high = min(low for low, _ in _LAB_BOUNDS), max(high for _, high in _LAB_BOUNDS)
        return {
            "type": "array",
            "items": {"type": "number", "minimum": low, "maximum": high},
            "minItems": 3,
            "maxItems": 3,
            "description": "CIELAB (D50, 2 degree observer)",
            "examples": [[55, -37, -50]],
        }


def text_problem(text: str) -> str:
    """What is wrong with a text for print and files, in words; empty when nothing is."""
    for character in text:
        category = unicodedata.category(character)
        if category in ("Cc", "Zl", "Zp"):
            return f"a control character (U+{ord(character):04X})"
        if unicodedata.bidirectional(character) in (
            "LRE",
            "RLE",
            "LRO",
            "RLO",
            "PDF",
            "LRI",
            "RLI",
            "FSI",
            "PDI",
        ):
            return f"a character that turns the reading direction (U+{ord(character):04X})"
        if category in ("Cs", "Cn", "Co") or ord(character) == 0xFEFF:
            return f"a character without meaning (U+{ord(character):04X})"
    return ""


_DEVICE_NAMES = frozenset(
    ["con", "prn", "aux", "nul", *(f"com{n}" for n in range(1, 10)), *(f"lpt{n}" for n in range(1, 10))]
)


def name_problem(name: str) -> str:
    """What is wrong with a name that becomes a file name on any system, in words; empty when nothing is."""
    if not name:
        return "an empty name"
    if len(name) > _LONGEST_NAME:
        return f"a name of {len(name)} characters, too long"
    if not _NAME.fullmatch(name) or ".." in name:
        return "not a name that every system can hold"
    if name.split(".")[0].lower() in _DEVICE_NAMES:
        return "a name that some systems keep for a device"
    return ""


def nearest_name(text: str) -> str:
    """The nearest legal name, or an empty text."""
    plain_text = unicodedata.normalize("NFKD", text[: 4 * _LONGEST_NAME])
    ascii_only = "".join(c for c in plain_text if not unicodedata.combining(c))
    name = re.sub(r"[^A-Za-z0-9_.-]+", "-", ascii_only)
    name = re.sub(r"\.{2,}", ".", re.sub(r"-{2,}", "-", name)).strip("-_.")[:_LONGEST_NAME].rstrip(".-")
    if not name:
        return ""
    return f"{name}-1" if name_problem(name) else name


PositiveLength = Annotated[float, QuantityField(LENGTH, low=0.0, high=10_000.0, above=True)]
LengthOrZero = Annotated[float, QuantityField(LENGTH, low=0.0, high=10_000.0)]
RulingOrChoose = Annotated[float | str, QuantityField(RULING, low=0.0, high=1000.0, above=True, choose=True)]
Resolution = Annotated[float, QuantityField(RESOLUTION, low=0.0, high=10_000.0, above=True)]
Angle = Annotated[float, QuantityField(ANGLE, low=-3600.0, high=3600.0)]
AngleOrChoose = Annotated[float | str, QuantityField(ANGLE, low=-3600.0, high=3600.0, choose=True)]
AngleError = Annotated[float, QuantityField(ANGLE, low=0.0, high=45.0)]
Share = Annotated[float, QuantityField(SHARE, low=0.0, high=1.0)]
Illuminance = Annotated[float, QuantityField(ILLUMINANCE, low=0.0, high=200_000.0, above=True)]
Lab = Annotated[tuple[float, float, float], _LabField()]
