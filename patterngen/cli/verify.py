"""`patterngen verify`."""

from __future__ import annotations

import click

from patterngen.cli._options import Progress, job_options, print_json


@click.command("verify")
@job_options
@click.option("--all", "everything", is_flag=True, help="Every finding and every listed beat, not only the worst.")
def command(preset: str, overrides: tuple[str, ...], as_json: bool, quiet: bool, everything: bool) -> int:
    """Compute the verdict of PRESET and write nothing.

    Derives what the preset leaves open, computes every beat of two or more screens and
    grids, grades each at the reading distance and at the far distance, and judges the job
    by every rule. Prints the verdict, then what is wrong, worst first, in words; --all
    prints the rest too.

    \b
    patterngen verify mine.toml
    patterngen verify mine.toml --set screen.cyan.angle="22.5 deg" --all
    patterngen verify mine.toml --json > verdict.json
    """
    import patterngen
    from patterngen.cli._report import report
    from patterngen.writers import verdict as verdict_writer

    progress = Progress(quiet=quiet)
    verdict = patterngen.verify(patterngen.load(preset, overrides), progress=progress)
    progress.done()
    if as_json:
        print_json(verdict_writer.document(verdict))
    elif not quiet:
        click.echo(report(verdict, everything=everything))
    return 1 if verdict.status == "fail" else 0
