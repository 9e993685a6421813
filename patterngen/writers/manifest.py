"""The manifest: what a finished job consists of, and how to tell that it is still so."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

import patterngen
from patterngen.errors import Fault, InputError
from patterngen.files import digest_of, read_plain_file
from patterngen.model.job import Job
from patterngen.writers.verdict import FORMAT, encode, plain

NAME = "manifest.json"
_MOST_BYTES = 50_000_000


@dataclass(frozen=True, slots=True)
class Written:
    """A file that was put into place: SHA-256 (hex) and size in bytes."""

    sha256: str
    size: int


def dumps(job: Job, files: Mapping[str, Written], *, verdict: str) -> bytes:
    """The manifest of a job's files, sorted by name.

    It holds the `verdict` ("pass", "warn", "fail"), the preset as it was
    used and its digest, the digests of the artwork that it names, the program's version, and
    the seeds by name, but never what a seed was made from in secret.
    """
    seeds = {screen.name: screen.params["seed"] for screen in job.screens if "seed" in screen.params}
    return encode(
        {
            "patterngen": FORMAT,
            "version": patterngen.__version__,
            "job": job.name,
            "verdict": verdict,
            "preset": {"sha256": hashlib.sha256(job.text.encode()).hexdigest(), "text": job.text},
            "artwork": plain(dict(sorted(job.artwork.items()))),
            "seeds": plain(seeds),
            "files": {name: {"sha256": files[name].sha256, "bytes": files[name].size} for name in sorted(files)},
        }
    )


def listed(folder: Path) -> frozenset[str]:
    """Names of the files that the folder's manifest lists; none where there is no manifest, or not a whole one."""
    try:
        return frozenset(_read(folder))
    except InputError:
        return frozenset()


def differences(folder: Path) -> list[str]:
    """One sentence for each file of a finished job that is missing, no longer what was written, or added.

    Raises `InputError` where there is no manifest, or none that can be read: that job is
    not finished.
    """
    files = _read(folder)
    out = []
    for name, (sha256, size) in sorted(files.items()):
        target = folder / name
        if Path(name).name != name:
            out.append(f"{name}: not a name of a file in this folder")
        elif target.is_symlink() or not target.is_file():
            out.append(f"{name}: missing")
        elif target.stat().st_size != size or digest_of(target) != sha256:
            out.append(f"{name}: not what was written")
    there = {entry.name for entry in folder.iterdir() if not entry.name.startswith(".")}
    return [*out, *(f"{name}: added, the manifest does not list it" for name in sorted(there - files.keys() - {NAME}))]


def _read(folder: Path) -> dict[str, tuple[str, int]]:
    """SHA-256 and size by name.  Raises `InputError` where there is no whole manifest."""
    path = folder / NAME
    data = read_plain_file(path, most_bytes=_MOST_BYTES, what="the manifest")
    try:
        return {str(name): (str(e["sha256"]), int(e["bytes"])) for name, e in json.loads(data)["files"].items()}
    except (ValueError, KeyError, TypeError, AttributeError, RecursionError):
        raise InputError(Fault(str(path), "", "this is not a manifest")) from None
