"""Screen angles that the preset leaves open."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from patterngen.model.job import Ink, Job, ScreenRequest
from patterngen.rules import _limits
from patterngen.rules._angles import apart_deg, lightest_ink
from patterngen.rules._examples import Example, dots, preset
from patterngen.rules._settle import has_lattice, is_open, settle
from patterngen.rules._shapes import AXIS_SHAPES
from patterngen.rules._words import degrees, rounded
from patterngen.units import plain

SUMMARY = "angles left open are the usual ones: the dominant ink at 45, the lightest beside its neighbours"
REASON = """Drawing inks stand 30 degrees apart, and only three do so within the 90 degrees after which
dots repeat; the lightest ink, whose beats have the least contrast, goes between two of them at 15. The
most important ink takes 45, the direction that the eye notices least. Dots with an axis repeat every 180
degrees and stand 60 apart. A fifth ink finds no place: it takes the angle of the ink it is seldom
printed with, which is a stopgap until angles are searched for."""
DERIVES = """`angle` of every screen with a lattice, one angle an ink. The dominant ink is the darkest,
unless another carries twice as much (mean tone times darkness on this paper); it gets 45 (135 for dots
with an axis). Then the others in the order of the ink tables: 15, then 75; the lightest ink of four 0.
Two inks stand at 45 and 75, one at 45. Where angles are given, the whole set is turned to fit them, and
where it does not fit, each open ink goes where it stands furthest from the others."""
SOURCES = (
    "trade-classic-angles",
    "din-16547",
    "trade-thirty-degrees",
    "trade-axis-dots",
    "trade-one-colour-forty-five",
    "trade-extra-inks",
    "trade-expanded-gamut",
    "trade-many-angles",
)
LIMITS = ("angle_apart", "angle_apart_light", "angle_apart_axis")
AFTER = ("dot-shape",)

_BY = "usual-angles"
_OUTWEIGHS = 2.0
_GREY_CHROMA = 15.0
_FIT_DEG = 0.5
_OPPOSITE = -0.7


def _open(ink: str, **keys: object) -> dict[str, object]:
    return dots(ink, angle=None, **keys)


_FOUR = tuple(_open(ink) for ink in ("Cyan", "Magenta", "Yellow", "Black"))
_SEVEN = tuple(
    _open(ink, tone="20 %") for ink in ("Cyan", "Magenta", "Yellow", "Black", "Orange", "Green", "Violet")
)


def _angles(**angles: str) -> dict[str, str]:
    return {f"screen.{name}.angle": f"{angle} deg" for name, angle in angles.items()}


EXAMPLES: tuple[Example, ...] = (
    (preset(_open("Black")), _angles(black="45")),
    (preset(_open("Orange"), _open("Black")), _angles(orange="75", black="45")),
    (preset(*_FOUR[:3]), _angles(cyan="15", magenta="45", yellow="75")),
    (preset(*_FOUR), _angles(cyan="15", magenta="75", yellow="0", black="45")),
    (
        preset(*(_open(ink, shape="ellipse") for ink in ("Cyan", "Magenta", "Yellow", "Black"))),
        _angles(cyan="15", magenta="75", yellow="0", black="135"),
    ),
    (
        preset(
            _open("Cyan", tone="5 %"),
            _open("Magenta", tone="70 %"),
            _open("Yellow", tone="60 %"),
            _open("Black", tone="3 %"),
        ),
        _angles(cyan="15", magenta="45", yellow="0", black="75"),
    ),
    (
        preset(*_SEVEN),
        _angles(cyan="15", magenta="75", yellow="0", black="45", orange="15", green="75", violet="45"),
    ),
    (
        preset(
            dots("Cyan", angle="22.5 deg"), _open("Magenta"), _open("Yellow"), dots("Black", angle="52.5 deg")
        ),
        _angles(magenta="82.5", yellow="7.5"),
    ),
)


@dataclass(frozen=True, slots=True)
class _Plan:
    """What the choice needs to know: inks in their order, who is who, distances wanted."""

    inks: tuple[Ink, ...]
    dominant: str
    lightest: str | None
    slots: tuple[float, ...]
    repeat_deg: float
    apart_deg: float
    apart_light_deg: float
    never: frozenset[frozenset[str]]

    def wanted(self, one: str, other: str) -> float:
        return self.apart_light_deg if self.lightest in (one, other) else self.apart_deg

    def room(self, ink: str, angle_deg: float, taken: Mapping[str, tuple[float, ...]]) -> float:
        """By how much the nearest ink is further off than it must be (negative: too near)."""
        gaps = [
            apart_deg(angle_deg, there, repeat_deg=self.repeat_deg) - self.wanted(ink, other)
            for other, angles in taken.items()
            if other != ink and frozenset((ink, other)) not in self.never
            for there in angles
        ]
        return min(gaps, default=math.inf)


def derive(job: Job) -> Job:
    """One angle for every ink whose screens leave it open."""
    lattices = [screen for screen in job.screens if has_lattice(screen)]
    open_screens = [s for s in lattices if is_open(s, "angle", s.angle_deg)]
    if not open_screens:
        return job
    plan = _plan(job, lattices)
    taken: dict[str, tuple[float, ...]] = {}
    for screen in lattices:
        if screen.angle_deg is not None:
            taken[screen.ink] = (*taken.get(screen.ink, ()), screen.angle_deg)
    chosen: dict[str, tuple[float, str]] = {}
    slots = _turned(plan, [angle for angles in taken.values() for angle in angles])
    waiting = {screen.ink for screen in open_screens}
    for name in _order(plan):
        if name not in waiting:
            continue
        if name in taken:
            chosen[name] = (taken[name][0], f"The other screens of {name} stand at this angle.")
            continue
        chosen[name] = _place(plan, name, slots, taken)
        taken[name] = (chosen[name][0],)
    for screen in open_screens:
        angle, because = chosen[screen.ink]
        job = settle(
            job,
            screen,
            "angle_deg",
            value=angle,
            shown=f"{plain(angle)} deg",
            key="angle",
            by=_BY,
            because=because,
        )
    return job


def _plan(job: Job, lattices: list[ScreenRequest]) -> _Plan:
    limits = _limits.in_force(job)
    names = {screen.ink for screen in lattices}
    inks = tuple(ink for ink in job.inks if ink.name in names)
    axis = any(screen.kind == "dots" and screen.shape in AXIS_SHAPES for screen in lattices)
    weight = {ink.name: _weight(job, ink, lattices) for ink in inks}
    darkest = min(inks, key=lambda ink: ink.lab[0]).name
    heaviest = max(inks, key=lambda ink: weight[ink.name]).name
    dominant = heaviest if weight[heaviest] >= _OUTWEIGHS * weight[darkest] else darkest
    lightest = lightest_ink(job) if len(inks) > 3 else None
    if dominant == lightest:
        lightest = None
    return _Plan(
        inks=inks,
        dominant=dominant,
        lightest=lightest,
        slots=(135.0, 15.0, 75.0, 0.0) if axis else (45.0, 15.0, 75.0, 0.0),
        repeat_deg=180.0 if axis else 90.0,
        apart_deg=limits["angle_apart_axis" if axis else "angle_apart"].value,
        apart_light_deg=limits["angle_apart_light"].value,
        never=frozenset(overprint.inks for overprint in job.overprints if overprint.never),
    )


def _weight(job: Job, ink: Ink, lattices: Iterable[ScreenRequest]) -> float:
    """Mean tone times darkness against the paper, summed over the ink's screens."""
    dark = max(job.paper_lab[0] - ink.lab[0], 0.0) / 100.0
    return dark * sum(_mean_tone(screen) for screen in lattices if screen.ink == ink.name)


