"""invariant: every citation stands once, says how far it may be trusted, and is cited."""

from __future__ import annotations

import re
from functools import cache
from pathlib import Path

import pytest

import patterngen
from patterngen import registry
from patterngen.rules import _limits
from patterngen.sources import keys, source

PACKAGE = Path(patterngen.__file__).parent
TESTS = Path(__file__).parents[1]
STANDINGS = {"published", "common practice", "from memory", "derived"}


@cache
def cited_somewhere() -> str:
    """Program and tests as one text, without the table itself and this test."""
    files = [*PACKAGE.rglob("*.py"), *PACKAGE.rglob("*.toml"), *TESTS.rglob("*.py")]
    own = {PACKAGE / "sources.toml", Path(__file__)}
    return "\n".join(path.read_text(encoding="utf-8") for path in files if path not in own)


@pytest.mark.parametrize("key", keys())
def test_a_source_has_a_text_and_a_standing(key: str) -> None:
    found = source(key)
    assert found.standing in STANDINGS
    assert len(found.text) > 20
    assert found.text == " ".join(found.text.split())
    assert re.fullmatch(r"[a-z0-9]+(-[a-z0-9]+)*", key)


@pytest.mark.parametrize("key", keys())
def test_a_source_is_cited(key: str) -> None:
    assert re.search(rf"(?<![\w-]){re.escape(key)}(?![\w-])", cited_somewhere()), "nobody cites it"


@pytest.mark.parametrize("key", keys())
def test_what_was_recalled_is_not_called_published(key: str) -> None:
    """A published text may say which part of it is recalled, but then it names the part that is not."""
    found = source(key)
    if found.standing == "published":
        assert "not read" not in found.text
        assert "recalled" not in found.text or "excerpt" in found.text
    if "not read" in found.text:
        assert found.standing == "from memory"


def test_no_source_is_written_twice() -> None:
    texts = [source(key).text for key in keys()]
    assert len(set(texts)) == len(texts)


@pytest.mark.parametrize("room", ["patterngen.rules", "patterngen.vision"])
def test_rules_and_eyes_cite_what_exists(room: str) -> None:
    for name, module in registry.modules(room).items():
        cited = getattr(module, "SOURCES", None) or (module.SOURCE_KEY,)
        assert set(cited) <= set(keys()), name


def test_limits_cite_what_exists() -> None:
    """`limits` looks every key up, so that reading all of them is the test."""
    for process in (None, *_limits.processes()):
        assert all(limit.source.text for limit in _limits.limits(process).values())


def test_an_unknown_key_is_a_mistake_of_the_program() -> None:
    with pytest.raises(KeyError):
        source("no-such-source")
