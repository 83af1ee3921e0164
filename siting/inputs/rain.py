"""A daily rain record from a CSV, understood or refused."""

import csv
import io
from pathlib import Path

import numpy as np
import pandas as pd

from siting.errors import InputError
from siting.notes import Notes
from siting.runoff.rain import Rain

DATE_NAMES = ("date", "day", "time", "datum", "fecha", "data", "jour", "tarih", "tarikh")
DATE_PATTERNS = (
    *("%Y-%m-%d", "%Y/%m/%d", "%Y%m%d", "%Y-%m-%d %H:%M:%S", "%d.%m.%Y"),
    *("%d/%m/%Y", "%m/%d/%Y", "%d-%m-%Y", "%m-%d-%Y"),
)
RAIN_NAMES = (
    *("rain", "rainfall", "precip", "precipitation", "prcp", "pr", "pluie", "lluvia", "chuva", "niederschlag"),
    *("precipitacion", "precipitacao", "precipitations", "yagis", "mvua"),
)
UNIT_ENDINGS = {"mm": "mm", "in": "inch", "inch": "inch", "inches": "inch"}
MOST_IN_A_DAY_MM = 1825.0
"""The most measured in 24 hours: Foc-Foc, La Reunion, 7-8 January 1966 (WMO Archive of Weather and Climate Extremes)."""
RARE_IN_A_DAY_MM = 500.0
"""A day above this is rare anywhere, and in dry country mostly a wrong unit or a sum of days (assumption)."""
LEAST_YEAR_MM = 15.0
"""A mean year below this looks like inches or metres (common practice)."""


def read_rain(path: Path, *, unit: str | None = None, notes: Notes) -> Rain:
    """
    Read a daily rain record.

    Parameters
    ----------
    path
        CSV with a date and a rain column in any order; comma, semicolon or tab; decimal point, or decimal comma
        where the comma does not separate the columns.
    unit
        "mm" or "inch"; None takes it from the column's name, else assumes mm and notes it.

    Returns
    -------
    Rain
        Consecutive days, mm, NaN where missing.

    Raises
    ------
    InputError
        Monthly totals, repeated days, depths below zero or beyond the most ever measured, lines with more fields than
        columns, days that cannot be told.
    """
    table = read_table(path, setting="rain.daily")
    dates = read_dates(path, table, setting="rain.daily")
    name = _column(path, table, RAIN_NAMES, "rain", "rain.daily")
    depth = read_numbers(path, table[name], setting="rain.daily")
    depth = depth * _millimetres(name, unit, notes)
    _check(path, dates, depth, unit_given=unit is not None)
    series = pd.Series(depth.to_numpy(), index=dates).sort_index()
    whole = series.reindex(pd.date_range(series.index[0], series.index[-1], freq="D"))
    _note_rare_days(whole, notes)
    _note_gaps(whole, notes)
    return Rain(whole.index.to_numpy().astype("datetime64[D]"), np.asarray(whole, dtype=np.float64))


def read_table(path: Path, *, setting: str) -> pd.DataFrame:
    """Read a daily table as text, whatever its separator."""
    if not path.exists():
        msg = f"{setting} {path.name} does not exist; give the path of a CSV"
        raise InputError(msg)
    try:
        text = path.read_text(encoding="utf-8-sig", errors="strict")
        separator = max(";\t,", key=text.partition("\n")[0].count)
        reader = csv.reader(io.StringIO(text, newline=""), delimiter=separator, skipinitialspace=True)
        lines = [(reader.line_num, fields) for fields in reader if any(field.strip() for field in fields)]
    except (UnicodeDecodeError, csv.Error) as error:
        msg = f"{setting} {path.name} cannot be read as a table; save it as CSV (UTF-8) with a date column"
        raise InputError(msg) from error
    names = _names(path, lines[0][1] if lines else [], setting)
    rows = [_row(path, fields, number, len(names), separator, setting) for number, fields in lines[1:]]
    if not rows or len(names) < 2:
        msg = f"{setting} {path.name} has {len(rows)} rows and {len(names)} columns; it needs dates and values"
        raise InputError(msg)
    return pd.DataFrame(rows, columns=names, dtype=str)


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


def _plain(name: str) -> str:
    return name.strip().lower().replace(" ", "_").replace("(", "_").replace(")", "").replace("__", "_")


def _column(path: Path, table: pd.DataFrame, names: tuple[str, ...], what: str, setting: str) -> str:
    found = [str(column) for column in table.columns if _plain(str(column)).split("_")[0] in names]
    if len(found) == 1:
        return found[0]
    columns = ", ".join(repr(str(column)) for column in table.columns)
    why = "no" if not found else "more than one"
    msg = f"{setting} {path.name} has {why} {what} column among {columns}; name it '{names[0]}'"
    raise InputError(msg)


