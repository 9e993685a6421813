"""Options that several commands share, and the one way of telling progress."""

from __future__ import annotations

import json
import os
import sys
import time
from collections.abc import Callable
from typing import Any, TypeVar

import click

Function = TypeVar("Function", bound=Callable[..., Any])

preset_argument = click.argument("preset", type=click.Path(path_type=str))

json_option = click.option(
    "--json", "as_json", is_flag=True, help="One JSON object on standard output, nothing else there."
)
quiet_option = click.option("--quiet", is_flag=True, help="No progress, no words; only the exit code (and --json).")
set_option = click.option(
    "--set",
    "overrides",
    multiple=True,
    metavar="KEY=VALUE",
    help='Override one preset value, for example --set screen.cyan.angle="22.5 deg". May be repeated.',
)


def job_options(function: Function) -> Function:
    """The preset and the options of every command that takes one."""
    for decorate in (quiet_option, json_option, set_option, preset_argument):
        function = decorate(function)
    return function


def coloured() -> bool:
    """Whether standard output wants colour (NO_COLOR and dumb terminals are honoured)."""
    return sys.stdout.isatty() and not os.environ.get("NO_COLOR") and os.environ.get("TERM") != "dumb"


def strong(text: str, colour: str) -> str:
    """Text made to stand out, where the terminal wants that; the words alone carry the meaning."""
    return click.style(text, fg=colour, bold=True) if coloured() else text


def print_json(data: object) -> None:
    """One JSON document on standard output."""
    sys.stdout.write(json.dumps(data, allow_nan=False, ensure_ascii=False, indent=2) + "\n")


class Progress:
    """Says on standard error what is being done, once the work has taken longer than a second."""

    def __init__(self, *, quiet: bool) -> None:
        self._quiet = quiet
        self._started = time.monotonic()
        self._live = sys.stderr.isatty() and not quiet
        self._shown = False

    def __call__(self, stage: str) -> None:
        """Called by the pipeline at the start of every stage."""
        passed = time.monotonic() - self._started
        if self._quiet or passed < 1.0:
            return
        if self._live:
            sys.stderr.write(f"\r\x1b[K{passed:5.1f} s  {stage}")
        else:
            sys.stderr.write(f"{passed:5.1f} s  {stage}\n")
        sys.stderr.flush()
        self._shown = True

    def done(self) -> None:
        """Clear the line that was used for progress."""
        if self._live and self._shown:
            sys.stderr.write("\r\x1b[K")
            sys.stderr.flush()
