"""invariant: which colour an overprint takes; expected products are worked out one combination at a time."""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest

from patterngen.colour.cielab import lab_to_xyz
from patterngen.colour.inks import InkStack
from patterngen.model.job import Ink, Overprint

PAPER = (95.0, 0.0, -2.0)
CREAM, SLATE, RUST, VEIL = (
    Ink("Cream", (88.0, 2.0, 22.0)),
    Ink("Slate", (38.0, -4.0, -16.0)),
    Ink("Rust", (47.0, 45.0, 40.0)),
    Ink("Veil", (91.0, 0.0, 3.0), opaque=True),
)


def stack(*inks: Ink, overprints: tuple[Overprint, ...] = ()) -> InkStack:
    return InkStack(PAPER, inks, overprints)


def multiplied(*inks: Ink) -> np.ndarray:
    paper = lab_to_xyz(PAPER)
    out = paper.copy()
    for ink in inks:
        out = out * lab_to_xyz(ink.lab) / paper
    return out


def test_unmeasured_overprints_multiply_relative_to_the_paper() -> None:
    """second way: every one of the eight combinations multiplied by hand."""
    inks = (CREAM, SLATE, RUST)
    found = stack(*inks).primaries([ink.name for ink in inks])
    assert found.shape == (2, 2, 2, 3)
    for bits in product((0, 1), repeat=3):
        printed = [ink for ink, bit in zip(inks, bits, strict=True) if bit]
        np.testing.assert_allclose(found[bits], multiplied(*printed), rtol=1e-13)


def test_solids_and_paper_are_what_was_given() -> None:
    found = stack(CREAM, SLATE).primaries(["Slate", "Cream"])
    np.testing.assert_allclose(found[0, 0], lab_to_xyz(PAPER), rtol=1e-13)
    np.testing.assert_allclose(found[1, 0], lab_to_xyz(SLATE.lab), rtol=1e-13)
    np.testing.assert_allclose(found[0, 1], lab_to_xyz(CREAM.lab), rtol=1e-13)


def test_a_measured_overprint_is_used_for_exactly_its_inks() -> None:
    measured = (30.0, 12.0, 5.0)
    found = stack(
        CREAM, SLATE, RUST, overprints=(Overprint(frozenset({"Rust", "Slate"}), measured),)
    ).primaries(["Cream", "Slate", "Rust"])
    np.testing.assert_allclose(found[0, 1, 1], lab_to_xyz(measured), rtol=1e-13)
    np.testing.assert_allclose(found[1, 1, 1], multiplied(CREAM, SLATE, RUST), rtol=1e-13)


def test_inks_that_never_meet_still_have_a_colour() -> None:
    """The beats need a number for every combination, even where its share is nought."""
    found = stack(SLATE, RUST, overprints=(Overprint(frozenset({"Rust", "Slate"}), never=True),))
    np.testing.assert_allclose(found.primaries(["Slate", "Rust"])[1, 1], multiplied(SLATE, RUST), rtol=1e-13)


@pytest.mark.parametrize(
    "order", [("Slate", "Veil", "Rust"), ("Rust", "Slate", "Veil"), ("Veil", "Rust", "Slate")]
)
def test_an_opaque_ink_hides_what_lies_under_it_whatever_the_order_of_screens(order: tuple[str, ...]) -> None:
    found = stack(SLATE, VEIL, RUST).primaries(order)

    def colour(*names: str) -> np.ndarray:
        return found[tuple(int(name in names) for name in order)]

    np.testing.assert_allclose(colour("Slate", "Veil"), lab_to_xyz(VEIL.lab), rtol=1e-13)
    np.testing.assert_allclose(colour("Veil", "Rust"), multiplied(VEIL, RUST), rtol=1e-13)
    np.testing.assert_allclose(colour("Slate", "Veil", "Rust"), multiplied(VEIL, RUST), rtol=1e-13)


def test_what_an_opaque_ink_hides_does_not_undo_a_measurement() -> None:
    measured, stained = (44.0, 40.0, 33.0), (80.0, 0.0, 0.0)
    overprints = (
        Overprint(frozenset({"Veil", "Rust"}), measured),
        Overprint(frozenset({"Slate", "Veil"}), stained),
    )
    found = stack(SLATE, VEIL, RUST, overprints=overprints).primaries(["Slate", "Veil", "Rust"])
    np.testing.assert_allclose(found[0, 1, 1], lab_to_xyz(measured), rtol=1e-13)
    np.testing.assert_allclose(found[1, 1, 1], lab_to_xyz(measured), rtol=1e-13)
    np.testing.assert_allclose(found[1, 1, 0], lab_to_xyz(stained), rtol=1e-13)


def test_two_screens_of_one_ink_print_it_once() -> None:
    found = stack(SLATE, RUST).primaries(["Slate", "Rust", "Slate"])
    np.testing.assert_array_equal(found[1, 0, 1], found[1, 0, 0])
    np.testing.assert_array_equal(found[0, 0, 1], found[1, 0, 0])
    np.testing.assert_array_equal(found[0, 1, 1], found[1, 1, 0])


def test_no_screens_leave_the_paper() -> None:
    np.testing.assert_allclose(stack(SLATE).primaries([]), lab_to_xyz(PAPER), rtol=1e-13)


def test_an_unknown_ink_is_loud() -> None:
    with pytest.raises(KeyError, match="Ochre"):
        stack(SLATE).primaries(["Ochre"])


def test_no_component_is_negative() -> None:
    """A very yellow deep colour has Z below 0 in CIELAB; the root of Yule and Nielsen would not exist."""
    assert lab_to_xyz((16.0, 0.0, 60.0))[2] < 0
    found = stack(Ink("Umber", (16.0, 0.0, 60.0)), RUST).primaries(["Umber", "Rust"])
    assert np.all(found >= 0)


def test_luminance_is_relative_to_the_paper() -> None:
    """second way: ((L + 16) / 116) cubed, by hand."""
    found = stack(SLATE, Ink("Bare", PAPER)).luminance()
    assert found["Bare"] == pytest.approx(1.0, abs=1e-14)
    assert found["Slate"] == pytest.approx((54 / 111) ** 3, rel=1e-12)


def test_sixteen_screens() -> None:
    """second way: the last of 65536 combinations is the product of all sixteen solids."""
    inks = tuple(Ink(f"Ink {i}", (30.0 + 4 * i, i, -i)) for i in range(16))
    found = stack(*inks).primaries([ink.name for ink in inks])
    np.testing.assert_allclose(found[(1,) * 16], multiplied(*inks), rtol=1e-12)


def test_display_colours_are_by_ink() -> None:
    found = stack(SLATE, RUST).rgb()
    assert list(found) == ["Slate", "Rust"]
    assert all(len(code) == 7 and int(code[1:], 16) >= 0 for code in found.values())
