"""Averages and differences over primaries, integer relations, tones that meet, swings: each by itself."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from patterngen.beats._differences import Strengths, all_differences, product_bound
from patterngen.beats._lattice import coordinates, integer_basis, modulus_extremes
from patterngen.beats._swing import PhaseMean, scattered
from patterngen.beats._tiers import least_contrast, octave, window_mm
from patterngen.beats.together import tones_together
from patterngen.model.area import Area, ToneField
from patterngen.model.job import Overprint
from tests.superpositions import SHEET, eye, process_stack, screen

# --- differences


def written_out(primaries: np.ndarray, tones: np.ndarray, members: set[int]) -> np.ndarray:
    out = np.zeros(3)
    for inked in np.ndindex(primaries.shape[:-1]):
        weight = 1.0
        for i, on in enumerate(inked):
            average = tones[i] if on else 1 - tones[i]
            weight *= (1 if on else -1) if i in members else average
        out += weight * primaries[inked]
    return out


@given(st.integers(0, 2**32 - 1), st.integers(1, 5))
def test_all_differences_are_sums_over_the_primaries(seed: int, n: int) -> None:
    """second way: every mean and mixed difference written out as one sum over all combinations of inks."""
    rng = np.random.default_rng(seed)
    primaries, tones = rng.random((2,) * n + (3,)), rng.random((2, n))
    found = all_differences(primaries, tones)
    for row in range(2):
        for s in range(2**n):
            members = {i for i in range(n) if s >> i & 1}
            assert found[row, s] == pytest.approx(written_out(primaries, tones[row], members), abs=1e-12)


def test_strengths_leave_out_what_does_not_print() -> None:
    """second way: rows of different screens against the plain sum, with and without Yule-Nielsen."""
    rng = np.random.default_rng(4)
    primaries = rng.uniform(0.05, 1, (2, 2, 2, 3))
    tones = np.array([[0.3, 0.0, 0.6], [0.2, 0.5, 0.7], [0.0, 0.4, 0.0]])
    sets = np.arange(8)
    for n in (1.0, 2.0):
        strengths = Strengths(primaries, tones, yule_nielsen=n)
        root = primaries ** (1 / n)
        for row in range(3):
            mean = written_out(root, tones[row], set())
            assert strengths.mean[row] == pytest.approx(mean**n)
            found = strengths.at(row, sets)
            for s in range(8):
                members = {i for i in range(3) if s >> i & 1}
                if any(tones[row, i] == 0 for i in members):
                    assert (found[s] == 0).all()
                else:
                    expected = n * mean ** (n - 1) * written_out(root, tones[row], members)
                    assert found[s] == pytest.approx(expected)


@given(st.integers(0, 2**32 - 1), st.integers(1, 5))
def test_product_bound_holds_for_every_set(seed: int, n: int) -> None:
    """invariant: no set of screens is stronger than the product of its members' shares."""
    contrasts = np.random.default_rng(seed).random(2**n) ** 3
    contrasts[0] = 2.0
    whole, each = product_bound(contrasts)
    for s in range(2**n):
        bound = whole * np.prod([each[i] for i in range(n) if s >> i & 1])
        assert contrasts[s] <= bound * (1 + 1e-9)


def test_product_bound_is_exact_for_inks_that_multiply() -> None:
    """invariant: transparent inks leave no slack."""
    primaries = process_stack().primaries(["C", "M", "K"])
    strengths = Strengths(primaries, np.array([[0.4, 0.3, 0.2]]), yule_nielsen=1.0)
    shares = strengths.shares((1,))
    assert shares.whole == pytest.approx(2.0)
    assert shares.largest[7] == pytest.approx(shares.whole * shares.each.prod())


# --- integer relations


@given(st.integers(0, 2**32 - 1), st.integers(1, 4), st.integers(1, 6))
def test_integer_basis_spans_the_same_lattice(seed: int, rank: int, dimensions: int) -> None:
    """invariant: every vector has whole coordinates, and the determinant is that of the generators."""
    rng = np.random.default_rng(seed)
    generators = rng.integers(-4, 5, (rank, dimensions))
    vectors = rng.integers(-3, 4, (12, rank)) @ generators
    basis = integer_basis(vectors)
    assert len(basis) == np.linalg.matrix_rank(vectors)
    if len(basis):
        _, whole = coordinates(basis, vectors)
        assert whole.all()
        # no coarser lattice: each basis row is a combination of the vectors, so a basis of both is no finer
        again = integer_basis(np.concatenate([vectors, basis]))
        volume = [np.linalg.det((b @ b.T).astype(float)) for b in (basis, again)]
        assert volume[0] == pytest.approx(volume[1], rel=1e-6)


