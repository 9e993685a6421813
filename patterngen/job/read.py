"""A preset, from a file or a dict, to a `Job`."""

from __future__ import annotations

import os
import re
import unicodedata
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any

from patterngen.errors import Fault, InputError
from patterngen.files import read_plain_file
from patterngen.job import check, gates
from patterngen.job.overrides import SET, as_toml, read_overrides, table_path, written_in
from patterngen.job.preset import LATER, TABLES, TITLE, VERSION
from patterngen.job.tables import TableReading, nearest, read_table, shown
from patterngen.model.area import Area, ToneField
from patterngen.model.fields import CHOOSE, name_problem, nearest_name
from patterngen.model.job import (
    Gain,
    GridRequest,
    Ink,
    Job,
    Overprint,
    Press,
    ScreenRequest,
    SheetSize,
    Viewing,
    Waiver,
)
from patterngen.rules import _limits

_MOST_FAULTS = 100
_KEYS = ("patterngen", "title", *TABLES)


def load(path_or_dict: str | os.PathLike[str] | Mapping[str, Any], overrides: Iterable[str] = ()) -> Job:
    """Read a preset file, or a preset as a dict, with overrides ("screen.cyan.angle=22.5 deg") put in.

    Raises `InputError` that carries every fault found.

    >>> from patterngen.job.read import load
    >>> job = load("presets/carton.toml", ["screen.cyan.angle=22.5 deg"])  # doctest: +SKIP
    """
    if isinstance(path_or_dict, Mapping):
        source = _Source.from_data(path_or_dict)
    elif isinstance(path_or_dict, str | os.PathLike):
        source = _Source.from_file(Path(path_or_dict))
    else:
        raise InputError(Fault("preset", "", "neither the path of a preset nor a dict", allowed="a path or a dict"))
    return _read(source, tuple(overrides))


class _Source:
    """A preset's text and data, where it came from, and what was normalised on the way."""

    def __init__(
        self,
        *,
        where: str,
        name: str,
        folder: Path | None,
        text: str,
        data: dict[str, Any],
        remarks: list[str],
    ) -> None:
        self.where, self.name, self.folder = where, name, folder
        self.text, self.data, self.remarks = text, data, remarks

    @classmethod
    def from_file(cls, path: Path) -> _Source:
        where = str(path)
        data = read_plain_file(path, most_bytes=gates.MOST_PRESET_BYTES, what="the preset")
        text, remarks = gates.decode(data, where=where)
        if problem := name_problem(path.stem):
            raise InputError(
                Fault(
                    where,
                    "",
                    f"the file's name becomes the job's name: {problem}",
                    shown(path.stem),
                    "letters a-z, digits, dash, underscore, dots inside",
                    nearest_name(path.stem),
                )
            )
        return cls(
            where=where,
            name=path.stem,
            folder=path.resolve().parent,
            text=text,
            data=gates.parse(text, where=where),
            remarks=remarks,
        )

    @classmethod
    def from_data(cls, data: Mapping[str, Any]) -> _Source:
        where = "preset"
        plain = _plain_data(data)
        if faults := list(gates.bad_values(plain, where=where)):
            raise InputError(faults[:_MOST_FAULTS])
        assert isinstance(plain, dict)
        text = as_toml(plain)
        title = plain.get("title")
        name = nearest_name(title.lower()) if isinstance(title, str) else ""
        return cls(
            where=where,
            name=name or "job",
            folder=Path.cwd(),
            text=text,
            data=gates.parse(text, where=where),
            remarks=[],
        )


def _plain_data(data: object, depth: int = 0) -> object:
    """Mappings and sequences as dicts and lists; too deep is left for the gate to refuse."""
    if depth <= gates.DEEPEST + 1:
        if isinstance(data, Mapping):
            return {key: _plain_data(value, depth + 1) for key, value in data.items()}
        if isinstance(data, list | tuple):
            return [_plain_data(value, depth + 1) for value in data]
    return data


