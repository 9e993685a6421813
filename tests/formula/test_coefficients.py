"""Fourier coefficients, gain and tints against closed formulas worked out outside the program."""

from __future__ import annotations

import numpy as np
import pytest

from patterngen.model.area import Area, ToneField
from patterngen.model.gain import EdgeGrowth, tone_value_increase
from patterngen.model.job import Gain, ScreenRequest
from patterngen.model.screen import Screen
from patterngen.screens import dots, lines


def screen(kind: str, shape: str | None = None, *, ruling_per_mm: float = 1.0, **more: object) -> Screen:
    fields: dict[str, object] = {
        "name": "a", "ink": "Slate", "kind": kind, "shape": shape, "ruling_per_mm": ruling_per_mm, "angle_deg": 0.0,
        "tone": ToneField(constant=0.5), "area": Area((0.0, 0.0, 10.0, 10.0)), "origin_mm": (0.0, 0.0), "gain": Gain(),
    }  # fmt: skip
    module = {"dots": dots, "lines": lines}[kind]
    return module.make(ScreenRequest(**{**fields, **more}))  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("tone", "orders"),
    [
        (0.5, (0.3183099, 0.0, -0.1061033)),
        (0.2, (0.1870979, 0.1513653, 0.1009102)),
        (0.1, (0.09836316, 0.09354893, 0.08583937)),
    ],
)
def test_lines(tone: float, orders: tuple[float, ...]) -> None:
    """second way: sin(pi n t) / (pi n) to seven digits, worked out with mpmath."""
    c = screen("lines").coefficients(tone, reach=3)
    assert np.abs(c[4:] - orders).max() < 6e-8  # half of the last digit given


DISCS = {
    0.10: {(1, 0): 0.0850933, (1, 1): 0.0717070, (2, 0): 0.0490326, (2, 1): 0.0395311},
    0.25: {(1, 0): 0.1638674, (1, 1): 0.0988277, (2, 0): 0.0167202, (2, 1): -0.0065578},
    0.50: {(1, 0): 0.1976553, (1, 1): 0.0334404, (2, 0): -0.0656331, (2, 1): -0.0595713},
}
SQUARES = {
    0.10: {(1, 0): 0.0843436, (1, 1): 0.0711384, (2, 0): 0.0460343},
    0.25: {(1, 0): 0.1591549, (1, 1): 0.1013212, (2, 0): 0.0},
    0.50: {(1, 0): 0.1790939, (1, 1): 0.0641492, (2, 0): -0.1084772},
}


@pytest.mark.parametrize(("shape", "table"), [("simpledot", DISCS), ("square", SQUARES)])
def test_dots(shape: str, table: dict[float, dict[tuple[int, int], float]]) -> None:
    """second way: r J1(2 pi r k) / k and sinc sinc to seven digits, worked out with mpmath."""
    made = screen("dots", shape)
    for tone, orders in table.items():
        c = made.coefficients(tone, reach=2)
        for (m, n), expected in orders.items():
            assert abs(c[2 + m, 2 + n] - expected) < 6e-8  # half of the last digit given


def test_discs_to_high_orders() -> None:
    """second way: r J1(2 pi r k) / k by scipy; 1e-11 is thirty times the error seen."""
    from scipy.special import j1

    k = np.arange(-64, 65)
    rho = np.hypot(k[:, None], k)
    for tone in (0.03, 0.4, 0.78):
        r = np.sqrt(tone / np.pi)
        with np.errstate(divide="ignore", invalid="ignore"):
            expected = np.where(rho > 0, r * j1(2 * np.pi * r * rho) / rho, tone)
        assert np.abs(screen("dots", "simpledot").coefficients(tone, reach=64) - expected).max() < 1e-11


def test_diamond_of_cosines() -> None:
    """second way: at half tone the cosine dot is the square on its corner, whose transform is sinc sinc / 2."""
    k = np.arange(-12, 13)
    m, n = np.meshgrid(k, k, indexing="ij")
    expected = 0.5 * np.sinc((m + n) / 2) * np.sinc((m - n) / 2)
    assert np.abs(screen("dots", "cosinedot").coefficients(0.5, reach=12) - expected).max() < 1e-11


def test_crosses_are_the_complement_of_shifted_squares() -> None:
    """second way: what a cross leaves clear is a square about the cell's corner; (-1)^(m + n) turns it there."""
    k = np.arange(-9, 10)
    sign = (-1.0) ** (k[:, None] + k)
    square = screen("dots", "square").coefficients(0.36, reach=9)
    expected = -sign * square
    expected[9, 9] = 0.64
    assert np.abs(screen("dots", "cross").coefficients(0.64, reach=9) - expected).max() < 1e-11


@pytest.mark.parametrize(
    ("shape", "inverted"),
    [
        ("simpledot", "invertedsimpledot"),
        ("ellipsea", "invertedellipsea"),
        ("ellipsec", "invertedellipsec"),
        ("doubledot", "inverteddoubledot"),
        ("double", "inverteddouble"),
    ],
)
@pytest.mark.parametrize("tone", [0.12, 0.5, 0.9])
def test_inverted_shapes_are_complements(shape: str, inverted: str, tone: float) -> None:
    """invariant: an inverted shape inks what its sister at the remaining tone leaves clear."""
    a, b = screen("dots", shape), screen("dots", inverted)
    total = a.coefficients(tone, reach=8) + b.coefficients(1 - tone, reach=8)
    total[8, 8] -= 1.0
    assert np.abs(total).max() < 1e-11


