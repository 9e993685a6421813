"""second way: models of what a half-tone reflects, worked by hand or with mpmath, to the digits shown.

Sources by their keys: demichel-1924, murray-davies-1936, yule-nielsen-1951.
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from patterngen.beats._differences import Strengths, all_differences
from patterngen.colour.inks import InkStack
from patterngen.model.job import Ink


def overlap_shares(tones: list[float]) -> np.ndarray:
    """Share of every combination of screens, (2,) * n, read off the engine's averages three combinations at a time."""
    n = len(tones)
    shares = np.empty(2**n)
    for at in range(2**n):
        marked = np.zeros((2**n, 3))
        marked[at] = 1.0
        shares[at] = all_differences(marked.reshape((2,) * n + (3,)), np.array([tones]))[0, 0, 0]
    return shares.reshape((2,) * n)


def reflectance(coverage: float, *, paper: float, ink: float, yule_nielsen: float) -> float:
    """Mean of one screen as the engine has it."""
    primaries = np.array([[paper] * 3, [ink] * 3])
    return float(Strengths(primaries, np.array([[coverage]]), yule_nielsen=yule_nielsen).mean[0, 1])


def test_overlap_shares_of_three_inks() -> None:
    """Demichel 1924: c .3, m .5, y .2."""
    found = overlap_shares([0.3, 0.5, 0.2])
    names = {
        "W": ((0, 0, 0), 0.28),
        "C": ((1, 0, 0), 0.12),
        "M": ((0, 1, 0), 0.28),
        "CM": ((1, 1, 0), 0.12),
        "Y": ((0, 0, 1), 0.07),
        "CY": ((1, 0, 1), 0.03),
        "MY": ((0, 1, 1), 0.07),
        "CMY": ((1, 1, 1), 0.03),
    }
    for index, share in names.values():
        assert found[index] == pytest.approx(share, abs=1e-15)


@given(st.lists(st.floats(0, 1), min_size=1, max_size=5))
def test_overlap_shares_add_up_and_keep_every_tone(tones: list[float]) -> None:
    """invariant: shares sum to 1, and the share of all combinations with one ink is its tone."""
    shares = overlap_shares(tones)
    assert shares.sum() == pytest.approx(1.0, abs=1e-12)
    for axis, tone in enumerate(tones):
        assert shares.take(1, axis=axis).sum() == pytest.approx(tone, abs=1e-12)


@pytest.mark.parametrize(
    ("yule_nielsen", "written"), [(1.0, 0.4500000), (1.7, 0.3510816), (2.0, 0.3280776)], ids=["1", "1.7", "2"]
)
def test_reflectance_of_half_coverage(yule_nielsen: float, written: float) -> None:
    """Murray-Davies for n = 1, Yule-Nielsen above: paper .85, ink .05, coverage .5."""
    found = reflectance(0.5, paper=0.85, ink=0.05, yule_nielsen=yule_nielsen)
    assert found == pytest.approx(written, abs=5e-8)


@pytest.mark.parametrize(("yule_nielsen", "coverage"), [(1.0, 0.5151017), (1.7, 0.3843026)], ids=["1", "1.7"])
def test_density_of_a_coverage(yule_nielsen: float, coverage: float) -> None:
    """Murray & Davies 1936 and its Yule-Nielsen form: that coverage of a solid 1.50 is a tint .30."""
    found = reflectance(coverage, paper=1.0, ink=10**-1.5, yule_nielsen=yule_nielsen)
    # the coverage is written to 5e-8, and a density moves by less than 1.5 times a coverage here
    assert -np.log10(found) == pytest.approx(0.30, abs=1e-7)


def test_mean_colour_of_a_mixture_by_counting_points() -> None:
    """second way: Neugebauer's mean against 400 000 points thrown at random, each inked by chance."""
    solids = {"Slate": (38.0, -4.0, -16.0), "Rust": (47.0, 45.0, 40.0), "Cream": (88.0, 2.0, 22.0)}
    inks = tuple(Ink(name, lab) for name, lab in solids.items())
    primaries = InkStack((95.0, 0.0, -2.0), inks).primaries([ink.name for ink in inks])
    tones = np.array([0.35, 0.6, 0.15])
    found = Strengths(primaries, tones[None, :], yule_nielsen=1.0).mean[0]
    inked = (np.random.default_rng(11).random((400_000, 3)) < tones).astype(int)
    points = primaries[inked[:, 0], inked[:, 1], inked[:, 2]]
    # five standard errors of the mean
    assert np.all(np.abs(points.mean(axis=0) - found) < 5 * points.std(axis=0) / np.sqrt(len(points)))
