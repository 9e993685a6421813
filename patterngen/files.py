"""Files read and written so that nothing is ever half there.

Reading takes plain files only, by size before content.  Writing goes to a marked
temporary file in the same folder, which is flushed, read back, compared and renamed:
whoever looks sees the old file or the new one.
"""

from __future__ import annotations

import hashlib
import os
import secrets
import stat
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

from patterngen.errors import Fault, InputError, MachineError


def read_plain_file(path: Path, *, most_bytes: int, what: str, where: str = "", key: str = "") -> bytes:
    """The bytes of a plain file.

    `what` names it in messages ("the preset"); `where` and `key` stand in the fault
    (default: the path itself).  Raises `InputError` for anything that is missing, not a
    plain file, not readable, or larger than `most_bytes`, before a byte is read.
    """

    def refuse(problem: str, *, allowed: str = "", value: str = "") -> InputError:
        return InputError(Fault(where or str(path), key, f"{what} {problem}", value=value, allowed=allowed))

    try:
        status = path.stat()
        _refuse_special(status, refuse)
        # without O_NONBLOCK a pipe put there after the check would hold us for ever
        handle = os.open(path, os.O_RDONLY | os.O_CLOEXEC | getattr(os, "O_NONBLOCK", 0))
    except FileNotFoundError:
        raise refuse("does not exist", value=str(path) if where else "") from None
    except PermissionError:
        raise refuse("may not be read: no permission") from None
    except NotADirectoryError:
        raise refuse("lies in something that is not a folder") from None
    except (OSError, ValueError) as error:
        raise refuse(f"cannot be opened ({_cause(error)})") from None
    with open(handle, "rb") as file:  # noqa: PTH123 (a descriptor, not a path)
        status = os.fstat(handle)
        _refuse_special(status, refuse)
        try:
            data = file.read(most_bytes + 1) if status.st_size <= most_bytes else b""
        except OSError as error:
            raise MachineError(f"{path}: {what} could not be read ({_cause(error)})") from error
    size = max(status.st_size, len(data))
    if size > most_bytes:
        raise refuse("is too large", value=f"{size} bytes", allowed=f"at most {most_bytes} bytes")
    return data


def _refuse_special(status: os.stat_result, refuse: object) -> None:
    kinds = {
        stat.S_IFDIR: "is a folder",
        stat.S_IFIFO: "is a pipe",
        stat.S_IFCHR: "is a device",
        stat.S_IFBLK: "is a device",
        stat.S_IFSOCK: "is a socket",
    }
    if not stat.S_ISREG(status.st_mode):
        assert callable(refuse)
        raise refuse(kinds.get(stat.S_IFMT(status.st_mode), "is something special"), allowed="a plain file")


@dataclass(frozen=True, slots=True)
class Staged:
    """A whole file under a temporary name beside its own: `put` gives it its name, `drop` takes it away."""

    path: Path
    part: Path
    sha256: str
    size: int

    def put(self) -> None:
        """Take the final name.  The folder is not flushed.  Raises `MachineError`."""
        with _told(self.path):
            self.part.replace(self.path)

    def drop(self) -> None:
        """Remove the temporary, if it is still there."""
        _forget(self.part)


def stage(path: Path, data: bytes | Iterable[bytes]) -> Staged:
    """Write a file beside its final name: flushed, fsynced, read back and compared.

    Pieces are written as they come, so that a long file need never be whole in memory.
    Raises `InputError` where the name is taken by a link, folder or pipe, `MachineError`
    where the machine fails; then no temporary is left.  Only a process that is killed leaves
    one, `.<name>.<process>.<random>.part`.
    """
    path = Path(path)
    refuse_odd_target(path)
    part = path.with_name(f".{path.name}.{os.getpid()}.{secrets.token_hex(4)}.part")
    wanted, size = hashlib.sha256(), 0
    try:
        with _told(path):
            # a name that nobody could plant, and never through one that is there
            with part.open("xb") as file:
                for piece in (data,) if isinstance(data, bytes) else data:
                    wanted.update(piece)
                    size += len(piece)
                    file.write(piece)
                file.flush()
                os.fsync(file.fileno())
            if digest_of(part) != wanted.hexdigest():
                raise OSError("what was written is not what can be read back")
    except BaseException:
        _forget(part)
        raise
    return Staged(path, part, wanted.hexdigest(), size)


def write_atomically(path: Path, data: bytes | Iterable[bytes]) -> str:
    """Put a file into place whole: `stage`, rename, fsync the folder.

    Returns the SHA-256 (hex) of what was written and read back.  Raises as `stage` does; then
    an older file of that name is untouched.
    """
    staged = stage(path, data)
    try:
        staged.put()
        sync_folder(staged.path.parent)
    except BaseException:
        staged.drop()
        raise
    return staged.sha256


def digest_of(path: Path) -> str:
    """SHA-256 (hex) of a file, read in pieces."""
    with Path(path).open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


def refuse_odd_target(path: Path) -> None:
    """Raise `InputError` where a link, a folder or a pipe stands in the place of a file to write."""
    try:
        status = path.lstat()
    except FileNotFoundError:
        return
    except (OSError, ValueError) as error:
        raise InputError(Fault(str(path), "", f"this cannot be a file to write ({_cause(error)})")) from None
    if stat.S_ISLNK(status.st_mode):
        raise InputError(
            Fault(
                str(path),
                "",
                "a link stands where a file is to be written",
                allowed="a plain file or nothing",
            )
        )
    if not stat.S_ISREG(status.st_mode):
        kind = "a folder" if stat.S_ISDIR(status.st_mode) else "something that is not a file"
        raise InputError(
            Fault(
                str(path),
                "",
                f"{kind} stands where a file is to be written",
                allowed="a plain file or nothing",
            )
        )


def sync_folder(folder: Path) -> None:
    """Flush the names in a folder to the disk.  Raises `MachineError`."""
    with _told(folder):
        handle = os.open(folder, os.O_RDONLY | getattr(os, "O_DIRECTORY", 0))
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


@contextmanager
def _told(path: Path) -> Iterator[None]:
    try:
        yield
    except OSError as error:
        raise MachineError(f"{path}: could not be written ({_cause(error)})") from error


def _forget(part: Path) -> None:
    # the first error is the one to tell; a temporary that cannot go is marked and harmless
    try:
        part.unlink(missing_ok=True)
    except OSError:
        return


def _cause(error: Exception) -> str:
    return (getattr(error, "strerror", None) or str(error) or type(error).__name__).lower()
