"""`patterngen why`."""

from __future__ import annotations

import click

from patterngen.cli._options import print_json, print_words, telling_options


@click.command("why")
@click.argument("rule", required=False)
@telling_options
def command(rule: str | None, as_json: bool, quiet: bool) -> None:
    """Print a rule's reason, what it measures, its limits and where they come from.

    RULE is a name as it stands in a verdict, for example `balance-drift`. Without RULE every
    rule is listed with the defect it looks for or the value it derives.
    """
    import patterngen
    from patterngen.rules import _engine

    if rule:
        page = patterngen.why(rule)
        if as_json:
            print_json({"rule": rule, "text": page})
        elif not quiet:
            print_words(page)
        return
    rules = _engine.summaries()
    if as_json:
        print_json({"rules": [{"rule": name, "summary": summary} for name, summary in rules.items()]})
    elif not quiet:
        for name, summary in rules.items():
            print_words(f"{name:<24}{summary}")
