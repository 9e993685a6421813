"""invariant: a job's folder holds what its manifest says, and a manifest only when the job is finished."""

from __future__ import annotations

import hashlib
import json
import os
import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import pytest

from patterngen.errors import InputError
from patterngen.model.area import Area, ToneField
from patterngen.model.job import Gain, Job, ScreenRequest
from patterngen.writers import manifest
from patterngen.writers._files import job_folder
from tests import drawings


def write(out: Path, files: dict[str, bytes], job: Job | None = None) -> Path:
    job = job or drawings.job()
    with job_folder(out, job.name) as folder:
        for name, data in files.items():
            folder.write(name, data)
        folder.finish(manifest.dumps(job, folder.written))
        return folder.path


def names(folder: Path) -> list[str]:
    return sorted(path.name for path in folder.iterdir())


def test_manifest_lists_every_other_file(tmp_path: Path) -> None:
    folder = write(tmp_path, {"base.pdf": b"%PDF", "base.svg": b"<svg/>", "verdict.json": b"{}"})
    data = json.loads((folder / "manifest.json").read_bytes())
    assert sorted([*data["files"], "manifest.json"]) == names(folder)
    for name, entry in data["files"].items():
        content = (folder / name).read_bytes()
        assert entry == {"sha256": hashlib.sha256(content).hexdigest(), "bytes": len(content)}
    text = data["preset"]["text"]
    assert data["preset"]["sha256"] == hashlib.sha256(text.encode()).hexdigest()
    assert manifest.differences(folder) == []


def test_seeds_are_listed_by_name(tmp_path: Path) -> None:
    request = ScreenRequest(
        "grain", "Black", "stochastic", None, None, None, ToneField(0.2), Area((0, 0, 1, 1)), (0, 0), Gain(),
        {"seed": 7, "secret_file": "never.txt"},
    )  # fmt: skip
    folder = write(tmp_path, {"verdict.json": b"{}"}, replace(drawings.job(), screens=(request,)))
    text = (folder / "manifest.json").read_text()
    assert json.loads(text)["seeds"] == {"grain": 7}
    assert "never.txt" not in text


@pytest.mark.parametrize("change", ["edit", "same length", "remove", "link"])
def test_a_changed_file_is_noticed(tmp_path: Path, change: str) -> None:
    folder = write(tmp_path, {"base.pdf": b"%PDF", "verdict.json": b"{}"})
    target = folder / "base.pdf"
    match change:
        case "edit":
            target.write_bytes(b"%PDF-")
        case "same length":
            target.write_bytes(b"%PDG")
        case "remove":
            target.unlink()
        case "link":
            (tmp_path / "elsewhere").write_bytes(b"%PDF")
            target.unlink()
            target.symlink_to(tmp_path / "elsewhere")
    assert [line.split(":")[0] for line in manifest.differences(folder)] == ["base.pdf"]


@pytest.mark.parametrize("text", ["", "[]", '{"files": 3}', '{"files": {"a": {}}}', "[" * 5000])
def test_what_is_no_manifest_is_refused(tmp_path: Path, text: str) -> None:
    (tmp_path / "manifest.json").write_text(text)
    with pytest.raises(InputError):
        manifest.differences(tmp_path)


def test_a_manifest_reaches_no_file_outside(tmp_path: Path) -> None:
    digest = hashlib.sha256(b"x").hexdigest()
    (tmp_path / "x").write_bytes(b"x")
    inner = tmp_path / "job"
    inner.mkdir()
    (inner / "manifest.json").write_text(json.dumps({"files": {"../x": {"sha256": digest, "bytes": 1}}}))
    assert manifest.differences(inner) == ["../x: not a name of a file in this folder"]


def test_drawings_of_an_earlier_run_do_not_stay_beside_a_failed_verdict(tmp_path: Path) -> None:
    old = {"base.pdf": b"1", "base.svg": b"2", "key.svg": b"3", "key-seal.pdf": b"4", "overlay.html": b"5"}
    folder = write(tmp_path, {**old, "verdict.json": b"{}"})
    (folder / "notes.txt").write_text("the user's own")
    with job_folder(tmp_path, "wrapper") as again:
        again.write("verdict.json", b'{"verdict": "fail"}')
        assert names(folder) == ["notes.txt", "overlay.html", "verdict.json"]
        again.finish(manifest.dumps(drawings.job(), again.written))
    assert names(folder) == ["manifest.json", "notes.txt", "verdict.json"]


def test_the_manifest_goes_before_anything_changes(tmp_path: Path) -> None:
    folder = write(tmp_path, {"base.pdf": b"1", "verdict.json": b"{}"})

    def interrupted() -> None:
        with job_folder(tmp_path, "wrapper") as again:
            again.write("base.pdf", b"2")
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        interrupted()
    assert names(folder) == ["base.pdf", "verdict.json"]


def test_nothing_changes_before_the_first_write(tmp_path: Path) -> None:
    folder = write(tmp_path, {"base.pdf": b"1"})
    before = names(folder)
    with pytest.raises(ZeroDivisionError), job_folder(tmp_path, "wrapper"):
        raise ZeroDivisionError
    assert names(folder) == before
    with pytest.raises(ZeroDivisionError), job_folder(tmp_path, "fresh"):
        raise ZeroDivisionError
    assert not (tmp_path / "fresh").exists()


def test_temporaries_of_dead_runs_are_cleared_and_of_living_ones_left(tmp_path: Path) -> None:
    folder = tmp_path / "wrapper"
    folder.mkdir()
    gone = subprocess.run([sys.executable, "-c", "import os; print(os.getpid())"], capture_output=True, check=True)
    dead = f".base.pdf.{int(gone.stdout)}.part"
    living = f".base.svg.{os.getppid()}.part"
    for name in (dead, living, ".hidden"):
        (folder / name).write_bytes(b"half")
    write(tmp_path, {"verdict.json": b"{}"})
    assert names(folder) == sorted([living, ".hidden", "manifest.json", "verdict.json"])


def test_same_files_same_bytes(tmp_path: Path) -> None:
    files = {"base.pdf": b"1", "verdict.json": b"{}"}
    first = write(tmp_path / "a", files)
    second = write(tmp_path / "b", files)
    again = write(tmp_path / "a", files)
    assert (first / "manifest.json").read_bytes() == (second / "manifest.json").read_bytes()
    assert first == again


@pytest.mark.parametrize("kind", ["link to a folder", "file", "pipe"])
def test_something_else_of_the_folders_name_is_refused(tmp_path: Path, kind: str) -> None:
    path = tmp_path / "wrapper"
    if kind == "link to a folder":
        (tmp_path / "real").mkdir()
        path.symlink_to(tmp_path / "real")
    elif kind == "file":
        path.write_text("mine")
    else:
        os.mkfifo(path)
    with pytest.raises(InputError), job_folder(tmp_path, "wrapper"):
        pytest.fail("it let us in")


def test_out_may_not_be_a_file(tmp_path: Path) -> None:
    (tmp_path / "out").write_text("mine")
    with pytest.raises(InputError), job_folder(tmp_path / "out", "wrapper"):
        pytest.fail("it let us in")
