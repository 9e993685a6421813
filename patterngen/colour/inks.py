"""The inks of a job on their paper, and the colour of every overprint.

Where an overprint was not measured this is a model, and a plain one: source overprint-product.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from patterngen.colour.cielab import ciede2000, lab_to_hex, lab_to_xyz, xyz_to_lab
from patterngen.model.job import Ink, Job, Lab, Overprint
from patterngen.model.lattice import FloatArray


@dataclass(frozen=True, slots=True)
class InkStack:
    """Paper, inks in the order of their tables, overprints that were measured, and Yule-Nielsen n.

    Order matters: a later ink prints on top of an earlier one.  Satisfies
    `patterngen.model.seeing.InkColours`.
    """

    paper_lab: Lab
    inks: tuple[Ink, ...]
    overprints: tuple[Overprint, ...] = ()
    yule_nielsen: float = 1.0

    @classmethod
    def of(cls, job: Job) -> InkStack:
        """The inks of a job."""
        return cls(job.paper_lab, job.inks, job.overprints, job.press.yule_nielsen)

    def primaries(self, inks: Sequence[str]) -> FloatArray:
        """XYZ of every combination of screens, shape (2,) * n + (3,).

        `inks` names the ink of each of the n screens; index 1 on an axis means that this
        screen inks the point.  Two screens of one ink print it once.  The colour of a
        combination is, in this order: the measured overprint of exactly these inks; the
        measured overprint of those that an opaque ink leaves to be seen; else the product, in
        XYZ relative to the paper, of those.  Raises KeyError for an ink that is not in the
        stack.
        """
        return self._colours(tuple(dict.fromkeys(inks)))[_subset_of_each_combination(inks)]

    def luminance(self) -> dict[str, float]:
        """Y of every solid relative to the paper, by the ink's name."""
        paper = float(_physical(self.paper_lab)[1])
        return {ink.name: float(_physical(ink.lab)[1]) / paper for ink in self.inks}

    def rgb(self) -> dict[str, str]:
        """Every solid as "#rrggbb" by the ink's name, for screens."""
        return {ink.name: lab_to_hex(ink.lab) for ink in self.inks}

    def lab(self, xyz: FloatArray) -> FloatArray:
        """(n, 3) XYZ to CIELAB (D50)."""
        return xyz_to_lab(xyz)

    def difference(self, lab_a: FloatArray, lab_b: FloatArray) -> FloatArray:
        """(n, 3), (n, 3) to CIEDE2000 (n,)."""
        return ciede2000(lab_a, lab_b)

    def _colours(self, names: tuple[str, ...]) -> FloatArray:
        """XYZ (2^m, 3) of every subset of m different inks: bit i of the row stands for names[i]."""
        known = {ink.name: ink for ink in self.inks}
        bit = {known[name].name: 1 << i for i, name in enumerate(names)}
        subsets = np.arange(1 << len(names))
        paper = _physical(self.paper_lab)
        xyz = np.tile(paper, (len(subsets), 1))
        seen = np.zeros_like(subsets)
        for ink in self.inks:  # from the paper up
            if ink.name not in bit:
                continue
            printed = (subsets & bit[ink.name]) != 0
            solid = _physical(ink.lab)
            xyz[printed] = solid if ink.opaque else xyz[printed] * (solid / paper)
            seen[printed] = (0 if ink.opaque else seen[printed]) | bit[ink.name]
        # in two passes, so that a measured set is preferred to what an opaque ink would leave of it
        for key in (seen, subsets):
            for overprint in self.overprints:
                if overprint.lab is not None and overprint.inks <= bit.keys():
                    xyz[key == sum(bit[name] for name in overprint.inks)] = _physical(overprint.lab)
        return xyz


def _subset_of_each_combination(inks: Sequence[str]) -> np.ndarray[tuple[int, ...], np.dtype[np.int64]]:
    """(2,) * n: the row of `InkStack._colours` for each combination of n screens."""
    order = {name: i for i, name in enumerate(dict.fromkeys(inks))}
    row = np.zeros((), dtype=np.int64)
    for name in inks:
        row = np.bitwise_or.outer(row, np.array([0, 1 << order[name]]))
    return row


def _physical(lab: Lab) -> FloatArray:
    """XYZ (3,) of a colour; a component that CIELAB makes negative (no surface is) becomes 0."""
    return np.maximum(lab_to_xyz(lab), 0.0)
