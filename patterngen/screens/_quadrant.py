"""One mechanism for every spot function: a shape is a falling function on a quadrant.

Seen from the centre of its dot every spot function is even in both directions, and on the
quadrant 0 <= a, b <= 1 (1 is the cell's edge) its value falls with a and with b.  So what is
inked above a level is bounded by a falling curve, and in the turned coordinates
w = a - b and p = a + b that curve is a single-valued p(w) whose slope never exceeds 1: no
vertical tangents, no special cases at the ends.  Each smooth piece of a function (ellipse,
ellipse about the corner, straight, cosine) gives p(w) in closed form; where pieces meet
(creases) and where the curve leaves the cell there are kinks, found by narrowing in on the
change of label.  Area, Fourier coefficients and Bezier outlines all come from the same smooth
stretches between kinks.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cache, lru_cache

import numpy as np
from numpy.typing import NDArray

from patterngen.model.area import BoolArray
from patterngen.model.lattice import FloatArray

Budget = Callable[[FloatArray], FloatArray]
"""How far a piece reaches at a level: the m of its inequality."""

_CLOSE = 1e-12
_NARROW = 1e-15
_LAST_DIGITS = 1e-15


class Piece:
    """One smooth piece of a spot function on the quadrant."""

    straight = False

    def reach(self, w: FloatArray, level: FloatArray) -> FloatArray:
        """Largest p at w (arrays alike) whose value lies above the level; -inf or inf: none, or all of them."""
        raise NotImplementedError

    def normal(self, a: FloatArray, b: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Outward normal of the level curve through (a, b), of any length, both parts >= 0."""
        raise NotImplementedError


@dataclass(frozen=True)
class Ellipse(Piece):
    """A a^2 + B b^2 < m about the dot's centre; the whole figure when it lies under the edge."""

    A: float
    B: float
    m: Budget

    def reach(self, w: FloatArray, level: FloatArray) -> FloatArray:
        A, B = self.A, self.B
        under = 4 * self.m(level) * (A + B) - 4 * A * B * w * w
        return np.where(under >= 0, ((B - A) * w + np.sqrt(np.maximum(under, 0))) / (A + B), -np.inf)

    def normal(self, a: FloatArray, b: FloatArray) -> tuple[FloatArray, FloatArray]:
        return self.A * a, self.B * b


@dataclass(frozen=True)
class CornerEllipse(Piece):
    """A (1 - a)^2 + B (1 - b)^2 > m: all but an ellipse about the cell's corner."""

    A: float
    B: float
    m: Budget

    def reach(self, w: FloatArray, level: FloatArray) -> FloatArray:
        A, B = self.A, self.B
        under = 4 * self.m(level) * (A + B) - 4 * A * B * w * w
        return np.where(under >= 0, 2 - ((A - B) * w + np.sqrt(np.maximum(under, 0))) / (A + B), np.inf)

    def normal(self, a: FloatArray, b: FloatArray) -> tuple[FloatArray, FloatArray]:
        return self.A * (1 - a), self.B * (1 - b)


@dataclass(frozen=True)
class Straight(Piece):
    """A a + B b < m."""

    A: float
    B: float
    m: Budget
    straight = True

    def reach(self, w: FloatArray, level: FloatArray) -> FloatArray:
        return (2 * self.m(level) - (self.A - self.B) * w) / (self.A + self.B)

    def normal(self, a: FloatArray, b: FloatArray) -> tuple[FloatArray, FloatArray]:
        return np.full_like(a, self.A), np.full_like(b, self.B)


@dataclass(frozen=True)
class Cosines(Piece):
    """cos(pi a) + cos(pi b) > 2 m."""

    m: Budget

    def reach(self, w: FloatArray, level: FloatArray) -> FloatArray:
        with np.errstate(divide="ignore", invalid="ignore"):
            ratio = self.m(level) / np.cos(0.5 * np.pi * w)
        return 2 / np.pi * np.arccos(np.clip(np.nan_to_num(ratio, nan=0.0), -1, 1))

    def normal(self, a: FloatArray, b: FloatArray) -> tuple[FloatArray, FloatArray]:
        # where the dot is the diamond both vanish at the cell's edge: the diamond's normal holds there
        return np.sin(np.pi * a) + 1e-300, np.sin(np.pi * b) + 1e-300


