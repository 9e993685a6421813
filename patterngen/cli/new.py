"""`patterngen new`."""

from __future__ import annotations

import sys

import click

from patterngen.cli._options import print_json, print_words, telling_options


@click.command("new")
@click.argument("kind")
@telling_options
def command(kind: str, as_json: bool, quiet: bool) -> None:
    """Print a commented starting preset on standard output.

    KIND is the name of a shipped preset; `patterngen presets` lists them. For example:
    `patterngen new carton > mine.toml`. Where the preset uses pictures or outlines, the folder
    to copy them from is told on standard error.
    """
    from patterngen.job import shipped

    text, art = shipped.new(kind), shipped.artwork(kind)
    if as_json:
        print_json({"name": kind, "preset": text, "artwork": [str(path) for path in art]})
        return
    if quiet:
        return
    print_words(text.rstrip("\n"))
    if art and sys.stderr is not None:
        names = ", ".join(path.name for path in art)
        print(f"This preset uses {names}: copy the folder {art[0].parent} beside it.", file=sys.stderr)
