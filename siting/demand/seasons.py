"""Seasons from harvest to harvest; each belongs to the year of its sowing, so none is cut."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError, InputError

Days = npt.NDArray[np.datetime64]
Integers = npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class Seasons:
    """
    Complete seasons of a record, one entry each.

    `label` is the calendar year of sowing; `first`, `sowing` and `end` are places in the record's days: the
    day after the harvest before, the day of sowing, and the day after the last day of growth.
    """

    label: Integers
    sown: Days
    first: Integers
    sowing: Integers
    end: Integers


def season_days(days: Days, *, planting: tuple[int, int], season_length_days: int) -> Seasons:
    """
    Find the complete seasons of a fixed sowing day.

    Parameters
    ----------
    days
        Consecutive days of the record.
    planting
        Month and day of sowing; 29 February is refused, for most years lack it.
    season_length_days
        Days from sowing to harvest, at most 365: a longer season would overlap the next.

    Raises
    ------
    InputError
        Where the record holds no complete season (from one harvest to the next).
    """
    month, day = planting
    if (month, day) == (2, 29):
        msg = "planting on 02-29: most years lack that day; give 02-28 or 03-01"
        raise ConfigError(msg)
    if not 0 < season_length_days <= 365:
        msg = f"a season of {season_length_days} days: it must last 1 to 365 days"
        raise ConfigError(msg)
    years = np.unique(days.astype("datetime64[Y]"))
    sown = np.array([_date(int(year.astype(int)) + 1970, month, day) for year in years], dtype="datetime64[D]")
    sowing = (sown - days[0]).astype(np.int64)
    first = np.array([_previous(when, month, day) for when in sown], dtype="datetime64[D]") + season_length_days
    start = (first - days[0]).astype(np.int64)
    end = sowing + season_length_days
    whole = (start >= 0) & (end <= days.size)
    if not whole.any():
        msg = (
            f"the record from {days[0]} to {days[-1]} holds no complete season sown on {month:02d}-{day:02d}; give a "
            "longer record or another planting day"
        )
        raise InputError(msg)
    label = years.astype(np.int64) + 1970
    return Seasons(label[whole], sown[whole], start[whole], sowing[whole], end[whole])


def _date(year: int, month: int, day: int) -> np.datetime64:
    try:
        return np.datetime64(f"{year:04d}-{month:02d}-{day:02d}", "D")
    except ValueError as error:
        msg = f"planting on {month:02d}-{day:02d} is no day of the year; write it as month-day, like 11-15"
        raise ConfigError(msg) from error


def _previous(sown: np.datetime64, month: int, day: int) -> np.datetime64:
    year = int(sown.astype("datetime64[Y]").astype(int)) + 1970
    return _date(year - 1, month, day)