def brute_extremes(amplitude: np.ndarray, orders: np.ndarray) -> tuple[float, float]:
    phases = np.random.default_rng(0).random((200_000, orders.shape[1]))
    modulus = np.abs(np.exp(2j * np.pi * phases @ orders.T) @ amplitude)
    return float(modulus.min()), float(modulus.max())


@settings(deadline=None, max_examples=20)
@given(st.integers(0, 2**32 - 1))
def test_extremes_of_dependent_phases(seed: int) -> None:
    """second way: the modulus at 200,000 random phases never leaves the extremes and comes near both."""
    rng = np.random.default_rng(seed)
    basis = rng.integers(-2, 3, (2, 4))
    turns = np.concatenate([[[0, 0]], rng.integers(-2, 3, (4, 2))])
    orders = np.array([1, 0, -1, 1]) + turns @ basis
    amplitude = rng.normal(size=5) + 1j * rng.normal(size=5)
    least, most = modulus_extremes([amplitude], [orders])[0]
    brute_least, brute_most = brute_extremes(amplitude, orders)
    total = float(np.abs(amplitude).sum())
    # searched on a grid and refined from a few starts: a narrow hole may be missed by a hundredth
    assert brute_most <= most + 1e-3 * total
    assert brute_least >= least - 1e-2 * total
    assert brute_most >= most - 0.03 * total
    assert brute_least <= least + 0.03 * total


def test_extremes_of_independent_phases_are_those_of_a_polygon() -> None:
    """second way: sides 5, 1, 1 leave 3 to 7; sides 3, 4, 5 close."""
    free = np.array([[1, 0, 0], [0, 1, 0], [0, 0, 1]])
    out = modulus_extremes([np.array([5.0, 1j, -1.0]), np.array([3.0, 4.0, 5.0])], [free, free])
    assert out[0] == pytest.approx([3.0, 7.0])
    assert out[1] == pytest.approx([0.0, 12.0])


# --- swings


def test_phase_mean_spreads_what_it_sums() -> None:
    """second way: the Fourier transform over the torus against the sum at each of its points."""
    rng = np.random.default_rng(1)
    for rank in (1, 2, 3, 5):
        turns = rng.integers(-3, 4, (6, rank))
        amplitude = 0.02 * (rng.normal(size=(6, 3)) + 1j * rng.normal(size=(6, 3)))
        model = PhaseMean(np.array([0.5, 0.6, 0.4]), amplitude, turns)
        theta, xyz = model.spread()
        some = np.linspace(0, len(theta) - 1, 50).astype(int)
        assert xyz[some] == pytest.approx(model.at(theta[some]), abs=1e-12)


def test_widest_pair_of_one_wave() -> None:
    """second way: one component a swings Y between mean - 2a and mean + 2a."""
    colours = process_stack()
    mean, a = np.array([0.30, 0.32, 0.25]), np.array([0.02, 0.03, 0.01])
    model = PhaseMean(mean, (a * np.exp(0.7j))[None, :], np.array([[3]]))
    theta, xyz = model.spread()
    dark, light, swing = model.widest_pair(colours, theta, xyz, refine=True)
    ends = colours.lab(np.stack([mean - 2 * a, mean + 2 * a]))
    # CIEDE2000 weighs by where the pair lies, so its widest pair may lie a little inside the ends
    assert swing >= float(colours.difference(ends[:1], ends[1:])[0]) * (1 - 1e-6)
    assert dark == pytest.approx(ends[0], abs=0.05)
    assert light == pytest.approx(ends[1], abs=0.05)
    assert model.luminance_extremes(theta, xyz) == pytest.approx((0.26, 0.38), abs=1e-6)


def test_scattered_points_are_even() -> None:
    """invariant: means of a half and boxes of a sixteenth hold their share."""
    points = scattered(4096, 4)
    assert points.mean(axis=0) == pytest.approx([0.5] * 4, abs=2e-3)
    assert ((points < 0.5).all(axis=1)).mean() == pytest.approx(1 / 16, abs=5e-3)


# --- bands of frequency


def test_octaves_never_overlook_an_area() -> None:
    """invariant: the window is never wider than the period, and at least half of it above the first."""
    period = np.geomspace(0.25, 300, 200)
    window = np.array([window_mm(int(n)) for n in octave(period)])
    assert (window <= period * (1 + 1e-6)).all()
    assert (window * 2 >= period * (1 - 1e-6)).all()
    assert octave(np.array([0.05]))[0] == 0


