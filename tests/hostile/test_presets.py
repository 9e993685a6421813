"""Hostile and wrong presets: each is refused in words, quickly, or read with a remark.

The corpus is kept as generators; whatever once broke the reader is added and stays.
"""

from __future__ import annotations

import os
import socket
from collections.abc import Callable
from pathlib import Path

import pytest

from patterngen.errors import InputError
from patterngen.job.read import load
from tests import cream_lid, spent

GOOD = cream_lid.WITH_IMAGER


def changed(old: str, new: str) -> Callable[[], bytes]:
    assert GOOD.count(old) == 1, old
    return lambda: GOOD.replace(old, new).encode()


def added(text: str) -> Callable[[], bytes]:
    return lambda: (GOOD + text).encode()


def inks(*names: str) -> Callable[[], bytes]:
    tables = "".join(f"[[ink]]\nname = {name}\nlab = [50, 0, 0]\n" for name in names)
    return lambda: GOOD.replace('[[ink]]\nname = "Clover"\nlab = [55, -37, -50]\n', tables).encode()


# name: (bytes of the file, words that the refusal must hold, in one of its lines)
REFUSED: dict[str, tuple[Callable[[], bytes], tuple[str, ...]]] = {
    "empty": (lambda: b"", ("empty", "title", "[[screen]]")),
    "only comments": (lambda: b"# nothing\n\n", ("empty",)),
    "huge": (lambda: b"# " + b"x" * (1 << 20), ("too large", "1048576")),
    "latin-1": (lambda: GOOD.encode().replace(b"Fennick", b"F\xe9nnick"), ("line 2", "UTF-8", "0xe9")),
    "utf-16": (lambda: GOOD.encode("utf-16"), ("UTF-16",)),
    "utf-16 without mark": (lambda: GOOD.encode("utf-16-le"), ("UTF-16",)),
    "utf-32": (lambda: GOOD.encode("utf-32"), ("UTF-32",)),
    "binary": (lambda: bytes(range(256)) * 10, ("UTF-8",)),
    "lone carriage returns": (lambda: GOOD.replace("\n", "\r").encode(), ("carriage return",)),
    "syntax": (changed("patterngen = 1", "patterngen = "), ("line 1, column 14",)),
    "unclosed text": (changed('"40 %"', '"40 %'), ("line 16",)),
    "unclosed list": (changed('"40 mm"]', '"40 mm"'), ("line 5",)),
    "end of file": (added("x = ["), ("line 17",)),
    "key twice": (changed('tone = "40 %"', 'tone = "40 %"\ntone = "50 %"'), ("line 17", "second time")),
    "table twice": (added('[sheet]\nsize = ["1 mm", "1 mm"]\n'), ("sheet", "second time")),
    "unknown key": (changed("angle =", "anlge ="), ("screen.clover.anlge", "nearest: angle")),
    "unknown table": (added("[shet]\n"), ("nearest: sheet",)),
    "20,000 parts in a key": (added(".".join(["a"] * 20_000) + " = 1\n"), ("line 17", "too many parts")),
    "20,000 quoted parts": (added(".".join(['"a"'] * 20_000) + " = 1\n"), ("too many parts",)),
    "20,000 parts in a table": (added("[" + " . ".join(["a"] * 20_000) + "]\n"), ("too many parts",)),
    "100,000 lists": (added("x = " + "[" * 100_000 + "]" * 100_000), ("nested too deep",)),
    "100,000 tables": (added("x = " + "{a=" * 100_000 + "1" + "}" * 100_000), ("nested too deep",)),
    "100,000 lists, unclosed": (added("x = " + "[" * 100_000), ("nested too deep",)),
    "a million quotes": (added("x = " + '"' * 900_000), ()),
    "quotes that never close": (added("x = " + '\\"""' * 200_000), ()),
    "quotes that never close, in one line": (added('x = "' + '\\"' * 400_000), ()),
    "apostrophes": (added("x = " + "'" * 900_000), ()),
    "a long backslash": (added('x = "' + "\\" * 900_000), ()),
    "5,000 digits": (changed("patterngen = 1", "patterngen = " + "1" * 5000), ("number",)),
    "beyond 64 bit": (changed("lab = [55,", "lab = [18446744073709551616,"), ("64 bit",)),
    "not a number": (changed("lab = [55,", "lab = [nan,"), ("ink[0].lab[0]", "finite")),
    "infinite": (changed("lab = [55,", "lab = [-inf,"), ("finite",)),
    "infinite by size": (changed("lab = [55,", "lab = [1e999,"), ("finite",)),
    "nan in a text": (changed('"150 lpi"', '"nan lpi"'), ("screen.clover.ruling",)),
    "1e999 in a text": (changed('"150 lpi"', '"1e999 lpi"'), ("out of all range",)),
    "1e308 in a text": (changed('"150 lpi"', '"1e308 lpi"'), ("out of all range",)),
    "1e-320 in a text": (changed('"150 lpi"', '"1e-320 lpi"'), ("out of all range",)),
    "true for a number": (changed("lab = [55,", "lab = [true,"), ("ink.Clover.lab",)),
    "true for a text": (changed('"150 lpi"', "true"), ("screen.clover.ruling",)),
    "no unit": (changed('"15 deg"', '"45"'), ("without its unit", '"45 deg"')),
    "bare number": (changed('"15 deg"', "45"), ("without its unit", '"45 deg"')),
    "decimal comma": (changed('"15 deg"', '"7,5 deg"'), ("decimal comma", '"7.5 deg"')),
    "typographic minus": (changed('"15 deg"', '"\u221215 deg"'), ('"-15 deg"',)),
    "full-width digits": (changed('"15 deg"', '"\uff11\uff15 deg"'), ('"15 deg"',)),
    "scalar for a list": (changed('["60 mm", "40 mm"]', '"60 mm"'), ("sheet.size", "pair")),
    "list for a scalar": (changed('"40 %"', '["40 %"]'), ("screen.clover.tone",)),
    "wrong length": (changed('["60 mm", "40 mm"]', '["60 mm"]'), ("sheet.size", "pair")),
    "three for a pair": (changed('["60 mm", "40 mm"]', '["60 mm", "40 mm", "1 mm"]'), ("sheet.size",)),
    "two units": (changed('"150 lpi"', '"150 lpi 60 /cm"'), ("two units",)),
    "unit of another quantity": (changed('"150 lpi"', '"150 mm"'), ("unknown unit",)),
    "zero ruling": (changed('"150 lpi"', '"0 lpi"'), ("screen.clover.ruling", "more than 0 lpi")),
    "negative ruling": (changed('"150 lpi"', '"-150 lpi"'), ("more than 0 lpi", '"150 lpi"')),
    "zero size": (changed('"60 mm"', '"0 mm"'), ("sheet.size", "more than 0 mm")),
    "zero imager": (changed('"2400 dpi"', '"0 dpi"'), ("press.imager",)),
    "tone over 100 %": (changed('"40 %"', '"120 %"'), ("screen.clover.tone", '"100 %"')),
    "negative tone": (changed('"40 %"', '"-1 %"'), ("screen.clover.tone", '"0 %"')),
    "tone as a fraction": (changed('"40 %"', "0.5"), ('"50 %"',)),
    "ruling beyond the imager": (changed('"150 lpi"', '"2400 lpi"'), ("screen.clover.ruling", '"1200 lpi"')),
    "no inks": (
        lambda: GOOD.replace('[[ink]]\nname = "Clover"\nlab = [55, -37, -50]\n', "").encode(),
        ("ink", "missing"),
    ),
    "empty list of inks": (
        lambda: ("ink = []\n" + GOOD.replace('[[ink]]\nname = "Clover"\nlab = [55, -37, -50]\n', "")).encode(),
        ("[[ink]], one or more",),
    ),
    "17 inks": (inks(*(f'"Clover {n}"' for n in range(17))), ("17 tables [[ink]]", "at most 16")),
    "10,000 inks": (inks(*(f'"Clover {n}"' for n in range(10_000))), ("10000 tables [[ink]]",)),
    "no screens": (lambda: GOOD[: GOOD.index("[[screen]]")].encode(), ("screen", "missing")),
    "ink All": (inks('"Clover"', '"All"'), ("every plate or none",)),
    "ink NONE": (inks('"Clover"', '"NONE"'), ("every plate or none",)),
    "ink without name": (inks('""'), ("empty",)),
    "ink twice": (inks('"Clover"', '"Clover"'), ("twice",)),
    "inks differ by case": (inks('"Clover"', '"CLOVER"'), ("case or form only",)),
    "inks differ by composition": (inks('"Clover"', '"Cr\u00e8me"', '"Cre\u0300me"'), ("twice",)),
    "ink with newline": (inks('"Clo\\nver"'), ("control character", '"Clover"')),
    "ink with zero": (inks('"Clo\\u0000ver"'), ("control character (U+0000)",)),
    "ink turned right to left": (inks('"Clo\\u202Ever"'), ("reading direction",)),
    "ink of 10,000 letters": (inks('"' + "x" * 10_000 + '"'), ("10000 characters",)),
    "ink unknown": (changed('ink = "Clover"', 'ink = "Clower"'), ("screen.clover.ink", '"Clover"')),
    "control in the title": (changed('cream lid"', 'cream\\u0007 lid"'), ("title", "U+0007")),
    "empty title": (changed('"Fennick & Oake, cream lid"', '""'), ("title",)),
    "no title": (changed('title = "Fennick & Oake, cream lid"\n', ""), ("title", "missing")),
    "screen name a path": (changed('name = "clover"', 'name = "../clover"'), ('"clover"',)),
    "screen name a device": (changed('name = "clover"', 'name = "con"'), ("device",)),
    "screen name an option": (changed('name = "clover"', 'name = "-rf"'), ('"rf"',)),
    "screen name with blanks": (changed('name = "clover"', 'name = "my clover"'), ('"my-clover"',)),
    "screen name of 256 letters": (changed('name = "clover"', f'name = "{"x" * 256}"'), ("too long",)),
    "colour too large": (changed("lab = [55,", "lab = [300,"), ("ink.Clover.lab", "[100, -37, -50]")),
    "colour a name": (changed("lab = [55, -37, -50]", 'lab = "cyan"'), ("CIELAB",)),
    "page of no size": (changed('["60 mm", "40 mm"]', '["0 mm", "0 mm"]'), ("sheet.size",)),
    "page of 1e9 mm": (changed('"60 mm"', '"1e9 mm"'), ("sheet.size",)),
    "page over 14400 pt": (changed('"60 mm"', '"5081 mm"'), ("5080 mm",)),
    "a billion shapes": (
        lambda: GOOD.replace('"60 mm", "40 mm"', '"5 m", "5 m"').replace("150 lpi", "300 lpi").encode(),
        ("shapes", "3.49e+09"),
    ),
    "newer version": (changed("patterngen = 1", "patterngen = 2"), ("newer version",)),
    "version missing": (changed("patterngen = 1\n", ""), ("patterngen = 1 at the top",)),
    "version true": (changed("patterngen = 1", "patterngen = true"), ("version",)),
    "key of a later version": (added('[[key]]\nname = "seal"\n'), ("does not make keys yet",)),
    "search of a later version": (added("[choose]\n"), ("does not search for angles yet",)),
    "unknown kind": (changed('kind = "dots"', 'kind = "dost"'), ("screen.clover.kind", '"dots"')),
    "unknown shape": (
        changed('kind = "dots"', 'kind = "dots"\nshape = "rouhd"'),
        ("screen.clover.shape", 'nearest: "round"'),
    ),
    "unknown process": (
        changed('imager = "2400 dpi"', 'process = "sheetfed-ofset"'),
        ("press.process", "sheetfed-offset"),
    ),
    "unknown eye": (added('[viewing]\neye = "barten"\n'), ("viewing.eye", "barten1999")),
    "unknown rule waived": (
        added('[[waive]]\nrule = "no-such-thing-at-all"\nreason = "x"\n'),
        ("waive[0].rule",),
    ),
    "two gains": (
        changed('imager = "2400 dpi"', 'gain = "16 %"\nedge_gain = "5 um"'),
        ("press.edge_gain", "two gains"),
    ),
    "single table for many": (changed("[[ink]]", "[ink]"), ("[[ink]]",)),
    "many tables for one": (changed("[sheet]", "[[sheet]]"), ("[sheet]",)),
    "a date": (changed('"15 deg"', "1979-05-27"), ("date",)),
    "impossible date": (changed('"15 deg"', "1979-02-31"), ()),
    "overprint of nobody": (
        added('[[overprint]]\ninks = ["Clover", "Rust"]\nlab = [1, 2, 3]\n'),
        ("overprint[0].inks[1]",),
    ),
    "overprint of one": (added('[[overprint]]\ninks = ["Clover"]\nlab = [1, 2, 3]\n'), ("at least 2",)),
    "overprint with itself": (
        added('[[overprint]]\ninks = ["Clover", "Clover"]\nlab = [1, 2, 3]\n'),
        ("twice",),
    ),
    "overprint without colour": (added('[[overprint]]\ninks = ["Clover", "Rust"]\n'), ("overprint[0].lab",)),
    "surrogate": (changed('cream lid"', 'cream \\uD800 lid"'), ("line 2",)),
}


