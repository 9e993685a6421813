"""The gates a preset's text passes before it is parsed: encoding, size, depth, syntax, numbers."""

from __future__ import annotations

import datetime
import math
import re
import tomllib
from collections.abc import Iterator
from typing import Any

from patterngen.errors import Fault, InputError

MOST_PRESET_BYTES = 1 << 20
DEEPEST = 16
"""Levels of nesting, and parts of a dotted key.  A preset needs four."""

_BYTE_ORDER_MARKS = (
    (b"\xff\xfe\x00\x00", "UTF-32"),
    (b"\x00\x00\xfe\xff", "UTF-32"),
    (b"\xff\xfe", "UTF-16"),
    (b"\xfe\xff", "UTF-16"),
)
_TOKEN = re.compile(
    r"""(?P<skip>\#[^\n]*|\"\"\"(?:[^\\]|\\.)*?\"\"\"|'''.*?''')
      | (?P<unclosed>\"\"\"|''')
      | (?P<word>\"(?:[^"\\\n]|\\.)*\"|'[^'\n]*'|[A-Za-z0-9_-]+)
      | (?P<broken>["'])
      | (?P<dot>\.) | (?P<open>[\[{]) | (?P<close>[\]}]) | (?P<end>[\n,=])
      | [ \t\r]+ | .""",
    re.VERBOSE | re.DOTALL,
)
_PLACE = re.compile(r"\s*\(at (?:line (\d+), column (\d+)|end of document)\)\s*$")
_LARGEST_INTEGER = 2**63


def decode(data: bytes, *, where: str) -> tuple[str, list[str]]:
    """Bytes of a preset to its text with plain line ends, and remarks on what was normalised.

    Raises `InputError` that names the encoding for anything but UTF-8.
    """
    remarks = []
    for mark, encoding in _BYTE_ORDER_MARKS:
        if data.startswith(mark):
            raise InputError(Fault(where, "", f"the file is written in {encoding}", allowed="UTF-8"))
    if data.startswith(b"\xef\xbb\xbf"):
        data = data[3:]
        remarks.append("the preset began with a byte order mark; it was left out")
    try:
        text = data.decode("utf-8")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        zeros = data[:4096].count(0)
        guess = "UTF-16 without its mark, or binary data" if zeros else "Latin-1 or Windows-1252, by the look of it"
        raise InputError(
            Fault(
                where,
                "",
                f"line {line}: the file is not UTF-8 ({guess})",
                value=f"byte 0x{data[error.start]:02x}",
                allowed="UTF-8",
            )
        ) from None
    if "\0" in text:
        line = text.count("\n", 0, text.index("\0")) + 1
        guess = "UTF-16" if data[:4096].count(0) > len(data[:4096]) // 4 else "binary data"
        raise InputError(Fault(where, "", f"line {line}: the file holds zero bytes ({guess})", allowed="UTF-8 text"))
    if "\r" in text:
        text = text.replace("\r\n", "\n")
        if "\r" in text:
            line = text.count("\n", 0, text.index("\r")) + 1
            raise InputError(
                Fault(
                    where,
                    "",
                    f"line {line}: a carriage return without a line feed",
                    allowed="plain line ends",
                )
            )
        remarks.append("the preset's line ends (CR LF) were read as plain ones")
    return text, remarks


def parse(text: str, *, where: str) -> dict[str, Any]:
    """Preset text to plain data.

    Depth is counted before parsing, as the standard parser takes a time that grows with
    the square of a key's parts.  Raises `InputError` with line and column.
    """
    _refuse_depth(text, where)
    try:
        data = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise InputError(_syntax_fault(str(error), text, where)) from None
    except (ValueError, RecursionError, OverflowError):
        # a number of thousands of digits, or a date that no calendar has
        raise InputError(
            Fault(where, "", "a number or date that no program can hold", allowed="everyday numbers")
        ) from None
    if faults := list(bad_values(data, where=where)):
        raise InputError(faults)
    return data


def parse_value(text: str) -> Any:
    """One TOML value ("[95, 0, -2]", "true"), or the text itself where it is none."""
    # a line end would let one value bring its own tables along
    if "\n" in text or len(text) > 10_000:
        return text
    try:
        _refuse_depth(text, "")
        data = tomllib.loads(f"value = {text}\n")
    except (InputError, ValueError, RecursionError, OverflowError):
        return text
    return data["value"] if list(data) == ["value"] else text


