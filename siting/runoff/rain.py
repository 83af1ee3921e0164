"""Daily rain records: of one gauge, and of several on one calendar."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.errors import InputError

Days = npt.NDArray[np.datetime64]
FloatArray = npt.NDArray[np.float64]

DAYS_OF_MONTH = (31.0, 28.25, 31.0, 30.0, 31.0, 30.0, 31.0, 31.0, 30.0, 31.0, 30.0, 31.0)
"""Mean length of the months, in days."""


@dataclass(frozen=True, slots=True, eq=False)
class Rain:
    """Rain by day: consecutive `days` (datetime64[D]) and depths in mm, NaN where missing."""

    days: Days
    rain_mm: FloatArray

    def __post_init__(self) -> None:
        if self.days.shape != self.rain_mm.shape:
            msg = f"{self.days.size} days and {self.rain_mm.size} depths of rain do not match"
            raise InputError(msg)
        _check(self.days, self.rain_mm)

    @property
    def as_dry_mm(self) -> FloatArray:
        """Depths with missing days as dry; whoever uses it says so."""
        return np.nan_to_num(self.rain_mm, nan=0.0)


@dataclass(frozen=True, slots=True, eq=False)
class StationRain:
    """
    Rain of several stations on one calendar.

    `days` are consecutive (datetime64[D]); `rain_mm` has one row for each name in `station`: (stations, days), mm, NaN
    where that station has no reading.
    """

    days: Days
    rain_mm: FloatArray
    station: tuple[str, ...]

    def __post_init__(self) -> None:
        if self.rain_mm.shape != (len(self.station), self.days.size) or not self.station:
            msg = f"{len(self.station)} stations on {self.days.size} days do not match rain of shape {self.rain_mm.shape}"
            raise InputError(msg)
        _check(self.days, self.rain_mm)

    @property
    def as_dry_mm(self) -> FloatArray:
        """Depths with missing days as dry; whoever uses it says so."""
        return np.nan_to_num(self.rain_mm, nan=0.0)

    def take(self, places: Sequence[int]) -> "StationRain":
        """Return the stations at some places, in that order."""
        return StationRain(self.days, self.rain_mm[list(places)], tuple(self.station[place] for place in places))

    def of(self, place: int) -> Rain:
        """Return the record of one station."""
        return Rain(self.days, self.rain_mm[place])


def _check(days: Days, rain_mm: FloatArray) -> None:
    """Refuse days with holes and depths that are none."""
    if days.ndim != 1 or days.size == 0:
        msg = f"a rain record has {days.size} days in {days.ndim} dimensions; it needs one row of days"
        raise InputError(msg)
    if np.any(np.diff(days.astype("datetime64[D]").astype(np.int64)) != 1):
        msg = "the days of the rain record are not consecutive; missing days must be NaN"
        raise InputError(msg)
    wrong = (rain_mm < 0) | np.isinf(rain_mm)
    if np.any(wrong):
        place = tuple(np.argwhere(wrong)[0])
        msg = f"rain of {rain_mm[place]:g} mm on {days[place[-1]]}: a depth is finite and not below zero"
        raise InputError(msg)


def months_of(days: Days) -> npt.NDArray[np.int64]:
    """Return the month of each day, 1 to 12."""
    return days.astype("datetime64[M]").astype(np.int64) % 12 + 1


def mean_annual_mm(rain: Rain) -> float:
    """
    Mean annual rain of a record, mm: the sum of the twelve months' mean daily rain times their lengths.

    So missing days and years begun or ended halfway do not count as dry. NaN where a month was never read.
    """
    month, known = months_of(rain.days), ~np.isnan(rain.rain_mm)
    here = [rain.rain_mm[known & (month == number)] for number in range(1, 13)]
    return float(
        sum(days * (depth.mean() if depth.size else np.nan) for days, depth in zip(DAYS_OF_MONTH, here, strict=True))
    )