@dataclass(frozen=True)
class Larger(Piece):
    """max(a, b) < m."""

    m: Budget
    straight = True

    def reach(self, w: FloatArray, level: FloatArray) -> FloatArray:
        return 2 * self.m(level) - np.abs(w)

    def normal(self, a: FloatArray, b: FloatArray) -> tuple[FloatArray, FloatArray]:
        return (a >= b).astype(float), (a < b).astype(float)


@dataclass(frozen=True)
class Smaller(Piece):
    """min(a, b) < m."""

    m: Budget
    straight = True

    def reach(self, w: FloatArray, level: FloatArray) -> FloatArray:
        return 2 * self.m(level) + np.abs(w)

    def normal(self, a: FloatArray, b: FloatArray) -> tuple[FloatArray, FloatArray]:
        return (a < b).astype(float), (a >= b).astype(float)


@dataclass(frozen=True)
class Shape:
    """A spot function as the mechanism sees it.

    `pieces` from the centre outwards, `creases` (A, B, m of A a + B b = m) between them.
    `levels` (full, empty): the levels at which everything and nothing is inked.
    `dot` is where the dot's centre lies in the function's own cell, in cells from its middle;
    `anchor` the same for the place that a screen's origin marks.  `copies` dots stand in a
    cell along each direction.  `slides`: the dot's centre moves along a as the dot grows, its far
    edge staying on the cell's edge.  `births` are the w at which a kink can appear in the middle
    of a smooth stretch, beside 0 and the ends.
    """

    name: str
    pieces: tuple[Piece, ...]
    levels: tuple[float, float]
    creases: tuple[tuple[float, float, float], ...] = ()
    dot: tuple[float, float] = (0.0, 0.0)
    anchor: tuple[float, float] = (0.0, 0.0)
    copies: tuple[int, int] = (1, 1)
    slides: tuple[float, float] = (0.0, 0.0)
    births: tuple[float, ...] = ()

    @property
    def whole(self) -> Ellipse | None:
        """The ellipse whose full figure is stamped, where the shape is one."""
        only = self.pieces[0]
        return only if len(self.pieces) == 1 and isinstance(only, Ellipse) else None


def _less_from_one(s: FloatArray) -> FloatArray:
    return 1 - s


def _more_than_minus_one(s: FloatArray) -> FloatArray:
    return 1 + s


_THREE_QUARTERS = 0.25 / 0.75**2

SHAPES: dict[str, Shape] = {
    shape.name: shape
    for shape in (
        Shape("simpledot", (Ellipse(1, 1, _less_from_one),), (-1, 1)),
        Shape("invertedsimpledot", (CornerEllipse(1, 1, _more_than_minus_one),), (-1, 1), dot=(0.5, 0.5)),
        Shape(
            "doubledot",
            (Cosines(lambda s: s),),
            (-1, 1),
            dot=(0.125, 0.125),
            anchor=(0.125, 0.125),
            copies=(2, 2),
        ),
        Shape(
            "inverteddoubledot",
            (Cosines(lambda s: s),),
            (-1, 1),
            dot=(-0.125, -0.125),
            anchor=(0.125, 0.125),
            copies=(2, 2),
        ),
        Shape("cosinedot", (Cosines(lambda s: s),), (-1, 1)),
        Shape(
            "double",
            (Cosines(lambda s: s),),
            (-1, 1),
            dot=(0.25, 0.125),
            anchor=(0.25, 0.125),
            copies=(1, 2),
        ),
        Shape(
            "inverteddouble",
            (Cosines(lambda s: s),),
            (-1, 1),
            dot=(-0.25, -0.125),
            anchor=(0.25, 0.125),
            copies=(1, 2),
        ),
        Shape("line", (Straight(0, 1, lambda s: -s),), (-1, 0)),
        Shape("linex", (Straight(1, 0, lambda s: (1 - s) / 2),), (-1, 1), slides=(1.0, 0.0)),
        Shape("liney", (Straight(0, 1, lambda s: (1 - s) / 2),), (-1, 1), slides=(0.0, 1.0)),
        Shape(
            "round",
            (Ellipse(1, 1, _less_from_one), CornerEllipse(1, 1, _more_than_minus_one)),
            (-1, 1),
            creases=((1, 1, 1),),
        ),
        Shape(
            "ellipse",
            (
                Ellipse(0.25, _THREE_QUARTERS, _less_from_one),
                Straight(3, 4, lambda s: 3.5 - s),
                CornerEllipse(0.25, _THREE_QUARTERS, _more_than_minus_one),
            ),
            (-1, 1),
            creases=((3, 4, 3), (3, 4, 4)),
            # where an ellipse first touches the crease: (0.5, 0.375) and (0.5, 0.625)
            births=(0.125, -0.125, -0.75, 0.75),
        ),
        Shape("ellipsea", (Ellipse(1, 0.9, _less_from_one),), (-0.9, 1)),
        Shape("invertedellipsea", (CornerEllipse(1, 0.9, _more_than_minus_one),), (-1, 0.9), dot=(0.5, 0.5)),
        Shape("ellipseb", (Ellipse(1, 0.625, lambda s: (1 - s) ** 2),), (1 - 1.625**0.5, 1)),
        Shape("ellipsec", (Ellipse(0.9, 1, _less_from_one),), (-0.9, 1)),
        Shape("invertedellipsec", (CornerEllipse(0.9, 1, _more_than_minus_one),), (-1, 0.9), dot=(0.5, 0.5)),
        Shape("square", (Larger(lambda s: -s),), (-1, 0)),
        Shape("cross", (Smaller(lambda s: -s),), (-1, 0)),
        Shape("rhomboid", (Straight(0.9, 1, lambda s: 1.9 - 2 * s),), (0, 0.95), dot=(0.5, 0.5)),
        Shape(
            "diamond",
            (
                Ellipse(1, 1, _less_from_one),
                Straight(0.85, 1, _less_from_one),
                CornerEllipse(1, 1, _more_than_minus_one),
            ),
            (-1, 1),
            creases=((1, 1, 0.75), (1, 1, 1.23)),
            births=(0.75, -0.75, 0.77, -0.77),
        ),
    )
}


