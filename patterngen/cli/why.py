"""`patterngen why`."""

from __future__ import annotations

import click


@click.command("why")
@click.argument("rule", required=False)
def command(rule: str | None) -> None:
    """Print a rule's reason, what it measures, its limits and where they come from.

    RULE is a name as it stands in a verdict, for example `balance-drift`. Without RULE every
    rule is listed with the defect it looks for or the value it derives.
    """
    import patterngen
    from patterngen.rules import _engine

    if rule:
        click.echo(patterngen.why(rule))
        return
    for name, summary in _engine.summaries().items():
        click.echo(f"{name:<24}{summary}")
