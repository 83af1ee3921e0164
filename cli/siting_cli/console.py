"""What concerns the terminal alone: exit codes, tables, JSON, progress."""

import dataclasses
import json
import math
import os
import sys
from collections.abc import Collection, Iterator, Mapping, Sequence
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any

import click

from siting.errors import CapacityError, ConfigError, GridError, InputError, OutputError, SitingError
from siting.progress import Progress, Silent

if TYPE_CHECKING:
    from rich.console import Console

DONE, OUR_BUG, USAGE, WRONG_INPUT, WARNED, NO_ROOM, INTERRUPTED = 0, 1, 2, 3, 4, 5, 130

EXIT_CODES: dict[type[BaseException], int] = {
    InputError: WRONG_INPUT,
    GridError: WRONG_INPUT,
    ConfigError: WRONG_INPUT,
    OutputError: WRONG_INPUT,  # a place to write to that cannot be used: named on the command line
    CapacityError: NO_ROOM,
    MemoryError: NO_ROOM,
    KeyboardInterrupt: INTERRUPTED,
}


def exit_code(error: BaseException) -> int:
    """Return the exit code of an error; 1, our own mistake, for what is not in the list."""
    return next((code for kind, code in EXIT_CODES.items() if isinstance(error, kind)), OUR_BUG)


def show(rows: Sequence[Mapping[str, object]], *, as_json: bool = False, footnotes: Collection[str] = ()) -> None:
    """
    Print rows to stdout: JSON with every key, or a table whose columns are the keys.

    In a table the columns named in `footnotes` hold numbers, and their texts follow below, each once.
    """
    if as_json:
        show_json(list(rows))
        return
    if not rows:
        return
    numbered, notes = _numbered(rows, footnotes)
    if sys.stdout.isatty():
        from rich.console import Console

        rich_table(numbered, Console())
    else:
        _plain_table(numbered)
    for number, note in enumerate(notes, start=1):
        click.echo(f"{'' if number > 1 else chr(10)}[{number}] {note}")


def _numbered(rows: Sequence[Mapping[str, object]], columns: Collection[str]) -> tuple[list[dict[str, object]], list[str]]:
    """Put a number in place of each text of `columns`; return the rows and the texts in the order of their numbers."""
    places: dict[str, int] = {}
    numbered = []
    for row in rows:
        new = dict(row)
        for column in columns:
            new[column] = f"[{places.setdefault(text(row[column]), len(places) + 1)}]"
        numbered.append(new)
    return numbered, list(places)


def _plain_table(rows: Sequence[Mapping[str, object]]) -> None:
    names = list(rows[0])
    texts = [names, *([text(row[name]) for name in names] for row in rows)]
    widths = [max(len(line[place]) for line in texts) for place in range(len(names))]
    for line in texts:
        click.echo("  ".join(cell.ljust(width) for cell, width in zip(line, widths, strict=True)).rstrip())


def rich_table(rows: Sequence[Mapping[str, object]], console: "Console") -> None:
    """Print rows on a terminal; long cells wrap, and numbers stand to the right."""
    from rich.table import Table
    from rich.text import Text

    table = Table(box=None, pad_edge=False)
    for name, value in rows[0].items():
        is_number = isinstance(value, int | float) and not isinstance(value, bool)
        table.add_column(name.replace("_", " "), justify="right" if is_number else "left", overflow="fold")
    for row in rows:
        table.add_row(*(Text(text(value)) for value in row.values()))  # as Text, so that [brackets] stay
    console.print(table)


def show_json(value: object) -> None:
    """Print a value to stdout as JSON; what is not known is null, never NaN."""
    click.echo(json.dumps(plain(value), indent=1, ensure_ascii=False, allow_nan=False))


def plain(value: Any) -> Any:
    """Return a value in JSON's own kinds: no NaN, no array scalar, no path object."""
    if value is None or isinstance(value, str | bool | int):
        return value
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, Mapping):
        return {str(key): plain(one) for key, one in value.items()}
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {field.name: plain(getattr(value, field.name)) for field in dataclasses.fields(value)}
    if hasattr(value, "tolist"):  # an array or a scalar of one
        return plain(value.tolist())
    if isinstance(value, list | tuple | set | frozenset):
        return [plain(one) for one in value]
    return str(value)


def text(value: object) -> str:
    """Return a value as shown to people; what is not known is a dash."""
    value = plain(value)
    if value is None:
        return "-"
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, float):
        return f"{value:.0f}" if abs(value) >= 10_000 else f"{value:.4g}"
    if isinstance(value, list):
        return "/".join(text(part) for part in value)
    return str(value)


def warn(sentence: str) -> None:
    """Print a warning to stderr."""
    click.echo(f"Warning: {sentence}", err=True)


def fail(error: BaseException) -> int:
    """Print an error to stderr as a sentence, with a traceback only where the mistake is ours; return its exit code."""
    code = exit_code(error)
    if isinstance(error, SitingError):
        click.echo(f"Error: {error}", err=True)
    elif isinstance(error, MemoryError):
        click.echo("Error: the memory did not suffice; close other programs or cut the elevation model smaller", err=True)
    elif code == INTERRUPTED:
        click.echo("Interrupted: nothing was put in place.", err=True)
    else:
        import traceback

        traceback.print_exception(error, file=sys.stderr)
        click.echo("Error: this is a mistake in siting, not yours; please report the lines above", err=True)
    return code


class Bar:
    """Progress on a terminal: one line a stage, with percent and time left."""

    def __init__(self, console: "Console") -> None:
        from rich.progress import BarColumn, Progress, TaskProgressColumn, TextColumn, TimeRemainingColumn

        columns = (TextColumn("{task.description}"), BarColumn(), TaskProgressColumn(), TimeRemainingColumn())
        self._lines = Progress(*columns, console=console)
        self._stages: dict[str, Any] = {}

    def __enter__(self) -> "Bar":
        self._lines.start()
        return self

    def __exit__(self, *exc: object) -> None:
        self._lines.stop()

    def stage(self, name: str, done: int, total: int) -> None:
        """Show that `done` of `total` parts of a stage are finished."""
        if name not in self._stages:
            self._stages[name] = self._lines.add_task(name, total=max(total, 1))
        # a stage without parts is finished once it is heard of
        self._lines.update(self._stages[name], completed=done if total > 0 else 1, total=max(total, 1))


@contextmanager
def listener() -> Iterator[Progress]:
    """Give a bar on a terminal, and silence elsewhere."""
    if not sys.stderr.isatty() or os.environ.get("TERM") == "dumb":
        yield Silent()
        return
    from rich.console import Console

    with Bar(Console(stderr=True)) as bar:
        yield bar