# --- the curve ---------------------------------------------------------------------------

_NOTHING, EDGE_A, EDGE_B = -1, 1000, 1001
"""Labels beside 2 i (piece i) and 2 i + 1 (crease after it): no ink; the cell's edge at a = 1; at b = 1."""


def curve(shape: Shape, w: FloatArray, level: FloatArray) -> tuple[FloatArray, NDArray[np.int64]]:
    """The bounding curve p (n,) at w (n,), levels (n,), and what bounds it there (labels)."""
    low = np.abs(w)
    edge = 2 - low
    p, label = low.copy(), np.full(w.shape, _NOTHING)
    edge_label = np.where(w >= 0, EDGE_A, EDGE_B)
    crease = low
    for i, piece in enumerate(shape.pieces):
        lo = np.clip(crease, low, edge)
        if i < len(shape.creases):
            A, B, m = shape.creases[i]
            crease = (2 * m - (A - B) * w) / (A + B)
            hi, hi_label = np.minimum(crease, edge), np.where(crease < edge, 2 * i + 1, edge_label)
        else:
            hi, hi_label = edge, edge_label
        root = piece.reach(w, level)
        taken = (root > lo + _CLOSE) & (hi > lo + _CLOSE)
        p = np.where(taken, np.minimum(root, hi), p)
        label = np.where(taken, np.where(root >= hi - _CLOSE, hi_label, 2 * i), label)
    return p, label


