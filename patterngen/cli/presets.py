"""`patterngen presets`."""

from __future__ import annotations

import click

from patterngen.cli._options import json_option, print_json


@click.command("presets")
@json_option
def command(as_json: bool) -> None:
    """List the presets that come with the program.

    Each is a complete job that can be built as it stands, and a starting point:
    `patterngen new NAME > mine.toml`.
    """
    import patterngen

    shipped = patterngen.presets()
    if as_json:
        print_json([{"name": p.name, "title": p.title, "about": p.about, "path": str(p.path)} for p in shipped])
        return
    for preset in shipped:
        click.echo(preset.name)
        click.echo(click.wrap_text(preset.about, width=88, initial_indent="    ", subsequent_indent="    "))
