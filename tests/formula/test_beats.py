"""second way: beats of two and more gratings, computed apart from the program, to the digits shown."""

from __future__ import annotations

import math

import numpy as np
import pytest

from patterngen.beats._balance import fastest_drift_per_mm
from patterngen.beats._swing import PhaseMean
from patterngen.model.job import SheetSize
from tests.orders import combinations_by_order
from tests.superpositions import GreyInks, PerfectInks, beats_of, row_of, screen, sharp_eye

SHEET = SheetSize(300.0, 200.0)
PERIOD_150 = 25.4 / 150


def half_unit(written: str) -> float:
    """Half a unit of the last digit of a number as it was written down."""
    return 0.5 * 10.0 ** -len(written.partition(".")[2]) * (1 + 1e-6)


TWO_GRATINGS = [
    ("0.2", "0.2", 5, "2.292559", "92.5"),
    ("0.2", "0.2", 1, "11.45930", "90.5"),
    ("0.2", "0.21", 0, "4.200000", "0"),
    ("0.2", "0.21", 3, "2.863583", "134.4666"),
    ("0.2", "0.21", -3, "2.863583", "45.5334"),
    ("0.25", "0.20", 10, "0.7886764", "43.21682"),
    ("25.4/150", "25.4/150", 30, "0.3271269", "105.0"),
    ("25.4/150", "25.4/150", 15, "0.6486565", "97.5"),
    ("25.4/150", "25.4/133", 0, "1.494118", "0"),
]


def number(text: str) -> float:
    top, _, below = text.partition("/")
    return float(top) / float(below or 1)


@pytest.mark.parametrize(("first", "second", "turn", "period", "bands"), TWO_GRATINGS)
def test_two_gratings_beat(first: str, second: str, turn: float, period: str, bands: str) -> None:
    """second way: T1 T2 / sqrt(T1^2 + T2^2 - 2 T1 T2 cos a); lines of the first grating at 0 degrees."""
    screens = [
        screen("a", kind="lines", ruling_per_mm=1 / number(first), angle_deg=0.0, tone=0.5, sheet=SHEET),
        screen("b", kind="lines", ruling_per_mm=1 / number(second), angle_deg=turn, tone=0.5, sheet=SHEET),
    ]
    table, _ = beats_of(screens, colours=PerfectInks(), viewer=sharp_eye(100.0), sheet=SHEET)
    row = row_of(table, {"a": [1], "b": [-1]})
    assert row is not None
    assert table.period_mm[row] == pytest.approx(float(period), abs=half_unit(period))
    fx, fy = table.frequency_per_mm[row]
    direction = (math.degrees(math.atan2(fy, fx)) + 90.0) % 180.0
    # an angle of 180 is one of 0
    assert abs((direction - float(bands) + 90.0) % 180.0 - 90.0) <= half_unit(bands)


def test_two_half_gratings_contrast() -> None:
    """second way: c = 1/pi^2, mean 1/4, so the contrast is 8/pi^2 = 0.8105695."""
    screens = [
        screen("a", kind="lines", ruling_per_mm=4.0, angle_deg=0.0, tone=0.5, sheet=SHEET),
        screen("b", kind="lines", ruling_per_mm=4.0, angle_deg=5.0, tone=0.5, sheet=SHEET),
    ]
    table, _ = beats_of(screens, colours=PerfectInks(), viewer=sharp_eye(100.0), sheet=SHEET)
    row = row_of(table, {"a": [1], "b": [-1]})
    assert row is not None
    assert table.contrast[row] == pytest.approx(0.8105695, abs=5e-8)
    assert 2 * abs(table.amplitude[row, 1]) == pytest.approx(0.2026424, abs=5e-8)
    assert table.mean[row, 1] == pytest.approx(0.25, abs=1e-12)


