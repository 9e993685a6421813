"""Path data to points: curves become chords that leave them by at most 0.1 um."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator

import numpy as np

from patterngen.job.svg_coordinates import LARGEST, NUMBER, all_numbers, apply
from patterngen.job.svg_remarks import OutlineError, clip
from patterngen.model.lattice import FloatArray

MOST_POINTS = 1_000_000
CHORD_ERROR_MM = 1e-4
_COMMAND = re.compile(r"([MmZzLlHhVvCcSsQqTtAa])")
_SIZES = {"M": 2, "L": 2, "H": 1, "V": 1, "C": 6, "S": 4, "Q": 4, "T": 2, "A": 7, "Z": 0}
_ARC = re.compile(
    rf"[\s,]*({NUMBER})[\s,]*({NUMBER})[\s,]*({NUMBER})[\s,]*([01])[\s,]*([01])"
    rf"[\s,]*({NUMBER})[\s,]*({NUMBER})[\s,]*",
    re.ASCII,
)


def path_points(text: str, matrix: FloatArray) -> Iterator[tuple[FloatArray, bool]]:
    """Subpaths of path data as points in mm and whether each is closed.  Raises `OutlineError`."""
    pieces = _COMMAND.split(text)
    if pieces[0].strip():
        raise _bad_path(pieces[0])
    if len(pieces) > 1 and pieces[1] not in "Mm":
        raise _bad_path(text)
    if len(pieces) // 2 > MOST_POINTS:
        raise too_many_points()
    here = start = np.zeros(2)
    run: list[FloatArray] = []
    before, control = "", here
    for letter, texts in _runs(pieces[1::2], pieces[2::2]):
        command = letter.upper()
        values = np.array([row for words in texts for row in _arguments(command, words)], dtype=float)
        base = letter.islower()
        if command == "M":
            if run:
                yield np.concatenate(run), False
            here = values[0] + (here if base else 0.0)
            start, run, before = here, [apply(matrix, here[None, :])], "M"
            values, command = values[1:], "L"
        if command == "Z":
            if run:
                yield np.concatenate(run), True
            here, run, before = start, [], "Z"
            continue
        if not len(values):
            continue
        if not run:
            # after a closed subpath the next one begins where that began
            run = [apply(matrix, here[None, :])]
            start = here
        if command in "LHV":
            points = _corners(command, values, here, base)
            run.append(apply(matrix, points))
            here, before = points[-1], "L"
            continue
        for row in values:
            if command == "A":
                end = row[5:7] + (here if base else 0.0)
                run.append(_arc(matrix, here, row, end))
                here, before = end, "A"
                continue
            corners = row.reshape(-1, 2) + (here if base else 0.0)
            if command in "ST":
                smooth = before in ("CS" if command == "S" else "QT") and before != ""
                corners = np.concatenate([(2 * here - control if smooth else here)[None, :], corners])
            cubic = corners if command in "CS" else _raised(here, corners)
            run.append(_chords(apply(matrix, np.concatenate([here[None, :], cubic]))))
            control, here, before = corners[-2], corners[-1], command
    if run:
        yield np.concatenate(run), False


def _runs(letters: list[str], texts: list[str]) -> Iterator[tuple[str, list[str]]]:
    """Commands of one letter in a row together: what comes from drawing programs then goes in few steps."""
    at = 0
    while at < len(letters):
        end = at + 1
        while letters[at] not in "MmZz" and end < len(letters) and letters[end] == letters[at]:
            end += 1
        yield letters[at], texts[at:end]
        at = end


def _arguments(command: str, text: str) -> list[list[float]]:
    """Numbers of one command, in rows of as many as it takes; whatever is no number is refused."""
    size = _SIZES[command]
    if command == "A":
        rows, at = [], 0
        while at < len(text):
            match = _ARC.match(text, at)
            if not match:
                break
            rows.append([float(part) for part in match.groups()])
            at = match.end()
        if at < len(text.rstrip()) or not rows:
            raise _bad_path(f"A{text}")
    else:
        numbers = all_numbers(text, None)
        if numbers is None or (size and (len(numbers) % size or not numbers)) or (not size and numbers):
            raise _bad_path(f"{command}{text}")
        rows = [numbers[at : at + size] for at in range(0, len(numbers), size)] if size else []
    if any(not -LARGEST <= number <= LARGEST for row in rows for number in row):
        raise _bad_path(f"{command}{text}")
    return rows


def _corners(command: str, values: FloatArray, here: FloatArray, relative: bool) -> FloatArray:
    if command == "L":
        return here + np.cumsum(values, axis=0) if relative else values
    axis = 0 if command == "H" else 1
    points = np.tile(here, (len(values), 1))
    points[:, axis] = here[axis] + np.cumsum(values[:, 0]) if relative else values[:, 0]
    return points


def _raised(here: FloatArray, corners: FloatArray) -> FloatArray:
    """A quadratic curve's (control, end) as a cubic's (control, control, end)."""
    control, end = corners
    return np.array([here + 2 / 3 * (control - here), end + 2 / 3 * (control - end), end])


def _chords(cubic: FloatArray) -> FloatArray:
    """Points of a cubic (4, 2) in mm after its first; no chord leaves it by more than the error.

    The chord of a piece of length h in the parameter is off by at most h^2 / 8 times the
    largest second derivative, which for a cubic is 6 times the larger second difference.
    """
    second = np.array([cubic[0] - 2 * cubic[1] + cubic[2], cubic[1] - 2 * cubic[2] + cubic[3]])
    bend = 6 * float(np.hypot(second[:, 0], second[:, 1]).max())
    count = min(max(1, math.ceil(math.sqrt(bend / (8 * CHORD_ERROR_MM)))), MOST_POINTS)
    u = np.arange(1, count + 1)[:, None] / count
    return np.asarray(
        (1 - u) ** 3 * cubic[0] + 3 * (1 - u) ** 2 * u * cubic[1] + 3 * (1 - u) * u**2 * cubic[2] + u**3 * cubic[3]
    )


def _arc(matrix: FloatArray, here: FloatArray, row: FloatArray, end: FloatArray) -> FloatArray:
    """Points of an elliptical arc after its first (SVG 1.1, appendix F.6: end points to centre)."""
    rx, ry = abs(row[0]), abs(row[1])
    if not rx or not ry or np.array_equal(here, end):
        return apply(matrix, end[None, :])
    turn = math.radians(row[2] % 360.0)
    c, s = math.cos(turn), math.sin(turn)
    half = (here - end) / 2
    x, y = c * half[0] + s * half[1], -s * half[0] + c * half[1]
    stretch = (x / rx) ** 2 + (y / ry) ** 2
    if stretch > 1:
        rx, ry = rx * math.sqrt(stretch), ry * math.sqrt(stretch)
        stretch = 1.0
    root = math.sqrt(max(1 / stretch - 1, 0.0)) * (-1 if row[3] == row[4] else 1)
    cx, cy = root * rx * y / ry, -root * ry * x / rx
    centre = np.array([c * cx - s * cy, s * cx + c * cy]) + (here + end) / 2
    first = math.atan2((y - cy) / ry, (x - cx) / rx)
    last = math.atan2((-y - cy) / ry, (-x - cx) / rx)
    sweep = (last - first) % (2 * math.pi)
    if not row[4]:
        sweep -= 2 * math.pi
    points = arc_points(matrix, centre, rx, ry, turn, first, sweep)[1:]
    points[-1] = apply(matrix, end[None, :])[0]
    return points


def arc_points(
    matrix: FloatArray, centre: FloatArray, rx: float, ry: float, turn: float, first: float, sweep: float
) -> FloatArray:
    """Points on an elliptical arc in mm, both ends included, chords within the error."""
    largest = max(rx, ry) * float(np.linalg.norm(matrix[:2, :2], 2))
    step = 2 * math.acos(max(1 - CHORD_ERROR_MM / largest, -0.5)) if largest > 0 else math.pi
    count = min(max(2, math.ceil(abs(sweep) / step)), MOST_POINTS)
    angle = first + sweep * np.arange(count + 1) / count
    c, s = math.cos(turn), math.sin(turn)
    x, y = rx * np.cos(angle), ry * np.sin(angle)
    return apply(matrix, np.column_stack([c * x - s * y, s * x + c * y]) + centre)


def too_many_points() -> OutlineError:
    """The error of a drawing with too many points."""
    return OutlineError(
        "its outlines have too many points",
        allowed=f"at most {MOST_POINTS}, with curves as chords {CHORD_ERROR_MM * 1000:g} um off",
    )


def _bad_path(text: str) -> OutlineError:
    return OutlineError(
        "has path data that cannot be read",
        value=clip(text),
        allowed="path commands with numbers, as SVG has them",
    )
