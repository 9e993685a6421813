"""Runs every bench of this folder and prints its ratios: `python -m tests.bench [name ...]`.

Ratios against a named alternative, both taken in this one run, median of five; every bench
checks that both sides did the same work.
"""

from __future__ import annotations

import importlib
import platform
import sys
from pathlib import Path


def main(wanted: list[str]) -> None:
    here = Path(__file__).parent
    print(f"{platform.machine()}, Python {platform.python_version()}")
    for path in sorted(here.glob("bench_*.py")):
        name = path.stem.removeprefix("bench_")
        if wanted and name not in wanted:
            continue
        print(f"\n{name}")
        for row in importlib.import_module(f"tests.bench.{path.stem}").run():
            print("  " + "  ".join(str(cell) for cell in row))


if __name__ == "__main__":
    main(sys.argv[1:])
