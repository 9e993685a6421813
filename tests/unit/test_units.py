"""Quantities as text."""

from __future__ import annotations

import pytest

from patterngen.units import (
    ANGLE,
    LENGTH,
    RESOLUTION,
    RULING,
    SHARE,
    Quantity,
    QuantityError,
    parse,
    plain,
    spell,
)


@pytest.mark.parametrize(
    ("text", "quantity", "inner"),
    [
        ("150 lpi", RULING, 150 / 25.4),
        ("60 /cm", RULING, 6.0),
        ("60 / cm", RULING, 6.0),
        ("9/mm", RULING, 9.0),
        ("2540 dpi", RESOLUTION, 100.0),
        ("40 um", LENGTH, 0.04),
        ("40 \u00b5m", LENGTH, 0.04),
        ("1 in", LENGTH, 25.4),
        ("72 pt", LENGTH, 25.4),
        ("-15 deg", ANGLE, -15.0),
        ("1e1 deg", ANGLE, 10.0),
        (".5 %", SHARE, 0.005),
        ("100 ppm", SHARE, 1e-4),
        ("5 MM", LENGTH, 5.0),
    ],
)
def test_known_units(text: str, quantity: Quantity, inner: float) -> None:
    """published: the inch is 25.4 mm exactly (international yard and pound agreement, 1959)."""
    # one rounding of the factor and one of the product
    assert parse(text, quantity) == pytest.approx(inner, rel=4e-16)


def test_minus_zero_is_zero() -> None:
    """invariant: no minus zero comes in, as it would go out again as "-0"."""
    assert str(parse("-0.0 deg", ANGLE)) == "0.0"


@pytest.mark.parametrize(
    ("value", "quantity", "nearest"),
    [
        ("45", ANGLE, '"45 deg"'),
        (45, ANGLE, '"45 deg"'),
        (0.5, SHARE, '"50 %"'),
        ("0.5", SHARE, '"50 %"'),
        (40, SHARE, '"40 %"'),
        ("0,5 mm", LENGTH, '"0.5 mm"'),
        ("1.000,5 mm", LENGTH, ""),
        ("\u221215 deg", ANGLE, '"-15 deg"'),
        ("\uff11\uff15 deg", ANGLE, '"15 deg"'),
        ("\u0661\u0665 deg", ANGLE, '"15 deg"'),
        ("15\u00b0", ANGLE, '"15 deg"'),
        ("15 degrees", ANGLE, '"15 deg"'),
        ("60 lines/cm", RULING, '"60 /cm"'),
        ("2400 ppi", RESOLUTION, '"2400 dpi"'),
        ("150 lip", RULING, '"150 lpi"'),
    ],
)
def test_what_was_meant(value: object, quantity: Quantity, nearest: str) -> None:
    """invariant: a refusal shows the spelling that is wanted, and that spelling is legal."""
    with pytest.raises(QuantityError) as caught:
        parse(value, quantity)
    if nearest:
        assert caught.value.nearest == nearest
        parse(nearest.strip('"'), quantity)
    assert caught.value.allowed


@pytest.mark.parametrize(
    "value",
    [
        *(True, None, [], {}, float("nan"), "", "mm", "nan mm", "inf mm", "1e999 mm", "1e308 mm"),
        *("1e-320 mm", "1e-999 mm", "1_0 mm", "0x10 mm", "5 mm mm", "5 kg", "5 mm\n", "5\0mm"),
        *("--5 mm", "5..0 mm", "1" * 200 + " mm"),
    ],
)
def test_refused(value: object) -> None:
    """invariant: nothing but a finite everyday number with one known unit is a quantity."""
    with pytest.raises(QuantityError):
        parse(value, LENGTH)


def test_two_units_at_once() -> None:
    """invariant: two units in one value are told as such."""
    with pytest.raises(QuantityError, match="two units"):
        parse("150 lpi (60 /cm)", RULING)


@pytest.mark.parametrize("number", [1 / 3, 5.905511811023622, 0.1 + 0.2, 1e-7, 12.5])
def test_spelt_and_read_again(number: float) -> None:
    """invariant: what is written reads back to the last digit but one."""
    for quantity in (LENGTH, RULING, SHARE):
        for unit in quantity.units:
            assert parse(spell(number, quantity, unit), quantity) == pytest.approx(number, rel=1e-15)


def test_plain() -> None:
    """invariant: everyday numbers are written without exponent and without minus zero."""
    assert [plain(v) for v in (150.0, 0.02, -0.0, 1e-12, 12345678.0)] == [
        "150",
        "0.02",
        "0",
        "1e-12",
        "12345678",
    ]