@pytest.mark.parametrize("shape", ["ellipsea", "ellipseb", "ellipsec"])
def test_ellipses(shape: str) -> None:
    """second way: an ellipse's transform is the disc's, squeezed: area 2 J1(q) / q, q = 2 pi |(alpha m, beta n)|."""
    from scipy.special import j1

    weights = {"ellipsea": (1.0, 0.9), "ellipseb": (1.0, 0.625), "ellipsec": (0.9, 1.0)}[shape]
    tone = 0.55
    alpha, beta = np.sqrt(tone / np.pi * np.sqrt(weights[0] * weights[1]) / np.array(weights))
    assert max(alpha, beta) < 0.5
    k = np.arange(-20, 21)
    q = 2 * np.pi * np.hypot(alpha * k[:, None], beta * k)
    q[20, 20] = 1.0
    expected = tone * 2 * j1(q) / q
    expected[20, 20] = tone
    assert np.abs(screen("dots", shape).coefficients(tone, reach=20) - expected).max() < 1e-11


def test_origin_and_angle_turn_the_phase() -> None:
    """second way: moving a pattern by d multiplies order k by exp(-2 pi i k.f.d)."""
    still = screen("dots", "ellipse", angle_deg=0.0).coefficients(0.3, reach=3)
    moved = screen("dots", "ellipse", ruling_per_mm=3.0, angle_deg=30.0, origin_mm=(0.2, -0.7))
    k = np.arange(-3, 4)
    turn = moved.frequencies_per_mm @ np.array([0.2, -0.7])
    assert moved.frequencies_per_mm == pytest.approx(
        3.0 * np.array([[np.sqrt(0.75), 0.5], [-0.5, np.sqrt(0.75)]]), abs=1e-12
    )
    phase = np.exp(-2j * np.pi * (k[:, None] * turn[0] + k[None, :] * turn[1]))
    assert np.abs(moved.coefficients(0.3, reach=3) - still * phase).max() < 1e-12


@pytest.mark.parametrize(("lpi", "printed"), [(65, 0.1149), (133, 0.1315)])
def test_tints_after_five_micrometres(lpi: int, printed: float) -> None:
    """second way: 10 % of discs whose edges grew by 5 um, pi (r + 0.005)^2 / pitch^2, to four digits."""
    made = screen("dots", "simpledot", ruling_per_mm=lpi / 25.4, gain=Gain(edge_mm=0.005))
    assert float(made.printed_tone(0.1)) == pytest.approx(printed, abs=6e-5)
    pitch = 25.4 / lpi
    exact = np.pi * (np.sqrt(0.1 / np.pi) + 0.005 / pitch) ** 2
    assert float(made.printed_tone(0.1)) == pytest.approx(exact, abs=1e-8)


@pytest.mark.parametrize(
    ("lpi", "tone", "pitch_um", "disc_um", "line_um"),
    [
        (65, 0.10, 390.769, 139.436, 39.0769),
        (133, 0.10, 190.977, 68.1455, 19.0977),
        (175, 0.20, 145.143, 73.2429, 29.0286),
        (200, 0.10, 127.000, 45.3168, 12.7000),
    ],
)
def test_widths_of_tints(lpi: int, tone: float, pitch_um: float, disc_um: float, line_um: float) -> None:
    """second way: 2 sqrt(t / pi) and t times the pitch, to six digits."""
    discs = screen("dots", "simpledot", ruling_per_mm=lpi / 25.4).smallest_mm(tone)
    strokes = screen("lines", ruling_per_mm=lpi / 25.4).smallest_mm(tone)
    assert 1000 * discs[0] == pytest.approx(disc_um, abs=1e-3)
    assert 1000 * discs[1] == pytest.approx(pitch_um - disc_um, abs=2e-3)
    assert 1000 * strokes[0] == pytest.approx(line_um, abs=1e-3)
    assert 1000 * strokes[1] == pytest.approx(pitch_um - line_um, abs=2e-3)


def test_tone_value_increase() -> None:
    """second way: 4 g t (1 - t) at g = 16 %; half tone prints at 66 %, a quarter at 37 %."""
    assert tone_value_increase(np.array([0.0, 0.25, 0.5, 1.0]), half_tone=0.16) == pytest.approx([0, 0.37, 0.66, 1])


def test_edge_growth_of_square_holes() -> None:
    """second way: clear squares of side s shrink by twice the growth; 1e-6 is the stated error."""

    def edges(tone: np.ndarray) -> np.ndarray:
        return 4 * np.sqrt(1 - tone) / 0.2

    grow = EdgeGrowth(edge_mm=0.01, edge_per_mm=edges)
    tone = np.array([0.3, 0.8, 0.95, 0.995])
    side = np.maximum(0.2 * np.sqrt(1 - tone) - 0.02, 0)
    assert grow(tone) == pytest.approx(1 - (side / 0.2) ** 2, abs=1e-6)


def test_edge_growth_undone() -> None:
    """invariant: growing and then shrinking by the same gives the tone back (stated error 1e-6, twice)."""
    made = screen("dots", "round", ruling_per_mm=5.0)
    edges = made.edges_per_mm  # type: ignore[attr-defined]
    tone = np.linspace(0.05, 0.9, 18)
    grown = EdgeGrowth(edge_mm=0.004, edge_per_mm=edges)(tone)
    assert np.all(grown > tone)
    assert EdgeGrowth(edge_mm=-0.004, edge_per_mm=edges)(grown) == pytest.approx(tone, abs=3e-6)
