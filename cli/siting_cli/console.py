"""What concerns the terminal alone: exit codes and tables."""

import json
from collections.abc import Sequence

import click

OUR_BUG, WRONG_INPUT, NO_ROOM = 1, 3, 5


def exit_code(error: Exception) -> int:
    """Return the exit code of an error: 3 for wrong input or settings, 5 for too little memory or disk, 1 else."""
    from siting.errors import CapacityError, ConfigError, GridError, InputError

    if isinstance(error, CapacityError):
        return NO_ROOM
    return WRONG_INPUT if isinstance(error, InputError | ConfigError | GridError) else OUR_BUG


def show(rows: Sequence[dict[str, object]], *, as_json: bool) -> None:
    """Print rows to stdout: JSON with every key, or a table whose columns are the keys."""
    if as_json:
        click.echo(json.dumps(list(rows), indent=1, ensure_ascii=False))
        return
    if not rows:
        return
    names = list(rows[0])
    texts = [names, *([_text(row[name]) for name in names] for row in rows)]
    widths = [max(len(text[place]) for text in texts) for place in range(len(names))]
    for text in texts:
        click.echo("  ".join(cell.ljust(width) for cell, width in zip(text, widths, strict=True)).rstrip())


def _text(value: object) -> str:
    if value is None:
        return "-"
    if isinstance(value, float):
        return f"{value:.4g}"
    if isinstance(value, tuple | list):
        return "/".join(_text(part) for part in value)
    return str(value)
