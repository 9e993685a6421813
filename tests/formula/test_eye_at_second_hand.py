"""second way: figures of the Mannos & Sakrison response that circulate in public code, not counted as published.

Source: mannos-sakrison-1974, at second hand.
"""

from __future__ import annotations

import numpy as np

from patterngen.vision import mannos_sakrison1974


def test_peak_of_mannos_and_sakrison() -> None:
    """Public code that clips the curve below its peak uses 7.8909 cycles per degree and 0.9809 there."""
    cpd = np.linspace(7.0, 9.0, 20_001)
    found = mannos_sakrison1974.response(cpd)
    assert abs(cpd[found.argmax()] - 7.8909) < 1.5e-4  # one step of the grid, and their last digit
    assert abs(found.max() - 0.9809) < 0.5e-4


def test_peak_is_near_eight_cycles_and_near_one() -> None:
    """K. Matkovic, thesis on tone mapping (one page read): a peak of about 1 near 8 cycles per degree."""
    found = mannos_sakrison1974.response([4.0, 8.0, 16.0])
    assert found[1] > 0.97
    assert np.all(found <= 1.0)
    assert found[1] > found[0]
    assert found[1] > found[2]
