"""invariant: the house keeps its order: imports point downwards, heavy libraries stay in their rooms."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

import patterngen

PACKAGE = Path(patterngen.__file__).parent

# Lower lines may be imported by higher ones, never the other way, and rooms in one line not by each other.
LINES = [
    ["__main__", "__init__"],
    ["cli"],
    ["sweep"],
    ["pipeline"],
    ["job", "solve", "measure", "writers"],
    ["keys", "ornament"],
    ["screens", "grids", "beats", "colour", "vision", "rules", "raster"],
    ["model"],
    ["registry", "sources", "units", "files"],
    ["errors"],
]
HEIGHT = {room: len(LINES) - i for i, line in enumerate(LINES) for room in line}

ONLY_IN = {
    "svgwrite": {"writers"},
    "reportlab": {"writers"},
    "pikepdf": {"writers"},
    "click": {"cli"},
    "tomlkit": {"job"},
    "svgelements": {"job"},
    "defusedxml": {"job"},
    "PIL": {"job"},
    "shapely": {"screens", "beats", "model", "job"},
}


def modules() -> list[Path]:
    return sorted(PACKAGE.rglob("*.py"))


def room(path: Path) -> str:
    first = path.relative_to(PACKAGE).parts[0]
    return first.removesuffix(".py")


def imports(path: Path) -> list[tuple[str, bool]]:
    """Every imported module of a file, and whether the import stands at the top level."""
    tree = ast.parse(path.read_text(encoding="utf-8"))
    top = set(tree.body)
    for node in tree.body:
        if isinstance(node, ast.If) and "TYPE_CHECKING" in ast.dump(node.test):
            top.discard(node)
    found = []
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            found += [(alias.name, node in top) for alias in node.names]
        elif isinstance(node, ast.ImportFrom) and node.module:
            if node.module == "patterngen":
                found += [(f"patterngen.{alias.name}", node in top) for alias in node.names]
            else:
                found.append((node.module, node in top))
    return found


@pytest.mark.parametrize("path", modules(), ids=lambda p: str(p.relative_to(PACKAGE)))
def test_imports_point_downwards(path: Path) -> None:
    here = room(path)
    assert here in HEIGHT, f"{path} lies in a room that the house does not have"
    for name, _ in imports(path):
        parts = name.split(".")
        if parts[0] != "patterngen" or len(parts) < 2 or parts[1] not in HEIGHT:
            continue
        there = parts[1]
        assert there == here or HEIGHT[there] < HEIGHT[here], f"{here} imports {there}"


@pytest.mark.parametrize("path", modules(), ids=lambda p: str(p.relative_to(PACKAGE)))
def test_kinds_do_not_import_each_other(path: Path) -> None:
    here = room(path)
    if here not in {"screens", "grids", "vision", "rules", "keys", "ornament"} or path.stem.startswith("_"):
        return
    for name, _ in imports(path):
        parts = name.split(".")
        if parts[:2] == ["patterngen", here] and len(parts) > 2:
            assert parts[2].startswith("_"), f"{path.stem} imports its neighbour {parts[2]}"


@pytest.mark.parametrize("path", modules(), ids=lambda p: str(p.relative_to(PACKAGE)))
def test_libraries_stay_in_their_rooms(path: Path) -> None:
    for name, _ in imports(path):
        rooms = ONLY_IN.get(name.split(".")[0])
        assert rooms is None or room(path) in rooms, f"{name} does not belong in {room(path)}"


def loaded_by(code: str) -> set[str]:
    out = subprocess.run(
        [sys.executable, "-c", f"import sys\n{code}\nprint(' '.join(sys.modules))"],
        capture_output=True,
        text=True,
        check=True,
    )
    return set(out.stdout.split())


def test_importing_the_package_loads_nothing_heavy() -> None:
    loaded = loaded_by("import patterngen")
    assert not loaded & {"scipy", "reportlab", "shapely", "numpy", "pydantic", "pikepdf"}


def test_help_loads_nothing_heavy() -> None:
    code = (
        "import patterngen.cli as c\n"
        "from click.testing import CliRunner\n"
        "assert CliRunner().invoke(c.commands, ['--help']).exit_code == 0\n"
        "assert CliRunner().invoke(c.commands, ['build', '--help']).exit_code == 0"
    )
    assert not loaded_by(code) & {"scipy", "reportlab", "shapely", "numpy", "pydantic", "pikepdf"}


@pytest.mark.parametrize("name", [n for n in patterngen.__all__ if not n.startswith("_")])
def test_public_names_exist_and_say_what_they_do(name: str) -> None:
    thing = getattr(patterngen, name)
    assert (thing.__doc__ or "").strip(), f"{name} has no docstring"
