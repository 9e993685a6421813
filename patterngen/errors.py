"""What can go wrong, as the user meets it.

Two families and no third: the input (or the call) is wrong, exit code 2; or the
machine failed us, exit code 3.  A design that breaks a rule is neither: it is a
`Verdict`.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Fault:
    """One thing that is wrong with the input.

    `where` is the file (or `--set`, or the call), `key` the dotted path inside it
    (may be empty), `value` what was given as text, `allowed` what would be legal
    and `nearest` the nearest legal spelling, if there is one.
    """

    where: str
    key: str
    problem: str
    value: str = ""
    allowed: str = ""
    nearest: str = ""

    def line(self) -> str:
        """The fault as one line of plain words."""
        head = ": ".join(part for part in (self.where, self.key) if part)
        text = f"{head}: {self.problem}" if head else self.problem
        if self.value:
            text += f", got {self.value}"
        if self.allowed:
            text += f"; allowed: {self.allowed}"
        if self.nearest:
            text += f"; nearest: {self.nearest}"
        return " ".join(text.split())


class PatterngenError(Exception):
    """Base of everything this program raises on purpose."""

    exit_code = 1


class InputError(PatterngenError):
    """The input or the call is wrong; nothing was written.  Carries every `Fault` found."""

    exit_code = 2

    def __init__(self, faults: Fault | Iterable[Fault]) -> None:
        self.faults: tuple[Fault, ...] = (faults,) if isinstance(faults, Fault) else tuple(faults)
        super().__init__("\n".join(fault.line() for fault in self.faults))


class MachineError(PatterngenError):
    """The machine failed us: disk full, no permission, a child process lost."""

    exit_code = 3
