"""Hydrological years: which there are, which are complete, and sums over them."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError, InputError
from siting.notes import Notes
from siting.runoff.rain import Days, Rain, StationRain, months_of

FloatArray = npt.NDArray[np.float64]

SHORT_RECORD_YEARS = 10
"""With fewer complete years a record is called short (common practice)."""


@dataclass(frozen=True, slots=True, eq=False)
class Years:
    """Kept years: the calendar year in which each begins, its first day and the day after its last."""

    labels: npt.NDArray[np.int64]
    first_day: Days
    end_day: Days
    starts_month: int
    dropped: tuple[int, ...]


def driest_month(rain: Rain | StationRain) -> int:
    """Return the month (1 to 12) with the least mean daily rain; the first of equals, without months never read."""
    month = months_of(rain.days)
    means = np.full(12, np.inf)
    for place in range(12):
        depth = rain.rain_mm[..., month == place + 1]
        if not np.isnan(depth).all():
            means[place] = np.nanmean(depth)
    return int(np.argmin(means)) + 1


def hydrological_years(rain: Rain | StationRain, *, starts_month: int | None, max_missing: float, notes: Notes) -> Years:
    """
    Divide a record into complete hydrological years.

    Parameters
    ----------
    rain
        Of one gauge, or of several: then a year must be complete at each of them.
    starts_month
        Month whose first day begins a year; None for the driest month, which is then noted.
    max_missing
        Share of days, 0 to 1, beyond which a year is dropped (and said to be).

    Raises
    ------
    InputError
        Where no complete year is left.
    ConfigError
        Where the month is not 1 to 12, or the share not 0 to 1.
    """
    if starts_month is not None and not 1 <= starts_month <= 12:
        msg = f"rain.year_starts is month {starts_month}; the months are 1 to 12"
        raise ConfigError(msg)
    if not 0 <= max_missing <= 1:
        msg = f"the share of missing days that a year may have is {max_missing:g}; it lies between 0 and 1"
        raise ConfigError(msg)
    month = driest_month(rain) if starts_month is None else starts_month
    if starts_month is None:
        notes.assume("rain.year_starts", f"month {month}", "", "driest month of the record", "yearly volumes")
    begin, end = rain.days[0], rain.days[-1] + 1
    first_year = int(begin.astype("datetime64[Y]").astype(int)) + 1970
    last_year = int(end.astype("datetime64[Y]").astype(int)) + 1970
    kept: list[int] = []
    dropped: list[int] = []
    missing_kept = 0
    for year in range(first_year, last_year + 1):
        start, stop = _bounds(year, month)
        if start < begin or stop > end:
            continue
        part = rain.rain_mm[..., int((start - begin).astype(int)) : int((stop - begin).astype(int))]
        missing = np.isnan(part).sum(axis=-1)
        if missing.max() > max_missing * part.shape[-1]:
            dropped.append(year)
        else:
            kept.append(year)
            missing_kept += int(missing.sum())
    if not kept:
        msg = (
            f"the rain record from {begin} to {rain.days[-1]} holds no complete year that begins in "
            f"month {month}; give a longer record, or another rain.year_starts"
        )
        if dropped:
            years = ", ".join(str(year) for year in dropped)
            msg += f"; more than {100 * max_missing:g} % of the days are missing in {years}"
        raise InputError(msg)
    _tell(kept, dropped, missing_kept, notes)
    bounds = [_bounds(year, month) for year in kept]
    return Years(
        np.array(kept, dtype=np.int64),
        np.array([start for start, _ in bounds]),
        np.array([stop for _, stop in bounds]),
        month,
        tuple(dropped),
    )


def _bounds(year: int, month: int) -> tuple[np.datetime64, np.datetime64]:
    first = np.datetime64(f"{year:04d}-{month:02d}-01", "D")
    after = np.datetime64(f"{year + 1:04d}-{month:02d}-01", "D")
    return first, after


def _tell(kept: list[int], dropped: list[int], missing: int, notes: Notes) -> None:
    if dropped:
        years = ", ".join(str(year) for year in dropped)
        notes.warn("years_dropped", f"Years left out because too many days are missing: {years}.")
    if missing:
        notes.assume("rain.missing_days", str(missing), "days", "missing days in kept years", "count as dry")
    if len(kept) < SHORT_RECORD_YEARS:
        years = "1 complete year" if len(kept) == 1 else f"{len(kept)} complete years"
        notes.warn(
            "short_record",
            f"The rain record holds {years}; dry and wet years are uncertain under {SHORT_RECORD_YEARS}.",
        )


def yearly_totals(values: FloatArray, days: Days, years: Years) -> FloatArray:
    """
    Sum daily values (..., days) over each kept year: (..., years).

    `days` are consecutive, one for each value. NaN makes its own year NaN and no other.
    """
    start = (years.first_day - days[0]).astype(np.int64)
    stop = (years.end_day - days[0]).astype(np.int64)
    if values.shape[-1] != days.size or np.any(start < 0) or np.any(stop > days.size):
        msg = f"{values.shape[-1]} values on {days.size} days from {days[0]} do not cover the years {years.labels}"
        raise InputError(msg)
    # each year by itself: a running sum would carry one year's rounding and NaN into the next
    sums = [values[..., first:after].sum(axis=-1) for first, after in zip(start, stop, strict=True)]
    return np.stack(sums, axis=-1).astype(np.float64)