def _read(source: _Source, texts: tuple[str, ...]) -> Job:
    overrides, faults = read_overrides(texts, source.data)
    if overrides:
        source.text = written_in(source.text, overrides)
        source.data = gates.parse(source.text, where=SET)
    set_paths = {override.path for override in overrides}
    readings = _Readings(source, faults)
    faults += check.across(readings.tables, where=source.where)
    if not faults:
        from patterngen.job import artwork

        art, art_faults = artwork.read(readings.tables, folder=source.folder, where=source.where)
        faults += art_faults
    if faults:
        raise InputError(_told(faults, set_paths))
    return _job(source, readings, art, set_paths)


def _told(faults: list[Fault], set_paths: set[str]) -> list[Fault]:
    """Faults of values from the command line name it; beyond a hundred only their number is told."""
    from dataclasses import replace

    told = [replace(f, where=SET) if f.key in set_paths else f for f in dict.fromkeys(faults)]
    if len(told) <= _MOST_FAULTS:
        return told
    rest = len(told) - _MOST_FAULTS
    return [*told[:_MOST_FAULTS], Fault(told[0].where, "", f"and {rest} more faults")]


class _Readings:
    """Every table of a preset as read; faults are added to the list that was handed in."""

    def __init__(self, source: _Source, faults: list[Fault]) -> None:
        self.tables: dict[str, list[TableReading]] = {name: [] for name in TABLES}
        self.title = ""
        where, data = source.where, source.data
        version = data.get("patterngen")
        if not data:
            faults.append(Fault(where, "", "the preset is empty", allowed=_needed()))
            return
        faults += _version_faults(version, where)
        faults += _unknown_keys(data, where)
        self._read_title(data, where, faults)
        for name, kind in TABLES.items():
            raw = data.get(name)
            if raw is None:
                if kind.needed:
                    faults.append(
                        Fault(
                            where,
                            name,
                            "this table is missing",
                            allowed=f"[[{name}]], one or more" if kind.many else f"[{name}]",
                        )
                    )
                    continue
                raw = [] if kind.many else {}
            self._read_tables(name, raw, where, faults)

    def _read_title(self, data: Mapping[str, Any], where: str, faults: list[Fault]) -> None:
        from pydantic_core import PydanticCustomError

        if "title" not in data:
            faults.append(Fault(where, "title", "this key is missing", allowed="a title in quotes"))
            return
        try:
            self.title = TITLE.read(data["title"])
        except PydanticCustomError as error:
            told = error.context or {}
            faults.append(
                Fault(where, "title", told["problem"], shown(data["title"]), told["allowed"], told["nearest"])
            )

    def _read_tables(self, name: str, raw: object, where: str, faults: list[Fault]) -> None:
        kind = TABLES[name]
        if not kind.many:
            if not isinstance(raw, Mapping):
                nearest_form = f"[{name}]" if isinstance(raw, list) else ""
                faults.append(
                    Fault(
                        where,
                        name,
                        "not a table",
                        shown(raw),
                        allowed=f"one table [{name}]",
                        nearest=nearest_form,
                    )
                )
                return
            self._read_one(name, raw, name, where, faults)
            return
        if not isinstance(raw, list):
            nearest_form = f"[[{name}]]" if isinstance(raw, Mapping) else ""
            faults.append(
                Fault(
                    where,
                    name,
                    "not a list of tables",
                    shown(raw),
                    allowed=f"[[{name}]], once for each",
                    nearest=nearest_form,
                )
            )
            return
        if kind.needed and not raw:
            faults.append(Fault(where, name, "this table is missing", allowed=f"[[{name}]], one or more"))
        if len(raw) > kind.most:
            faults.append(Fault(where, name, f"{len(raw)} tables [[{name}]]", allowed=f"at most {kind.most}"))
        for index, table in enumerate(raw[: kind.most]):
            path = table_path(name, index, table)
            if sum(table_path(name, i, t) == path for i, t in enumerate(raw[: kind.most])) > 1:
                path = f"{name}[{index}]"
            if not isinstance(table, Mapping):
                faults.append(Fault(where, path, "not a table", shown(table), allowed=f"a table [[{name}]]"))
            else:
                self._read_one(name, table, path, where, faults)

    def _read_one(self, name: str, raw: Mapping[str, Any], path: str, where: str, faults: list[Fault]) -> None:
        kind = TABLES[name]
        models = kind.models(name)
        known = raw.get("kind") if kind.family else ""
        if isinstance(known, str) and known in models:
            reading = read_table(models[known], raw, path=path, where=where)
        else:
            # without its kind only the common keys can be judged; the kind's own are left alone
            own = {key for model in models.values() for key in model.model_fields}
            base = kind.base(name)
            common = {key: value for key, value in raw.items() if key not in own or key in base.model_fields}
            reading = read_table(base, common, path=path, where=where)
        faults += reading.faults
        self.tables[name].append(reading)


