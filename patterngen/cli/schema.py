"""`patterngen schema`."""

from __future__ import annotations

import click

from patterngen.cli._options import print_json


@click.command("schema")
def command() -> None:
    """Print the JSON Schema of a preset.

    Save it beside your presets and begin each preset with the line
    `#:schema ./preset.schema.json`: editors that read JSON Schema then complete and check
    the keys while you type.
    """
    import patterngen

    print_json(patterngen.schema())