@pytest.mark.parametrize("name", REFUSED)
def test_refused(name: str, tmp_path: Path) -> None:
    """invariant: refused within 2 s, every line names the file, and words say what and where."""
    make, words = REFUSED[name]
    path = tmp_path / "lid.toml"
    path.write_bytes(make())
    with spent.at_most(2.0), pytest.raises(InputError) as caught:
        load(path)
    text = str(caught.value)
    assert all(line.startswith(str(path)) for line in text.splitlines())
    missing = [word for word in words if word not in text]
    assert not missing, text
    assert len(text) < 20_000


ACCEPTED = {
    "byte order mark": lambda: b"\xef\xbb\xbf" + GOOD.encode(),
    "CR LF": lambda: GOOD.replace("\n", "\r\n").encode(),
    "angle beyond a turn": changed('"15 deg"', '"405 deg"'),
    "ruling of the other unit": changed('"150 lpi"', '"150 /cm"'),
    "decomposed accents": changed("cream lid", "cre\u0300me lid"),
}


@pytest.mark.parametrize("name", ACCEPTED)
def test_accepted_with_a_remark(name: str, tmp_path: Path) -> None:
    """invariant: what is put right is told."""
    path = tmp_path / "lid.toml"
    path.write_bytes(ACCEPTED[name]())
    assert len(load(path).remarks) == 1


