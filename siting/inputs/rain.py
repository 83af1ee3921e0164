"""Daily rain records from a CSV, of one gauge or of several, understood or refused."""

from collections.abc import Sequence
from pathlib import Path

import numpy as np
import numpy.typing as npt
import pandas as pd

from siting.errors import InputError
from siting.inputs.daily_csv import DATE_NAMES, column_named, plain_name, read_dates, read_numbers, read_table
from siting.notes import Notes
from siting.runoff.generator import RainGenerator, daily_from_monthly
from siting.runoff.rain import Rain, StationRain

FloatArray = npt.NDArray[np.float64]
Readings = tuple[pd.DatetimeIndex, FloatArray]

RAIN_NAMES = (
    *("rain", "rainfall", "precip", "precipitation", "prcp", "pr", "pluie", "lluvia", "chuva", "niederschlag"),
    *("precipitacion", "precipitacao", "precipitations", "yagis", "mvua"),
)
STATION_NAMES = ("station", "gauge", "site", "estacion", "estacao", "poste", "istasyon", "kituo")
UNIT_SETTING = "rain.unit"
UNIT_ENDINGS = {"mm": "mm", "in": "inch", "inch": "inch", "inches": "inch"}
MOST_IN_A_DAY_MM = 1825.0
"""The most measured in 24 hours: Foc-Foc, La Reunion, 7-8 January 1966 (WMO Archive of Weather and Climate Extremes)."""
MOST_IN_A_MONTH_MM = 9300.0
"""The most measured in a month: Cherrapunji, July 1861 (from memory)."""
RARE_IN_A_DAY_MM = 500.0
"""A day above this is rare anywhere, and in dry country mostly a wrong unit or a sum of days (assumption)."""
LEAST_YEAR_MM = 15.0
"""A mean year below this looks like inches or metres (common practice)."""
WET_YEAR_MM, WET_YEAR_UNSURE_MM = 1500.0, 1000.0
"""A mean year above this, or above the second where the unit is assumed, is no dry country's (assumption)."""
SPARSE_DAYS = 5
"""Rows this many days apart are totals, not days."""
DAYS_A_YEAR, MONTHS_A_YEAR = 365.25, 12.0
MONTH_DAYS = (28, 31)
"""Days from one monthly total to the next."""


def read_rain(path: Path, *, unit: str | None = None, generator: RainGenerator | None = None, notes: Notes) -> Rain:
    """
    Read the daily rain record of one gauge.

    Parameters
    ----------
    path
        CSV with a date and a rain column in any order; comma, semicolon or tab; decimal point, or decimal comma
        where the comma does not separate the columns.
    unit
        "mm" or "inch"; None takes it from the column's name, else assumes mm and notes it.
    generator
        Draws days where the file holds monthly totals, each that of the month of its date; None refuses them.

    Returns
    -------
    Rain
        Consecutive days, mm, NaN where missing.

    Raises
    ------
    InputError
        Totals of several days, repeated days, depths below zero or beyond the most ever measured, lines with more fields
        than columns, days that cannot be told; a generator for a file of days.
    """
    table = read_table(path, setting="rain.daily")
    dates = read_dates(path, table, setting="rain.daily", months=True)
    name = column_named(path, table, RAIN_NAMES, "rain", "rain.daily")
    depth = _depths(path, table[name], dates, _millimetres(name, unit, notes))
    what = f"rain.daily {path.name}"
    monthly = _monthly(dates)
    _check(what, dates, depth, most_mm=MOST_IN_A_MONTH_MM if monthly else MOST_IN_A_DAY_MM)
    if generator is not None:
        if not monthly:
            msg = f"rain.generator is true, but {what} holds no monthly totals; take rain.generator out"
            raise InputError(msg)
        if unit is None:
            _refuse_odd_years(what, depth, MONTHS_A_YEAR)
        _note_wet_years(depth, "The rain record", notes, MONTHS_A_YEAR)
        return _drawn(dates, depth, generator, notes)
    _refuse_totals(what, dates, depth, monthly)
    if unit is None:
        _refuse_odd_years(what, depth)
    whole = _whole(dates, depth)
    _note_doubts(whole, "The rain record", notes)
    return Rain(whole.index.to_numpy().astype("datetime64[D]"), np.asarray(whole, dtype=np.float64))