def _needed() -> str:
    tables = [f"[[{name}]]" if kind.many else f"[{name}] with size" for name, kind in TABLES.items() if kind.needed]
    return f"patterngen = {VERSION}, title, {', '.join(tables)}"


def _version_faults(version: object, where: str) -> list[Fault]:
    if version is None:
        return [
            Fault(
                where,
                "patterngen",
                "the version of the preset is missing",
                allowed=f"patterngen = {VERSION} at the top",
            )
        ]
    if isinstance(version, bool) or not isinstance(version, int) or version < 1:
        return [
            Fault(
                where,
                "patterngen",
                "not the version of a preset",
                shown(version),
                nearest=f"patterngen = {VERSION}",
            )
        ]
    if version > VERSION:
        return [
            Fault(
                where,
                "patterngen",
                "the preset was written for a newer version of this program",
                shown(version),
                allowed=f"presets of version {VERSION}",
            )
        ]
    return []


def _unknown_keys(data: Mapping[str, Any], where: str) -> list[Fault]:
    out = []
    for key in data:
        if key in LATER:
            out.append(Fault(where, key, LATER[key]))
        elif key not in _KEYS:
            near = nearest(key, (*_KEYS, *LATER))
            out.append(
                Fault(
                    where,
                    shown(key).strip('"'),
                    "no such table or key in a preset",
                    allowed=", ".join(_KEYS),
                    nearest=near,
                )
            )
    return out


def _job(source: _Source, readings: _Readings, art: Any, set_paths: set[str]) -> Job:
    tables = readings.tables
    sheet_table, viewing_table, press_table, paper_table = (
        tables[name][0] for name in ("sheet", "viewing", "press", "paper")
    )
    origin = _origins(tables, set_paths)
    remarks = list(source.remarks)
    width_mm, height_mm = sheet_table["size"]
    sheet = SheetSize(width_mm, height_mm, sheet_table["bleed"], sheet_table["marks"])
    press, limit_origins = _press(press_table, set_paths)
    origin |= limit_origins
    screens = tuple(_screen(reading, press, sheet, art, remarks) for reading in tables["screen"])
    grids = tuple(_grid(reading, remarks) for reading in tables["grid"])
    far_mm = viewing_table["far"]
    viewing = Viewing(
        distance_mm=viewing_table["distance"],
        far_mm=2 * viewing_table["distance"] if far_mm is None else far_mm,
        limit=viewing_table["limit"],
        limit_coarse=viewing_table["limit_coarse"],
        light_lx=viewing_table["light"],
        eye=viewing_table["eye"],
    )
    remarks += check.oddities(tables)
    remarks += art.remarks
    if unicodedata.normalize("NFC", source.text) != source.text:
        remarks.append("names and texts were read in composed Unicode form (NFC)")
    job = Job(
        name=source.name,
        title=readings.title,
        text=source.text,
        folder=source.folder,
        sheet=sheet,
        viewing=viewing,
        press=press,
        paper_lab=paper_table["lab"],
        inks=tuple(Ink(r["name"], r["lab"], r["opaque"]) for r in tables["ink"]),
        overprints=tuple(Overprint(frozenset(r["inks"]), r["lab"], r["never"]) for r in tables["overprint"]),
        screens=screens,
        grids=grids,
        waivers=tuple(Waiver(r["rule"], r["reason"]) for r in tables["waive"]),
        origin=origin,
        remarks=tuple(remarks),
        artwork=art.digests,
    )
    if faults := check.too_much(job, where=source.where):
        raise InputError(faults)
    return job


