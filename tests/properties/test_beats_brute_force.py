"""second way: beats against a Fourier sum over millions of points of `covers`, and against the search of a box."""

from __future__ import annotations

import numpy as np
import pytest

from patterngen.beats._enumerate import Tier
from patterngen.beats._search import in_tiers
from patterngen.beats._superposition import Superposition, ToneRows
from patterngen.beats._tiers import least_contrast
from patterngen.model.screen import Screen
from tests.orders import combinations_by_order, combinations_in_box
from tests.superpositions import (
    SHEET,
    PixelComb,
    SineMesh,
    beats_of,
    eye,
    process_stack,
    screen,
    sharp_eye,
)

PERIOD_MM = 4.0
"""A print that repeats after this, both ways, is sampled over one repeat: nothing leaks between frequencies."""
SIDES = (2003, 2399)

FIELD_MM = 10.0
FIELD_SIDE = 2400

SHAPES = ("simpledot", "round", "square", "ellipse", "diamond", "lines")
COLOURS = process_stack()


def random_set(seed: int, *, repeats: bool = False, shapes: tuple[str, ...] = SHAPES) -> list[Screen]:
    """Two to four screens of random inks, shapes, tones, origins; with `repeats` all fit into `PERIOD_MM`."""
    rng = np.random.default_rng(seed)
    inks = rng.permutation(["C", "M", "Y", "K", "Rust", "Moss", "Dusk"])[: 2 + seed % 3]
    screens = []
    for i, ink in enumerate(inks):
        shape = str(rng.choice(shapes))
        ruling, angle = rng.uniform(3.5, 5.5), rng.uniform(0, 180)
        if repeats:
            a, b = np.rint(ruling * PERIOD_MM * np.array([np.cos(np.deg2rad(angle)), np.sin(np.deg2rad(angle))]))
            ruling, angle = np.hypot(a, b) / PERIOD_MM, np.rad2deg(np.arctan2(b, a))
        screens.append(
            screen(
                f"s{i}",
                ink=str(ink),
                kind="lines" if shape == "lines" else "dots",
                shape=shape,
                ruling_per_mm=float(ruling),
                angle_deg=float(angle),
                # four dark screens would leave little light, and the sum much noise
                tone=float(rng.uniform(0.2, 1.0 - 0.15 * len(inks))),
                origin_mm=(float(rng.uniform(0, 1)), float(rng.uniform(0, 1))),
            )
        )
    return screens


def window(count: int) -> np.ndarray:
    """Blackman-Harris with four terms: beyond 4 / field its spectrum is below 1e-4 of the peak."""
    u = 2 * np.pi * (np.arange(count) + 0.5) / count
    w = 0.35875 - 0.48829 * np.cos(u) + 0.14128 * np.cos(2 * u) - 0.01168 * np.cos(3 * u)
    return np.asarray(w / w.sum())


def fourier_sum(
    screens: list[Screen], frequency_per_mm: np.ndarray, *, side_mm: float, weight: np.ndarray
) -> tuple[np.ndarray, float]:
    """Complex amplitude in Y at each frequency (n, 2), and mean Y, over a square grid of points of `covers`."""
    count = len(weight)
    # an odd corner, so that no origin of a screen is one of the field
    x = 7.3 + side_mm * (np.arange(count) + 0.5) / count
    y = 5.1 + side_mm * (np.arange(count) + 0.5) / count
    primaries = COLOURS.primaries([s.ink for s in screens])[..., 1].ravel()
    turn_x = weight[:, None] * np.exp(-2j * np.pi * x[:, None] * frequency_per_mm[:, 0])
    turn_y = weight[:, None] * np.exp(-2j * np.pi * y[:, None] * frequency_per_mm[:, 1])
    total, mean = np.zeros(len(frequency_per_mm), dtype=complex), 0.0
    for at in range(0, count, 200):
        rows = slice(at, at + 200)
        grid_x, grid_y = np.meshgrid(x, y[rows])
        index = np.zeros(grid_x.shape, dtype=np.intp)
        for s in screens:
            index = 2 * index + s.covers(grid_x, grid_y)
        light = primaries[index]
        total += ((light @ turn_x) * turn_y[rows]).sum(axis=0)
        mean += float((weight[rows] @ light) @ weight)
    return total, mean


def alone(screens: list[Screen], frequency_per_mm: np.ndarray, *, within_per_mm: float) -> np.ndarray:
    """Which frequencies have no other combination so near (orders up to 8, contrast above 1e-4)."""
    vectors = [s.frequencies_per_mm for s in screens]
    f_max = float(np.hypot(*frequency_per_mm.T).max()) + 1.0
    orders = combinations_by_order(vectors, total=8, f_max_per_mm=f_max)
    orders = orders[plain_contrast(screens, orders, reach=8) > 1e-4]
    every = np.concatenate([[[0.0, 0.0]], orders @ np.concatenate(vectors)])
    out = []
    for f in frequency_per_mm:
        # a window that is a product parts two frequencies in either direction
        apart = np.minimum(np.abs(every - f).max(axis=1), np.abs(every + f).max(axis=1))
        out.append((apart < within_per_mm).sum() <= 1)
    return np.array(out, dtype=bool)