def read_rain_stations(
    path: Path,
    stations: Sequence[str] | None,
    *,
    unit: str | None = None,
    generator: RainGenerator | None = None,
    notes: Notes,
) -> StationRain:
    """
    Read daily rain of several stations onto one calendar, from the first day of any to the last of any.

    Parameters
    ----------
    path
        CSV with a date column and either a station and a rain column, or one column of rain named as each station
        (a unit may follow, as in "Rehm_mm").
    stations
        The names to read, in this order; others in the file are passed over, and said. None, or one name beside a
        column of rain, reads the record of one gauge as `read_rain` does.
    unit, generator
        As in `read_rain`; days are drawn for one gauge alone.

    Returns
    -------
    StationRain
        NaN where a station has no reading; the missing days of each are said.

    Raises
    ------
    InputError
        As `read_rain`; and where a station named is not in the file.
    """
    table = read_table(path, setting="rain.daily")
    station_column = _station_column(table)
    if stations is None or (len(stations) == 1 and station_column is None and _has_rain(table)):
        if station_column is not None and table[station_column].str.strip().nunique() > 1:
            msg = f"rain.daily {path.name} holds several stations; say where they lie in rain.stations"
            raise InputError(msg)
        rain = read_rain(path, unit=unit, generator=generator, notes=notes)
        return StationRain(rain.days, rain.rain_mm[None, :], (stations[0] if stations else path.stem,))
    if generator is not None:
        msg = "rain.generator draws the days of one gauge, not of several together; give daily rain or one station"
        raise InputError(msg)
    dates = read_dates(path, table, setting="rain.daily", months=True)
    if station_column is None:
        found = _by_column(path, table, dates, stations, unit, notes)
    else:
        found = _by_row(path, table, dates, station_column, unit, notes)
    lacking = [name for name in stations if name not in found]
    if lacking:
        has = ", ".join(map(repr, table.columns if station_column is None else found))
        msg = f"rain.daily {path.name} has no rain of the station {lacking[0]!r}; it has {has}"
        raise InputError(msg)
    _note_unplaced(path, [name for name in found if name not in stations], notes)
    return _one_calendar(path, {name: found[name] for name in stations}, unit, notes)


def _station_column(table: pd.DataFrame) -> str | None:
    columns = [str(column) for column in table.columns if plain_name(str(column)).split("_")[0] in STATION_NAMES]
    return columns[0] if len(columns) == 1 else None


def _has_rain(table: pd.DataFrame) -> bool:
    return any(plain_name(str(column)).split("_")[0] in RAIN_NAMES for column in table.columns)


def _by_row(
    path: Path, table: pd.DataFrame, dates: pd.DatetimeIndex, station: str, unit: str | None, notes: Notes
) -> dict[str, Readings]:
    """Return dates and depths of each station of a table with a station column."""
    name = column_named(path, table, RAIN_NAMES, "rain", "rain.daily")
    depth = _depths(path, table[name], dates, _millimetres(name, unit, notes))
    names = table[station].str.strip()
    return {
        str(one): (dates[rows], depth[rows]) for one in dict.fromkeys(names) if (rows := (names == one).to_numpy()).any()
    }


def _by_column(
    path: Path, table: pd.DataFrame, dates: pd.DatetimeIndex, stations: Sequence[str], unit: str | None, notes: Notes
) -> dict[str, Readings]:
    """Return dates and depths of each station that has a column of its own."""
    wanted = {plain_name(name): name for name in stations}
    found: dict[str, Readings] = {}
    unplaced = []
    for column in map(str, table.columns):
        plain = plain_name(column)
        start, _, ending = plain.rpartition("_")
        key = plain if plain in wanted or ending not in UNIT_ENDINGS else start
        if key in wanted:
            found[wanted[key]] = (dates, _depths(path, table[column], dates, _millimetres(column, unit, notes)))
        elif plain.split("_")[0] not in DATE_NAMES:
            unplaced.append(column)
    _note_unplaced(path, unplaced, notes)
    return found