def normal_of(shape: Shape, label: int, a: FloatArray, b: FloatArray) -> tuple[FloatArray, FloatArray]:
    if label == EDGE_A:
        return np.ones_like(a), np.zeros_like(a)
    if label == EDGE_B:
        return np.zeros_like(a), np.ones_like(a)
    if label % 2:
        A, B, _ = shape.creases[label // 2]
        return np.full_like(a, A), np.full_like(a, B)
    return shape.pieces[label // 2].normal(a, b)


@dataclass(frozen=True)
class Stretches:
    """Smooth stretches of many curves as columns: which level (index), from w to w, label."""

    levels: FloatArray
    of: NDArray[np.int64]
    start: FloatArray
    stop: FloatArray
    label: NDArray[np.int64]


@cache
def _first_looks(births: tuple[float, ...]) -> FloatArray:
    """w from -1 to 1, crowding towards every place where a kink can be born."""
    near = np.concatenate([np.geomspace(1e-13, 0.3, 40), np.linspace(0.35, 1, 14)])
    centres = (0.0, -1.0, 1.0, *births)
    w = np.concatenate([np.array(centres)] + [c + sign * near for c in centres for sign in (-1, 1)])
    return np.unique(w[(w >= -1) & (w <= 1)])


def stretches(shape: Shape, levels: FloatArray) -> Stretches:
    """The smooth stretches of the curve at each of the levels (n,)."""
    levels = np.atleast_1d(np.asarray(levels, dtype=float))
    looks = _first_looks(shape.births)
    w = np.broadcast_to(looks, (len(levels), len(looks)))
    of = np.broadcast_to(np.arange(len(levels))[:, None], w.shape)
    _, label = curve(shape, w, levels[:, None])
    step = np.linspace(0, 1, 49)[None, :]
    change = label[:, :-1] != label[:, 1:]
    lo, hi, who = w[:, :-1][change], w[:, 1:][change], of[:, :-1][change]
    while np.any(hi - lo > _NARROW):
        fine = lo[:, None] + (hi - lo)[:, None] * step
        fine[:, -1] = hi
        _, fine_label = curve(shape, fine, levels[who, None])
        moved = fine_label[:, :-1] != fine_label[:, 1:]
        # one or two changes are kinks; more are the last digits flickering where two bounds touch
        noisy = moved.sum(axis=1) > 2
        if noisy.any():
            first = np.argmax(moved[noisy], axis=1)
            moved[noisy] = np.arange(moved.shape[1]) == first[:, None]
        lo, hi, who = fine[:, :-1][moved], fine[:, 1:][moved], who[np.nonzero(moved)[0]]
    return _between(shape, levels, who, 0.5 * (lo + hi))


def _between(shape: Shape, levels: FloatArray, who: NDArray[np.int64], kinks: FloatArray) -> Stretches:
    """Stretches between kinks, and between them and -1, 0 (where |w| has its kink) and 1."""
    n = len(levels)
    fixed = np.array([-1.0, 0.0, 1.0])
    of = np.concatenate([np.repeat(np.arange(n), 3), who])
    at = np.concatenate([np.tile(fixed, n), kinks])
    order = np.lexsort((at, of))
    of, at = of[order], at[order]
    pair = (of[:-1] == of[1:]) & (at[1:] - at[:-1] > 1e-11)
    start, stop, of = at[:-1][pair], at[1:][pair], of[:-1][pair]
    _, label = curve(shape, 0.5 * (start + stop), levels[of])
    inked = label != _NOTHING
    return Stretches(levels, of[inked], start[inked], stop[inked], label[inked])


# --- area ---------------------------------------------------------------------------------


@cache
def _gauss(n: int) -> tuple[FloatArray, FloatArray]:
    """Nodes and weights on 0..1."""
    x, weight = np.polynomial.legendre.leggauss(n)
    return 0.5 * (x + 1), 0.5 * weight


@cache
def _last_terms(n: int) -> FloatArray:
    """(n, 3): values at n Gauss nodes to the last three terms of their Legendre series."""
    x, _ = _gauss(n)
    to_series = np.linalg.inv(np.polynomial.legendre.legvander(2 * x - 1, n - 1))
    return np.array(to_series[-3:].T, dtype=float)


def _slope(shape: Shape, label: NDArray[np.int64], w: FloatArray, p: FloatArray) -> FloatArray:
    """dp/dw (n, m) at points of the curve, the rows lying on stretches with these labels (n,)."""
    a, b = 0.5 * (p + w), 0.5 * (p - w)
    out = np.empty_like(p)
    for which in np.unique(label):
        rows = label == which
        na, nb = normal_of(shape, int(which), a[rows], b[rows])
        out[rows] = (nb - na) / (na + nb)
    return out


def _steady(shape: Shape, found: Stretches, nodes: int, *, slopes: bool = False) -> Stretches:
    """Stretches split until a polynomial of that many nodes holds the curve (or its slope) to the last digits."""
    x, _ = _gauss(nodes)
    done: list[tuple[NDArray[np.int64], FloatArray, FloatArray, NDArray[np.int64]]] = []
    of, start, stop, label = found.of, found.start, found.stop, found.label
    for _ in range(60):
        w = start[:, None] + (stop - start)[:, None] * x
        p, _ = curve(shape, w, found.levels[of][:, None])
        held = _slope(shape, label, w, p) if slopes else p
        rough = np.abs(held @ _last_terms(nodes)).max(axis=1) * (stop - start) > _LAST_DIGITS
        rough &= stop - start > 1e-13
        done.append((of[~rough], start[~rough], stop[~rough], label[~rough]))
        if not rough.any():
            break
        middle = 0.5 * (start + stop)[rough]
        of, label = np.tile(of[rough], 2), np.tile(label[rough], 2)
        start, stop = np.concatenate([start[rough], middle]), np.concatenate([middle, stop[rough]])
    columns = [np.concatenate(part) for part in zip(*done, strict=True)]
    return Stretches(found.levels, columns[0], columns[1], columns[2], columns[3])


def areas(shape: Shape, levels: FloatArray) -> FloatArray:
    """Share of the cell inked above each level (n,), good to 1e-12."""
    levels = np.atleast_1d(np.asarray(levels, dtype=float))
    found = _steady(shape, stretches(shape, levels), 16)
    x, weight = _gauss(16)
    width = found.stop - found.start
    w = found.start[:, None] + width[:, None] * x
    p, _ = curve(shape, w, levels[found.of][:, None])
    strip = ((p - np.abs(w)) @ weight) * width / 2
    return np.bincount(found.of, strip, minlength=len(levels)).astype(float)


@cache
def _area_table(name: str) -> tuple[FloatArray, FloatArray]:
    """(levels (n,), areas (n,)) from empty to full, areas rising."""
    shape = SHAPES[name]
    full, empty = shape.levels
    # closer towards both ends, where dots and holes grow with the root of the level
    levels = empty + (full - empty) * np.sin(np.linspace(0.0, 0.5 * np.pi, 129)) ** 2
    inked = areas(shape, levels)
    inked[0], inked[-1] = 0.0, 1.0
    return levels, np.maximum.accumulate(inked)


@lru_cache(maxsize=4096)
def level_of(name: str, tone: float) -> float:
    """The level that inks one tone between 0 and 1."""
    return float(levels_of(SHAPES[name], np.array([tone]))[0])


def levels_of(shape: Shape, tones: FloatArray) -> FloatArray:
    """The level (n,) that inks each tone (n,), 0 < tone < 1, to 1e-13 of the tone.

    Source: Chandrupatla's bracketed root search, all tones at once: Chandrupatla 1997,
    Advances in Engineering Software 28, 145-149 (from memory).
    """
    tones = np.atleast_1d(np.asarray(tones, dtype=float))
    known, inked = _area_table(shape.name)
    above = np.clip(np.searchsorted(inked, tones), 1, len(known) - 1)
    a, b = known[above - 1], known[above]
    fa, fb = inked[above - 1] - tones, inked[above] - tones
    c, fc = a.copy(), fa.copy()
    t = np.clip(fa / (fa - fb), 1e-9, 1 - 1e-9)
    for _ in range(80):
        at = a + t * (b - a)
        f = areas(shape, at) - tones
        same = np.sign(f) == np.sign(fa)
        c, fc = np.where(same, a, b), np.where(same, fa, fb)
        b, fb = np.where(same, b, a), np.where(same, fb, fa)
        a, fa = at, f
        closer = np.abs(fa) < np.abs(fb)
        best, fbest = np.where(closer, a, b), np.where(closer, fa, fb)
        if np.all((np.abs(fbest) < 2e-14) | (np.abs(b - a) < 1e-15)):
            break
        with np.errstate(divide="ignore", invalid="ignore"):
            xi, phi = (a - b) / (c - b), (fa - fb) / (fc - fb)
            inverse = (phi**2 < xi) & ((1 - phi) ** 2 < 1 - xi)
            quadratic = fa / (fb - fa) * fc / (fb - fc) + (c - a) / (b - a) * fa / (fc - fa) * fb / (fc - fb)
        t = np.where(inverse & np.isfinite(quadratic), quadratic, 0.5)
        t = np.clip(t, 1e-9, 1 - 1e-9)
    return best


# --- Fourier coefficients and edge length ---------------------------------------------------


@dataclass(frozen=True)
class _Walk:
    """Quadrature points of many curves, each from (., 0) to (0, .): rows of panels, `of` says of which level.

    `a`, `b` are places, `da`, `db` steps with the weights in them; `edge` marks panels that
    run along the cell's edge, which is no edge of the ink.
    """

    of: NDArray[np.int64]
    a: FloatArray
    b: FloatArray
    da: FloatArray
    db: FloatArray
    edge: BoolArray


def _walk(shape: Shape, levels: FloatArray, *, longest: float = 2.0) -> _Walk:
    """Panels of 16 Gauss nodes, none longer than `longest` half cells."""
    nodes = 16
    found = _steady(shape, stretches(shape, levels), nodes, slopes=True)
    pieces = np.maximum(1, np.ceil((found.stop - found.start) / longest)).astype(np.int64)
    index = np.repeat(np.arange(len(pieces)), pieces)
    part = np.arange(len(index)) - np.repeat(np.cumsum(pieces) - pieces, pieces)
    width = ((found.stop - found.start) / pieces)[index]
    x, weight = _gauss(nodes)
    w = (found.start[index] + part * width)[:, None] + width[:, None] * x
    of, label = found.of[index], found.label[index]
    p, _ = curve(shape, w, levels[of][:, None])
    a, b = 0.5 * (p + w), 0.5 * (p - w)
    slope = _slope(shape, label, w, p)
    dw = -(width[:, None] * weight)  # along the outline, counter-clockwise, w falls
    return _Walk(of, a, b, 0.5 * (slope + 1) * dw, 0.5 * (slope - 1) * dw, label >= EDGE_A)


@lru_cache(maxsize=512)
def _series(name: str, tone: float, reach: int) -> FloatArray:
    shape = SHAPES[name]
    walk = _walk(shape, np.array([level_of(name, tone)]), longest=8.0 / max(reach, 1))
    a, b, db = walk.a.ravel(), walk.b.ravel(), walk.db.ravel()
    k = np.arange(1, reach + 1)
    # Green: the quarter cell's integral of cos cos is a line integral of sin cos
    along = np.concatenate([a[None, :], np.sin(np.pi * k[:, None] * a) / (np.pi * k[:, None])])
    across = np.concatenate([np.ones((1, len(b))), np.cos(np.pi * k[:, None] * b)])
    out: FloatArray = (along * db) @ across.T
    out.setflags(write=False)
    return out


def series(shape: Shape, tone: float, *, reach: int) -> FloatArray:
    """Coefficients (reach + 1, reach + 1) of one dot in its own cell, about its centre.

    Orders 0 and up; they are even in both directions.

    Errors: below 1e-12 for reach up to 64.
    """
    if tone <= 0.0 or tone >= 1.0:
        out = np.zeros((reach + 1, reach + 1))
        out[0, 0] = min(max(tone, 0.0), 1.0)
        return out
    return _series(shape.name, float(tone), int(reach))


def edge_lengths(shape: Shape, tones: FloatArray, *, sides: tuple[float, float]) -> FloatArray:
    """Length (n,) of inked edge in one cell of the given sides, at each tone (n,) between 0 and 1."""
    if len(tones) == 1:
        return np.array([_edge_length(shape.name, float(tones[0]), sides)])
    return _edges_at(shape, levels_of(shape, tones), sides)


@lru_cache(maxsize=4096)
def _edge_length(name: str, tone: float, sides: tuple[float, float]) -> float:
    """One tone, kept: the screens of a job share their tones and often their ruling."""
    return float(_edges_at(SHAPES[name], np.array([level_of(name, tone)]), sides)[0])


def _edges_at(shape: Shape, levels: FloatArray, sides: tuple[float, float]) -> FloatArray:
    walk = _walk(shape, levels)
    steps = np.hypot(walk.da * sides[0], walk.db * sides[1]).sum(axis=1)
    # a quadrant's half cells are sides / 2, and there are four quadrants
    lengths = np.bincount(walk.of[~walk.edge], steps[~walk.edge], minlength=len(levels))
    return np.asarray(2.0 * lengths, dtype=float)


@dataclass(frozen=True)
class Extent:
    """How far one dot reaches, in half cells (1 is from its centre to its cell's edge).

    `along`, `across`: on its axes.  `edge` (n, 2) are points of its edge, the corners among them.
    """

    along: float
    across: float
    edge: FloatArray


@lru_cache(maxsize=4096)
def extent(name: str, tone: float) -> Extent:
    """The extent of a shape at a tone between 0 and 1."""
    shape = SHAPES[name]
    level = np.array([level_of(name, tone)])
    found = stretches(shape, level)
    share = np.linspace(0, 1, 65)
    w = found.start[:, None] + (found.stop - found.start)[:, None] * share
    p, _ = curve(shape, w, np.full_like(w, level[0]))
    a, b = 0.5 * (p + w), 0.5 * (p - w)
    free = (found.label != EDGE_A) & (found.label != EDGE_B)
    return Extent(
        along=float(a.max()),
        across=float(b.max()),
        edge=np.stack([a[free].ravel(), b[free].ravel()], axis=1),
    )
