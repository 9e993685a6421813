"""The presets that come with the program, found from a checkout and from an installed wheel alike."""

from __future__ import annotations

from dataclasses import dataclass
from difflib import get_close_matches
from pathlib import Path

from patterngen.errors import Fault, InputError


@dataclass(frozen=True, slots=True)
class ShippedPreset:
    """A shipped preset: its name (for `new`), its file, its title, and what its opening comment says."""

    name: str
    path: Path
    title: str
    about: str


def folder() -> Path:
    """The folder of the shipped presets.  A wheel carries them inside the package, a checkout beside it."""
    package = Path(__file__).resolve().parent.parent
    for place in (package / "presets", package.parent / "presets"):
        if any(place.glob("*.toml")):
            return place
    raise InputError(Fault("presets", "", "the shipped presets are missing from this installation"))


def presets() -> tuple[ShippedPreset, ...]:
    """Every shipped preset, by name."""
    import tomllib

    found = []
    for path in sorted(folder().glob("*.toml")):
        text = path.read_text(encoding="utf-8")
        title = tomllib.loads(text).get("title", "")
        found.append(ShippedPreset(path.stem, path, title, _opening_comment(text)))
    return tuple(found)


def new(kind: str) -> str:
    """The text of a commented starting preset; `kind` is the name of a shipped preset.

    Raises `InputError` with the nearest name.
    """
    known = {preset.name: preset for preset in presets()}
    if kind not in known:
        near = get_close_matches(kind, known, n=1, cutoff=0.3)
        raise InputError(
            Fault("new", "", f"no preset is called {kind!r}", allowed=", ".join(known), nearest=near[0] if near else "")
        )
    return known[kind].path.read_text(encoding="utf-8")


def artwork(kind: str) -> tuple[Path, ...]:
    """The pictures and outlines that a shipped preset names, where they lie."""
    text = new(kind)
    return tuple(path for path in sorted(folder().glob("art/*")) if f'"art/{path.name}"' in text)


def _opening_comment(text: str) -> str:
    lines = []
    for line in text.splitlines():
        if line.startswith("#:"):
            continue
        if not line.startswith("#"):
            break
        lines.append(line.lstrip("#").strip())
    return " ".join(lines)
