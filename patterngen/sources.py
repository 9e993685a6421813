"""Every citation once: `sources.toml`, read when first asked for."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import cache
from importlib import resources
from typing import Literal

Standing = Literal["published", "common practice", "from memory", "derived"]


@dataclass(frozen=True, slots=True)
class Source:
    """Where a number or a rule comes from, and how far it may be trusted."""

    text: str
    standing: Standing


@cache
def _table() -> dict[str, Source]:
    text = resources.files("patterngen").joinpath("sources.toml").read_text(encoding="utf-8")
    return {key: Source(entry["text"], entry["standing"]) for key, entry in tomllib.loads(text).items()}


def source(key: str) -> Source:
    """The source of that key; a KeyError is a mistake in the program, never of the user."""
    return _table()[key]


def keys() -> tuple[str, ...]:
    """All keys, for the test that each is used and each has its standing."""
    return tuple(_table())
