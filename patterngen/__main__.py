"""`python -m patterngen` and the `patterngen` command."""

from __future__ import annotations


def main() -> None:
    """Run the command line."""
    from patterngen.cli import run

    run()


if __name__ == "__main__":
    main()