def _mean_tone(screen: ScreenRequest) -> float:
    tone = screen.tone
    if tone.constant is not None:
        return tone.constant
    return float(tone.values.mean()) if tone.values is not None else 0.0


def _order(plan: _Plan) -> list[str]:
    """Who chooses first: the dominant ink, then the tables' order, the lightest of four last of them."""
    names = [ink.name for ink in plan.inks]
    first = [plan.dominant]
    middle = [name for name in names if name not in (plan.dominant, plan.lightest)]
    last = [plan.lightest] if plan.lightest is not None else []
    return [*first, *middle[:2], *last, *middle[2:]]


def _turned(plan: _Plan, given: list[float]) -> tuple[float, ...]:
    """The slots, turned as a whole so that as many given angles as possible stand on one (least turn of "
    "equals)."""
    turns = {0.0}
    for angle in given:
        turns |= {_folded(angle - slot, plan.repeat_deg) for slot in plan.slots}

    def worth(turn: float) -> tuple[int, float, float]:
        on = sum(
            any(apart_deg(angle, slot + turn, repeat_deg=plan.repeat_deg) <= _FIT_DEG for slot in plan.slots)
            for angle in given
        )
        return (-on, abs(turn), turn)

    turn = min(turns, key=worth)
    return tuple((slot + turn) % plan.repeat_deg if turn else slot for slot in plan.slots)


