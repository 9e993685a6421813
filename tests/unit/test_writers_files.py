"""invariant: a job's folder holds what its manifest says, and a manifest only when the job is finished."""

from __future__ import annotations

import hashlib
import json
import os
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import pytest

from patterngen.errors import InputError, MachineError
from patterngen.model.area import Area, ToneField
from patterngen.model.job import Gain, Job, ScreenRequest
from patterngen.writers import _files, manifest
from patterngen.writers._files import job_folder
from tests import drawings


def write(out: Path, files: dict[str, bytes], job: Job | None = None) -> Path:
    job = job or drawings.job()
    with job_folder(out, job.name) as folder:
        for name, data in files.items():
            folder.write(name, data)
        folder.finish(manifest.dumps(job, folder.written, verdict="pass"))
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


def test_the_manifest_tells_verdict_and_artwork() -> None:
    """A job that failed says so, and its artwork is listed by path with its digest, sorted."""
    job = drawings.job()
    data = json.loads(manifest.dumps(job, {}, verdict="fail"))
    assert (data["verdict"], data["artwork"]) == ("fail", {})

    job = replace(job, artwork={"b.svg": "22", "a.png": "11"})
    data = json.loads(manifest.dumps(job, {}, verdict="pass"))
    assert list(data["artwork"].items()) == [("a.png", "11"), ("b.svg", "22")]
    assert data["verdict"] == "pass"


def test_drawings_of_an_earlier_run_do_not_stay_beside_a_failed_verdict(tmp_path: Path) -> None:
    old = {"base.pdf": b"1", "base.svg": b"2", "key.svg": b"3", "key-seal.pdf": b"4", "overlay.html": b"5"}
    folder = write(tmp_path, {**old, "verdict.json": b"{}"})
    (folder / "notes.txt").write_text("the user's own")
    (folder / "key-mine.pdf").write_text("the user's own too: no manifest lists it")
    write(tmp_path, {"verdict.json": b'{"verdict": "fail"}'})
    assert names(folder) == ["key-mine.pdf", "manifest.json", "notes.txt", "verdict.json"]


@pytest.mark.parametrize("stop", [KeyboardInterrupt, MachineError, ZeroDivisionError])
def test_what_stops_before_the_end_leaves_the_old_job(tmp_path: Path, stop: type[BaseException]) -> None:
    folder = write(tmp_path, {"base.pdf": b"1", "base.svg": b"2", "verdict.json": b"{}"})
    before = {path.name: path.read_bytes() for path in folder.iterdir()}

    def stopped() -> None:
        with job_folder(tmp_path, "wrapper") as again:
            again.write("base.pdf", b"3")
            again.write("verdict.json", b"4")
            raise stop

    with pytest.raises(stop):
        stopped()
    assert {path.name: path.read_bytes() for path in folder.iterdir()} == before
    assert manifest.differences(folder) == []


def test_what_is_never_finished_is_not_there(tmp_path: Path) -> None:
    folder = write(tmp_path, {"base.pdf": b"1"})
    with job_folder(tmp_path, "wrapper") as again:
        again.write("base.pdf", b"2")
    assert (folder / "base.pdf").read_bytes() == b"1"
    assert names(folder) == ["base.pdf", "manifest.json"]


def test_a_link_put_in_a_files_place_meanwhile_is_refused_in_time(tmp_path: Path) -> None:
    folder = write(tmp_path, {"verdict.json": b"{}"})
    with job_folder(tmp_path, "wrapper") as again:
        again.write("base.pdf", b"1")
        (folder / "base.pdf").symlink_to(tmp_path / "elsewhere")
        with pytest.raises(InputError, match="a link"):
            again.finish(manifest.dumps(drawings.job(), again.written, verdict="pass"))
    assert manifest.differences(folder) == ["base.pdf: added, the manifest does not list it"]


def test_pieces_are_written_as_they_come(tmp_path: Path) -> None:
    folder = tmp_path / "wrapper"

    def pieces() -> Iterator[bytes]:
        yield b"<svg>"
        assert len(list(folder.glob(".base.svg.*.part"))) == 1
        yield b"</svg>"

    with job_folder(tmp_path, "wrapper") as own:
        own.write("base.svg", pieces())
        assert own.written["base.svg"].size == 11
        own.finish(manifest.dumps(drawings.job(), own.written, verdict="pass"))
    assert (folder / "base.svg").read_bytes() == b"<svg></svg>"
    assert manifest.differences(folder) == []


def test_nothing_changes_before_the_first_write(tmp_path: Path) -> None:
    folder = write(tmp_path, {"base.pdf": b"1"})
    before = names(folder)
    with pytest.raises(ZeroDivisionError), job_folder(tmp_path, "wrapper"):
        raise ZeroDivisionError
    assert names(folder) == before
    with pytest.raises(ZeroDivisionError), job_folder(tmp_path, "fresh"):
        raise ZeroDivisionError
    assert not (tmp_path / "fresh").exists()


def test_temporaries_of_killed_runs_are_cleared_and_strangers_files_left(tmp_path: Path) -> None:
    folder = tmp_path / "wrapper"
    folder.mkdir()
    # a process number that has been given again tells nothing: who holds the lock writes alone
    ours = [f".base.pdf.{os.getppid()}.part", ".key-seal.svg.7.part", ".manifest.json.8.part", ".lock"]
    others = [".hidden", ".notes.txt.9.part", ".base.pdf.part"]
    for name in ours + others:
        (folder / name).write_bytes(b"half")
    write(tmp_path, {"verdict.json": b"{}"})
    assert names(folder) == sorted([*others, "manifest.json", "verdict.json"])


def test_a_second_writer_is_told(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """It waits, gives up naming the folder, and harms nothing; once the first is done it gets in."""
    monkeypatch.setattr(_files, "WAIT_S", 0.1)
    with job_folder(tmp_path, "wrapper") as first:
        first.write("base.pdf", b"1")
        with pytest.raises(MachineError, match="wrapper: another run"), job_folder(tmp_path, "wrapper") as second:
            second.write("base.pdf", b"2")
        first.finish(manifest.dumps(drawings.job(), first.written, verdict="pass"))
    assert manifest.differences(tmp_path / "wrapper") == []
    assert (write(tmp_path, {"base.pdf": b"3"}) / "base.pdf").read_bytes() == b"3"


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
