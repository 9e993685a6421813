"""`patterngen schema`."""

from __future__ import annotations

import click

from patterngen.cli._options import print_json, telling_options


@click.command("schema")
@telling_options
def command(as_json: bool, quiet: bool) -> None:
    """Print the JSON Schema of a preset.

    Save it beside your presets and begin each preset with the line
    `#:schema ./preset.schema.json`: editors that read JSON Schema then complete and check
    the keys while you type. It is JSON with and without --json.
    """
    import patterngen

    if as_json or not quiet:
        print_json(patterngen.schema())
