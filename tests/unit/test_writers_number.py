"""invariant: numbers as text read back as the same numbers, in plain digits."""

from __future__ import annotations

import locale
import math
import re

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from patterngen.writers._number import integers, lookup, number, numbers, rows


@given(st.floats(min_value=-1e9, max_value=1e9))
def test_reads_back_to_twelve_digits_without_an_exponent(value: float) -> None:
    text = number(value)
    assert re.fullmatch(r"-?\d+(\.\d*[1-9])?", text)
    assert math.isclose(float(text), value, rel_tol=1e-11, abs_tol=0.0)


@pytest.mark.parametrize("value", [0.0, -0.0, 1e-320 * 0])
def test_zero_has_no_sign(value: float) -> None:
    assert number(value) == "0"


@pytest.mark.parametrize("value", [math.nan, math.inf, -math.inf])
def test_refuses_what_is_not_finite(value: float) -> None:
    with pytest.raises(ValueError, match="finite"):
        number(value)


def test_no_locale_gets_in() -> None:
    before = locale.setlocale(locale.LC_NUMERIC)
    try:
        for name in ("de_DE.UTF-8", "fr_FR.UTF-8", "C"):
            try:
                locale.setlocale(locale.LC_NUMERIC, name)
            except locale.Error:
                continue
            assert numbers(0.5, 1234567.25) == "0.5 1234567.25"
    finally:
        locale.setlocale(locale.LC_NUMERIC, before)


@given(st.lists(st.integers(min_value=-(2**40), max_value=2**40), min_size=1, max_size=40))
def test_whole_numbers_as_a_column(values: list[int]) -> None:
    assert rows(integers(np.array(values)), b" ").decode().split() == [str(value) for value in values]


def test_many_small_numbers_come_from_a_table() -> None:
    values = np.random.default_rng(1).integers(-9, 12, 5000)
    assert rows(b"<", integers(values), b">") == "".join(f"<{value}>" for value in values).encode()


def test_columns_side_by_side() -> None:
    text = rows(lookup([b"a", b"bcd", b""], np.array([1, 0, 2])), b":", integers(np.array([0, -5, 70])), b"\n")
    assert text == b"bcd:0\na:-5\n:70\n"


def test_empty_column() -> None:
    assert rows(integers(np.zeros(0, dtype=int)), b" ") == b""


def test_fractions_are_no_column() -> None:
    with pytest.raises(TypeError):
        integers(np.array([0.5]))
