"""What rules ask of the table of beats."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from patterngen.model.area import BoolArray
from patterngen.model.evidence import Evidence
from patterngen.model.lattice import FloatArray
from patterngen.model.verdict import BeatTable

_SAME = 0.02


def far_limits(evidence: Evidence) -> FloatArray:
    """The limit at the far distance (n,) that holds for each beat's period."""
    viewing = evidence.design.job.viewing
    return np.where(evidence.beats.period_mm <= 1.0 + 1e-12, viewing.limit, viewing.limit_coarse)


def slower_than_sheet(evidence: Evidence) -> BoolArray:
    """Which beats (n,) are longer than the sheet's diagonal, and so are balance."""
    return np.asarray(evidence.beats.period_mm > evidence.design.job.sheet.diagonal_mm)


def patterns(table: BeatTable, rows: Sequence[int], strength: FloatArray) -> list[list[int]]:
    """Rows that a person sees as one pattern (often the same bands crosswise), the strongest first.

    One pattern has the same participants, period and `strength` (n,), the last two within 2 %.
    """
    who = table.taking_part() @ (1 << np.arange(len(table.slots), dtype=np.int64))
    period = table.period_mm
    out: list[list[int]] = []
    alike: dict[int, list[list[int]]] = {}
    for row in sorted(rows, key=lambda r: -strength[r]):
        found = alike.setdefault(int(who[row]), [])
        for pattern in found:
            first = pattern[0]
            if math.isclose(period[row], period[first], rel_tol=_SAME) and math.isclose(
                strength[row], strength[first], rel_tol=_SAME
            ):
                pattern.append(row)
                break
        else:
            found.append([row])
            out.append(found[-1])
    return out
