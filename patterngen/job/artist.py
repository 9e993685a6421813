"""The child process that reads artwork: bytes in on standard input, plain numbers out, nothing else.

It opens no file, and caps its own memory and time before it looks at the first byte.
Protocol: one JSON line with the tasks, then their bytes; for each task one JSON line with
the answer, then its bytes.
"""

from __future__ import annotations

import json
import sys
from collections.abc import Mapping
from typing import Any, BinaryIO

import numpy as np

MEMORY_BYTES = 3 << 30
PROCESSOR_SECONDS = 20


def main() -> None:
    """Answer every task on standard input."""
    _cap()
    source, answer = sys.stdin.buffer, sys.stdout.buffer
    for task in json.loads(source.readline()):
        data = source.read(task["bytes"])
        head, body = _answer(task, data)
        _send(answer, head, body)


def _answer(task: Mapping[str, Any], data: bytes) -> tuple[dict[str, Any], bytes]:
    from shapely.errors import ShapelyError

    from patterngen.job.outlines import OutlineError
    from patterngen.job.pictures import PictureError

    try:
        return _outlines(task, data) if task["kind"] == "outlines" else _picture(task, data)
    except (OutlineError, PictureError) as error:
        return {
            "problem": error.problem,
            "value": error.value,
            "allowed": error.allowed,
            "nearest": error.nearest,
        }, b""
    except ShapelyError:
        problem = "has outlines that cannot be united"
        return {"problem": problem, "value": "", "allowed": "outlines that do not cross", "nearest": ""}, b""
    except MemoryError:
        return {
            "problem": "needs too much memory",
            "value": "",
            "allowed": f"at most {MEMORY_BYTES >> 30} GiB",
            "nearest": "",
        }, b""
    except RecursionError:
        return {"problem": "is nested too deep", "value": "", "allowed": "plain drawings", "nearest": ""}, b""


def _outlines(task: Mapping[str, Any], data: bytes) -> tuple[dict[str, Any], bytes]:
    from patterngen.job import outlines

    found = outlines.read(
        data,
        element=task["element"],
        sheet_mm=tuple(task["sheet_mm"]),
        box_mm=tuple(task["box_mm"]),
        label=task["label"],
    )
    lengths = [len(ring) for ring in found.rings]
    return {"rings": lengths, "remarks": found.remarks}, np.concatenate(found.rings).astype("<f8").tobytes()


def _picture(task: Mapping[str, Any], data: bytes) -> tuple[dict[str, Any], bytes]:
    from patterngen.job import pictures

    found = pictures.read(data, label=task["label"])
    values = found.values.astype(found.values.dtype.newbyteorder("<"))
    return {
        "size": list(values.shape),
        "bits": 8 * values.itemsize,
        "remarks": found.remarks,
    }, values.tobytes()


def _send(stream: BinaryIO, head: dict[str, Any], body: bytes) -> None:
    stream.write(json.dumps(head | {"bytes": len(body)}).encode() + b"\n")
    stream.write(body)
    stream.flush()


def _cap() -> None:
    import resource

    for what, most, last in (
        (resource.RLIMIT_AS, MEMORY_BYTES, MEMORY_BYTES),
        # the soft end sends a signal that tells why; the hard one only kills
        (resource.RLIMIT_CPU, PROCESSOR_SECONDS, PROCESSOR_SECONDS + 5),
        (resource.RLIMIT_FSIZE, 0, 0),
        (resource.RLIMIT_CORE, 0, 0),
    ):
        hard = resource.getrlimit(what)[1]
        if hard != resource.RLIM_INFINITY:
            most, last = min(most, hard), min(last, hard)
        resource.setrlimit(what, (most, last))


if __name__ == "__main__":
    main()
