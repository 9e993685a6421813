"""`patterngen why`."""

from __future__ import annotations

import click


@click.command("why")
@click.argument("rule")
def command(rule: str) -> None:
    """Print a rule's reason, what it measures, its limits and where they come from.

    RULE is a name as it stands in a verdict, for example `balance-drift`.
    """
    import patterngen

    click.echo(patterngen.why(rule))
