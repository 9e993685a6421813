"""`patterngen verify`."""

from __future__ import annotations

from pathlib import Path

import click

from patterngen.cli._options import Progress, print_json, print_words, set_option, telling_options


@click.command("verify")
@click.argument("preset", required=False)
@set_option
@telling_options
@click.option("--all", "everything", is_flag=True, help="Every finding and every listed beat, not only the worst.")
@click.option("--files", metavar="DIR", help="Instead of a preset: hash the files of a built job against its manifest.")
def command(
    preset: str | None, overrides: tuple[str, ...], as_json: bool, quiet: bool, everything: bool, files: str | None
) -> int:
    """Compute the verdict of PRESET and write nothing.

    Derives what the preset leaves open, computes every beat of two or more screens and
    grids, grades each at the reading distance and at the far distance, and judges the job
    by every rule. Prints the verdict, then what is wrong, worst first, in words; --all
    prints the rest too. With --files a built job is checked instead: exit code 1 when a
    file was changed, lost or added.

    \b
    patterngen verify mine.toml
    patterngen verify mine.toml --set screen.cyan.angle="22.5 deg" --all
    patterngen verify mine.toml --json > verdict.json
    patterngen verify --files out/mine
    """
    if files is not None and preset is None:
        return _files(Path(files), as_json=as_json, quiet=quiet)
    if preset is None or files is not None:
        raise click.UsageError("give a PRESET, or --files DIR, and not both")
    import patterngen
    from patterngen.cli._report import report
    from patterngen.writers import verdict as verdict_writer

    with Progress(quiet=quiet) as progress:
        verdict = patterngen.verify(patterngen.load(preset, overrides), progress=progress)
    if as_json:
        print_json(verdict_writer.document(verdict))
    elif not quiet:
        print_words(report(verdict, everything=everything))
    return 1 if verdict.status == "fail" else 0


def _files(folder: Path, *, as_json: bool, quiet: bool) -> int:
    from patterngen.errors import Fault, InputError
    from patterngen.writers import manifest

    if not (folder / "manifest.json").is_file():
        raise InputError(Fault(str(folder), "", "there is no manifest.json here, so no finished job"))
    differences = manifest.differences(folder)
    if as_json:
        print_json({"folder": str(folder), "differences": differences})
    elif not quiet:
        print_words("\n".join(differences) or f"{folder}: every file is as it was written")
    return 1 if differences else 0