def bad_values(data: object, *, where: str, key: str = "", depth: int = 0) -> Iterator[Fault]:
    """Faults of values that no field may hold: not finite, beyond 64 bit, dates, odd types, too deep."""
    if depth > DEEPEST:
        yield Fault(where, key, "nested too deep", allowed=f"at most {DEEPEST} levels")
    elif isinstance(data, dict):
        for name, value in data.items():
            if not isinstance(name, str):
                yield Fault(where, key, "a key that is not a text", value=repr(name)[:60])
            else:
                yield from bad_values(value, where=where, key=f"{key}.{name}" if key else name, depth=depth + 1)
    elif isinstance(data, list | tuple):
        for index, value in enumerate(data):
            yield from bad_values(value, where=where, key=f"{key}[{index}]", depth=depth + 1)
    elif isinstance(data, bool):
        return
    elif isinstance(data, int):
        if not -_LARGEST_INTEGER <= data < _LARGEST_INTEGER:
            yield Fault(where, key, "a whole number beyond 64 bits", allowed="everyday numbers")
    elif isinstance(data, float):
        if not math.isfinite(data):
            yield Fault(where, key, "not a finite number", value=str(data), allowed="everyday numbers")
    elif isinstance(data, str):
        if any("\ud800" <= character <= "\udfff" for character in data):
            yield Fault(where, key, "a text that is not Unicode", value=ascii(data)[:60])
    elif isinstance(data, datetime.date | datetime.time):
        yield Fault(
            where,
            key,
            "a date where none belongs",
            value=str(data),
            allowed="a text, in quotes",
            nearest=f'"{data}"',
        )
    else:
        yield Fault(
            where,
            key,
            f"a value of a kind that no preset holds ({type(data).__name__})",
            allowed="texts, numbers, true, false, lists and tables",
        )


def _refuse_depth(text: str, where: str) -> None:
    open_brackets = parts = 0
    for token in _TOKEN.finditer(text):
        kind = token.lastgroup
        if kind in ("unclosed", "broken"):
            # a text without an end: the parser will say so, and nothing after it counts
            return
        if kind == "dot":
            parts += 1
        elif kind == "open":
            open_brackets += 1
            parts = 0
        elif kind == "close":
            open_brackets = max(open_brackets - 1, 0)
            parts = 0
        elif kind == "end":
            parts = 0
        if open_brackets > DEEPEST or parts > DEEPEST:
            line = text.count("\n", 0, token.start()) + 1
            what = "brackets nested too deep" if open_brackets > DEEPEST else "a key of too many parts"
            raise InputError(Fault(where, "", f"line {line}: {what}", allowed=f"at most {DEEPEST} levels"))


# What the parser says, in words for somebody who only wants the file to be read.
_PLAIN_WORDS = (
    (r"Cannot overwrite a value", "this key stands here a second time"),
    (r"Duplicate inline table key (.*)", r"this key stands here a second time: \1"),
    (r"Cannot declare \((.*?),?\) twice", r"this table stands here a second time: \1"),
    (r"Cannot mutate immutable namespace|Cannot redefine namespace", "this table is closed already"),
    (r"Invalid value", "no legal value stands here (a text needs quotes)"),
    (r"Invalid statement", "this is neither a key with a value, nor a [table], nor a # comment"),
    (r"Invalid initial character for a key part", "a key cannot begin like this"),
    (r"Expected '=' after a key in a key/value pair", "an equals sign is missing after the key"),
    (r"Expected '\]' at the end of a table declaration", "a ] is missing after the table's name"),
    (r"Expected '\]\]' at the end of an array declaration", "a ]] is missing after the table's name"),
    (r"Expected newline or end of document after a statement", "something follows the value on its line"),
    (r"Unterminated string|Expected \"'\"|Expected '\"'", "the closing quote is missing"),
    (r"Unclosed array", "the closing ] of this list is missing"),
    (r"Unclosed inline table", "the closing } of this table is missing"),
    (r"Unescaped '\\\\' in a string", "a backslash that begins no known escape (double it)"),
    (r"Illegal character (.*)", r"a character that may not stand here: \1"),
)


def _syntax_fault(message: str, text: str, where: str) -> Fault:
    place = _PLACE.search(message)
    problem = _PLACE.sub("", message)
    for pattern, words in _PLAIN_WORDS:
        if match := re.search(pattern, problem):
            problem = match.expand(words)
            break
    if place and place.group(1):
        line, column = int(place.group(1)), int(place.group(2))
    else:
        lines = text.split("\n")
        line, column = len(lines), len(lines[-1]) + 1
    source = text.split("\n")[line - 1].strip()[:60]
    return Fault(where, "", f"line {line}, column {column}: {problem}", value=source, allowed="TOML 1.0")
