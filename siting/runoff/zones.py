"""Rain in space: zones of ground under the rain of one station, times a factor."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.errors import InputError
from siting.runoff.rain import StationRain

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.integer]

NO_ZONE = -1
"""Zone of cells whose rain is unknown."""

FACTOR_STEP = 1.05
"""Factors are told in steps of 5 %: none is off by more than 2.5 %, and classes of ground stay few."""

SMALL_FACTOR, LARGE_FACTOR = 0.7, 1.4
"""Beyond these a record scaled in space is marked: wetter places have more rains, not only larger (assumption)."""


@dataclass(frozen=True, slots=True, eq=False)
class RainZones:
    """
    Zones of rain: for each the place of its station in the record, and the factor on every day's rain there.

    Factors are finite and not below zero; a record of one gauge is station 0.
    """

    station: npt.NDArray[np.int64]
    factor: FloatArray

    def __post_init__(self) -> None:
        if self.station.shape != self.factor.shape or self.station.ndim != 1 or self.station.size == 0:
            msg = f"{self.station.size} stations and {self.factor.size} factors of rain zones do not match"
            raise InputError(msg)
        wrong = self.factor[~((self.factor >= 0) & np.isfinite(self.factor))]
        if wrong.size or np.any(self.station < 0):
            what = f"the factor {wrong[0]:g}" if wrong.size else f"the station {self.station.min()}"
            msg = f"a rain zone has {what}; factors are finite and at least 0, stations counted from 0"
            raise InputError(msg)

    @property
    def count(self) -> int:
        """Return the number of zones."""
        return int(self.station.size)


@dataclass(frozen=True, slots=True, eq=False)
class RainField:
    """
    Rain over the ground: the zone of each cell (NO_ZONE where unknown), the zones, and the record of their stations.

    The record holds only stations that some cell takes its rain from.
    """

    zone_of_cell: npt.NDArray[np.int16]
    zones: RainZones
    record: StationRain


def zone_rain_mm(rain_mm: npt.ArrayLike, zones: RainZones) -> FloatArray:
    """
    Daily rain of every zone, mm: its station's, times its factor.

    Parameters
    ----------
    rain_mm
        (stations, days), or (days,) for a single station; NaN stays NaN.

    Returns
    -------
    array
        (zones, days).

    Raises
    ------
    InputError
        Where a zone asks for a station that the record lacks.
    """
    rain = np.atleast_2d(np.asarray(rain_mm, dtype=np.float64))
    if zones.station.max() >= rain.shape[0]:
        msg = f"a rain zone takes the rain of station {zones.station.max()}, and the record has {rain.shape[0]} stations"
        raise InputError(msg)
    return rain[zones.station] * zones.factor[:, None]


def factor_steps(factor: npt.ArrayLike) -> npt.NDArray[np.int64]:
    """Return the step of 5 % nearest to each factor (above 0): 0 is 1, 2 is 1.1025, -1 is 0.952."""
    step: npt.NDArray[np.int64] = np.round(np.log(np.asarray(factor, dtype=np.float64)) / np.log(FACTOR_STEP)).astype(
        np.int64
    )
    return step