def test_texts_stay_as_they_are(tmp_path: Path) -> None:
    """invariant: markup and brackets in a title or an ink's name are text like any other."""
    title = "</script><script>alert(1)</script> ]]> &x; ) /OpenAction ( \\ \u00e9 \U0001f404"
    path = tmp_path / "lid.toml"
    path.write_text(
        GOOD.replace('"Fennick & Oake, cream lid"', f"'{title}'").replace('"Clover"', "'Clo/ver (1) <#%> \U0001f404'"),
        encoding="utf-8",
    )
    job = load(path)
    assert job.title == title
    assert job.inks[0].name == "Clo/ver (1) <#%> \U0001f404"


def test_minus_zero(tmp_path: Path) -> None:
    """invariant: -0.0 is read as 0."""
    path = tmp_path / "lid.toml"
    path.write_text(GOOD.replace("[55, -37, -50]", "[55, -0.0, -50]").replace("15 deg", "-0.0 deg"), encoding="utf-8")
    job = load(path)
    assert str(job.inks[0].lab) == "(55.0, 0.0, -50.0)"
    assert str(job.screens[0].angle_deg) == "0.0"


@pytest.mark.parametrize(
    ("name", "words"),
    [
        ("missing", "does not exist"),
        ("folder", "is a folder"),
        ("pipe", "is a pipe"),
        ("socket", "is a socket"),
        ("inside a file", "not a folder"),
        ("circle", "cannot be opened"),
    ],
)  # fmt: skip
def test_no_plain_file(name: str, words: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """invariant: refused before anything is read; a pipe nobody writes to does not hold us."""
    monkeypatch.chdir(tmp_path)  # a socket's path must be short
    path = Path("lid.toml")
    if name == "folder":
        path.mkdir()
    elif name == "pipe":
        os.mkfifo(path)
    elif name == "socket":
        with socket.socket(socket.AF_UNIX) as made:
            made.bind(str(path))
    elif name == "inside a file":
        path.write_text(GOOD, encoding="utf-8")
        path = path / "lid.toml"
    elif name == "circle":
        path.symlink_to(path)
    with spent.at_most(1.0), pytest.raises(InputError, match=words):
        load(path)


def test_device() -> None:
    """invariant: a device is no preset."""
    with pytest.raises(InputError, match="is a device"):
        load("/dev/zero")


@pytest.mark.skipif(os.geteuid() == 0 and not Path("/usr/bin/setpriv").exists(), reason="root reads everything")
def test_no_permission(tmp_path: Path) -> None:
    """invariant: no permission is told as such (tried as another user, as root may read everything)."""
    import subprocess
    import sys

    path = tmp_path / "lid.toml"
    path.write_text(GOOD, encoding="utf-8")
    path.chmod(0)
    code = (
        "import os, sys\n"
        "from patterngen.files import read_plain_file\n"
        "from patterngen.errors import InputError\n"
        "from pathlib import Path\n"
        "if os.geteuid() == 0: os.chdir(sys.argv[2]); os.setegid(65534); os.seteuid(65534)\n"
        "try: read_plain_file(Path(sys.argv[1]), most_bytes=100, what='the preset')\n"
        "except InputError as error: print(error)\n"
    )
    for folder in (tmp_path, *tmp_path.parents):
        if folder.stat().st_uid == os.geteuid() and folder != Path("/"):
            folder.chmod(folder.stat().st_mode | 0o055)
    command = [sys.executable, "-c", code, "lid.toml", str(tmp_path)]
    home = os.environ | {"PYTHONPATH": os.pathsep.join(part or str(Path.cwd()) for part in sys.path)}
    told = subprocess.run(command, capture_output=True, text=True, cwd=tmp_path, env=home, check=True)
    assert "no permission" in told.stdout


@pytest.mark.parametrize("stem", ["my lid", "con", "-rf", "a..b", "x" * 100, "lid\u202e", "l\u00efd"])
def test_file_name_becomes_the_job_name(stem: str, tmp_path: Path) -> None:
    """invariant: a job's folder must be one that every system can hold."""
    path = tmp_path / f"{stem}.toml"
    path.write_text(GOOD, encoding="utf-8")
    with pytest.raises(InputError, match="job's name"):
        load(path)


OVERRIDES = {
    "no equals sign": ("screen.clover.angle", "not an override"),
    "no address": ("=5", "not an override"),
    "unknown table": ("scren.clover.angle=5 deg", "nearest: screen"),
    "unknown name": ("screen.clovr.angle=5 deg", "nearest: clover"),
    "unknown key": ("screen.clover.anlge=5 deg", "nearest: angle"),
    "no such entry": ("screen[3].angle=5 deg", "no [[screen]] of that name"),
    "a whole table": ("sheet=5", "whole table"),
    "through a value": ("screen.clover.tone.x.y=5", "no table"),
    "too deep": ("sheet.a.b.c.d=5", "too deep"),
    "past a list": ("sheet.size[7]=5 mm", "only 2 entries"),
    "bad address": ("screen.[=5", "not the address"),
    "bad value": ("screen.clover.tone=0.5", '"50 %"'),
    "nan": ("ink.Clover.lab=[nan, 0, 0]", "finite"),
    "smuggled table": ('title="x"\n[ink]', "title"),
}


@pytest.mark.parametrize("name", OVERRIDES)
def test_bad_overrides(name: str, tmp_path: Path) -> None:
    """invariant: a wrong override is told as one, with the nearest legal spelling."""
    text, words = OVERRIDES[name]
    path = tmp_path / "lid.toml"
    path.write_text(GOOD, encoding="utf-8")
    with pytest.raises(InputError) as caught:
        load(path, [text])
    assert words in str(caught.value)
    assert str(caught.value).startswith("--set")
