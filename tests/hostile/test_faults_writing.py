"""invariant: whatever fails while a job is written, each file is the old or a whole new one, and a re-run mends all."""

from __future__ import annotations

import contextlib
import errno
import os
import resource
import shutil
import signal
import subprocess
import sys
import warnings
from collections.abc import Callable
from pathlib import Path

import pytest

from patterngen.errors import MachineError
from patterngen.writers import _files, manifest
from patterngen.writers._files import job_folder
from tests import drawings

OLD = {"base.pdf": b"old" * 9_000, "base.svg": b"OLD" * 9_000, "verdict.json": b"{}"}
NEW = {"base.pdf": b"new!" * 200_000, "base.svg": b"NEW!" * 200_000, "verdict.json": b'{"verdict": "pass"}'}
ROOT = Path(__file__).parents[2]


def write(out: Path, files: dict[str, bytes]) -> Path:
    job = drawings.job()
    with job_folder(out, job.name) as folder:
        for name, data in files.items():
            folder.write(name, data)
        folder.finish(manifest.dumps(job, folder.written, verdict="pass"))
        return folder.path


def contents(folder: Path) -> dict[str, bytes]:
    return {path.name: path.read_bytes() for path in folder.iterdir()}


def check_nothing_is_torn(folder: Path) -> None:
    """Every file is an old or a new one, and beside a manifest all are of one run."""
    found = {name: data for name, data in contents(folder).items() if not name.startswith(".")}
    finished = found.pop("manifest.json", None)
    for name, data in found.items():
        assert data in (OLD[name], NEW[name]), name
    if finished is not None:
        assert found in (OLD, NEW)
        assert manifest.differences(folder) == []


def check_rerun(out: Path, clean: dict[str, bytes]) -> None:
    assert contents(write(out, NEW)) == clean


@pytest.fixture
def clean(tmp_path: Path) -> dict[str, bytes]:
    return contents(write(tmp_path / "clean", NEW))


def in_child(work: Callable[[], None]) -> int:
    """Run in a forked child; its wait status."""
    with warnings.catch_warnings():
        # nothing of the child's work needs another thread's lock
        warnings.simplefilter("ignore", DeprecationWarning)
        child = os.fork()
    if child == 0:
        status = 1
        try:
            work()
            status = 0
        except MachineError:
            status = 3
        finally:
            os._exit(status)
    return os.waitpid(child, 0)[1]


class KillAt:
    """Kills its own process at the n-th call that touches the file system."""

    def __init__(self, n: int) -> None:
        self.left = n

    def arm(self) -> None:
        for name in ("open", "fsync", "replace", "rename", "unlink", "listdir", "scandir", "mkdir", "close"):
            setattr(os, name, self.counted(getattr(os, name)))

    def counted(self, call: Callable[..., object]) -> Callable[..., object]:
        def wrapped(*args: object, **named: object) -> object:
            self.left -= 1
            if self.left == 0:
                os.kill(os.getpid(), signal.SIGKILL)
            return call(*args, **named)

        return wrapped


def test_killed_at_every_step(tmp_path: Path, clean: dict[str, bytes]) -> None:
    """Killed at its first, second, third … call until it gets through; each time the rest is whole."""
    kills, seen = 0, set()
    for n in range(1, 200):
        out = tmp_path / f"run{n}"
        folder = write(out, OLD)
        killer = KillAt(n)

        def work(killer: KillAt = killer, out: Path = out) -> None:
            killer.arm()
            write(out, NEW)

        status = in_child(work)
        check_nothing_is_torn(folder)
        seen.add((contents(folder)["base.pdf"] == NEW["base.pdf"], (folder / "manifest.json").exists()))
        if os.WIFEXITED(status):
            assert os.WEXITSTATUS(status) == 0
            break
        kills += 1
        check_rerun(out, clean)
        shutil.rmtree(out)
    assert kills > 10
    # the old job, nothing finished, the new job
    assert seen == {(False, True), (False, False), (True, False), (True, True)}


@pytest.mark.parametrize("kilobytes", [4, 64, 700, 790])
def test_file_size_limit(tmp_path: Path, clean: dict[str, bytes], kilobytes: int) -> None:
    """The system refuses larger files: exit code 3's error, the old drawing kept, no temporary left."""
    folder = write(tmp_path / "out", OLD)

    def work() -> None:
        resource.setrlimit(resource.RLIMIT_FSIZE, (kilobytes * 1024,) * 2)
        write(tmp_path / "out", NEW)

    before = contents(folder)
    status = in_child(work)
    if kilobytes * 1024 < len(NEW["base.pdf"]):
        assert os.WEXITSTATUS(status) == 3
        assert contents(folder) == before
    check_nothing_is_torn(folder)
    check_rerun(tmp_path / "out", clean)


