"""Options that several commands share, and the ways of telling: JSON, words, progress."""

from __future__ import annotations

import json
import os
import sys
import threading
import time
from collections.abc import Callable
from typing import Any, TypeVar

import click

from patterngen.errors import MachineError

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


def telling_options(function: Function) -> Function:
    """`--json` and `--quiet`, which every command has."""
    return quiet_option(json_option(function))


def job_options(function: Function) -> Function:
    """The preset and the options of every command that takes one."""
    return preset_argument(set_option(telling_options(function)))


def coloured() -> bool:
    """Whether standard output wants colour (NO_COLOR and dumb terminals are honoured)."""
    return (
        sys.stdout is not None
        and sys.stdout.isatty()
        and not os.environ.get("NO_COLOR")
        and os.environ.get("TERM") != "dumb"
    )


def strong(text: str, colour: str) -> str:
    """Text made to stand out, where the terminal wants that; the words alone carry the meaning."""
    return click.style(text, fg=colour, bold=True) if coloured() else text


def print_json(data: object) -> None:
    """One JSON document on standard output, UTF-8 whatever the locale."""
    if sys.stdout is None:
        raise MachineError("patterngen: standard output is closed")
    text = json.dumps(data, allow_nan=False, ensure_ascii=False, indent=2) + "\n"
    sys.stdout.flush()
    sys.stdout.buffer.write(text.encode("utf-8"))
    sys.stdout.buffer.flush()


def print_words(text: str) -> None:
    """Words on standard output; what the locale cannot write is spelled out."""
    if sys.stdout is None:
        return
    encoding = sys.stdout.encoding or "ascii"
    sys.stdout.write(text.encode(encoding, "backslashreplace").decode(encoding) + "\n")


class Progress:
    """Says on standard error what is being done and for how long, once the work has taken longer than a second.

    On a terminal one line is kept up to date; elsewhere a plain line is written when the stage
    changes, and every ten seconds.
    """

    def __init__(self, *, quiet: bool) -> None:
        self._started = time.monotonic()
        self._live = sys.stderr is not None and sys.stderr.isatty() and not quiet
        self._stage = ""
        self._told = ("", 0.0)
        self._over = threading.Event()
        if not quiet and sys.stderr is not None:
            threading.Thread(target=self._beat, daemon=True).start()

    def __call__(self, stage: str) -> None:
        """Called by the pipeline at the start of every stage, and within long ones."""
        self._stage = stage

    def _beat(self) -> None:
        while not self._over.wait(0.25):
            passed = time.monotonic() - self._started
            if passed < 1.0 or not self._stage:
                continue
            if self._live:
                self._write(f"\r\x1b[K{passed:5.1f} s  {self._stage}")
            elif self._stage.partition(":")[0] != self._told[0] or passed - self._told[1] >= 10.0:
                self._told = (self._stage.partition(":")[0], passed)
                self._write(f"{passed:5.1f} s  {self._stage}\n")

    def _write(self, text: str) -> None:
        try:
            sys.stderr.write(text)
            sys.stderr.flush()
        except (OSError, ValueError):
            self._over.set()

    def done(self) -> None:
        """Stop, and clear the line that was used for progress."""
        self._over.set()
        if self._live:
            self._write("\r\x1b[K")

    def __enter__(self) -> Progress:
        return self

    def __exit__(self, *_: object) -> None:
        self.done()