@pytest.mark.parametrize(
    ("tone", "colours", "contrast"),
    [
        (0.1, PerfectInks(), "0.01787869"),
        (0.5, PerfectInks(), "0.3125411"),
        (0.1, GreyInks(paper=0.85, ink=0.05), "0.01563217"),
        (0.5, GreyInks(paper=0.85, ink=0.05), "0.2469460"),
    ],
)
def test_two_disc_screens_contrast(tone: float, colours: PerfectInks, contrast: str) -> None:
    """second way: 2 (r J1(2 pi r))^2 over the mean, for opaque discs and for ink .05 on paper .85."""
    screens = [
        screen("a", ruling_per_mm=150 / 25.4, angle_deg=0.0, tone=tone),
        screen("b", ruling_per_mm=150 / 25.4, angle_deg=15.0, tone=tone),
    ]
    table, _ = beats_of(screens, colours=colours, viewer=sharp_eye(100.0))
    row = row_of(table, {"a": [1, 0], "b": [-1, 0]})
    assert row is not None
    assert table.contrast_max[row] >= table.contrast[row] >= table.contrast_min[row]
    own = 2 * abs(table.amplitude[row, 1]) / table.mean[row, 1]
    assert own == pytest.approx(float(contrast), abs=half_unit(contrast))
    assert table.period_mm[row] == pytest.approx(0.648657, abs=5e-7)


# --- three colours: the singular state and what disturbs it ---------------------------------


def corners(turns_deg: tuple[float, float, float], sizes: tuple[float, float, float] = (0, 0, 0)) -> complex:
    """e^i15 + e^i135 + e^i255 at 150 lpi, each turned and made finer by so much: the order-3 beat of three inks."""
    at = np.deg2rad(np.array([15.0, 135.0, 255.0]) + np.array(turns_deg))
    return complex((np.exp(1j * at) * (1 + np.array(sizes))).sum() * 150 / 25.4)


def press_drift(errors_deg: tuple[float, float, float], sizes: tuple[float, float, float]) -> float:
    at = np.exp(1j * np.deg2rad([15.0, 135.0, 255.0])) * 150 / 25.4
    parts = np.column_stack([at.real, at.imag])
    return 1 / fastest_drift_per_mm(np.zeros(2), parts, angle_error_deg=errors_deg, size_error=sizes)


@pytest.mark.parametrize(
    ("error", "period"),
    [
        ("0.005", "1940.4"),
        ("0.01", "970.21"),
        ("0.02", "485.104"),
        ("0.05", "194.042"),
        ("0.1", "97.0209"),
        ("0.5", "19.4042"),
        ("1", "9.70221"),
    ],
)
def test_one_angle_off(error: str, period: str) -> None:
    """second way: p / (2 sin(error / 2)), as the press can make it from balance and as screens set that way."""
    assert press_drift((float(error), 0, 0), (0, 0, 0)) == pytest.approx(float(period), abs=half_unit(period))
    sheet = SheetSize(3000.0, 2000.0)
    screens = [
        screen(name, ruling_per_mm=150 / 25.4, angle_deg=angle, tone=0.5, sheet=sheet)
        for name, angle in (("a", 15.0 + float(error)), ("b", 75.0), ("c", 45.0))
    ]
    table, _ = beats_of(screens, colours=PerfectInks(), viewer=sharp_eye(200.0), sheet=sheet)
    slow = np.isclose(table.period_mm, float(period), rtol=0, atol=half_unit(period))
    named = [table.participants(row) for row in np.flatnonzero(slow)]
    assert any({len(k) for k in orders.values()} == {2} and len(orders) == 3 for orders in named)


@pytest.mark.parametrize(("error", "period"), [(1e-4, "1693.33"), (1e-3, "169.333"), (1e-2, "16.9333")])
def test_one_ruling_off(error: float, period: str) -> None:
    """second way: p / error."""
    assert 1 / abs(corners((0, 0, 0), (error, 0, 0))) == pytest.approx(float(period), abs=half_unit(period))
    # a plate that is smaller by e prints frequencies 1 / (1 - e) as high, hence the second-order difference
    assert press_drift((0, 0, 0), (error, 0, 0)) == pytest.approx(float(period), rel=1.01 * error)


