"""second way: CIELAB, CIEDE2000 and sRGB against colour-science, an independent implementation."""

from __future__ import annotations

import warnings

import numpy as np
import pytest

from patterngen.colour import cielab

with warnings.catch_warnings():
    warnings.simplefilter("ignore")  # it warns of optional libraries that it does not find
    import colour

PRINT_WHITE = colour.CCS_ILLUMINANTS["CIE 1931 2 Degree Standard Observer"]["D50"]
EXACT = 1e-9
"""Both compute the same formula in double precision; what differs is the order of rounding."""


def many_colours(seed: int, count: int = 4000) -> np.ndarray:
    """CIELAB colours of every lightness and hue, with greys and deep blacks among them."""
    random = np.random.default_rng(seed)
    lab = random.uniform([0, -110, -110], [100, 110, 110], (count, 3))
    lab[:200, 1:] = 0.0
    lab[200:400, 0] *= 0.08
    return lab


def test_lab_to_xyz_equals_colour_science() -> None:
    lab = many_colours(1)
    expected = colour.Lab_to_XYZ(lab, PRINT_WHITE)
    np.testing.assert_allclose(cielab.lab_to_xyz(lab), expected, rtol=0, atol=EXACT)


def test_xyz_to_lab_equals_colour_science() -> None:
    # the cube brings many colours into the dark, straight part
    xyz = np.random.default_rng(2).uniform(0, 1.1, (4000, 3)) ** 3
    expected = colour.XYZ_to_Lab(xyz, PRINT_WHITE)
    np.testing.assert_allclose(cielab.xyz_to_lab(xyz), expected, rtol=0, atol=EXACT)


@pytest.mark.parametrize("scale", [1.0, 0.01], ids=["far", "near"])
def test_ciede2000_equals_colour_science(scale: float) -> None:
    a = many_colours(3)
    b = a + scale * (many_colours(4) - a)
    expected = colour.delta_E(a, b, method="CIE 2000")
    np.testing.assert_allclose(cielab.ciede2000(a, b), expected, rtol=0, atol=EXACT)


def test_screen_colours_equal_colour_science() -> None:
    lab = many_colours(5)
    expected = colour.XYZ_to_sRGB(
        colour.Lab_to_XYZ(lab, PRINT_WHITE),
        illuminant=PRINT_WHITE,
        chromatic_adaptation_transform="Bradford",
        apply_cctf_encoding=False,
    )
    expected = colour.cctf_encoding(np.clip(expected, 0, 1), function="sRGB")
    np.testing.assert_allclose(cielab.lab_to_srgb(lab), expected, rtol=0, atol=EXACT)


def test_white_and_black_are_white_and_black_on_a_screen() -> None:
    """invariant: the adaptation takes white to white."""
    assert cielab.lab_to_hex([100, 0, 0]) == "#ffffff"
    assert cielab.lab_to_hex([0, 0, 0]) == "#000000"


def test_colours_that_no_screen_shows_are_clipped() -> None:
    """invariant: process cyan lies outside sRGB in red, and stays a cyan."""
    red, green, blue = cielab.lab_to_srgb([55, -37, -50])
    assert red == 0.0
    assert 0.4 < green < blue < 1.0


def test_lab_and_back() -> None:
    """invariant: the two directions undo each other, 1e-10 for the rounding of a cube."""
    lab = many_colours(6)
    np.testing.assert_allclose(cielab.xyz_to_lab(cielab.lab_to_xyz(lab)), lab, rtol=0, atol=1e-10)


def test_a_difference_is_the_same_both_ways_and_none_to_itself() -> None:
    """invariant: CIEDE2000 is symmetric; hues exactly opposite are the one place where rounding decides."""
    a, b = many_colours(7), many_colours(8)
    np.testing.assert_allclose(cielab.ciede2000(a, b), cielab.ciede2000(b, a), rtol=1e-12)
    assert np.all(cielab.ciede2000(a, a) == 0.0)


def test_shapes_are_kept() -> None:
    """invariant: leading axes pass through, and one colour against many broadcasts."""
    lab = many_colours(9, 600).reshape(2, 3, 100, 3)
    assert cielab.lab_to_xyz(lab).shape == lab.shape
    assert cielab.ciede2000(lab, lab[0, 0, 0]).shape == (2, 3, 100)
