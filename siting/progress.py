"""Progress is someone who listens; nobody does by default."""

from typing import Protocol


class Progress(Protocol):
    """Something that hears about stages: a bar, a log or nothing."""

    def stage(self, name: str, done: int, total: int) -> None:
        """Hear that `done` of `total` parts of the stage `name` are finished."""
        ...


class Silent:
    """The listener that does nothing."""

    def stage(self, name: str, done: int, total: int) -> None:
        """Ignore the news."""
