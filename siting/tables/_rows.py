"""Read the tables that lie beside this module: once, as text, every row with its source."""

import csv
from difflib import get_close_matches
from functools import cache
from importlib.resources import files

Row = dict[str, str]


@cache
def rows(name: str) -> tuple[Row, ...]:
    """Return the rows of `name`.csv; empty cells are empty text."""
    text = files(__package__ or __name__).joinpath(f"{name}.csv").read_text(encoding="utf-8")
    return tuple(csv.DictReader(text.splitlines()))


def number(text: str) -> float | None:
    """Return the number in a cell; None where the cell is empty."""
    return float(text) if text.strip() else None


def nearest(word: str, known: list[str], most: int = 5) -> str:
    """Return the known words most like `word`, for a message."""
    inside = [name for name in known if word.lower() in name.lower()]
    like = get_close_matches(word, known, n=most, cutoff=0.3)
    found = list(dict.fromkeys(inside + like))[:most] or known[:most]
    return ", ".join(repr(name) for name in found)
