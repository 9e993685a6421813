"""Pictures and outlines that a preset names: gates for their paths, and a child process to read them.

The child (`artist`) has caps on memory and time and is handed bytes, never a path.  A file
that makes it fail is named, and the others are still read.
"""

from __future__ import annotations

import hashlib
import json
import os
import signal
import subprocess
import sys
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from itertools import islice
from pathlib import Path, PurePosixPath
from typing import Any

import numpy as np
from numpy.typing import NDArray

from patterngen.errors import Fault, InputError, MachineError
from patterngen.files import read_plain_file
from patterngen.job.artist import MEMORY_BYTES, PROCESSOR_SECONDS
from patterngen.job.preset import ImageTone, SvgArea
from patterngen.job.tables import TableReading, nearest, shown
from patterngen.model.area import Area, ToneField
from patterngen.model.fields import text_problem
from patterngen.model.job import SheetSize
from patterngen.units import plain

MOST_SVG_BYTES = 8 << 20
MOST_PICTURE_BYTES = 128 << 20
WALL_SECONDS = 60
_MOST_LISTED = 10_000
_ENDINGS = {"outlines": (".svg",), "picture": (".png", ".tif", ".tiff", ".jpg", ".jpeg")}
"""Usual ends of file names, for suggestions only: what a file is, its content tells."""
_FREE_SHARE = 0.01
_FREE_MM = 0.2


@dataclass(frozen=True)
class Artwork:
    """What was read, by the path of the screen that asked for it."""

    areas: Mapping[str, Area] = field(default_factory=dict)
    pictures: Mapping[str, tuple[NDArray[np.float32], str]] = field(default_factory=dict)
    remarks: tuple[str, ...] = ()
    digests: Mapping[str, str] = field(default_factory=dict)
    """SHA-256 (hex) of every file's bytes, by its path as in the preset."""

    def tone(self, path: str, area: Area) -> ToneField:
        """The picture of that screen, fitted into its area's box: aspect kept, centred."""
        values, label = self.pictures[path]
        rows, columns = values.shape
        x0, y0, x1, y1 = area.box_mm
        scale = min((x1 - x0) / columns, (y1 - y0) / rows)
        wide, high = scale * columns, scale * rows
        left, low = (x0 + x1 - wide) / 2, (y0 + y1 - high) / 2
        return ToneField(values=values, box_mm=(left, low, left + wide, low + high), label=label)


def free_sides(tone: ToneField, area: Area) -> str:
    """What a picture that lacks its area's proportions leaves free, in words; empty when that hardly shows."""
    x0, y0, x1, y1 = area.box_mm
    left, low, right, high = tone.box_mm
    for free_mm, whole_mm, sides in (
        ((x1 - x0 - (right - left)) / 2, x1 - x0, "left and right"),
        ((y1 - y0 - (high - low)) / 2, y1 - y0, "top and bottom"),
    ):
        if free_mm > max(_FREE_SHARE * whole_mm, _FREE_MM):
            size = " x ".join(plain(round(length, 2)) for length in (x1 - x0, y1 - y0))
            return f"the picture leaves {plain(round(free_mm, 2))} mm free at the {sides} of its area ({size} mm)"
    return ""


@dataclass(frozen=True)
class _Task:
    """One file to be read, for one or more screens."""

    key: str
    label: str
    head: Mapping[str, Any]
    data: bytes


@dataclass(frozen=True)
class _Answer:
    head: Mapping[str, Any]
    body: bytes


def read(
    tables: Mapping[str, Sequence[TableReading]], *, folder: Path | None, where: str
) -> tuple[Artwork, list[Fault]]:
    """Every picture and outline of the preset, and the faults of those that cannot be used.

    Raises `MachineError` where no child process can be had.
    """
    sheet = _sheet(tables["sheet"][0])
    tasks: dict[tuple[str, ...], _Task] = {}
    wanted: dict[str, tuple[str, ...]] = {}
    faults: list[Fault] = []
    files: dict[tuple[str, ...], bytes] = {}
    for reading in tables["screen"]:
        for key, task_key, task in _tasks(reading, sheet):
            wanted[key] = task_key
            if task_key in tasks:
                continue
            file = task_key[:2]
            try:
                # one reading for all elements of a file, so that its digest is that of all
                data = files[file] if file in files else _bytes(task_key, key, folder=folder, where=where)
            except InputError as error:
                faults += error.faults
                continue
            files[file] = data
            tasks[task_key] = _Task(key, task_key[1], task | {"bytes": len(data)}, data)
    if not tasks:
        return Artwork(), faults
    answers, more = _ask(tasks, where)
    digests = {path: hashlib.sha256(data).hexdigest() for (_, path), data in files.items()}
    return replace(_artwork(tables["screen"], wanted, answers), digests=digests), faults + more


def _sheet(reading: TableReading) -> SheetSize:
    width_mm, height_mm = reading["size"]
    return SheetSize(width_mm, height_mm, reading["bleed"], reading["marks"])


