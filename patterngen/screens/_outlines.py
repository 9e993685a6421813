"""Outlines of dots as cubic Beziers: one quadrant's curve fitted, mirrored, closed."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from patterngen.model.area import BoolArray
from patterngen.model.lattice import FloatArray
from patterngen.model.shapes import Contour
from patterngen.screens._quadrant import (
    EDGE_A,
    EDGE_B,
    Ellipse,
    Shape,
    Stretches,
    curve,
    normal_of,
    stretches,
)

_BULGE = 0.06
"""Half cells that a dot reaches into its neighbour where both are inked, so that no seam shows between them."""

_OFF_CURVE = 2e-5
"""Half cells (1e-5 of the pitch) that a Bezier outline may leave the curve."""


def of_levels(shape: Shape, levels: FloatArray, *, even: bool) -> list[Contour]:
    """The dot's outline at each level (n,), in cells about its centre, within 1e-5 cells of the true curve.

    Where the dot crosses the edge of its cell the outline bulges a little into the neighbour,
    tapering, inside what the neighbour inks itself at the same tone; so neighbours overlap
    and the union of all is exactly what is inked.  Unless the tone is `even`, the bulge keeps
    away from the ends of the crossing, so that it stays inside a neighbour that is a little lighter.
    """
    levels = np.atleast_1d(np.asarray(levels, dtype=float))
    if shape.whole is not None:
        return [_figure(shape.whole, level) for level in levels]
    found = _fitted(shape, stretches(shape, levels))
    order = np.lexsort((-found.start, found.of))
    of = found.of[order]
    cuts = np.searchsorted(of, np.arange(len(levels) + 1))
    bends = _bends(shape, found)[order]
    label = found.label[order]
    straight = _is_straight(shape, label)
    first = bends[:, 0]
    rest = bends[:, 1:]
    return [
        _around(first[lo:hi], rest[lo:hi], straight[lo:hi], label[lo:hi], 0.0 if even else _BULGE)
        for lo, hi in pairwise(cuts)
    ]


def full_cell() -> Contour:
    """The whole cell, a little over its edges."""
    r = 0.5 * (1 + _BULGE)
    return Contour(np.array([r, -r]), *_lines(np.array([[r, -r], [r, r], [-r, r], [-r, -r], [r, -r]])))


def _figure(piece: Ellipse, level: float) -> Contour:
    """A full ellipse as eight arcs: 4e-6 of its radius off at the most."""
    m = float(piece.m(np.array(level)))
    radii = 0.5 * np.sqrt(m / np.array([piece.A, piece.B]))
    at = np.arange(9) * np.pi / 4
    on = np.stack([np.cos(at), np.sin(at)], axis=1)
    on[np.abs(on) < 1e-15] = 0.0
    turn = np.stack([-on[:, 1], on[:, 0]], axis=1) * (4 / 3 * np.tan(np.pi / 16))
    on[-1] = on[0]
    bends = np.stack([on[:-1] + turn[:-1], on[1:] - turn[1:], on[1:]], axis=1) * radii
    return Contour(on[0] * radii, bends, np.zeros(8, dtype=bool))


def _is_straight(shape: Shape, label: NDArray[np.int64]) -> BoolArray:
    of_piece = np.array([piece.straight for piece in shape.pieces])
    known = label < EDGE_A
    out = np.ones(label.shape, dtype=bool)
    even = known & (label % 2 == 0)
    out[even] = of_piece[label[even] // 2]
    return out


def _bends(shape: Shape, found: Stretches) -> FloatArray:
    """(n, 4, 2) cubics over the stretches, from their larger w to their smaller, in half cells."""
    w = np.stack([found.stop, found.start])
    p, _ = curve(shape, w, found.levels[found.of][None, :])
    # just inside, so that a kink's own normal is never taken for the stretch's
    ends = np.stack([0.5 * (p + w), 0.5 * (p - w)], axis=-1)
    tangent = np.empty_like(ends)
    for label in np.unique(found.label):
        rows = found.label == label
        na, nb = normal_of(shape, int(label), ends[:, rows, 0], ends[:, rows, 1])
        length = na + nb
        tangent[:, rows, 0], tangent[:, rows, 1] = -nb / length, na / length
    start, stop = ends
    out = np.empty((len(found.of), 4, 2))
    out[:, 0], out[:, 3] = start, stop
    # Hermite handles: |da| + |db| = |dw| along these curves
    third = ((found.stop - found.start) / 3)[:, None]
    out[:, 1], out[:, 2] = start + third * tangent[0], stop - third * tangent[1]
    straight = _is_straight(shape, found.label)
    chord = stop - start
    out[straight, 1] = (start + chord / 3)[straight]
    out[straight, 2] = (start + chord * 2 / 3)[straight]
    _tighten(shape, found, out, tangent, ~straight)
    return out


def _tighten(shape: Shape, found: Stretches, bends: FloatArray, tangent: FloatArray, rows: BoolArray) -> None:
    """Sets the handles so that the cubic's middle lies on the curve, as one does for circles."""
    t0, t1 = tangent[0], tangent[1]
    chord = bends[:, 3] - bends[:, 0]
    cross = t0[:, 0] * t1[:, 1] - t0[:, 1] * t1[:, 0]
    bent = rows & (np.abs(cross) > 1e-6)
    if not bent.any():
        return
    start, stop, d, span = bends[bent, 0], bends[bent, 3], chord[bent], cross[bent]
    ahead = (d[:, 0] * t1[bent, 1] - d[:, 1] * t1[bent, 0]) / span
    back = (t0[bent, 0] * d[:, 1] - t0[bent, 1] * d[:, 0]) / span
    corner = start + ahead[:, None] * t0[bent]
    middle = 0.5 * (start + stop)
    level = found.levels[found.of[bent]]
    arrow = corner - middle
    arrow_w, arrow_p = arrow[:, 0] - arrow[:, 1], arrow[:, 0] + arrow[:, 1]
    middle_w, middle_p = middle[:, 0] - middle[:, 1], middle[:, 0] + middle[:, 1]
    share = np.full(len(level), 0.5)
    with np.errstate(divide="ignore", invalid="ignore"):
        for _ in range(8):
            p, _ = curve(shape, middle_w + share * arrow_w, level)
            share = (p - middle_p) / arrow_p
    good = (ahead > 0) & (back > 0) & (share > 0) & (share < 1)
    kappa = (4 / 3 * share)[:, None]
    index = np.nonzero(bent)[0][good]
    bends[index, 1] = (start + kappa * (corner - start))[good]
    bends[index, 2] = (stop + kappa * (corner - stop))[good]


