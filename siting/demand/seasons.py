"""Seasons from harvest to harvest; each belongs to the year of its sowing, so none is cut."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError, InputError
from siting.notes import Notes

Days = npt.NDArray[np.datetime64]
Integers = npt.NDArray[np.int64]
Flags = npt.NDArray[np.bool_]


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

    Returns
    -------
    Seasons
        Those that lie in the record from the day after one harvest to the next harvest; the first year sown has
        none before it and is left out unless the record reaches back to that harvest.

    Raises
    ------
    ConfigError
        A planting day that is no day of every year, or a length outside 1 to 365 days.
    InputError
        Where the record holds no complete season, or its days are not consecutive.
    """
    month, day = planting
    if (month, day) == (2, 29):
        msg = "planting on 02-29: most years lack that day; give 02-28 or 03-01"
        raise ConfigError(msg)
    if not 0 < season_length_days <= 365:
        msg = f"a season of {season_length_days} days: it must last 1 to 365 days; shorten crop.stage_days"
        raise ConfigError(msg)
    if days.size == 0 or np.any(np.diff(days.astype("datetime64[D]").astype(np.int64)) != 1):
        msg = "the days of the record are not consecutive; keep missing days, without a value"
        raise InputError(msg)
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


def complete_seasons(seasons: Seasons, *, missing: Flags, max_missing: float, notes: Notes) -> Seasons:
    """
    Leave out the seasons that lack too many days of rain, and say so.

    Parameters
    ----------
    missing
        By day of the record: no rain is known.
    max_missing
        Share of the days from the harvest before to the harvest, 0 to 1, beyond which a season is left out.

    Raises
    ------
    InputError
        Where no season is left.
    """
    bounds = zip(seasons.first, seasons.end, strict=True)
    keep = np.array([missing[first:end].mean() <= max_missing for first, end in bounds], dtype=np.bool_)
    dropped = ", ".join(str(year) for year in seasons.label[~keep])
    if not keep.any():
        msg = f"every season ({dropped}) lacks more than {max_missing:.0%} of its days of rain; give a fuller record"
        raise InputError(msg)
    if dropped:
        notes.warn(
            "seasons_dropped", f"Seasons left out because too many days of rain are missing, by year of sowing: {dropped}."
        )
    return Seasons(seasons.label[keep], seasons.sown[keep], seasons.first[keep], seasons.sowing[keep], seasons.end[keep])


def _date(year: int, month: int, day: int) -> np.datetime64:
    try:
        return np.datetime64(f"{year:04d}-{month:02d}-{day:02d}", "D")
    except ValueError as error:
        msg = f"planting on {month:02d}-{day:02d} is no day of the year; write it as month-day, like 11-15"
        raise ConfigError(msg) from error


def _previous(sown: np.datetime64, month: int, day: int) -> np.datetime64:
    year = int(sown.astype("datetime64[Y]").astype(int)) + 1970
    return _date(year - 1, month, day)