def _tasks(reading: TableReading, sheet: SheetSize) -> list[tuple[str, tuple[str, ...], dict[str, Any]]]:
    """(preset key, what is to be read, how) for the art of one screen."""
    out: list[tuple[str, tuple[str, ...], dict[str, Any]]] = []
    area, tone = reading["area"], reading["tone"]
    if isinstance(area, SvgArea):
        head = {
            "kind": "outlines",
            "element": area.id,
            "sheet_mm": (sheet.width_mm, sheet.height_mm),
            "box_mm": sheet.box_mm,
            "label": area.svg,
        }
        out.append((f"{reading.path}.area.svg", ("outlines", area.svg, area.id or ""), head))
    if isinstance(tone, ImageTone):
        out.append((f"{reading.path}.tone.image", ("picture", tone.image), {"kind": "picture", "label": tone.image}))
    return out


def _bytes(task_key: tuple[str, ...], key: str, *, folder: Path | None, where: str) -> bytes:
    """The bytes of an art file inside the preset's folder.  Raises `InputError`."""
    text = task_key[1]
    outlines = task_key[0] == "outlines"

    def refuse(problem: str, nearest: str = "") -> InputError:
        return InputError(
            Fault(
                where,
                key,
                problem,
                shown(text),
                'a path inside the preset\'s folder, like "art/panel.svg"',
                nearest,
            )
        )

    if folder is None:
        raise refuse("this preset has no folder, so it cannot name files")
    if "\\" in text:
        raise refuse("a path with backslashes", shown(text.replace("\\", "/")))
    path = PurePosixPath(text)
    if path.is_absolute() or ".." in path.parts or text.startswith("~") or (len(text) > 1 and text[1] == ":"):
        raise refuse("the path leaves the preset's folder")
    base = folder.resolve()
    try:
        full = (base / path).resolve()
    except (OSError, RuntimeError):
        raise refuse("the path is a circle of links") from None
    if not full.is_relative_to(base):
        raise refuse("the path leaves the preset's folder through a link")
    most = MOST_SVG_BYTES if outlines else MOST_PICTURE_BYTES
    what = "the drawing" if outlines else "the picture"
    if _is_missing(full):
        near = _nearest_file(base, path, _ENDINGS[task_key[0]])
        raise refuse(f"{what} does not exist", shown(near) if near else "")
    data = read_plain_file(full, most_bytes=most, what=what, where=where, key=key)
    if outlines and data.startswith(b"\x1f\x8b"):
        raise InputError(Fault(where, key, "the drawing is packed (svgz)", shown(text), "plain SVG: unpack it first"))
    if outlines and (
        data.startswith((b"\x89PNG", b"\xff\xd8\xff", b"II", b"MM", b"%PDF", b"GIF8")) or not data.strip()
    ):
        raise InputError(
            Fault(
                where,
                key,
                "the drawing is empty" if not data.strip() else "the file is no SVG, by its content",
                shown(text),
                "SVG",
            )
        )
    return data


def _is_missing(path: Path) -> bool:
    try:
        path.stat()
    except FileNotFoundError:
        return True
    except (OSError, ValueError):
        return False  # it may be there: the reader will say what is wrong with it
    return False


def _nearest_file(base: Path, path: PurePosixPath, endings: Sequence[str]) -> str:
    """The path of an existing file of that kind that looks most like the one asked for, or an empty text.

    Folders are followed part by part, each as spelt or as it comes nearest.
    """
    here = PurePosixPath()
    for at, part in enumerate(path.parts):
        last = at == len(path.parts) - 1
        try:
            with os.scandir(base / here) as entries:
                names = sorted(
                    entry.name
                    for entry in islice(entries, _MOST_LISTED)
                    if not text_problem(entry.name)
                    and (entry.is_file() and entry.name.lower().endswith(tuple(endings)) if last else entry.is_dir())
                )
        except OSError:
            return ""
        # endings are of one kind here, and would make every name look alike
        known = {PurePosixPath(name).stem if last else name: name for name in reversed(names)}
        like = PurePosixPath(part).stem if last else part
        word = like if like in known else nearest(like, known)
        if not word:
            return ""
        here /= known[word]
    try:
        inside = (base / here).resolve().is_relative_to(base)
    except (OSError, RuntimeError):
        return ""
    return str(here) if inside else ""


def _ask(tasks: Mapping[tuple[str, ...], _Task], where: str) -> tuple[dict[tuple[str, ...], _Answer], list[Fault]]:
    """Hand the tasks to a child; where one kills it, name that one and go on with the rest."""
    answers: dict[tuple[str, ...], _Answer] = {}
    faults: list[Fault] = []
    left = dict(tasks)
    while left:
        got, death = _one_child(list(left.values()))
        for (task_key, task), answer in zip(list(left.items()), got, strict=False):
            del left[task_key]
            if "problem" in answer.head:
                faults.append(_fault(task, answer.head, where))
            else:
                answers[task_key] = answer
        if death and left:
            task_key, task = next(iter(left.items()))
            del left[task_key]
            faults.append(Fault(where, task.key, f"the file {death}", shown(task.label), allowed="a simpler file"))
    return answers, faults