def _fitted(shape: Shape, found: Stretches) -> Stretches:
    """Stretches split until one cubic follows each."""
    u = (np.arange(1, 8) / 8)[:, None]
    powers = np.stack([(1 - u) ** 3, 3 * (1 - u) ** 2 * u, 3 * (1 - u) * u**2, u**3])[..., 0]
    parts = []
    for _ in range(40):
        bends = _bends(shape, found)
        at = np.einsum("ku,nkx->nux", powers, bends)
        w, p_drawn = at[..., 0] - at[..., 1], at[..., 0] + at[..., 1]
        p, _ = curve(shape, w, found.levels[found.of][:, None])
        off = np.abs(p - p_drawn).max(axis=1) > _OFF_CURVE
        off &= ~_is_straight(shape, found.label) & (found.stop - found.start > 1e-6)
        parts.append((found.of[~off], found.start[~off], found.stop[~off], found.label[~off]))
        if not off.any():
            break
        half = 0.5 * (found.start + found.stop)[off]
        found = Stretches(
            found.levels,
            np.tile(found.of[off], 2),
            np.concatenate([found.start[off], half]),
            np.concatenate([half, found.stop[off]]),
            np.tile(found.label[off], 2),
        )
    columns = [np.concatenate(part) for part in zip(*parts, strict=True)]
    return Stretches(found.levels, columns[0], columns[1], columns[2], columns[3])


def _around(
    first: FloatArray, rest: FloatArray, straight: BoolArray, label: NDArray[np.int64], aside: float
) -> Contour:
    """One quadrant's cubics, mirrored into a closed outline in cells; bulges keep `aside` from their ends."""
    starts = np.concatenate([first, rest[-1:, 2]])
    on_a, on_b = label == EDGE_A, label == EDGE_B
    inner = ~(on_a | on_b)
    if not inner.any():
        return full_cell()
    lead, tail = int(on_a.sum()), int(on_b.sum())
    parts, begin = [(rest[inner], straight[inner])], starts[0]
    if lead:
        path = _bulge(float(starts[lead][1]), aside)
        begin = path[0]
        parts.insert(0, _lines(path))
    if tail:
        parts.append(_lines(_bulge(float(starts[len(starts) - 1 - tail][0]), aside)[::-1, ::-1]))
    quarter = np.concatenate([bends for bends, _ in parts])
    flag = np.concatenate([flags for _, flags in parts])
    nodes = np.concatenate([begin[None, :], quarter[:, 2]])
    back = np.stack([quarter[:, 1], quarter[:, 0], nodes[:-1]], axis=1)[::-1]
    left, down = np.array([-1.0, 1.0]), np.array([1.0, -1.0])
    bends = np.concatenate([quarter, back * left, -quarter, back * down])
    return _joined(Contour(begin * 0.5, bends * 0.5, np.concatenate([flag, flag[::-1], flag, flag[::-1]])))


def _bulge(reach: float, aside: float) -> FloatArray:
    """From the middle of the edge a = 1 to where the ink ends on it, (1, reach), by way of the neighbour."""
    end = reach - aside
    if end <= 0.2 * _BULGE:
        return np.array([[1.0, 0.0], [1.0, reach]])
    taper = min(_BULGE, 0.5 * end)
    path = [[1 + _BULGE, 0.0], [1 + _BULGE, end - taper], [1.0, end]]
    return np.array(path if aside == 0.0 else [*path, [1.0, reach]])


def _lines(path: FloatArray) -> tuple[FloatArray, BoolArray]:
    """Straight cubics along a path, and that they are straight."""
    a, b = path[:-1], path[1:]
    return np.stack([a + (b - a) / 3, a + (b - a) * 2 / 3, b], axis=1), np.ones(len(a), dtype=bool)


def _joined(contour: Contour) -> Contour:
    """The same outline with straight pieces that go on in one line made into one."""
    ends = contour.bends[:, 2]
    step = ends - np.concatenate([ends[-1:], ends[:-1]])
    after = np.roll(step, -1, axis=0)
    on = np.abs(step[:, 0] * after[:, 1] - step[:, 1] * after[:, 0]) <= 1e-12 * np.abs(step * after).sum(axis=1)
    on &= contour.straight & np.roll(contour.straight, -1) & ((step * after).sum(axis=1) > 0)
    if not on.any():
        return contour
    # begin where nothing is joined, then drop the joints
    first = int(np.nonzero(~on)[0][-1]) + 1
    keep = np.roll(~on, -first)
    bends, straight = np.roll(contour.bends, -first, axis=0)[keep], np.roll(contour.straight, -first)[keep]
    start = bends[-1, 2]
    here = np.concatenate([start[None, :], bends[:-1, 2]])
    chord = bends[:, 2] - here
    bends[straight, 0] = (here + chord / 3)[straight]
    bends[straight, 1] = (here + chord * 2 / 3)[straight]
    return Contour(start, bends, straight)
