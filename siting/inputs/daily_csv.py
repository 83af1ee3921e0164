"""Tables in CSV as people write them: separators, column names, dates and numbers."""

import csv
import io
from pathlib import Path

import pandas as pd

from siting.errors import InputError

DATE_NAMES = ("date", "day", "time", "datum", "fecha", "data", "jour", "tarih", "tarikh")
DATE_PATTERNS = (
    *("%Y-%m-%d", "%Y/%m/%d", "%Y%m%d", "%Y-%m-%d %H:%M:%S", "%d.%m.%Y"),
    *("%d/%m/%Y", "%m/%d/%Y", "%d-%m-%Y", "%m-%d-%Y"),
)
MONTH_PATTERNS = ("%Y-%m", "%Y/%m")
MISSING_WORDS = ("", "na", "nan", "-", "m")
MISSING_NUMBERS = (-99.0, -99.9, -999.0, -9999.0)
"""Marks of a missing value, with or without decimals (common practice)."""


def read_table(path: Path, *, setting: str) -> pd.DataFrame:
    """Read a table as text, whatever its separator."""
    if not path.exists():
        msg = f"{setting} {path.name} does not exist; give the path of a CSV"
        raise InputError(msg)
    try:
        text = path.read_text(encoding="utf-8-sig", errors="strict")
        separator = separator_of(text)
        reader = csv.reader(io.StringIO(text, newline=""), delimiter=separator, skipinitialspace=True)
        lines = [(reader.line_num, fields) for fields in reader if any(field.strip() for field in fields)]
    except (UnicodeDecodeError, csv.Error) as error:
        msg = f"{setting} {path.name} cannot be read as a table; save it as CSV (UTF-8) with a line of names"
        raise InputError(msg) from error
    names = _names(path, lines[0][1] if lines else [], setting)
    rows = [_row(path, fields, number, len(names), separator, setting) for number, fields in lines[1:]]
    if not rows or len(names) < 2:
        msg = f"{setting} {path.name} holds {_count(len(rows), 'row')} of {_count(len(names), 'column')}; "
        msg += "it needs a line of names, and rows of two columns at least"
        raise InputError(msg)
    return pd.DataFrame(rows, columns=names, dtype=str)


def separator_of(text: str) -> str:
    """Tell what separates the columns of a table: semicolon, tab or comma, whichever its first line holds most of."""
    return max(";\t,", key=text.partition("\n")[0].count)


def _count(number: int, what: str) -> str:
    return f"{number} {what}{'' if number == 1 else 's'}"


def _names(path: Path, header: list[str], setting: str) -> list[str]:
    """Return the names of the columns, by place where the file names none."""
    names = [name.strip() or f"column {place}" for place, name in enumerate(header, 1)]
    for name in names:
        if names.count(name) > 1:
            msg = f"{setting} {path.name} has the column {name} twice; keep one"
            raise InputError(msg)
    return names


def _row(path: Path, fields: list[str], number: int, columns: int, separator: str, setting: str) -> list[str]:
    """Return one line's fields, empty where it is short; refuse more fields than columns: nobody can tell which is which."""
    if any(field.strip() for field in fields[columns:]):
        way_out = (
            "if that is a decimal comma, separate the columns with semicolons" if separator == "," else "mend that line"
        )
        msg = f"{setting} {path.name} has {len(fields)} fields in line {number} under {columns} columns; {way_out}"
        raise InputError(msg)
    return [*fields[:columns], *[""] * (columns - len(fields))]


def plain_name(name: str) -> str:
    """Return the name of a column in small letters with underscores, so that "Rain (mm)" is rain_mm."""
    return name.strip().lower().replace(" ", "_").replace("(", "_").replace(")", "").replace("__", "_")


def column_named(path: Path, table: pd.DataFrame, names: tuple[str, ...], what: str, setting: str) -> str:
    """Return the one column that begins with one of these names; refuse none and several."""
    found = [str(column) for column in table.columns if plain_name(str(column)).split("_")[0] in names]
    if len(found) == 1:
        return found[0]
    columns = ", ".join(repr(str(column)) for column in table.columns)
    why = "no" if not found else "more than one"
    msg = f"{setting} {path.name} has {why} {what} column among {columns}; name it '{names[0]}'"
    raise InputError(msg)


def read_dates(path: Path, table: pd.DataFrame, *, setting: str, months: bool = False) -> pd.DatetimeIndex:
    """Read the date column, with `months` also as 2001-12; refuse dates that could be read in two ways."""
    text = table[column_named(path, table, DATE_NAMES, "date", setting)].str.strip()
    patterns = (*DATE_PATTERNS, *MONTH_PATTERNS) if months else DATE_PATTERNS
    readings = [pd.to_datetime(text, format=pattern, errors="coerce") for pattern in patterns]
    whole = [dates for dates in readings if dates.notna().all()]
    if len(whole) == 1:
        return pd.DatetimeIndex(whole[0]).normalize()
    unread = min(readings, key=lambda dates: dates.isna().sum()).isna()
    example = text.iloc[0] if whole else text[unread].iloc[0]
    why = "could be day or month first" if whole else "cannot be read"
    msg = f"dates in {setting} {path.name} such as {example!r} {why}; write them as 2001-12-31"
    raise InputError(msg)


def read_numbers(
    path: Path, text: "pd.Series[str]", *, setting: str, dates: pd.DatetimeIndex | None = None
) -> "pd.Series[float]":
    """
    Read a column of numbers with decimal points or commas; empty cells and the usual marks are missing.

    With `dates`, those of the rows, a refusal names the day.
    """
    grouped = text.str.strip().str.fullmatch(r"\d{1,3}(,\d{3})+(\.\d+)?", na=False)
    if grouped.any():
        example = _first(text, grouped, dates)
        msg = f"{setting} {path.name} has {example}, a decimal or a thousands comma; write numbers with a point"
        raise InputError(msg)
    plain = text.str.strip().str.replace(",", ".", regex=False)
    missing = plain.isna() | plain.str.lower().isin(MISSING_WORDS)
    depth = pd.to_numeric(plain.where(~missing), errors="coerce")
    strange = depth.isna() & ~missing
    if strange.any():
        msg = f"{setting} {path.name} has {_first(text, strange, dates)}, which is no number; leave missing days empty"
        raise InputError(msg)
    return depth.astype(float).mask(depth.isin(MISSING_NUMBERS))


def _first(text: "pd.Series[str]", wrong: "pd.Series[bool]", dates: pd.DatetimeIndex | None) -> str:
    """Quote the first wrong cell, with its day where that is known."""
    place = int(wrong.to_numpy().argmax())
    day = "" if dates is None else f" on {dates[place].date()}"
    return f"{text.iloc[place]!r}{day}"