def _one_calendar(path: Path, found: dict[str, Readings], unit: str | None, notes: Notes) -> StationRain:
    """Check each station's readings, and lay them side by side."""
    series = {}
    for name, (dates, depth) in found.items():
        what = f"rain.daily {path.name} at {name!r}"
        _check(what, dates, depth, most_mm=MOST_IN_A_DAY_MM)
        _refuse_totals(what, dates, depth, _monthly(dates))
        if unit is None:
            _refuse_odd_years(what, depth)
        series[name] = pd.Series(depth, index=dates)
    first, last = min(dates.min() for dates, _ in found.values()), max(dates.max() for dates, _ in found.values())
    frame = pd.DataFrame(series).reindex(pd.date_range(first, last, freq="D"))
    for name in found:
        _note_doubts(frame[name], f"The rain record of {name!r}", notes)
    days = frame.index.to_numpy().astype("datetime64[D]")
    return StationRain(days, frame.to_numpy(dtype=np.float64).T.copy(), tuple(found))


def _note_unplaced(path: Path, names: Sequence[str], notes: Notes) -> None:
    if names:
        listed = ", ".join(map(repr, names))
        notes.warn(
            "rain_station_unplaced", f"rain.daily {path.name} holds stations that rain.stations does not place: {listed}."
        )


def _depths(path: Path, text: "pd.Series[str]", dates: pd.DatetimeIndex, millimetres: float) -> FloatArray:
    return np.asarray(read_numbers(path, text, setting="rain.daily", dates=dates), dtype=np.float64) * millimetres


def _millimetres(name: str, unit: str | None, notes: Notes) -> float:
    ending = plain_name(name).rsplit("_", maxsplit=1)[-1]
    known = unit or UNIT_ENDINGS.get(ending)
    if known is None:
        notes.assume(UNIT_SETTING, "mm", "", "the file names no unit", "all water")
        known = "mm"
    if known not in ("mm", "inch"):
        msg = f"rain.unit is {known!r}; it must be 'mm' or 'inch'"
        raise InputError(msg)
    return 25.4 if known == "inch" else 1.0


def _monthly(dates: pd.DatetimeIndex) -> bool:
    """Tell whether there is one row a month."""
    months = dates.to_numpy().astype("datetime64[M]")
    least, most = MONTH_DAYS
    return np.unique(months).size == months.size and least <= _usual_step(dates) <= most


def _usual_step(dates: pd.DatetimeIndex) -> float:
    """Return the usual number of days from row to row; 1 for a single row."""
    steps = np.diff(np.sort(dates.to_numpy()).astype("datetime64[D]").astype(np.int64))
    return float(np.median(steps)) if steps.size else 1.0


def _check(what: str, dates: pd.DatetimeIndex, depth: FloatArray, *, most_mm: float) -> None:
    if dates.has_duplicates:
        day = dates[dates.duplicated()][0].date()
        msg = f"{what} has {day} more than once; keep one row a day"
        raise InputError(msg)
    if np.isnan(depth).all():
        msg = f"{what} holds no depth at all; give a file with readings"
        raise InputError(msg)
    if np.nanmin(depth) < 0:
        day = dates[int(np.nanargmin(depth))].date()
        msg = f"{what} has a depth of {np.nanmin(depth):g} mm on {day}; leave missing days empty"
        raise InputError(msg)
    if np.nanmax(depth) > most_mm:
        msg = (
            f"{what} has {np.nanmax(depth):g} mm on {dates[int(np.nanargmax(depth))].date()}, beyond the most ever "
            f"measured, {most_mm:g} mm; correct that day, or the unit of all in rain.unit"
        )
        raise InputError(msg)


def _refuse_totals(what: str, dates: pd.DatetimeIndex, depth: FloatArray, monthly: bool) -> None:
    _refuse_wet_days_alone(what, dates, depth)
    step = _usual_step(dates)
    if step >= SPARSE_DAYS:
        way_out = ", or let days be drawn from the totals with rain.generator = true" if monthly else ""
        msg = f"{what} has one row in {step:g} days: totals; runoff comes from single events, so give daily rain{way_out}"
        raise InputError(msg)


