"""second way: each published formula computed apart from the program with mpmath, to the digits shown."""

from __future__ import annotations

import numpy as np
import pytest

from patterngen.model.seeing import cycles_per_degree
from patterngen.vision import (
    barten1999,
    barten2003,
    mannos_sakrison1974,
    movshon_kiorpes1988,
    watson_ahumada2005,
)

CPD = (1.0, 2.0, 4.0, 8.0, 16.0, 30.0)


def last_digit(text: str) -> float:
    """Half a unit of the last digit of a number as it was written down."""
    mantissa, _, exponent = text.partition("e")
    return 0.5 * 10.0 ** (int(exponent or 0) - len(mantissa.partition(".")[2])) * (1 + 1e-9)


def assert_reads(found: float, written: str) -> None:
    assert found == pytest.approx(float(written), rel=0, abs=last_digit(written))


TABLE = {
    "Mannos & Sakrison 1974": (
        mannos_sakrison1974.response,
        {},
        ".31596 .52797 .81053 .98078 .69075 .18698",
    ),
    "Movshon & Kiorpes 1988": (
        movshon_kiorpes1988.sensitivity,
        {},
        "61.405 87.532 102.16 79.921 28.094 2.8248",
    ),
    "Watson & Ahumada 2005": (
        watson_ahumada2005.sensitivity,
        {},
        "106.56 182.04 214.20 135.14 43.115 7.1656",
    ),
    "Barten 1999, 100 cd/m2, 10 degrees": (
        barten1999.sensitivity,
        {"luminance_cd_m2": 100.0, "field_deg": 10.0},
        "413.94 621.63 668.52 466.12 179.22 27.345",
    ),
    "Barten 1999, 100 cd/m2, 2 degrees": (
        barten1999.sensitivity,
        {"luminance_cd_m2": 100.0, "field_deg": 2.0},
        "118.73 223.19 356.60 363.36 155.69 17.680",
    ),
    "Barten 1999, 20 cd/m2, 10 degrees": (
        barten1999.sensitivity,
        {"luminance_cd_m2": 20.0, "field_deg": 10.0},
        "404.67 574.21 539.79 320.57 111.83 14.476",
    ),
    "Barten 1999, 20 cd/m2, 60 degrees, pupil 2.1 mm": (
        barten1999.sensitivity,
        {"luminance_cd_m2": 20.0, "field_deg": 60.0, "diameter_mm": 2.1},
        "500.39 525.92 360.87 186.16 70.969 14.206",
    ),
    "Barten 2003, 100 cd/m2, 10 degrees": (
        barten2003.sensitivity,
        {"luminance_cd_m2": 100.0, "field_deg": 10.0},
        "410.67 609.01 633.74 426.12 169.38 30.598",
    ),
}


@pytest.mark.parametrize("name", TABLE)
def test_sensitivities(name: str) -> None:
    function, conditions, row = TABLE[name]
    for found, written in zip(function(CPD, **conditions), row.split(), strict=True):
        assert_reads(float(found), written)


PEAKS = {
    "Mannos & Sakrison 1974": ("7.89091", ".980878"),
    "Movshon & Kiorpes 1988": ("4.00000", "102.158"),
    "Watson & Ahumada 2005": ("3.44945", "217.292"),
    "Barten 1999, 100 cd/m2, 10 degrees": ("3.23334", "681.554"),
}


@pytest.mark.parametrize("name", PEAKS)
def test_peaks(name: str) -> None:
    function, conditions, _ = TABLE[name]
    at, height = PEAKS[name]
    # a parabola through three points near the peak: its apex is off by the cube of the step, 1e-12
    x = float(at) + np.array([-1e-3, 0.0, 1e-3])
    a, b, c = np.polyfit(x - float(at), function(x, **conditions), 2)
    assert_reads(float(at) - b / (2 * a), at)
    assert_reads(c - b * b / (4 * a), height)


def test_barten_pupil_and_light_on_the_retina() -> None:
    diameter = barten1999.pupil_mm(luminance_cd_m2=100.0, field_deg=10.0)
    assert_reads(diameter, "4.07595")
    assert_reads(barten1999.retinal_illuminance_td(luminance_cd_m2=100.0, diameter_mm=diameter), "1089.7")


@pytest.mark.parametrize(
    ("period_mm", "distance_mm", "exact"),
    [
        (1.0, 400.0, "6.981321"),
        (25.4 / 150, 300.0, "30.92119"),
        (10.0, 100.0, "0.1746783"),
    ],
)
def test_cycles_per_degree(period_mm: float, distance_mm: float, exact: str) -> None:
    """The exact formula: the usual pi D / (180 P) already reads 0.1745329 in the last row."""
    assert_reads(float(cycles_per_degree(np.array(1 / period_mm), distance_mm=distance_mm)), exact)


@pytest.mark.parametrize(
    ("cpd", "distance_mm", "period_mm"),
    [
        (3.0, 400.0, "2.327112"),
        (60.0, 300.0, "0.0872665"),
        (1.0, 300.0, "5.236121"),
        (8.0, 300.0, "0.654499"),
        (1.0, 400.0, "6.981494"),
        (8.0, 400.0, "0.872665"),
    ],
)
def test_period_of_a_frequency(cpd: float, distance_mm: float, period_mm: str) -> None:
    """The written period, put through the program, comes out as the frequency it stands for."""
    half = last_digit(period_mm)
    periods = float(period_mm) + np.array([-half, half])
    high, low = cycles_per_degree(1 / periods, distance_mm=distance_mm)
    assert low <= cpd <= high


def test_the_worked_verdict_of_a_fifteen_degree_pair() -> None:
    """0 and 15 degrees at 150 lpi from 400 mm: above threshold by every model for opaque dots."""
    period_mm = 25.4 / 150 / (2 * np.sin(np.deg2rad(7.5)))
    cpd = float(cycles_per_degree(np.array(1 / period_mm), distance_mm=400.0))
    assert_reads(cpd, "10.7627")
    models = (
        movshon_kiorpes1988.sensitivity(cpd),
        watson_ahumada2005.sensitivity(cpd),
        barten1999.sensitivity(cpd, luminance_cd_m2=100.0),
    )
    for contrast, row in ((0.01787869, "1.04 1.62 6.05"), (0.3125411, "18.2 28.3 105.7")):
        for sensitivity, written in zip(models, row.split(), strict=True):
            assert_reads(float(contrast * sensitivity), written)
