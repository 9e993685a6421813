"""What no single field can see: names that clash, inks that do not exist, jobs beyond all measure."""

from __future__ import annotations

import math
import unicodedata
from collections.abc import Iterable, Iterator, Mapping, Sequence

from patterngen.errors import Fault
from patterngen.job.preset import GridTable, ImageTone, ScreenTable
from patterngen.job.tables import TableReading, nearest, shown
from patterngen.model.job import Job
from patterngen.units import RULING, plain

__all__ = [
    "COMMON_GRID_KEYS",
    "COMMON_SCREEN_KEYS",
    "ImageTone",
    "across",
    "degrees",
    "oddities",
    "percent",
    "too_much",
]

COMMON_SCREEN_KEYS = frozenset(ScreenTable.model_fields)
COMMON_GRID_KEYS = frozenset(GridTable.model_fields)

MOST_SHAPES = 1_000_000_000
LARGEST_PAGE_MM = 14_400 * 25.4 / 72
"""The largest page that PDF readers are sure to open (14,400 points)."""

# common practice, no source: rulings between these are met on a press, 20 to 120 lines/cm
_USUAL_RULINGS_PER_MM = (2.0, 12.0)
# ISO 32000-1, 8.6.6.4: these two Separation names stand for every plate and for none
_RESERVED_INKS = frozenset(["all", "none"])

Readings = Mapping[str, Sequence[TableReading]]


def across(tables: Readings, *, where: str) -> list[Fault]:
    """Faults that need more than one value; faulty values take no part."""
    checks = (_sheet, _gains, _edge_gains, _ink_names, _names, _inks_used, _overprints, _rulings, _waivers)
    return [fault for check in checks for fault in check(tables, where)]


def too_much(job: Job, *, where: str) -> list[Fault]:
    """Faults of a job that would draw more shapes than any reader takes; counted before anything is drawn.

    Screens whose ruling is still open are left out: call it again when it is derived.
    """
    counts = {screen.name: estimated_shapes(job, screen.name) for screen in job.screens if screen.ruling_per_mm}
    total = sum(counts.values())
    if total <= MOST_SHAPES:
        return []
    name, most = max(counts.items(), key=lambda item: item[1])
    ruling = next(s.ruling_per_mm for s in job.screens if s.name == name) or 0.0
    # shapes grow with the square of the ruling, so this one would bring the job below the cap
    coarser = ruling * math.sqrt(max(MOST_SHAPES - (total - most), 0) / most)
    return [
        Fault(
            where,
            f"screen.{name}.ruling",
            f"the job would draw about {total:.3g} shapes, {most:.3g} of them here",
            _spell_ruling(ruling),
            allowed=f"at most {MOST_SHAPES:.0e} shapes in all".replace("e+0", "e"),
            nearest=f'"{_spell_ruling(coarser)}" or a smaller sheet' if coarser > 0 else "a smaller sheet",
        )
    ]


def estimated_shapes(job: Job, name: str) -> float:
    """About how many shapes a screen draws: one for each cell of its lattice, one for each line."""
    screen = next(s for s in job.screens if s.name == name)
    ruling = screen.ruling_per_mm or 0.0
    if screen.kind == "lines" and screen.tone.constant is not None:
        x0, y0, x1, y1 = screen.area.box_mm
        return ruling * math.hypot(x1 - x0, y1 - y0)
    return ruling**2 * screen.area.area_mm2()


def oddities(tables: Readings) -> list[str]:
    """Remarks on what is legal but hardly meant."""
    return [remark for reading in tables["screen"] for remark in _odd_ruling(reading)]


def degrees(angle_deg: float) -> str:
    """An angle for a message."""
    return f"{plain(angle_deg)} deg"


def percent(share: float) -> str:
    """A share for a message."""
    return f"{plain(100 * share)} %"


