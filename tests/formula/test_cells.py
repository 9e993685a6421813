"""second way: rational tangents, supercells and bricks worked out apart from the program with mpmath.

The construction is Holladay 1980, "An optimum algorithm for halftone generation for displays
and hard copies" (as cited and described in US 2004/0239962); the values are computed, not printed there.
"""

from __future__ import annotations

from fractions import Fraction
from math import radians, tan

import pytest

from patterngen.model.cells import PixelCell, guaranteeing_multiple, nearest_cell, smallest_supercell

CELLS = 2400 / 150


@pytest.mark.parametrize(
    ("multiple", "vector", "angle", "lpi"),
    [
        (1, (15, 4), "14.93142", "154.5976"),
        (2, (31, 8), "14.47029", "149.9268"),
        (4, (62, 17), "15.33328", "149.3271"),
        (9, (139, 37), "14.90576", "150.1667"),
        (15, (232, 62), "14.96216", "149.9115"),
        (22, (340, 91), "14.98385", "150.0139"),
    ],
)
def test_supercells_at_15_degrees(multiple: int, vector: tuple[int, int], angle: str, lpi: str) -> None:
    cell = nearest_cell(cells=CELLS, angle_deg=15.0, multiple=multiple)
    assert (cell.a, cell.b) == vector
    assert f"{cell.angle_deg:.5f}" == angle
    assert f"{cell.ruling(2400):.4f}" == lpi


def test_bigger_supercells_are_not_always_better() -> None:
    def miss(multiple: int) -> float:
        return abs(nearest_cell(cells=CELLS, angle_deg=15.0, multiple=multiple).angle_deg - 15.0)

    assert all(miss(1) < miss(m) for m in (2, 3, 4, 5, 8, 9))


def test_first_supercell_within_tolerance_and_the_one_that_always_is() -> None:
    found = smallest_supercell(cells=CELLS, angle_deg=15.0, angle_error_deg=0.02, ruling_error=0.001)
    assert found is not None
    assert (found.multiple, found.a, found.b) == (22, 340, 91)
    assert guaranteeing_multiple(cells=CELLS, angle_error_deg=0.02) == 127


@pytest.mark.parametrize(
    ("b", "a", "angle"),
    [
        (3, 11, "15.25512"),
        (4, 15, "14.93142"),
        (11, 41, "15.01836"),
        (15, 56, "14.99508"),
        (41, 153, "15.00132"),
        (56, 209, "14.99965"),
    ],
)
def test_convergents_of_the_tangent_of_15_degrees(b: int, a: int, angle: str) -> None:
    assert f"{PixelCell(a, b).angle_deg:.5f}" == angle
    # nearer to tan 15 than any other fraction of a smaller denominator
    wanted = Fraction(tan(radians(15)))
    best = min(
        (Fraction(p, q) for q in range(1, a) for p in (q * b // a, q * b // a + 1)), key=lambda f: abs(f - wanted)
    )
    assert abs(Fraction(b, a) - wanted) < abs(best - wanted)


@pytest.mark.parametrize(
    ("vector", "area", "brick"),
    [((3, 1), 10, (10, 1, 3)), ((4, 1), 17, (17, 1, 4)), ((15, 4), 241, (241, 1, 64)), ((6, 2), 40, (20, 2, 6))],
)
def test_bricks(vector: tuple[int, int], area: int, brick: tuple[int, int, int]) -> None:
    found = PixelCell(*vector).brick
    assert found == brick
    assert found[0] * found[1] == area


@pytest.mark.parametrize("vector", [(15, 4), (7, 3), (6, 2), (9, 6), (41, 11)])
def test_a_brick_repeats_the_cell(vector: tuple[int, int]) -> None:
    """second way: every lattice point of the cell lies on the brick's lattice, counted out."""
    a, b = vector
    width, height, shift = PixelCell(a, b).brick
    for p in range(-6, 7):
        for q in range(-6, 7):
            x, y = p * a - q * b, p * b + q * a
            assert y % height == 0
            assert (x - y // height * shift) % width == 0
