"""What is said of a drawing: why it cannot be used, and what was left out or mended in it."""

from __future__ import annotations

from dataclasses import dataclass, field


class OutlineError(ValueError):
    """The drawing cannot be used: `problem`, and what is `allowed` or `nearest`."""

    def __init__(self, problem: str, *, value: str = "", allowed: str = "", nearest: str = "") -> None:
        super().__init__(problem)
        self.problem, self.value, self.allowed, self.nearest = problem, value, allowed, nearest


@dataclass
class Remarks:
    """What is told of the drawing called `label`: sentences, and counts of what was left out or mended."""

    label: str
    sentences: list[str] = field(default_factory=list)
    left_out: dict[str, int] = field(default_factory=dict)
    open: int = 0
    flat: int = 0

    def leave_out(self, what: str) -> None:
        """Count one more of what holds no outline."""
        self.left_out[what] = self.left_out.get(what, 0) + 1

    def summary(self) -> list[str]:
        """All sentences, with one each for what was left out and what was mended."""
        out = list(self.sentences)
        if self.left_out:
            words = ", ".join(f"{what} ({n})" if n > 1 else what for what, n in sorted(self.left_out.items()))
            out.append(f"{self.label}: left out, as it holds no outline: {words}")
        if self.open:
            out.append(
                f"{self.label}: {self.open} open outline{'s were' if self.open > 1 else ' was'}"
                " closed by a straight line"
            )
        if self.flat:
            out.append(f"{self.label}: {self.flat} outline{'s' if self.flat > 1 else ''} without area left out")
        return out


def clip(text: str) -> str:
    """Text of a drawing as it may stand in a message: one line of at most 60 printable characters."""
    text = " ".join("".join(c if c.isprintable() else " " for c in text[:400]).split())
    return text if len(text) <= 60 else text[:59] + "…"