def _odd_ruling(reading: TableReading) -> Iterator[str]:
    ruling = reading["ruling"]
    low, high = _USUAL_RULINGS_PER_MM
    if not isinstance(ruling, float) or low <= ruling <= high:
        return
    # what the figure would be had the two units been mixed up
    for unit, other in (("/cm", "lpi"), ("lpi", "/cm")):
        figure = ruling / RULING.units[unit]
        swapped = figure * RULING.units[other]
        if low <= swapped <= high and abs(figure - round(figure, 3)) < 1e-9:
            yield (
                f"{reading.path}.ruling: {plain(figure)} {unit} is an unusual ruling; "
                f'if {plain(figure)} {other} was meant, write "{plain(figure)} {other}"'
            )
            return


def _sheet(tables: Readings, where: str) -> Iterator[Fault]:
    for reading in tables["sheet"]:
        if not (size := reading.get("size")):
            continue
        bleed = reading.get("bleed") or 0.0
        longest = max(size) + 2 * bleed
        if longest > LARGEST_PAGE_MM:
            yield Fault(
                where,
                "sheet.size",
                "the page is larger than print files can hold",
                f"{plain(longest)} mm with bleed",
                allowed=f"at most {plain(LARGEST_PAGE_MM)} mm (14400 pt), bleed included",
                nearest=f'"{plain(math.floor(LARGEST_PAGE_MM - 2 * bleed))} mm"' if bleed < LARGEST_PAGE_MM / 2 else "",
            )


def _gains(tables: Readings, where: str) -> Iterator[Fault]:
    for reading in (*tables["press"], *tables["screen"]):
        if reading.get("gain") is not None and reading.get("edge_gain") is not None:
            yield Fault(where, f"{reading.path}.edge_gain", "two gains at once", allowed="either gain or edge_gain")


def _edge_gains(tables: Readings, where: str) -> Iterator[Fault]:
    """Edges that grow by half the pitch close every shape, whatever its tone."""
    pitches_mm: dict[str, tuple[float, str]] = {}  # by the table whose edge_gain counts: the finest of its screens
    for reading in tables["screen"]:
        ruling = reading.get("ruling")
        if not isinstance(ruling, float):
            continue
        own = {reading.path for key in ("gain", "edge_gain") if key in reading.given}
        table = next(iter(own), "press")
        pitches_mm[table] = min(pitches_mm.get(table, (math.inf, "")), (1 / ruling, reading.path))
    for reading in (*tables["press"], *tables["screen"]):
        edge_mm = reading.get("edge_gain")
        pitch_mm, screen = pitches_mm.get(reading.path, (math.inf, ""))
        if edge_mm is None or edge_mm < pitch_mm / 2:
            continue
        half_um = 500 * pitch_mm
        whole_um = math.ceil(half_um) - 1
        yield Fault(
            where,
            f"{reading.path}.edge_gain",
            f"edges that grow this much close every shape of {screen}",
            f"{plain(1000 * edge_mm)} um",
            allowed=f"less than half its pitch, {plain(round(half_um, 2))} um",
            nearest=f'"{whole_um} um"' if whole_um > 0 else "",
        )


def _ink_names(tables: Readings, where: str) -> Iterator[Fault]:
    seen: dict[str, str] = {}
    for reading in tables["ink"]:
        name = reading.get("name")
        if name is None:
            continue
        key = _folded(name)
        if key in _RESERVED_INKS:
            yield Fault(
                where,
                f"{reading.path}.name",
                "a name that print files keep for every plate or none",
                shown(name),
                nearest=shown(f"{name} ink"),
            )
        if len(name.encode()) > 120:
            yield Fault(
                where,
                f"{reading.path}.name",
                "a name too long for print files",
                shown(name),
                allowed="at most 120 bytes in UTF-8",
            )
        if key in seen:
            how = "stands here twice" if seen[key] == name else f"differs from {shown(seen[key])} by case or form only"
            yield Fault(
                where,
                f"{reading.path}.name",
                f"the ink {how}",
                shown(name),
                allowed="a name of its own for each ink",
                nearest=shown(f"{name} 2"),
            )
        seen.setdefault(key, name)