@pytest.mark.parametrize("seed", range(3))
def test_spectrum_is_that_of_the_print(seed: int) -> None:
    """second way: every frequency up to 3 /mm of a print that repeats, from 4 and 6 million points of one repeat.

    Combinations of any order fall on one another there, so what is compared is their complex
    sum: colours, coefficients, phases and completeness at once.
    """
    screens = random_set(seed, repeats=True)
    over = Superposition(screens, (), COLOURS, ToneRows.of(screens, (), SHEET))
    hits, floors = in_tiers(over, (1,), [Tier(-1.0, 3.0, 2e-6)], None, cast=over.casts[0])
    assert floors[0] < 1e-5
    bins = np.rint(hits.frequency_per_mm * PERIOD_MM).astype(int)
    assert bins / PERIOD_MM == pytest.approx(hits.frequency_per_mm, abs=1e-9)
    half = int(3.0 * PERIOD_MM) + 1
    predicted = np.zeros((2 * half + 1, 2 * half + 1), dtype=complex)
    amplitude = over.amplitudes(hits, 0)[:, 1]
    np.add.at(predicted, tuple((half + bins).T), amplitude)
    np.add.at(predicted, tuple((half - bins).T), amplitude.conj())
    m, n = np.meshgrid(np.arange(-half, half + 1), np.arange(0, half + 1), indexing="ij")
    inside = (np.hypot(m, n) < 2.9 * PERIOD_MM) & ((n > 0) | (m > 0))
    m, n = m[inside], n[inside]
    expected = 2 * predicted[half + m, half + n] / over.mean[0, 1]
    assert np.abs(expected).max() > 3e-3
    nearer = np.full(len(expected), np.inf)
    for side in SIDES:
        even = np.full(side, 1.0 / side)
        found, mean = fourier_sum(screens, np.column_stack([m, n]) / PERIOD_MM, side_mm=PERIOD_MM, weight=even)
        # the mean too moves by what falls on frequency zero
        assert mean == pytest.approx(over.mean[0, 1] + 2 * predicted[half, half].real, rel=1e-3)
        nearer = np.minimum(nearer, np.abs(2 * found / over.mean[0, 1] - expected))
    # orders that the points are too few for come back at false frequencies: mostly others on each grid
    assert (nearer <= 0.01 * np.abs(expected) + 1e-4).mean() > 0.97
    assert (nearer <= 0.01 * np.abs(expected) + 1e-3).all()
    assert np.sqrt((nearer**2).mean()) < 1e-4


@pytest.mark.parametrize("seed", [3, 12, 21])
def test_contrast_is_that_of_the_print(seed: int) -> None:
    """second way: discs that never repeat, a window of 10 mm: contrast within 1 % + 1e-4, and gone beside it."""
    screens = random_set(seed, shapes=("simpledot",))
    table, _ = beats_of(screens, viewer=sharp_eye(150.0))
    rows = np.flatnonzero((table.components == 1) & (table.contrast > 3e-2) & (table.period_mm < 2.0))
    assert len(rows)
    rows = rows[alone(screens, table.frequency_per_mm[rows], within_per_mm=4 / FIELD_MM)][:8]
    assert len(rows) >= 2
    beside = table.frequency_per_mm[rows[:1]] + [[2.5 / FIELD_MM, 0.0]]
    frequency = np.concatenate([table.frequency_per_mm[rows], beside])
    amplitude, _ = fourier_sum(screens, frequency, side_mm=FIELD_MM, weight=window(FIELD_SIDE))
    contrast = 2 * np.abs(amplitude[:-1]) / table.mean[rows, 1]
    assert contrast == pytest.approx(table.contrast[rows], rel=0.01, abs=1e-4)
    assert abs(amplitude[-1]) < 0.2 * abs(amplitude[0])


@pytest.mark.parametrize("seed", range(10, 16))
def test_no_combination_is_missing(seed: int) -> None:
    """second way: every combination of a box of orders weighed one by one; those that are to be listed are there."""
    rng = np.random.default_rng(seed)
    screens = random_set(seed)
    viewer = eye(distance_mm=float(rng.uniform(150, 500)), far_mm=float(rng.uniform(500, 1500)))
    table, _ = beats_of(screens, viewer=viewer)
    assert table.bound_visibility <= 0.5
    vectors = [s.frequencies_per_mm for s in screens]
    reach = 6 if sum(map(len, vectors)) <= 6 else 4
    orders = combinations_in_box(vectors, reach=reach, f_max_per_mm=12.0)
    orders = orders[taking_part(screens, orders).sum(axis=1) >= 2]
    contrast = plain_contrast(screens, orders, reach=reach)
    f = orders @ np.concatenate(vectors)
    speed = np.hypot(*f.T)
    due = np.flatnonzero((contrast >= least_contrast(viewer, np.maximum(speed, 1e-9))) & (speed > 0.0093))
    assert len(due) > 3
    for i in due:
        apart = np.minimum(np.hypot(*(table.frequency_per_mm - f[i]).T), np.hypot(*(table.frequency_per_mm + f[i]).T))
        row = int(np.argmin(apart))
        assert apart[row] < 1e-9 or table.components[row] > 1
        assert table.contrast[row] >= contrast[i] * (1 - 1e-9)
        if table.components[row] == 1:
            assert table.contrast[row] == pytest.approx(contrast[i], rel=1e-9)


