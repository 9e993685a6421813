"""What rules ask of the table of beats."""

from __future__ import annotations

import numpy as np

from patterngen.model.area import BoolArray
from patterngen.model.evidence import Evidence
from patterngen.model.lattice import FloatArray


def far_limits(evidence: Evidence) -> FloatArray:
    """The limit at the far distance (n,) that holds for each beat's period."""
    viewing = evidence.design.job.viewing
    return np.where(evidence.beats.period_mm <= 1.0 + 1e-12, viewing.limit, viewing.limit_coarse)


def slower_than_sheet(evidence: Evidence) -> BoolArray:
    """Which beats (n,) are longer than the sheet's diagonal, and so are balance."""
    return np.asarray(evidence.beats.period_mm > evidence.design.job.sheet.diagonal_mm)