def test_opposite_errors_are_worse_than_one() -> None:
    """second way: +0.02 and -0.02 degrees on two plates give 280.103 mm, +0.02 on both 485.104, on all three none."""
    assert 1 / abs(corners((0.02, -0.02, 0))) == pytest.approx(280.103, abs=5e-4)
    assert 1 / abs(corners((0.02, 0.02, 0))) == pytest.approx(485.104, abs=5e-4)
    assert abs(corners((0.02, 0.02, 0.02))) < 1e-14
    # the press may do either way round, of which the other is worse in the second order
    worse = 1 / abs(corners((-0.02, 0.02, 0)))
    assert press_drift((0.02, 0.02, 0), (0, 0, 0)) == pytest.approx(worse, rel=1e-9)
    assert worse == pytest.approx(280.103, rel=3e-4)
    # with all three free one against the other two is worst: twice one alone, to the second order
    assert press_drift((0.02, 0.02, 0.02), (0, 0, 0)) == pytest.approx(485.104 / 2, rel=5e-4)


def test_worst_drift_is_the_worst_of_all_corners() -> None:
    """second way: all sign patterns of three angle and three size errors tried one by one."""
    rng = np.random.default_rng(3)
    for _ in range(20):
        v = rng.normal(size=(3, 2)) * 6
        start = rng.normal(size=2) * 0.01
        turn, size = rng.uniform(0, 0.05, 3), rng.uniform(0, 2e-4, 3)
        z, rest = v @ [1, 1j], complex(*start) - complex(v.sum(axis=0) @ [1, 1j])
        worst = 0.0
        for signs in np.ndindex(*(2,) * 6):
            s = 2 * np.array(signs) - 1
            worst = max(worst, abs(rest + (z * np.exp(1j * np.deg2rad(turn) * s[:3]) / (1 + size * s[3:])).sum()))
        found = fastest_drift_per_mm(start, v, angle_error_deg=turn, size_error=size)
        assert found == pytest.approx(worst, rel=1e-9)


def test_combinations_of_the_usual_set() -> None:
    """second way: 15/75/0/45, |k| <= 1, order <= 4, |F| < 0.30 f: 2 at zero, 4 + 4 at 0.261052 f, nothing else."""
    vectors = [np.array([[np.cos(a), np.sin(a)], [-np.sin(a), np.cos(a)]]) for a in np.deg2rad([15.0, 75.0, 0.0, 45.0])]
    orders = combinations_by_order(vectors, total=4, f_max_per_mm=0.30 - 1e-9)
    orders = orders[np.abs(orders).max(axis=1) <= 1]
    layers = (orders.reshape(-1, 4, 2) != 0).any(axis=2).sum(axis=1)
    # an order on both axes of a layer is two indices of that layer, which the count allows
    speed = np.hypot(*(orders @ np.concatenate(vectors)).T)
    still = speed < 1e-12
    # at zero also stands the sum and the difference of the two order-3 states, of order 6: beyond order 4
    assert still.sum() == 2
    assert (np.abs(orders[still]).sum(axis=1) == 3).all()
    assert (layers[still] == 3).all()
    moving = ~still
    assert speed[moving] == pytest.approx(np.full(int(moving.sum()), 0.261052), abs=5e-7)
    assert sorted(zip(layers[moving].tolist(), np.abs(orders[moving]).sum(axis=1).tolist(), strict=True)) == (
        [(2, 2)] * 4 + [(3, 3)] * 4
    )


def test_balance_with_rational_tangents() -> None:
    """second way: (3,1), (1,3) and (2,-2) add up exactly; angles 18.4349/71.5651/45, 150 lpi against 134.164."""
    a, b, c = (3, 1), (1, 3), (2, -2)
    angle = [math.degrees(math.atan2(v[1], v[0])) for v in (a, b, c)]
    assert angle[0] == pytest.approx(18.4349, abs=5e-5)
    assert angle[1] == pytest.approx(71.5651, abs=5e-5)
    assert math.hypot(*c) / math.hypot(*a) == pytest.approx(0.894427, abs=5e-7)
    ruling = 150 * math.hypot(*c) / math.hypot(*a)
    assert ruling == pytest.approx(134.164, abs=5e-4)
    screens = [
        screen("a", ruling_per_mm=150 / 25.4, angle_deg=angle[0], tone=0.5),
        screen("b", ruling_per_mm=150 / 25.4, angle_deg=angle[1], tone=0.5),
        screen("c", ruling_per_mm=ruling / 25.4, angle_deg=45.0, tone=0.5),
    ]
    _, balance = beats_of(screens, colours=PerfectInks())
    assert balance[0].exact
    assert set(balance[0].names) == {"a", "b", "c"}
    # an order of one on one axis of each: (3,1) - (1,3) = (2,-2)
    orders = balance[0].orders
    assert sorted(sum(map(abs, k)) for k in orders.values()) == [1, 1, 1]


