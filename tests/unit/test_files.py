"""Files written whole or not at all."""

from __future__ import annotations

import errno
import hashlib
import os
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

from patterngen.errors import InputError, MachineError
from patterngen.files import read_plain_file, write_atomically

OLD, NEW = b"old" * 1000, b"new" * 100_000


def leftovers(folder: Path) -> list[str]:
    return sorted(entry.name for entry in folder.iterdir() if entry.name != "lid.svg")


def test_written_and_hashed(tmp_path: Path) -> None:
    """second way: the digest returned is that of the bytes on disk."""
    path = tmp_path / "lid.svg"
    path.write_bytes(OLD)
    digest = write_atomically(path, (NEW[at : at + 1000] for at in range(0, len(NEW), 1000)))
    assert path.read_bytes() == NEW
    assert digest == hashlib.sha256(NEW).hexdigest()
    assert not leftovers(tmp_path)


@pytest.mark.parametrize("call", ["fsync", "replace", "open", "write", "read back"])
def test_old_file_stays(call: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """invariant: whichever call fails, the old file is whole, the fault named, nothing left."""
    path = tmp_path / "lid.svg"
    path.write_bytes(OLD)

    def fail(*_: Any, **__: Any) -> Any:
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    data: Any = NEW
    if call == "fsync":
        monkeypatch.setattr(os, "fsync", fail)
    elif call == "replace":
        monkeypatch.setattr(Path, "replace", fail)
    elif call == "open":
        monkeypatch.setattr(Path, "open", fail)
    elif call == "read back":
        monkeypatch.setattr("patterngen.files.digest_of", lambda _: "0" * 64)
    else:

        def pieces() -> Any:
            yield NEW
            fail()

        data = pieces()
    with pytest.raises(MachineError, match=r"lid\.svg: could not be written"):
        write_atomically(path, data)
    monkeypatch.undo()
    assert path.read_bytes() == OLD
    assert not leftovers(tmp_path)


def test_a_fault_of_the_caller_leaves_nothing(tmp_path: Path) -> None:
    """invariant: when what makes the bytes fails, that error comes through and nothing is left."""

    def pieces() -> Any:
        yield NEW
        raise KeyError("a mistake")

    with pytest.raises(KeyError):
        write_atomically(tmp_path / "lid.svg", pieces())
    assert not list(tmp_path.iterdir())


@pytest.mark.parametrize("kind", ["link", "dangling link", "folder", "pipe"])
def test_odd_targets(kind: str, tmp_path: Path) -> None:
    """invariant: what is no plain file is not written over."""
    path = tmp_path / "lid.svg"
    if kind == "link":
        (tmp_path / "other").write_bytes(OLD)
        path.symlink_to(tmp_path / "other")
    elif kind == "dangling link":
        path.symlink_to(tmp_path / "nothing")
    elif kind == "folder":
        path.mkdir()
    else:
        os.mkfifo(path)
    with pytest.raises(InputError, match="stands where a file"):
        write_atomically(path, NEW)
    assert not (tmp_path / "nothing").exists()


def test_folder_missing(tmp_path: Path) -> None:
    """invariant: a folder that is not there is the machine's word, not a traceback."""
    with pytest.raises(MachineError, match="no such file"):
        write_atomically(tmp_path / "gone" / "lid.svg", NEW)


def test_killed_midway(tmp_path: Path) -> None:
    """invariant: killed while writing, the old file is whole and what is left is marked as a part."""
    path = tmp_path / "lid.svg"
    path.write_bytes(OLD)
    code = (
        "import os, sys\n"
        "from pathlib import Path\n"
        "from patterngen.files import write_atomically\n"
        "def pieces():\n"
        "    yield b'new' * 1000\n"
        "    os.kill(os.getpid(), 9)\n"
        "write_atomically(Path(sys.argv[1]), pieces())\n"
    )
    environment = os.environ | {"PYTHONPATH": os.pathsep.join(p or "." for p in sys.path)}
    done = subprocess.run([sys.executable, "-c", code, str(path)], env=environment, check=False)
    assert done.returncode == -9
    assert path.read_bytes() == OLD
    assert all(name.startswith(".lid.svg.") and name.endswith(".part") for name in leftovers(tmp_path))
    write_atomically(path, NEW)
    assert path.read_bytes() == NEW


def test_size_before_content(tmp_path: Path) -> None:
    """invariant: a file over the cap is refused without being read."""
    path = tmp_path / "huge"
    with path.open("wb") as file:
        file.truncate(10 << 30)  # a hole: reading it would take seconds
    with pytest.raises(InputError, match="too large"):
        read_plain_file(path, most_bytes=1000, what="the preset")