def _fault(task: _Task, head: Mapping[str, str], where: str) -> Fault:
    key = f"{task.key.rpartition('.')[0]}.id" if head["problem"].endswith("this id") else task.key
    value = f"{shown(task.label)} ({head['value']})" if head["value"] else shown(task.label)
    words = "the drawing cannot be used: " if task.head["kind"] == "outlines" else "the picture "
    return Fault(where, key, words + head["problem"], value, head["allowed"], head["nearest"])


def _one_child(tasks: Sequence[_Task]) -> tuple[list[_Answer], str]:
    """(answers in order, as many as came; what killed the child, in words, or nothing)."""
    if not sys.executable:
        raise MachineError("no Python program is known to start the reader of artwork with")
    package_home = str(Path(__file__).resolve().parents[2])
    paths = [package_home, *filter(None, [os.environ.get("PYTHONPATH")])]
    # one thread is enough, and keeps the address space of the mathematics library small
    environment = os.environ | {
        "PYTHONPATH": os.pathsep.join(paths),
        "OPENBLAS_NUM_THREADS": "1",
        "OMP_NUM_THREADS": "1",
    }
    command = [sys.executable, "-P", "-m", "patterngen.job.artist"]
    request = json.dumps([task.head for task in tasks]).encode() + b"\n" + b"".join(task.data for task in tasks)
    try:
        done = subprocess.run(
            command, input=request, capture_output=True, timeout=WALL_SECONDS, env=environment, check=False
        )
    except subprocess.TimeoutExpired as error:
        return _answers(error.stdout or b""), f"took longer than {WALL_SECONDS} s to read"
    except OSError as error:
        raise MachineError(f"the reader of artwork could not be started ({error.strerror or error})") from error
    answers = _answers(done.stdout)
    if done.returncode == 0 and len(answers) == len(tasks):
        return answers, ""
    if done.returncode == -signal.SIGXCPU:
        return answers, f"took more than {PROCESSOR_SECONDS} s of computing"
    if b"MemoryError" in done.stderr or done.returncode in (-signal.SIGSEGV, -signal.SIGBUS, -signal.SIGABRT):
        return answers, f"brought its reader down (which may use {MEMORY_BYTES >> 30} GiB)"
    if done.returncode == -signal.SIGKILL:
        raise MachineError("the reader of artwork was killed from outside, perhaps for lack of memory")
    lines = done.stderr.decode("utf-8", "replace").strip().splitlines()
    raise MachineError(f"the reader of artwork ended with code {done.returncode}: {lines[-1] if lines else 'no word'}")


def _answers(output: bytes) -> list[_Answer]:
    """The whole answers in a child's output; one cut short does not count."""
    out: list[_Answer] = []
    at = 0
    while (end := output.find(b"\n", at)) >= 0:
        head = json.loads(output[at:end])
        body = output[end + 1 : end + 1 + head["bytes"]]
        if len(body) < head["bytes"]:
            break
        out.append(_Answer(head, body))
        at = end + 1 + head["bytes"]
    return out


def _artwork(
    screens: Sequence[TableReading],
    wanted: Mapping[str, tuple[str, ...]],
    answers: Mapping[tuple[str, ...], _Answer],
) -> Artwork:
    areas: dict[str, Area] = {}
    pictures: dict[str, tuple[NDArray[np.float32], str]] = {}
    remarks: list[str] = []
    made: dict[tuple[str, ...], Any] = {}
    for task_key, answer in answers.items():
        made[task_key] = _area(task_key, answer) if task_key[0] == "outlines" else _tones(answer)
        remarks += answer.head["remarks"]
    for reading in screens:
        outlines, picture = wanted.get(f"{reading.path}.area.svg"), wanted.get(f"{reading.path}.tone.image")
        if outlines in made:
            areas[reading.path] = made[outlines]
        if picture is not None and picture in made:
            pictures[reading.path] = (made[picture], picture[1])
    return Artwork(areas, pictures, tuple(dict.fromkeys(remarks)))


def _area(task_key: tuple[str, ...], answer: _Answer) -> Area:
    points = np.frombuffer(answer.body, dtype="<f8").reshape(-1, 2).astype(float)
    ends = np.cumsum(answer.head["rings"])
    rings = tuple(np.split(points, ends[:-1]))
    low, high = points.min(axis=0), points.max(axis=0)
    box = (float(low[0]), float(low[1]), float(high[0]), float(high[1]))
    label = f"{task_key[1]}#{task_key[2]}" if task_key[2] else task_key[1]
    return Area(box, rings, label)


def _tones(answer: _Answer) -> NDArray[np.float32]:
    bits = answer.head["bits"]
    values = np.frombuffer(answer.body, dtype=f"<u{bits // 8}").reshape(answer.head["size"])
    white = np.float32(2**bits - 1)
    return (1 - values.astype(np.float32) / white).astype(np.float32)