def own_columns(screens: list[Screen]) -> list[slice]:
    ends = np.cumsum([len(s.frequencies_per_mm) for s in screens])
    return [slice(int(end) - len(s.frequencies_per_mm), int(end)) for s, end in zip(screens, ends, strict=True)]


def taking_part(screens: list[Screen], orders: np.ndarray) -> np.ndarray:
    return np.stack([orders[:, c].any(axis=1) for c in own_columns(screens)], axis=1)


def plain_contrast(screens: list[Screen], orders: np.ndarray, *, reach: int) -> np.ndarray:
    """2 |A| / mean in Y, the difference over the primaries written out as a sum over all of them."""
    part = taking_part(screens, orders)
    primaries = COLOURS.primaries([s.ink for s in screens])[..., 1]
    tones = [float(s.printed_tone(s.tone.constant)) for s in screens]
    product = np.ones(len(orders), dtype=complex)
    for i, s in enumerate(screens):
        c = s.coefficients(tones[i], reach=reach)
        c[(reach,) * c.ndim] = 1.0
        product *= c[tuple((orders[:, own_columns(screens)[i]] + reach).T)]
    strength = np.zeros(len(orders))
    mean = 0.0
    for inked in np.ndindex(primaries.shape):
        weight = np.ones(len(orders))
        share = 1.0
        for i, on in enumerate(inked):
            average = tones[i] if on else 1.0 - tones[i]
            weight *= np.where(part[:, i], 1.0 if on else -1.0, average)
            share *= average
        strength += weight * primaries[inked]
        mean += share * primaries[inked]
    return np.asarray(2 * np.abs(product * strength) / mean)


def test_a_mesh_multiplies_the_print() -> None:
    """second way: a mesh 1 + d cos over one screen makes contrast 2 c Delta / mean times d/2."""
    dots = screen("a", ink="K", ruling_per_mm=4.0, angle_deg=10.0, tone=0.4)
    mesh = SineMesh("mesh", ruling_per_mm=4.4, angle_deg=15.0, depth=0.3)
    table, _ = beats_of([dots], grids=[mesh], viewer=sharp_eye(150.0))
    paper, solid = COLOURS.primaries(["K"])[:, 1]
    mean = 0.6 * paper + 0.4 * solid
    c = abs(dots.coefficients(0.4, reach=1)[2, 1])
    expected = 2 * c * (paper - solid) / mean * 0.15
    rows = [row for row in range(len(table)) if set(table.participants(row)) == {"a", "mesh"}]
    first = [
        r for r in rows if table.participants(r) in ({"a": [1, 0], "mesh": [-1, 0]}, {"a": [-1, 0], "mesh": [1, 0]})
    ]
    assert len(first) == 1
    assert table.contrast[first[0]] == pytest.approx(expected, rel=1e-9)
    # a mesh alone makes no beat
    assert all("a" in table.participants(row) for row in range(len(table)))


def test_a_comb_of_pixels_samples_the_print() -> None:
    """second way: discs read at the points of a comb and drawn as its pixels, a Fourier sum over the pixels."""
    dots = screen("a", ink="K", ruling_per_mm=4.0, angle_deg=11.0, tone=0.3)
    comb = PixelComb("pixels", ruling_per_mm=17.3, angle_deg=0.0)
    table, _ = beats_of([dots], grids=[comb], viewer=sharp_eye(60.0))
    rows = np.flatnonzero((table.components == 1) & (table.period_mm < 3.0))[:6]
    assert len(rows) >= 2
    paper, solid = COLOURS.primaries(["K"])[:, 1]
    count = 1400
    at = np.arange(count) / 17.3
    x, y = np.meshgrid(at, at)
    light = _unbounded(dots, x, y, paper, solid)
    w = window(count)
    for row in rows:
        fx, fy = table.frequency_per_mm[row]
        found = (w * np.exp(-2j * np.pi * fy * at)) @ light @ (w * np.exp(-2j * np.pi * fx * at))
        found *= np.sinc(fx / 17.3) * np.sinc(fy / 17.3)
        assert 2 * abs(found) / table.mean[row, 1] == pytest.approx(table.contrast[row], rel=0.01, abs=1e-4)


def _unbounded(dots: Screen, x: np.ndarray, y: np.ndarray, paper: float, solid: float) -> np.ndarray:
    """Reflectance of the unbounded screen: discs of radius sqrt(t / pi) cells about every lattice point."""
    u = np.stack([x, y], axis=-1) @ dots.frequencies_per_mm.T
    away = u - np.rint(u)
    return np.where((away**2).sum(axis=-1) < 0.3 / np.pi, solid, paper)