def test_least_contrast_is_the_lower_of_both_distances() -> None:
    """invariant: half a threshold near, a tenth of the limit far, the limit changing at 1 mm."""
    viewer = eye()
    f = np.array([0.3, 0.999, 1.0, 3.0])
    near, far = viewer.sensitivity_near(f), viewer.sensitivity_far(f)
    assert least_contrast(viewer, f) == pytest.approx(np.minimum(0.5 / near, [0.1, 0.1, 0.4, 0.4] / far))


# --- tones that meet


def test_even_tones_make_one_row() -> None:
    """invariant: constant tones on the whole sheet meet everywhere."""
    screens = [
        screen("C", ruling_per_mm=5, angle_deg=15, tone=0.4),
        screen("K", ruling_per_mm=5, angle_deg=45, tone=0.1),
    ]
    assert tones_together(screens, (), SHEET, window_mm=50.0).tolist() == [[0.4, 0.1]]
    assert tones_together([], (), SHEET, window_mm=1.0).shape == (0, 0)


def test_panels_meet_where_they_overlap() -> None:
    """invariant: two overlapping panels make three rows, a window wider than the overlap only two."""
    left = Area((0.0, 0.0, 50.0, 60.0), label="left")
    right = Area((44.0, 0.0, 90.0, 60.0), label="right")
    screens = [
        screen("C", ruling_per_mm=5, angle_deg=15, tone=0.4, area=left),
        screen("K", ruling_per_mm=5, angle_deg=45, tone=0.1, area=right),
    ]
    narrow = tones_together(screens, (), SHEET, window_mm=1.0).tolist()
    assert narrow == [[0.0, 0.1], [0.4, 0.0], [0.4, 0.1]]
    wide = tones_together(screens, (), SHEET, window_mm=12.0).tolist()
    assert wide == [[0.0, 0.1], [0.4, 0.0]]


def test_outlines_with_holes() -> None:
    """invariant: inside the ring both print, in its hole only one."""
    box = np.array([[10.0, 10.0], [80.0, 10.0], [80.0, 50.0], [10.0, 50.0]])
    hole = np.array([[30.0, 20.0], [30.0, 40.0], [60.0, 40.0], [60.0, 20.0]])
    ring = Area((10.0, 10.0, 80.0, 50.0), (box, hole), "ring")
    screens = [
        screen("C", ruling_per_mm=5, angle_deg=15, tone=0.4, area=ring),
        screen("K", ruling_per_mm=5, angle_deg=45, tone=0.1),
    ]
    assert tones_together(screens, (), SHEET, window_mm=2.0).tolist() == [[0.0, 0.1], [0.4, 0.1]]


def test_pictures_keep_their_extremes() -> None:
    """invariant: rows stay few, every tone lies in the picture's range, darkest and lightest are kept."""
    rng = np.random.default_rng(0)
    fields = []
    for _ in range(3):
        coarse = rng.random((9, 13)).astype(np.float32)
        fields.append(ToneField(values=np.kron(coarse, np.ones((20, 20), np.float32)), box_mm=(0.0, 0.0, 90.0, 60.0)))
    screens = [
        screen(name, ruling_per_mm=6, angle_deg=a, tone=f)
        for name, a, f in zip("CMK", (15, 75, 45), fields, strict=True)
    ]
    rows = tones_together(screens, (), SHEET, window_mm=0.25)
    assert 20 < len(rows) <= 408
    for i, field in enumerate(fields):
        assert field.values is not None
        assert rows[:, i].max() == pytest.approx(float(field.values.max()), abs=0.02)
        assert rows[:, i][rows[:, i] > 0].min() == pytest.approx(float(field.values.min()), abs=0.02)
    # over wide windows the picture's blocks melt towards its mean
    wide = tones_together(screens, (), SHEET, window_mm=32.0)
    assert np.ptp(wide[:, 0]) < 0.7 * np.ptp(rows[:, 0])


def test_inks_that_never_meet_alternate() -> None:
    """invariant: a row in which both print becomes one without each."""
    screens = [
        screen(name, ruling_per_mm=5, angle_deg=a, tone=t)
        for name, a, t in (("C", 15, 0.4), ("M", 75, 0.3), ("K", 45, 0.1))
    ]
    rows = tones_together(screens, [Overprint(frozenset({"C", "M"}), never=True)], SHEET, window_mm=1.0)
    assert rows.tolist() == [[0.0, 0.3, 0.1], [0.4, 0.0, 0.1]]
