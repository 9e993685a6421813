"""A job's folder: new files wait beside the old ones until all are whole, the manifest comes last."""

from __future__ import annotations

import fcntl
import os
import re
import time
from collections.abc import Iterable, Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from patterngen.errors import Fault, InputError, MachineError
from patterngen.files import Staged, refuse_odd_target, stage, sync_folder
from patterngen.writers import manifest
from patterngen.writers.manifest import Written

LOCK = ".lock"
"""Held by whoever writes into the folder; gone when nobody does."""
WAIT_S = 5.0
"""How long a second writer waits for the first."""
_POLL_S = 0.02
_OURS = r"(?:(?:base|key|key-[^/]+)\.(?:svg|pdf)|overlay\.html|docket\.pdf|verdict\.json)"
_FILE = re.compile(_OURS)
_ALWAYS_OURS = frozenset({"base.svg", "base.pdf", "verdict.json"})
"""Taken away when they are not written again, even where no manifest says that they were ours."""
_TEMPORARY = re.compile(rf"\.(?:{_OURS}|{re.escape(manifest.NAME)})\.\d+(?:\.[0-9a-f]+)?\.part")


class JobFolder:
    """The folder of one job while its files are being written.

    Until `finish` the files wait under temporary names: whatever fails or stops before, the
    job that was there stays, whole and with its manifest.  From the first file on no other
    writer gets in; the lock goes with the process that holds it, however that ends.
    """

    def __init__(self, path: Path) -> None:
        self.path = path
        self.written: dict[str, Written] = {}
        self._staged: dict[str, Staged] = {}
        self._lock: int | None = None
        self._listed_before: frozenset[str] = frozenset()

    def write(self, name: str, data: bytes | Iterable[bytes]) -> None:
        """Write one file whole beside its place.  Raises `InputError` or `MachineError`."""
        self._begin()
        staged = self._stage(name, data)
        self.written[name] = Written(staged.sha256, staged.size)

    def finish(self, text: bytes) -> None:
        """Give all files their names, the manifest last: from now on the job is finished.

        The older manifest goes first, then the job's older files that are not written again:
        a verdict never stands beside drawings that it does not belong to.
        """
        self._begin()
        last = self._stage(manifest.NAME, text)
        # nothing has changed yet, so this is the place to refuse
        for staged in self._staged.values():
            refuse_odd_target(staged.path)
        with _told(self.path, "an older file could not be removed"):
            last.path.unlink(missing_ok=True)
        sync_folder(self.path)
        self._remove_left_over()
        for staged in self._staged.values():
            if staged is not last:
                staged.put()
        # on the disk the files must be there before the manifest that lists them
        sync_folder(self.path)
        last.put()
        sync_folder(self.path)

    def close(self) -> None:
        """Take away what still waits, and let the next writer in."""
        for staged in self._staged.values():
            staged.drop()
        if self._lock is not None:
            # while it is held nobody else can have a lock file of that name
            with suppress(OSError):
                (self.path / LOCK).unlink()
            os.close(self._lock)
            self._lock = None

    def _stage(self, name: str, data: bytes | Iterable[bytes]) -> Staged:
        staged = self._staged[name] = stage(self.path / name, data)
        return staged

    def _begin(self) -> None:
        """Before the first file: wait for the folder, and clear what runs that were killed left in it."""
        if self._lock is not None:
            return
        self._lock = _locked(self.path)
        self._listed_before = manifest.listed(self.path)
        with _told(self.path, "an older file could not be removed"):
            for entry in self.path.iterdir():
                # nobody else is writing, so no living run needs it
                if _TEMPORARY.fullmatch(entry.name):
                    entry.unlink(missing_ok=True)

    def _remove_left_over(self) -> None:
        with _told(self.path, "an older file could not be removed"):
            for entry in self.path.iterdir():
                ours = entry.name in self._listed_before or entry.name in _ALWAYS_OURS
                if ours and _FILE.fullmatch(entry.name) and entry.name not in self.written:
                    entry.unlink(missing_ok=True)


@contextmanager
def job_folder(out: Path, job: str) -> Iterator[JobFolder]:
    """The folder `out`/`job`, made where it is missing; removed again if nothing came into it.

    Raises `InputError` where something else has that name, `MachineError` where it cannot
    be made, or when another run does not finish writing into it within `WAIT_S`.
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
    folder = JobFolder(path)
    try:
        yield folder
    except BaseException:
        folder.close()
        if made:
            with suppress(OSError):
                path.rmdir()
        raise
    folder.close()


def _locked(folder: Path) -> int:
    """A descriptor that holds the folder's lock file.  Raises `MachineError` after `WAIT_S`."""
    path = folder / LOCK
    until = time.monotonic() + WAIT_S
    while True:
        with _told(folder, "the folder could not be locked"):
            # the run before us may have taken away a folder that it had made
            folder.mkdir(exist_ok=True)
            handle = os.open(path, os.O_RDWR | os.O_CREAT | os.O_CLOEXEC | os.O_NOFOLLOW, 0o666)
            try:
                if _taken(handle) and _same(handle, path):
                    return handle
            except BaseException:
                os.close(handle)
                raise
            os.close(handle)
        if time.monotonic() >= until:
            raise MachineError(f"{folder}: another run has been writing into this folder for {WAIT_S:g} s")
        time.sleep(_POLL_S)


def _taken(handle: int) -> bool:
    try:
        fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except BlockingIOError:
        return False
    return True


def _same(handle: int, path: Path) -> bool:
    """Whether the lock file is still the one of that name: its holder removes it when it is done."""
    try:
        return os.path.samestat(os.fstat(handle), path.lstat())
    except FileNotFoundError:
        return False


@contextmanager
def _told(path: Path, problem: str) -> Iterator[None]:
    try:
        yield
    except OSError as error:
        raise MachineError(f"{path}: {problem} ({_cause(error)})") from error


def _cause(error: OSError) -> str:
    return (error.strerror or type(error).__name__).lower()
