"""Numbers as text: one fixed notation for a single number, and columns of whole numbers at once.

Never an exponent, never a locale, never a minus zero, never NaN.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

SIGNIFICANT = 12
"""Digits kept of a single number: 1e-12 of a metre is far below any reader's own arithmetic."""

TextColumn = NDArray[np.void]
"""One text of fixed width for each row, padded with NUL bytes that `rows` removes."""


def number(value: float, *, significant: int = SIGNIFICANT) -> str:
    """A number in fixed notation with at most `significant` digits.  Raises ValueError if not finite.

    >>> number(0.1 + 0.2), number(-0.0), number(1e-7), number(50.0)
    ('0.3', '0', '0.0000001', '50')
    """
    if not math.isfinite(value):
        raise ValueError("a drawing holds finite numbers only")
    if value == 0:
        return "0"
    return str(
        np.format_float_positional(float(value), precision=significant, unique=False, fractional=False, trim="-")
    )


def numbers(*values: float) -> str:
    """Several numbers, blanks between."""
    return " ".join(number(value) for value in values)


def integers(values: NDArray[Any]) -> TextColumn:
    """Whole numbers (n,) as a column of decimal texts.

    Many numbers of a small range are looked up in a table of texts.
    """
    whole = np.asarray(values)
    if whole.dtype.kind not in "iu":
        raise TypeError("a column of texts is made of whole numbers")
    if whole.size == 0:
        return np.zeros(0, dtype="V1")
    low, high = int(whole.min()), int(whole.max())
    if high - low < whole.size // 2:
        return _spell(np.arange(low, high + 1, dtype=np.int64))[whole.astype(np.int64) - low]
    return _spell(whole.astype(np.int64))


def _spell(whole: NDArray[np.int64]) -> TextColumn:
    """Decimal texts, digit by digit for all rows at once, right-aligned."""
    rest = np.abs(whole)
    digits = len(str(int(rest.max())))
    out = np.zeros((whole.size, digits + 1), dtype=np.uint8)
    lead = np.full(whole.size, digits)
    for place in range(digits, 0, -1):
        above = rest // 10
        shown = (rest > 0) | (place == digits)
        out[:, place] = np.where(shown, 48 + (rest - 10 * above), 0)
        lead[shown] = place
        rest = above
    negative = whole < 0
    out[negative, lead[negative] - 1] = ord("-")
    if not negative.any():
        out = np.ascontiguousarray(out[:, 1:])
    return out.view(f"V{out.shape[1]}").reshape(whole.size)


def lookup(texts: list[bytes], index: NDArray[Any]) -> TextColumn:
    """A column that takes its texts from a short list."""
    width = max(1, max(len(text) for text in texts))
    table = np.frombuffer(b"".join(text.ljust(width, b"\0") for text in texts), dtype=f"V{width}")
    column: TextColumn = table[index]
    return column


def rows(*columns: bytes | TextColumn) -> bytes:
    """Columns set side by side and rows one after the other; a bytes column repeats in every row.

    >>> rows(integers(np.array([1, -20])), b" ", integers(np.array([0, 7])), b"\\n")
    b'1 0\\n-20 7\\n'
    """
    size = next(len(column) for column in columns if not isinstance(column, bytes))
    widths = [len(column) if isinstance(column, bytes) else column.dtype.itemsize for column in columns]
    names = [f"c{k}" for k in range(len(columns))]
    table = np.zeros(size, dtype=[(name, f"V{width}") for name, width in zip(names, widths, strict=True)])
    for name, column in zip(names, columns, strict=True):
        table[name] = np.void(column) if isinstance(column, bytes) else column
    return table.tobytes().translate(None, b"\0")
