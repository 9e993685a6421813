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
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from patterngen.model.area import BoolArray
from patterngen.model.lattice import FloatArray
from patterngen.model.shapes import Contour

Budget = Callable[[FloatArray], FloatArray]
"""How far a piece reaches at a level: the m of its inequality."""

_CLOSE = 1e-12
_NARROW = 1e-15


class Piece:
    """One smooth piece of a spot function on the quadrant."""

    straight = False

    def reach(self, w: FloatArray, level: FloatArray) -> FloatArray:
        """Largest p (n,) at w (n,) whose value still lies above the level; -inf or inf where it never or always does."""
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
        Shape("doubledot", (Cosines(lambda s: s),), (-1, 1), dot=(0.125, 0.125), anchor=(0.125, 0.125), copies=(2, 2)),
        Shape(
            "inverteddoubledot", (Cosines(lambda s: s),), (-1, 1),
            dot=(-0.125, -0.125), anchor=(0.125, 0.125), copies=(2, 2),
        ),
        Shape("cosinedot", (Cosines(lambda s: s),), (-1, 1)),
        Shape("double", (Cosines(lambda s: s),), (-1, 1), dot=(0.25, 0.125), anchor=(0.25, 0.125), copies=(1, 2)),
        Shape(
            "inverteddouble", (Cosines(lambda s: s),), (-1, 1),
            dot=(-0.25, -0.125), anchor=(0.25, 0.125), copies=(1, 2),
        ),
        Shape("line", (Straight(0, 1, lambda s: -s),), (-1, 0)),
        Shape("linex", (Straight(1, 0, lambda s: (1 - s) / 2),), (-1, 1), slides=(1.0, 0.0)),
        Shape("liney", (Straight(0, 1, lambda s: (1 - s) / 2),), (-1, 1), slides=(0.0, 1.0)),
        Shape(
            "round",
            (Ellipse(1, 1, _less_from_one), CornerEllipse(1, 1, _more_than_minus_one)), (-1, 1),
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

_NOTHING, _EDGE_A, _EDGE_B = -1, 1000, 1001
"""Labels beside 2 i (piece i) and 2 i + 1 (crease after piece i): no ink; the cell's edge at a = 1; at b = 1."""


def curve(shape: Shape, w: FloatArray, level: FloatArray) -> tuple[FloatArray, NDArray[np.int64]]:
    """The bounding curve p (n,) at w (n,), levels (n,), and what bounds it there (labels)."""
    low = np.abs(w)
    edge = 2 - low
    p, label = low.copy(), np.full(w.shape, _NOTHING)
    edge_label = np.where(w >= 0, _EDGE_A, _EDGE_B)
    for i, piece in enumerate(shape.pieces):
        lo = low if i == 0 else np.clip(crease, low, edge)  # noqa: F821 - set in the round before
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


def _normal(shape: Shape, label: int, a: FloatArray, b: FloatArray) -> tuple[FloatArray, FloatArray]:
    if label == _EDGE_A:
        return np.ones_like(a), np.zeros_like(a)
    if label == _EDGE_B:
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


def _first_looks(shape: Shape) -> FloatArray:
    """w from -1 to 1, crowding towards every place where a kink can be born."""
    near = np.concatenate([np.geomspace(1e-13, 0.3, 40), np.linspace(0.35, 1, 14)])
    centres = (0.0, -1.0, 1.0, *shape.births)
    w = np.concatenate([np.array(centres)] + [c + sign * near for c in centres for sign in (-1, 1)])
    return np.unique(w[(w >= -1) & (w <= 1)])


def stretches(shape: Shape, levels: FloatArray) -> Stretches:
    """The smooth stretches of the curve at each of the levels (n,)."""
    levels = np.atleast_1d(np.asarray(levels, dtype=float))
    looks = _first_looks(shape)
    w = np.broadcast_to(looks, (len(levels), len(looks)))
    of = np.broadcast_to(np.arange(len(levels))[:, None], w.shape)
    _, label = curve(shape, w, levels[:, None])
    step = np.linspace(0, 1, 18)[None, :]
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


@lru_cache(maxsize=8)
def _gauss(n: int) -> tuple[FloatArray, FloatArray]:
    """Nodes and weights on 0..1."""
    x, weight = np.polynomial.legendre.leggauss(n)
    return 0.5 * (x + 1), 0.5 * weight


def _steady(shape: Shape, found: Stretches, nodes: int) -> Stretches:
    """Stretches split until a polynomial of that many nodes holds each to the last digits."""
    x, _ = _gauss(nodes)
    fit = np.polynomial.legendre.legvander(2 * x - 1, nodes - 1)
    to_series = np.linalg.inv(fit)
    done: list[tuple[NDArray[np.int64], FloatArray, FloatArray, NDArray[np.int64]]] = []
    of, start, stop, label = found.of, found.start, found.stop, found.label
    for _ in range(60):
        w = start[:, None] + (stop - start)[:, None] * x
        p, _ = curve(shape, w, found.levels[of][:, None])
        series = p @ to_series.T
        rough = np.abs(series[:, -3:]).max(axis=1) * (stop - start) > 1e-15
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
    return np.bincount(found.of, strip, minlength=len(levels))


def levels_of(shape: Shape, tones: FloatArray) -> FloatArray:
    """The level (n,) that inks each tone (n,), 0 < tone < 1: Chandrupatla's bracketed root search, all at once.

    Source: Chandrupatla 1997, Advances in Engineering Software 28, 145-149 (from memory).
    """
    tones = np.atleast_1d(np.asarray(tones, dtype=float))
    full, empty = shape.levels
    a, b = np.full(tones.shape, empty), np.full(tones.shape, full)
    fa, fb = -tones, 1.0 - tones
    c, fc = a.copy(), fa.copy()
    t = np.full(tones.shape, 0.5)
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
    found = _steady(shape, stretches(shape, levels), nodes)
    pieces = np.maximum(1, np.ceil((found.stop - found.start) / longest)).astype(np.int64)
    index = np.repeat(np.arange(len(pieces)), pieces)
    part = np.arange(len(index)) - np.repeat(np.cumsum(pieces) - pieces, pieces)
    width = ((found.stop - found.start) / pieces)[index]
    x, weight = _gauss(nodes)
    w = (found.start[index] + part * width)[:, None] + width[:, None] * x
    of, label = found.of[index], found.label[index]
    p, _ = curve(shape, w, levels[of][:, None])
    a, b = 0.5 * (p + w), 0.5 * (p - w)
    slope = np.empty_like(p)
    for which in np.unique(label):
        rows = label == which
        na, nb = _normal(shape, int(which), a[rows], b[rows])
        slope[rows] = (nb - na) / (na + nb)
    dw = -(width[:, None] * weight)  # along the outline, counter-clockwise, w falls
    return _Walk(of, a, b, 0.5 * (slope + 1) * dw, 0.5 * (slope - 1) * dw, label >= _EDGE_A)


@lru_cache(maxsize=512)
def _series(name: str, tone: float, reach: int) -> FloatArray:
    shape = SHAPES[name]
    walk = _walk(shape, levels_of(shape, np.array([tone])), longest=8.0 / max(reach, 1))
    a, b, db = walk.a.ravel(), walk.b.ravel(), walk.db.ravel()
    k = np.arange(1, reach + 1)
    # Green: the quarter cell's integral of cos cos is a line integral of sin cos
    along = np.concatenate([a[None, :], np.sin(np.pi * k[:, None] * a) / (np.pi * k[:, None])])
    across = np.concatenate([np.ones((1, len(b))), np.cos(np.pi * k[:, None] * b)])
    out: FloatArray = (along * db) @ across.T
    out.setflags(write=False)
    return out


def series(shape: Shape, tone: float, *, reach: int) -> FloatArray:
    """Coefficients (reach + 1, reach + 1) of one dot in its own cell, about its centre, orders >= 0 (even in both).

    Errors: below 1e-12 for reach up to 64.
    """
    if tone <= 0.0 or tone >= 1.0:
        out = np.zeros((reach + 1, reach + 1))
        out[0, 0] = min(max(tone, 0.0), 1.0)
        return out
    return _series(shape.name, float(tone), int(reach))


def edge_lengths(shape: Shape, tones: FloatArray, *, sides: tuple[float, float]) -> FloatArray:
    """Length (n,) of inked edge in one cell of the given sides, at each tone (n,) between 0 and 1."""
    walk = _walk(shape, levels_of(shape, tones))
    steps = np.hypot(walk.da * sides[0], walk.db * sides[1]).sum(axis=1)
    # a quadrant's half cells are sides / 2, and there are four quadrants
    return 2 * np.bincount(walk.of[~walk.edge], steps[~walk.edge], minlength=len(tones))


@dataclass(frozen=True)
class Extent:
    """How far one dot reaches, in half cells (1 is from its centre to its cell's edge).

    `along`, `across`: on its axes.  `neck_a`, `neck_b`: half the width with which it crosses the
    cell's edge at a = 1 and b = 1 (0 if it does not).  `edge` (n, 2) are points of its edge,
    the corners among them.
    """

    along: float
    across: float
    neck_a: float
    neck_b: float
    edge: FloatArray


@lru_cache(maxsize=512)
def extent(name: str, tone: float) -> Extent:
    """The extent of a shape at a tone between 0 and 1."""
    shape = SHAPES[name]
    level = levels_of(shape, np.array([tone]))
    found = stretches(shape, level)
    share = np.linspace(0, 1, 65)
    w = found.start[:, None] + (found.stop - found.start)[:, None] * share
    p, _ = curve(shape, w, np.full_like(w, level[0]))
    a, b = 0.5 * (p + w), 0.5 * (p - w)
    on_a, on_b = found.label == _EDGE_A, found.label == _EDGE_B
    free = ~(on_a | on_b)
    return Extent(
        along=float(a.max()),
        across=float(b.max()),
        neck_a=float(b[on_a].max()) if on_a.any() else 0.0,
        neck_b=float(a[on_b].max()) if on_b.any() else 0.0,
        edge=np.stack([a[free].ravel(), b[free].ravel()], axis=1),
    )


# --- outlines -------------------------------------------------------------------------------

_BULGE = 0.06
"""Half cells that a dot reaches into its neighbour where both are inked, so that no seam shows between them."""

_OFF_CURVE = 2e-5
"""Half cells (1e-5 of the pitch) that a Bezier outline may leave the curve."""


def outlines(shape: Shape, levels: FloatArray) -> list[Contour]:
    """The dot's outline at each level (n,), in cells about its centre, within 1e-5 cells of the true curve.

    Where the dot crosses the edge of its cell the outline bulges a little into the neighbour,
    tapering, inside what the neighbour inks itself at the same tone; so neighbours overlap
    and the union of all is exactly what is inked.
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
        _around(first[lo:hi], rest[lo:hi], straight[lo:hi], label[lo:hi])
        for lo, hi in zip(cuts[:-1], cuts[1:], strict=True)
    ]


def full_cell() -> Contour:
    """The whole cell, a little over its edges."""
    r = 0.5 * (1 + _BULGE)
    corners = np.array([[r, -r], [r, r], [-r, r], [-r, -r]])
    return _polygon(corners)


def _polygon(corners: FloatArray) -> Contour:
    ends = np.roll(corners, -1, axis=0)
    bends = np.stack([corners + (ends - corners) / 3, corners + (ends - corners) * 2 / 3, ends], axis=1)
    return Contour(corners[0], bends, np.ones(len(corners), dtype=bool))


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
    known = label < _EDGE_A
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
        na, nb = _normal(shape, int(label), ends[:, rows, 0], ends[:, rows, 1])
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


def _around(first: FloatArray, rest: FloatArray, straight: BoolArray, label: NDArray[np.int64]) -> Contour:
    """One quadrant's cubics, mirrored into a closed outline in cells, with its bulges."""
    starts = np.concatenate([first, rest[-1:, 2]])
    on_a, on_b = label == _EDGE_A, label == _EDGE_B
    inner = ~(on_a | on_b)
    if not inner.any():
        return full_cell()
    lead, tail = int(on_a.sum()), int(on_b.sum())
    pieces = [rest[inner]]
    flags = [straight[inner]]
    begin = starts[0]
    if lead:
        reach = float(starts[lead][1])
        taper = min(_BULGE, 0.5 * reach)
        begin = np.array([1 + _BULGE, 0.0])
        path = np.array([begin, [1 + _BULGE, reach - taper], starts[lead]])
        pieces.insert(0, _lines(path))
        flags.insert(0, np.ones(2, dtype=bool))
    if tail:
        corner = starts[len(starts) - 1 - tail]
        reach = float(corner[0])
        taper = min(_BULGE, 0.5 * reach)
        path = np.array([corner, [reach - taper, 1 + _BULGE], [0.0, 1 + _BULGE]])
        pieces.append(_lines(path))
        flags.append(np.ones(2, dtype=bool))
    quarter, flag = np.concatenate(pieces), np.concatenate(flags)
    nodes = np.concatenate([begin[None, :], quarter[:, 2]])
    back = np.stack([quarter[:, 1], quarter[:, 0], nodes[:-1]], axis=1)[::-1]
    left, down = np.array([-1.0, 1.0]), np.array([1.0, -1.0])
    bends = np.concatenate([quarter, back * left, -quarter, back * down])
    return _joined(Contour(begin * 0.5, bends * 0.5, np.concatenate([flag, flag[::-1], flag, flag[::-1]])))


def _lines(path: FloatArray) -> FloatArray:
    a, b = path[:-1], path[1:]
    return np.stack([a + (b - a) / 3, a + (b - a) * 2 / 3, b], axis=1)


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
    bends, straight, keep = (np.roll(x, -first, axis=0) for x in (contour.bends, contour.straight, ~on))
    bends, straight = bends[keep].copy(), straight[keep]
    start = bends[-1, 2]
    here = np.concatenate([start[None, :], bends[:-1, 2]])
    chord = bends[:, 2] - here
    bends[straight, 0] = (here + chord / 3)[straight]
    bends[straight, 1] = (here + chord * 2 / 3)[straight]
    return Contour(start, bends, straight)