# --- the rosette: white left by three opaque screens of discs ---------------------------------

ROSETTE = {
    0.2: {(0, 0): "0.496540", (0.5, 0.5): "0.519926", (0, 0.5): "0.515515", (0.25, 0.25): "0.512197"},
    0.5: {(0, 0): "0.096480", (0.5, 0.5): "0.155194", (0, 0.5): "0.126493", (0.25, 0.25): "0.123813"},
}


@pytest.mark.parametrize("tone", [0.2, 0.5])
def test_white_of_the_rosette(tone: float) -> None:
    """second way: (1-g)^3 - sum' (r J1(2 pi r rho) / rho)^3 cos 2 pi (m a + n b) for phases a, b."""
    # the coefficients are those of the screen itself, the orders those of its two balances
    reach = 60
    discs = screen("a", ruling_per_mm=150 / 25.4, angle_deg=15.0, tone=tone)
    c = discs.coefficients(tone, reach=reach).real
    m, n = np.meshgrid(np.arange(-reach, reach + 1), np.arange(-reach, reach + 1), indexing="ij")
    upper = (m > 0) | ((m == 0) & (n > 0))
    amplitude = np.repeat((-(c[upper] ** 3))[:, None], 3, axis=1).astype(complex)
    turns = np.stack([m[upper], n[upper]], axis=1)
    white = PhaseMean(np.full(3, (1 - tone) ** 3), amplitude, turns)
    for phase, written in ROSETTE[tone].items():
        # what is left out beyond order 60 falls as the 2.5th power: below 1e-6 in all
        assert white.at(np.array([phase]))[0, 1] == pytest.approx(float(written), abs=half_unit(written) + 1e-6)


def test_rosette_is_found_by_itself() -> None:
    """second way: three opaque 50 % disc screens at 15/75/45 leave 0.09648 to 0.15519 white, 0.125 on the mean."""
    screens = [
        screen(name, ruling_per_mm=150 / 25.4, angle_deg=angle, tone=0.5)
        for name, angle in (("a", 15.0), ("b", 75.0), ("c", 45.0))
    ]
    table, balance = beats_of(screens, colours=PerfectInks())
    assert len(balance) == 1
    assert set(balance[0].names) == {"a", "b", "c"}
    dark, average, light = balance[0].mean_y
    # followed to order 12 along both balances: the rest is below 1e-5
    assert dark == pytest.approx(0.096480, abs=2e-5)
    assert average == pytest.approx(0.125, abs=1e-12)
    assert light == pytest.approx(0.155194, abs=2e-5)
    row = row_of(table, balance[0].orders)
    assert row is not None
    assert table.period_mm[row] > 1e6
    assert table.colour_swing[row] == balance[0].colour_swing


def test_both_axes_must_shift() -> None:
    """second way: half a row of misregister on both axes, 84.667 um at 150 lpi, turns one rosette into the other."""
    screens = [
        screen(name, ruling_per_mm=150 / 25.4, angle_deg=angle, tone=0.5)
        for name, angle in (("a", 15.0), ("b", 75.0), ("c", 45.0))
    ]
    _, balance = beats_of(screens, colours=PerfectInks())
    first = screens[0].frequencies_per_mm
    half_row = 0.5 * PERIOD_150
    assert 1000 * half_row == pytest.approx(84.667, abs=5e-4)
    shift = half_row * (first[0] + first[1]) / np.linalg.norm(first[0])
    # every balance has an odd order of each screen on one axis: its phase is turned by half a turn
    ks = np.array(balance[0].orders["a"])
    assert np.cos(2 * np.pi * float(ks @ first @ shift)) == pytest.approx(-1.0)