@pytest.mark.parametrize(("call", "error"), [("fsync", errno.EIO), ("fsync", errno.ENOSPC), ("replace", errno.EXDEV)])
@pytest.mark.parametrize("n", [1, 2, 4, 6])
def test_nth_call_fails(
    tmp_path: Path, clean: dict[str, bytes], monkeypatch: pytest.MonkeyPatch, call: str, error: int, n: int
) -> None:
    """A flush or rename that fails is told as the machine's fault; what was there stays whole."""
    folder = write(tmp_path / "out", OLD)
    before = contents(folder)
    real, seen = getattr(os, call), 0

    def failing(*args: object, **named: object) -> object:
        nonlocal seen
        seen += 1
        if seen == n:
            raise OSError(error, os.strerror(error))
        return real(*args, **named)

    with monkeypatch.context() as patch:
        patch.setattr(os, call, failing)
        if call == "replace" and n > 4:
            # three files and the manifest: no further rename
            write(tmp_path / "out", NEW)
        else:
            with pytest.raises(MachineError):
                write(tmp_path / "out", NEW)
            assert not list(folder.glob(".*"))
        if call == "fsync" and n <= len(NEW) + 1:
            # the files and the manifest waiting beside the old ones
            assert contents(folder) == before
    check_nothing_is_torn(folder)
    check_rerun(tmp_path / "out", clean)


def test_two_writers_and_a_reader(tmp_path: Path) -> None:
    """Two processes write one job at once; every file read is whole, and a manifest's digests never mix two runs."""
    out = tmp_path / "out"
    folder = write(out, OLD)
    manifests = {(folder / "manifest.json").read_bytes(), (write(tmp_path / "b", NEW) / "manifest.json").read_bytes()}
    children = []
    for files in (OLD, NEW):
        with warnings.catch_warnings():
            warnings.simplefilter("ignore", DeprecationWarning)
            child = os.fork()
        if child == 0:
            status = 1
            try:
                for _ in range(30):
                    write(out, files)
                status = 0
            finally:
                os._exit(status)
        children.append(child)
    reads, seen = 0, set()
    while children:
        data = (folder / "base.pdf").read_bytes()
        assert data in (OLD["base.pdf"], NEW["base.pdf"])
        seen.add(data[:3])
        with contextlib.suppress(FileNotFoundError):
            assert (folder / "manifest.json").read_bytes() in manifests
        reads += 1
        done, status = os.waitpid(children[0], os.WNOHANG)
        if done:
            assert status == 0
            children.remove(done)
    assert reads > 20
    assert seen == {b"old", b"new"}
    assert not list(folder.glob(".*"))
    check_nothing_is_torn(folder)
    assert (folder / "manifest.json").exists()


def test_the_lock_goes_with_the_process_that_held_it(tmp_path: Path, clean: dict[str, bytes]) -> None:
    """Killed between two files it keeps nobody waiting; a living holder does."""
    out = tmp_path / "out"
    folder = write(out, OLD)
    here, there = os.pipe()
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", DeprecationWarning)
        child = os.fork()
    if child == 0:
        with job_folder(out, "wrapper") as own:
            own.write("base.pdf", NEW["base.pdf"])
            os.write(there, b"!")
            signal.pause()
    assert os.read(here, 1) == b"!"
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(_files, "WAIT_S", 0.1)
        with pytest.raises(MachineError, match="another run"):
            write(out, NEW)
        os.kill(child, signal.SIGKILL)
        os.waitpid(child, 0)
        assert manifest.differences(folder) == []
        check_rerun(out, clean)


IN_NAMESPACE = """
import sys
sys.path.insert(0, sys.argv[2])
from pathlib import Path
from tests.hostile.test_faults_writing import NEW, OLD, check_nothing_is_torn, contents, write
from patterngen.errors import MachineError
out = Path(sys.argv[1])
if sys.argv[3] == "old":
    write(out, OLD)
else:
    try:
        write(out, NEW)
    except MachineError as error:
        print(error)
        # the old job, finished as it was, and nothing else
        assert sorted(contents(out / "wrapper")) == sorted([*OLD, "manifest.json"])
        assert (out / "wrapper" / "base.pdf").read_bytes() == OLD["base.pdf"]
        check_nothing_is_torn(out / "wrapper")
        sys.exit(3)
"""


@pytest.mark.parametrize(
    ("prepare", "between", "words"),
    [
        ("mount -t tmpfs -o size=400k none {d}", "true", "no space"),
        ("mount --bind {d} {d}", "mount -o remount,ro,bind {d}", "read-only"),
    ],
    ids=["disk full", "read-only"],
)
def test_disk(tmp_path: Path, prepare: str, between: str, words: str) -> None:
    """A full and a read-only disk, each in a mount namespace of its own."""
    if not shutil.which("unshare") or subprocess.run(["unshare", "-Urm", "true"], capture_output=True).returncode:
        pytest.skip("needs user namespaces (unshare -Urm)")
    script = tmp_path / "inside.py"
    script.write_text(IN_NAMESPACE)
    disk = tmp_path / "disk"
    disk.mkdir()
    run = f"{sys.executable} {script} {disk} {ROOT}"
    steps = [prepare.format(d=disk), f"{run} old", between.format(d=disk), f"{run} new"]
    done = subprocess.run(
        ["unshare", "-Urm", "sh", "-c", " && ".join(steps)], capture_output=True, text=True, timeout=60
    )
    assert done.returncode == 3, done.stderr
    assert words in done.stdout.lower()