def _origins(tables: Mapping[str, list[TableReading]], set_paths: set[str]) -> dict[str, str]:
    """Where each value came from; what is left open has no origin yet."""
    origin = {"patterngen": "preset", "title": SET if "title" in set_paths else "preset"}
    for readings in tables.values():
        for reading in readings:
            for key, value in reading.values.items():
                path = f"{reading.path}.{key}"
                # part of a value may be set alone: sheet.size[0]
                is_set = any(p == path or re.match(rf"{re.escape(path)}[.\[]", p) for p in set_paths)
                if key in reading.given:
                    origin[path] = SET if is_set else "preset"
                elif value is not None:
                    origin[path] = "default"
    origin.setdefault("viewing.far", "default")
    return origin


def _gain(reading: TableReading, otherwise: Gain) -> Gain:
    if reading["gain"] is not None:
        return Gain(half_tone=reading["gain"])
    if reading["edge_gain"] is not None:
        return Gain(edge_mm=reading["edge_gain"])
    return otherwise


def _press(reading: TableReading, set_paths: set[str]) -> tuple[Press, dict[str, str]]:
    process = reading["process"]
    limits = _limits.limits(process)
    for name in _limits.quantities():
        if (value := reading[name]) is not None:
            limits[name] = _limits.own_limit(name, value, origin=SET if f"press.{name}" in set_paths else "preset")
    press = Press(
        process=process,
        imager_per_mm=reading["imager"],
        register_mm=reading["register"],
        angle_error_deg=reading["angle_error"],
        size_error=reading["size_error"],
        yule_nielsen=reading["yule_nielsen"],
        gain=_gain(reading, Gain()),
        limits=limits,
    )
    return press, {f"press.{name}": limit.origin for name, limit in limits.items()}


def _turned(angle_deg: float, path: str, remarks: list[str]) -> float:
    """An angle within one turn; a remark where that changed it."""
    if -180.0 <= angle_deg < 360.0:
        return angle_deg
    remarks.append(f"{path}: {check.degrees(angle_deg)} is read as {check.degrees(angle_deg % 360.0)}")
    return angle_deg % 360.0


def _screen(reading: TableReading, press: Press, sheet: SheetSize, art: Any, remarks: list[str]) -> ScreenRequest:
    ruling, angle = reading["ruling"], reading["angle"]
    chosen = tuple(key for key, value in (("ruling", ruling), ("angle", angle)) if value == CHOOSE)
    own = {k: v for k, v in reading.values.items() if k not in check.COMMON_SCREEN_KEYS and k != "shape"}
    if chosen:
        own["choose"] = chosen
    area = art.areas.get(reading.path) or Area(sheet.box_mm)
    tone = (
        art.tone(reading.path, area)
        if isinstance(reading["tone"], check.ImageTone)
        else ToneField(constant=reading["tone"], label=check.percent(reading["tone"]))
    )
    if tone.constant is None:
        from patterngen.job.artwork import free_sides

        if free := free_sides(tone, area):
            remarks.append(f"{reading.path}.tone: {free}")
        area = area.within(tone.box_mm)
    return ScreenRequest(
        name=reading["name"],
        ink=reading["ink"],
        kind=reading["kind"],
        shape=reading.get("shape"),
        ruling_per_mm=None if ruling == CHOOSE else ruling,
        angle_deg=None if angle is None or angle == CHOOSE else _turned(angle, f"{reading.path}.angle", remarks),
        tone=tone,
        area=area,
        origin_mm=reading["origin"],
        gain=_gain(reading, press.gain),
        params=own,
    )


def _grid(reading: TableReading, remarks: list[str]) -> GridRequest:
    own = {k: v for k, v in reading.values.items() if k not in check.COMMON_GRID_KEYS}
    angle_deg = _turned(reading["angle"], f"{reading.path}.angle", remarks)
    return GridRequest(reading["name"], reading["kind"], reading["ruling"], angle_deg, own)
