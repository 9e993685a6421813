"""invariant: what every eye model must do, and where two of them hang together."""

from __future__ import annotations

import warnings
from types import ModuleType

import numpy as np
import pytest

from patterngen import registry
from patterngen.colour.cielab import lab_to_xyz
from patterngen.errors import InputError
from patterngen.model.job import Viewing
from patterngen.sources import keys
from patterngen.vision import barten1999, luminance_cd_m2, mannos_sakrison1974, viewer

with warnings.catch_warnings():
    warnings.simplefilter("ignore")  # it warns of optional libraries that it does not find
    from colour import contrast

MODELS = registry.modules("patterngen.vision")
each_model = pytest.mark.parametrize("model", MODELS.values(), ids=MODELS.keys())


def test_the_models_are_found_by_name() -> None:
    assert {"barten1999", "watson-ahumada2005", "mannos-sakrison1974"} <= set(MODELS)


@each_model
def test_a_model_says_what_it_is(model: ModuleType) -> None:
    low, high = model.VALID_CPD
    assert 0 <= low < high
    assert isinstance(model.TAKES_LIGHT, bool)
    assert model.SUMMARY
    assert model.SOURCE_KEY in keys()
    assert "Range" in model.__doc__


@each_model
def test_sensitivity_is_finite_and_never_negative_at_any_frequency(model: ModuleType) -> None:
    cpd = np.concatenate([[0.0], np.geomspace(1e-14, 1e12, 2000), [np.inf]])
    found = model.sensitivity(cpd, luminance_cd_m2=139.45)
    assert found.shape == cpd.shape
    assert np.all(np.isfinite(found))
    assert np.all(found >= 0)
    assert found[-1] == 0


@each_model
def test_sensitivity_has_one_peak_between_one_and_ten_cycles(model: ModuleType) -> None:
    cpd = np.geomspace(0.05, 80, 3000)
    found = model.sensitivity(cpd, luminance_cd_m2=139.45)
    turns = np.flatnonzero(np.diff(np.sign(np.diff(found[found > 1e-9]))))
    assert len(turns) == 1
    assert 1 < cpd[turns[0]] < 10


@each_model
def test_light_counts_only_where_a_model_says_so(model: ModuleType) -> None:
    cpd = np.array([1.0, 4.0, 20.0])
    dim, bright = (model.sensitivity(cpd, luminance_cd_m2=light) for light in (5.0, 500.0))
    assert np.all(bright > dim) if model.TAKES_LIGHT else np.array_equal(bright, dim)


def test_barten_equals_colour_science() -> None:
    """second way: colour-science, whose defaults (field 60, pupil by hand) are not ours."""
    cpd = np.geomspace(0.02, 100, 400)
    for luminance in (0.5, 20.0, 139.45, 2000.0):
        for field in (2.0, 10.0, 60.0):
            pupil = contrast.pupil_diameter_Barten1999(luminance, field)
            expected = contrast.contrast_sensitivity_function_Barten1999(
                cpd,
                sigma=contrast.sigma_Barten1999(0.5 / 60, 0.08 / 60, pupil),
                E=contrast.retinal_illuminance_Barten1999(luminance, pupil),
                X_0=field,
            )
            found = barten1999.sensitivity(cpd, luminance_cd_m2=luminance, field_deg=field)
            # relative: sensitivities run up to 1000.  Towards 0 their 1 - exp loses digits, ours does not
            np.testing.assert_allclose(found, expected, rtol=1e-9)


def test_barten_falls_in_proportion_to_frequency_towards_zero() -> None:
    """second way: for small u the neural noise is Phi0 (u0 / u)^2, so S goes like u, without lost digits."""
    tiny = np.geomspace(1e-13, 1e-9, 5)
    slope = barten1999.sensitivity(tiny, luminance_cd_m2=100.0) / tiny
    np.testing.assert_allclose(slope, slope[0], rtol=1e-9)
    area = 1 / 10**2 + 1 / 12**2
    np.testing.assert_allclose(slope[0], 1 / (3 * np.sqrt(20 * area * 3e-8 * 49)), rtol=1e-9)


def test_mannos_and_sakrison_have_the_height_of_bartens_peak() -> None:
    """second way: the peak of Barten's curve under the default light, searched on a fine grid."""
    luminance = luminance_cd_m2(light_lx=500.0, paper_y=float(lab_to_xyz((95.0, 0.0, -2.0))[1]))
    barten = barten1999.sensitivity(np.linspace(3.2, 3.5, 300_001), luminance_cd_m2=luminance).max()
    theirs = mannos_sakrison1974.sensitivity(np.linspace(7.8, 8.0, 200_001)).max()
    # a step of 1e-6 misses a peak by the order of its square
    assert theirs == pytest.approx(barten, rel=1e-9)


def test_luminance_of_matt_paper() -> None:
    """second way: all light of 500 lx comes back into a half space whose projected solid angle is pi."""
    y = ((95 + 16) / 116) ** 3
    assert luminance_cd_m2(light_lx=500.0, paper_y=y) == pytest.approx(139.4489, abs=1e-4)
    assert luminance_cd_m2(light_lx=np.pi, paper_y=1.0) == pytest.approx(1.0, rel=1e-15)


def test_a_viewer_has_the_conditions_of_the_job() -> None:
    looks = viewer(Viewing(distance_mm=300.0, far_mm=900.0, light_lx=200.0), paper_y=0.8)
    assert (looks.distance_mm, looks.far_mm, looks.limit, looks.limit_coarse) == (300.0, 900.0, 4.0, 1.0)
    cpd = np.array([2.0, 11.0])
    expected = barten1999.sensitivity(cpd, luminance_cd_m2=160.0 / np.pi)
    np.testing.assert_allclose(looks.sensitivity(cpd), expected, rtol=1e-12)


def test_an_unknown_eye_is_refused_with_the_nearest() -> None:
    with pytest.raises(InputError, match="barten1999"):
        viewer(Viewing(eye="barten99"), paper_y=0.9)
