"""A job's folder: old files go before they could mislead, the manifest comes last."""

from __future__ import annotations

import os
import re
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from patterngen.errors import Fault, InputError, MachineError
from patterngen.files import write_atomically
from patterngen.writers import manifest
from patterngen.writers.manifest import Written

_PRINTING = re.compile(r"(base|key|key-[^/]+)\.(svg|pdf)")
_OTHERS = re.compile(r"overlay\.html|docket\.pdf|verdict\.json")
_TEMPORARY = re.compile(r"\..+\.(\d+)\.part")


class JobFolder:
    """The folder of one job while its files are being written.

    Printing files are written first.  Whatever printing file of an earlier run has not been
    replaced when the first other file comes is removed: a verdict never stands beside
    drawings that it does not belong to.
    """

    def __init__(self, path: Path) -> None:
        self.path = path
        self.written: dict[str, Written] = {}
        self._begun = False

    def write(self, name: str, data: bytes) -> None:
        """Put one file into place whole.  Raises `InputError` or `MachineError`."""
        self._begin()
        if not _PRINTING.fullmatch(name):
            self._remove_left_over(_PRINTING)
        self.written[name] = Written(write_atomically(self.path / name, data), len(data))

    def finish(self, text: bytes) -> None:
        """Write the manifest: from now on the job is finished."""
        self._begin()
        self._remove_left_over(_PRINTING)
        self._remove_left_over(_OTHERS)
        write_atomically(self.path / manifest.NAME, text)

    def _begin(self) -> None:
        """Before the first change: the folder no longer holds a finished job."""
        if self._begun:
            return
        self._begun = True
        with _told(self.path):
            (self.path / manifest.NAME).unlink(missing_ok=True)
            for entry in self.path.iterdir():
                match = _TEMPORARY.fullmatch(entry.name)
                if match and not _alive(int(match[1])):
                    entry.unlink(missing_ok=True)

    def _remove_left_over(self, names: re.Pattern[str]) -> None:
        with _told(self.path):
            for entry in self.path.iterdir():
                if names.fullmatch(entry.name) and entry.name not in self.written:
                    entry.unlink(missing_ok=True)


@contextmanager
def job_folder(out: Path, job: str) -> Iterator[JobFolder]:
    """The folder `out`/`job`, made where it is missing; removed again if nothing came into it.

    Raises `InputError` where something else has that name, `MachineError` where it cannot
    be made.
    """
    path = out / job
    made = not path.exists()
    if path.is_symlink() or (not made and not path.is_dir()):
        raise InputError(Fault(str(path), "", "no folder, but something else of that name, is there"))
    try:
        path.mkdir(parents=True, exist_ok=True)
    except (FileExistsError, NotADirectoryError):
        raise InputError(Fault(str(out), "", "this is not a folder")) from None
    except OSError as error:
        raise MachineError(f"{path}: the folder could not be made ({_cause(error)})") from error
    try:
        yield JobFolder(path)
    except BaseException:
        if made:
            with suppress(OSError):
                path.rmdir()
        raise


@contextmanager
def _told(path: Path) -> Iterator[None]:
    try:
        yield
    except OSError as error:
        raise MachineError(f"{path}: an older file could not be removed ({_cause(error)})") from error


def _cause(error: OSError) -> str:
    return (error.strerror or type(error).__name__).lower()


def _alive(process: int) -> bool:
    """Whether a process of that number runs here."""
    try:
        os.kill(process, 0)
    except (ProcessLookupError, OverflowError):
        return False
    except PermissionError:
        return True
    return True
