"""`patterngen new`."""

from __future__ import annotations

import click


@click.command("new")
@click.argument("kind")
def command(kind: str) -> None:
    """Print a commented starting preset on standard output.

    KIND is the name of a shipped preset; `patterngen presets` lists them. For example:
    `patterngen new carton > mine.toml`. A preset that uses pictures or outlines names them
    relative to itself: copy them along from the folder that `patterngen presets --json` shows.
    """
    import patterngen

    click.echo(patterngen.new(kind), nl=False)