def read_dates(path: Path, table: pd.DataFrame, *, setting: str) -> pd.DatetimeIndex:
    """Read the date column; refuse dates that could be read in two ways."""
    text = table[_column(path, table, DATE_NAMES, "date", setting)].str.strip()
    readings = [pd.to_datetime(text, format=pattern, errors="coerce") for pattern in DATE_PATTERNS]
    whole = [dates for dates in readings if dates.notna().all()]
    if len(whole) == 1:
        return pd.DatetimeIndex(whole[0]).normalize()
    unread = min(readings, key=lambda dates: dates.isna().sum()).isna()
    example = text.iloc[0] if whole else text[unread].iloc[0]
    why = "could be day or month first" if whole else "cannot be read"
    msg = f"dates in {setting} {path.name} such as {example!r} {why}; write them as 2001-12-31"
    raise InputError(msg)


def read_numbers(path: Path, text: "pd.Series[str]", *, setting: str) -> "pd.Series[float]":
    """Read a column of numbers with decimal points or commas; empty cells and the usual marks are missing."""
    grouped = text.str.strip().str.fullmatch(r"\d{1,3}(,\d{3})+(\.\d+)?").fillna(False).astype(bool)
    if grouped.any():
        example = text[grouped].iloc[0]
        msg = f"{setting} {path.name} has {example!r}, a decimal or a thousands comma; write numbers with a point"
        raise InputError(msg)
    plain = text.str.strip().str.replace(",", ".", regex=False)
    missing = plain.isna() | plain.str.lower().isin(["", "na", "nan", "-", "-99", "-999", "-9999", "-99.9", "m"])
    depth = pd.to_numeric(plain.where(~missing), errors="coerce")
    strange = depth.isna() & ~missing
    if strange.any():
        msg = f"{setting} {path.name} has {text[strange].iloc[0]!r} for a number; leave missing days empty"
        raise InputError(msg)
    return depth.astype(float)


def _millimetres(name: str, unit: str | None, notes: Notes) -> float:
    ending = _plain(name).rsplit("_", maxsplit=1)[-1]
    known = unit or UNIT_ENDINGS.get(ending)
    if known is None:
        notes.assume("rain.unit", "mm", "", "the file names no unit", "all water")
        known = "mm"
    if known not in ("mm", "inch"):
        msg = f"rain.unit is {known!r}; it must be 'mm' or 'inch'"
        raise InputError(msg)
    return 25.4 if known == "inch" else 1.0


def _check(path: Path, dates: pd.DatetimeIndex, depth: "pd.Series[float]", *, unit_given: bool) -> None:
    if dates.has_duplicates:
        day = dates[dates.duplicated()][0].date()
        msg = f"rain.daily {path.name} has {day} more than once; keep one row a day"
        raise InputError(msg)
    if depth.notna().sum() == 0:
        msg = f"rain.daily {path.name} holds no depth at all; give a file with readings"
        raise InputError(msg)
    if depth.min() < 0:
        msg = f"rain.daily {path.name} has a depth of {depth.min():g} mm; leave missing days empty"
        raise InputError(msg)
    if depth.max() > MOST_IN_A_DAY_MM:
        msg = (
            f"rain.daily {path.name} has {depth.max():g} mm on {dates[int(depth.argmax())].date()}, beyond the most ever "
            f"measured, {MOST_IN_A_DAY_MM:g} mm; correct that day, or the unit of all in rain.unit"
        )
        raise InputError(msg)
    steps = np.diff(np.sort(dates.to_numpy()).astype("datetime64[D]").astype(np.int64))
    if steps.size and np.median(steps) >= 5:
        msg = (
            f"rain.daily {path.name} has one row in {np.median(steps):g} days: totals; runoff comes from single "
            "events, so give daily rain"
        )
        raise InputError(msg)
    if not unit_given and depth.mean() * 365.25 < LEAST_YEAR_MM and depth.size > 365:
        msg = (
            f"rain.daily {path.name} sums to {depth.mean() * 365.25:.1f} mm in a mean year; if it is in inches, say "
            "rain.unit = 'inch', and if it is right, say rain.unit = 'mm'"
        )
        raise InputError(msg)


def _note_rare_days(series: "pd.Series[float]", notes: Notes) -> None:
    rare = int((series > RARE_IN_A_DAY_MM).sum())
    if rare:
        notes.warn(
            "rain_rare_days",
            f"The rain record has {rare} days above {RARE_IN_A_DAY_MM:g} mm, the largest {series.max():g} mm on "
            f"{series.index[int(series.argmax())].date()}: check the unit, and that it is the rain of one day.",
        )


def _note_gaps(series: "pd.Series[float]", notes: Notes) -> None:
    missing = series.isna().to_numpy()
    if not missing.any():
        return
    after = int(np.count_nonzero(missing[:-1] & ~missing[1:] & (series.to_numpy()[1:] > 0)))
    notes.warn(
        "rain_gaps",
        f"The rain record lacks {int(missing.sum())} days; {after} readings right after a gap may be sums of several days.",
    )