def _names(tables: Readings, where: str) -> Iterator[Fault]:
    seen: dict[str, str] = {}
    for reading in (*tables["screen"], *tables["grid"]):
        name = reading.get("name")
        if name is None:
            continue
        key = _folded(name)
        if key in seen:
            yield Fault(
                where,
                f"{reading.path}.name",
                f"the name is taken by {seen[key]}",
                shown(name),
                allowed="a name of its own for each screen and grid",
                nearest=_free_name(name, seen),
            )
        seen.setdefault(key, reading.path)


def _inks_used(tables: Readings, where: str) -> Iterator[Fault]:
    names = [reading.get("name") for reading in tables["ink"]]
    if None in names or not names:
        return  # an ink whose name is faulty may be the one that is meant
    known = [str(name) for name in names]
    places = [(f"{r.path}.ink", r.get("ink")) for r in tables["screen"]]
    places += [(f"{r.path}.inks[{i}]", ink) for r in tables["overprint"] for i, ink in enumerate(r.get("inks") or ())]
    for key, ink in places:
        if ink is not None and ink not in known:
            near = nearest(ink, known)
            yield Fault(
                where,
                key,
                "no [[ink]] has this name",
                shown(ink),
                allowed=", ".join(map(shown, known)),
                nearest=shown(near) if near else "",
            )


def _overprints(tables: Readings, where: str) -> Iterator[Fault]:
    seen: dict[frozenset[str], str] = {}
    for reading in tables["overprint"]:
        inks = reading.get("inks")
        if inks is not None:
            if len(set(inks)) < len(inks):
                yield Fault(
                    where,
                    f"{reading.path}.inks",
                    "an ink stands here twice",
                    shown(inks),
                    allowed="each ink once",
                )
            group = frozenset(inks)
            if group in seen:
                yield Fault(
                    where,
                    f"{reading.path}.inks",
                    f"these inks stand in {seen[group]} already",
                    shown(inks),
                    allowed="each set of inks once",
                )
            seen.setdefault(group, reading.path)
        if any(fault.key.startswith((f"{reading.path}.lab", f"{reading.path}.never")) for fault in reading.faults):
            continue
        if reading.get("never") and reading.get("lab") is not None:
            yield Fault(
                where,
                f"{reading.path}.lab",
                "a colour for inks that never meet",
                allowed="either lab or never = true",
            )
        if not reading.get("never") and reading.get("lab") is None:
            yield Fault(
                where,
                f"{reading.path}.lab",
                "this key is missing",
                allowed="lab = [L, a, b] as measured, or never = true",
            )


def _rulings(tables: Readings, where: str) -> Iterator[Fault]:
    imagers = [reading.get("imager") for reading in tables["press"]]
    imager = imagers[0] if imagers else None
    if imager is None:
        return
    for reading in tables["screen"]:
        ruling = reading.get("ruling")
        if isinstance(ruling, float) and ruling > imager / 2 * (1 + 1e-12):
            yield Fault(
                where,
                f"{reading.path}.ruling",
                "finer than the imager can draw: a cell needs two of its pixels",
                _spell_ruling(ruling),
                allowed=f"at most {_spell_ruling(imager / 2)} with this imager",
                nearest=f'"{_spell_ruling(imager / 2)}"',
            )


def _waivers(tables: Readings, where: str) -> Iterator[Fault]:
    seen: set[str] = set()
    for reading in tables["waive"]:
        rule = reading.get("rule")
        if rule is not None and rule in seen:
            yield Fault(
                where,
                f"{reading.path}.rule",
                "this rule is waived already",
                shown(rule),
                allowed="each rule once",
            )
        if rule is not None:
            seen.add(rule)


def _folded(name: str) -> str:
    """Two names are one when this is the same: case and form of letters do not count."""
    return unicodedata.normalize("NFKC", name).casefold()


def _free_name(name: str, taken: Iterable[str]) -> str:
    used = set(taken)
    return next(f'"{name}-{n}"' for n in range(2, len(used) + 3) if _folded(f"{name}-{n}") not in used)


def _spell_ruling(ruling_per_mm: float) -> str:
    return f"{plain(ruling_per_mm / RULING.units['lpi'])} lpi"