def _refuse_wet_days_alone(what: str, dates: pd.DatetimeIndex, depth: FloatArray) -> None:
    """Refuse rain on fewer than half of the days and no dry one: rain of following days, which totals do not have."""
    read = dates[~np.isnan(depth)].sort_values()
    span = (read[-1] - read[0]).days + 1
    neighbours = read.size > 1 and np.diff(read).min() == np.timedelta64(1, "D")
    if neighbours and 2 * read.size < span and np.nanmin(depth) > 0:
        msg = f"{what} holds {read.size} of {_days(span)} and no dry one: it seems to list wet days alone; "
        msg += "write dry days as 0, and leave out only those not measured"
        raise InputError(msg)


def _refuse_odd_years(what: str, depth: FloatArray, rows_a_year: float = DAYS_A_YEAR) -> None:
    mean = np.nanmean(depth) * rows_a_year
    if mean < LEAST_YEAR_MM and depth.size > rows_a_year:
        msg = (
            f"{what} sums to {mean:.1f} mm in a mean year; if it is in inches, say "
            "rain.unit = 'inch', and if it is right, say rain.unit = 'mm'"
        )
        raise InputError(msg)


def _whole(dates: pd.DatetimeIndex, depth: FloatArray) -> "pd.Series[float]":
    """Lay readings on consecutive days; NaN where there is none."""
    series = pd.Series(depth, index=dates).sort_index()
    return series.reindex(pd.date_range(series.index[0], series.index[-1], freq="D"))


def _drawn(dates: pd.DatetimeIndex, total_mm: FloatArray, generator: RainGenerator, notes: Notes) -> Rain:
    """Draw days from monthly totals in any order; a month without a row stays missing."""
    month = dates.to_numpy().astype("datetime64[M]")
    months = np.arange(month.min(), month.max() + 1)
    totals = np.full(months.size, np.nan)
    totals[(month - months[0]).astype(np.int64)] = total_mm
    notes.assume("rain.month_of_total", "that of its date", "", "common practice", "seasons and years of the drawn days")
    return daily_from_monthly(months, totals, generator=generator, notes=notes)


def _note_doubts(series: "pd.Series[float]", what: str, notes: Notes) -> None:
    """Say what in a record of days should be looked at."""
    _note_wet_years(np.asarray(series, dtype=np.float64), what, notes)
    _note_rare_days(series, what, notes)
    _note_gaps(series, what, notes)


def _note_wet_years(depth: FloatArray, what: str, notes: Notes, rows_a_year: float = DAYS_A_YEAR) -> None:
    """Say that a mean year is more than dry country has; sooner where nobody told the unit."""
    mean = float(np.nanmean(depth)) * rows_a_year
    assumed = any(one.id == UNIT_SETTING for one in notes.assumptions)
    if depth.size > rows_a_year and mean > (WET_YEAR_UNSURE_MM if assumed else WET_YEAR_MM):
        notes.warn(
            "rain_wet",
            f"{what} sums to {mean:.0f} mm in a mean year, much for dry country: divide depths in tenths of a millimetre by "
            f"10; {'if it is right' if assumed else 'if it is in another unit'}, say the unit in rain.unit.",
        )


def _note_rare_days(series: "pd.Series[float]", what: str, notes: Notes) -> None:
    rare = int((series > RARE_IN_A_DAY_MM).sum())
    if rare:
        notes.warn(
            "rain_rare_days",
            f"{what} has {_days(rare)} above {RARE_IN_A_DAY_MM:g} mm, the largest {series.max():g} mm on "
            f"{series.index[int(series.argmax())].date()}: check the unit, and that it is the rain of one day.",
        )


def _note_gaps(series: "pd.Series[float]", what: str, notes: Notes) -> None:
    missing = series.isna().to_numpy()
    if not missing.any():
        return
    after = int(np.count_nonzero(missing[:-1] & ~missing[1:] & (series.to_numpy()[1:] > 0)))
    text = f"{what} lacks {_days(int(missing.sum()))}, the first {series.index[int(missing.argmax())].date()}"
    if 2 * missing.sum() > missing.size:
        text += "; where those were dry, write them as 0"
    if after:
        sums = (
            "1 reading right after a gap may be a sum" if after == 1 else f"{after} readings right after a gap may be sums"
        )
        text += f"; {sums} of several days"
    notes.warn("rain_gaps", f"{text}.")


def _days(count: int) -> str:
    return "1 day" if count == 1 else f"{count} days"
