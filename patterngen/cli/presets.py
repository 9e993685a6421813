"""`patterngen presets`."""

from __future__ import annotations

import click

from patterngen.cli._options import print_json, print_words, telling_options


@click.command("presets")
@telling_options
def command(as_json: bool, quiet: bool) -> None:
    """List the presets that come with the program.

    Each is a complete job that can be built as it stands, and a starting point:
    `patterngen new NAME > mine.toml`.
    """
    import patterngen

    shipped = patterngen.presets()
    if as_json:
        rows = [{"name": p.name, "title": p.title, "about": p.about, "path": str(p.path)} for p in shipped]
        print_json({"presets": rows})
    elif not quiet:
        for preset in shipped:
            print_words(preset.name)
            print_words(click.wrap_text(preset.about, width=88, initial_indent="    ", subsequent_indent="    "))
