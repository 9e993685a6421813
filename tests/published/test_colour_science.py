"""published: values printed in the documentation and the test-suite of colour-science 0.4.7.

Source: colour-science.  They are typed in here, not computed by it: `colour.contrast.barten1999`
(Barten 1999 and ITU-R BT.2246-4, figure 31), `colour.difference`, `colour.models.cie_lab`, and its
tables of illuminants (CIE 015:2018).
"""

from __future__ import annotations

import numpy as np
import pytest

from patterngen.colour import cielab
from patterngen.vision import barten1999


@pytest.mark.parametrize(
    ("luminance", "field", "printed"), [(100.0, 60.0, 2.7931307), (20.0, 60.0, 3.262346170373243)]
)
def test_pupil(luminance: float, field: float, printed: float) -> None:
    found = barten1999.pupil_mm(luminance_cd_m2=luminance, field_deg=field)
    assert found == pytest.approx(printed, abs=1e-7)  # the first is printed to seven decimals, cut off


@pytest.mark.parametrize(
    ("luminance", "pupil", "printed"),
    [(100.0, 2.1, 330.4115803), (20.0, 2.1, 66.082316060529919), (20.0, 2.5, 91.815644777503664)],
)
def test_light_on_the_retina(luminance: float, pupil: float, printed: float) -> None:
    found = barten1999.retinal_illuminance_td(luminance_cd_m2=luminance, diameter_mm=pupil)
    assert found == pytest.approx(printed, abs=1e-7)


def test_sensitivity_at_four_cycles_per_degree() -> None:
    """Its defaults: 20 cd/m2, 60 degrees, pupil 2.1 mm."""
    found = barten1999.sensitivity(4.0, luminance_cd_m2=20.0, field_deg=60.0, diameter_mm=2.1)
    assert float(found) == pytest.approx(360.8691122, abs=1e-7)


def test_least_contrast_that_is_detected() -> None:
    """ITU-R BT.2246-4, figure 31, as printed: 2 / 1.27 over the peak sensitivity, 0.01 to 100 cd/m2."""
    printed = [
        0.0218764, 0.0141848, 0.0095244, 0.0066805, 0.0049246,
        0.0038228, 0.0031188, 0.0026627, 0.0023674, 0.0021814,
    ]  # fmt: skip
    cpd = np.geomspace(0.1, 20.0, 20_000)
    found = [
        2 / 1.27 / barten1999.sensitivity(cpd, luminance_cd_m2=light, field_deg=60.0).max()
        for light in np.geomspace(0.01, 100.0, 10)
    ]
    # seven decimals, cut off; the grid of frequencies misses the peak by less than 1e-8 of it
    np.testing.assert_allclose(found, printed, rtol=0, atol=1.01e-7)


@pytest.mark.parametrize(
    ("one", "other", "printed"),
    [
        ((48.99183622, -0.10561667, 400.65619925), (50.65907324, -0.11671910, 402.82235718), 1.67093032721),
        ((100.0, 21.57210357, 272.22819350), (100.0, 426.67945353, 72.39590835), 94.03564903),
        ((100.0, 21.57210357, 272.22819350), (100.0, 74.05216981, 276.45318193), 14.87906419),
    ],
)
def test_ciede2000_far_outside_of_surface_colours(
    one: tuple[float, ...], other: tuple[float, ...], printed: float
) -> None:
    assert float(cielab.ciede2000(one, other)) == pytest.approx(printed, abs=0.5e-8)


def test_cielab_under_print_light() -> None:
    found = cielab.xyz_to_lab([0.20654008, 0.12197225, 0.05136952])
    np.testing.assert_allclose(found, [41.52787529, 51.19354174, 19.91843098], rtol=0, atol=0.5e-8)


def test_whites() -> None:
    """CIE 015:2018: D50 96.42, 100, 82.51 and D65 95.04, 100, 108.88.

    Computed here from the chromaticity, whose four digits leave the last digit of XYZ open by two.
    """
    np.testing.assert_allclose(100 * cielab.D50, [96.42, 100.0, 82.51], rtol=0, atol=0.02)
    np.testing.assert_allclose(100 * cielab.D65, [95.04, 100.0, 108.88], rtol=0, atol=0.03)
