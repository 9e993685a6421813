"""How far a drawing file is, in words."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass

from patterngen.model.shapes import Batch


@dataclass(slots=True)
class Count:
    """Counts the shapes of one `ink` that go into `file` and tells `progress` at each batch."""

    file: str
    ink: str
    progress: Callable[[str], None] | None
    shapes: int = 0

    def each(self, batches: Iterable[Batch]) -> Iterator[Batch]:
        """The batches as they are, each told before it is drawn."""
        for batch in batches:
            self.shapes += batch.total
            if self.progress is not None:
                self.progress(f"writing {self.file}: {self.ink}, {self.shapes:,} shapes")
            yield batch