def _folded(angle_deg: float, repeat_deg: float) -> float:
    """An angle as the smallest turn that amounts to the same."""
    return round((angle_deg + repeat_deg / 2) % repeat_deg - repeat_deg / 2, 6)


def _place(
    plan: _Plan, ink: str, slots: tuple[float, ...], taken: Mapping[str, tuple[float, ...]]
) -> tuple[float, str]:
    """Angle and reason for one ink."""
    order = slots if ink != plan.lightest else slots[::-1]
    if ink not in (plan.dominant, plan.lightest):
        # the dominant ink's slot is left to it, also while it waits
        order = (
            (*slots[1:3], slots[0], slots[3])
            if len(plan.inks) != 2
            else (slots[2], slots[1], slots[0], slots[3])
        )
    for angle in order:
        if plan.room(ink, angle, taken) >= -_FIT_DEG:
            return angle, _reason(plan, ink, angle, slots)
    partner = _partner(plan, ink, taken) if len(plan.inks) > 4 else None
    if partner is not None:
        opposite = _opposition(plan, ink, partner) < _OPPOSITE
        beside = "its opposite in hue, with which it is seldom printed" if opposite else "the least crowded"
        return taken[partner][0], (
            f"No angle is left {degrees(plan.apart_deg)} from the others; "
            f"{ink} shares that of {partner}, {beside}. "
            "That is doubtful; "
            "an [[overprint]] with never = true says which inks do not meet."
        )
    widest = int(2 * plan.repeat_deg)
    angle = max((0.5 * i for i in range(widest)), key=lambda a: (plan.room(ink, a, taken), -a))
    near = plan.room(ink, angle, taken)
    short = f"{rounded(-near, digits=3)} degrees less than wanted" if near < -1e-9 else "as far as wanted"
    return (
        angle,
        f"The given angles leave no usual one free; here {ink} stands furthest from its nearest neighbour, "
        f"{short}.",
    )


def _partner(plan: _Plan, ink: str, taken: Mapping[str, tuple[float, ...]]) -> str | None:
    """The one of the first four whose angle an ink beyond them shares: uncrowded and of opposite hue.

    The lightest ink stands near two drawing inks, so only a light ink may join it there; and two
    grey-like inks never share.
    """
    first = [name for name in _order(plan)[:4] if name in taken and name != ink]
    if not _is_light(plan, ink):
        first = [name for name in first if name != plan.lightest]
    if _chroma(plan, ink) < _GREY_CHROMA:
        first = [name for name in first if _chroma(plan, name) >= _GREY_CHROMA]
    crowd = {name: sum(taken[name][0] in angles for angles in taken.values()) for name in first}
    return min(first, key=lambda name: (crowd[name], _opposition(plan, ink, name)), default=None)


def _is_light(plan: _Plan, ink: str) -> bool:
    """Whether an ink is nearer in lightness to the lightest ink than to the darkest."""
    all_of_them = [other.lab[0] for other in plan.inks]
    return _lab(plan, ink)[0] >= 0.5 * (min(all_of_them) + max(all_of_them))


def _opposition(plan: _Plan, one: str, other: str) -> float:
    """Cosine of the hue angle between two inks, -1 for complements; near 0 where one is grey."""
    (_, a, b), (_, c, d) = _lab(plan, one), _lab(plan, other)
    return (a * c + b * d) / max(_chroma(plan, one), _GREY_CHROMA) / max(_chroma(plan, other), _GREY_CHROMA)


def _chroma(plan: _Plan, name: str) -> float:
    return math.hypot(*_lab(plan, name)[1:])


def _lab(plan: _Plan, name: str) -> tuple[float, float, float]:
    return next(ink.lab for ink in plan.inks if ink.name == name)


def _reason(plan: _Plan, ink: str, angle: float, slots: tuple[float, ...]) -> str:
    if len(plan.inks) == 1:
        return "The eye notices 45 degrees least, and there is no other ink to keep clear of."
    turned = ", in a set turned to fit the given angles" if slots != plan.slots else ""
    if ink == plan.dominant and angle == slots[0]:
        return f"{ink} carries most of the picture: {plain(angle)} is the dominant ink's place{turned}."
    if ink == plan.lightest:
        return (
            f"{ink} is the lightest ink: {degrees(plan.apart_light_deg)} from its neighbours will do{turned}."
        )
    return (
        f"{ink} is a drawing ink, {degrees(plan.apart_deg)} or more from every other that it meets{turned}."
    )
