"""`patterngen build`."""

from __future__ import annotations

from pathlib import Path

import click

from patterngen.cli._options import Progress, job_options, print_json, print_words


@click.command("build")
@job_options
@click.option(
    "--out", default="out", show_default=True, metavar="DIR", help="Folder in which the job's folder is made."
)
@click.option("--keep-failed", is_flag=True, help="Write the printing files although a rule failed.")
@click.option("--all", "everything", is_flag=True, help="Print every finding and every listed beat.")
def command(
    preset: str,
    overrides: tuple[str, ...],
    as_json: bool,
    quiet: bool,
    out: str,
    keep_failed: bool,
    everything: bool,
) -> int:
    """Verify PRESET and write the job's files to DIR/<job>.

    The job is named by the preset's file name. Files: base.pdf (every ink a named
    separation that overprints; this is the print master), base.svg, verdict.json, and
    manifest.json, which is written last: a folder with a manifest is finished. When a rule
    fails the exit code is 1 and the printing files are not written.

    \b
    patterngen build mine.toml
    patterngen build mine.toml --out jobs --set press.register="0.1 mm"
    """
    import patterngen
    from patterngen import pipeline
    from patterngen.cli._report import report
    from patterngen.writers import verdict as verdict_writer

    with Progress(quiet=quiet) as progress:
        proof = pipeline.prove(patterngen.load(preset, overrides), progress=progress)
        folder = pipeline.write(proof, Path(out), keep_failed=keep_failed, progress=progress)
    if as_json:
        print_json(verdict_writer.document(proof.verdict))
    elif not quiet:
        print_words(report(proof.verdict, everything=everything))
        files = ", ".join(sorted(path.name for path in folder.iterdir() if not path.name.startswith(".")))
        print_words(f"\nWritten to {folder}: {files}")
        if "base.pdf" not in files:
            print_words("No printing files: a rule failed. Those of an earlier build were taken away.")
    return 1 if proof.verdict.status == "fail" else 0
