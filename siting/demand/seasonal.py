"""The seasonal method: by hand what rain and run-on supply of what the crop needs."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.demand.crop import daily_coefficients
from siting.demand.seasons import Seasons
from siting.errors import ConfigError, InputError

FloatArray = npt.NDArray[np.float64]

LEAST_RUNON_MM = 1e-9
"""Run-on over the catchment, below which a season has none: rounding, not water."""


@dataclass(frozen=True, slots=True, eq=False)
class SeasonTable:
    """
    Every plot (first axis) in every season (second axis); depths over the plot in mm.

    `demand_mm`, `rain_mm` and `rain_only_ratio` hold for all plots alike. `runon_mm` is all that arrives from one
    harvest to the next, usable or not; `usable_before_mm` all of it that was usable before sowing, of which the
    supply counts what the soil can store. `needed_ratio` is the catchment area over the cropped area that would
    suffice, NaN where the season brought no run-on (then `lacks_runon`), or where demand is unknown.
    """

    demand_mm: FloatArray
    rain_mm: FloatArray
    runon_mm: FloatArray
    usable_in_season_mm: FloatArray
    usable_before_mm: FloatArray
    supply_mm: FloatArray
    supply_ratio: FloatArray
    rain_only_ratio: FloatArray
    needed_ratio: FloatArray

    @property
    def lacks_runon(self) -> npt.NDArray[np.bool_]:
        """Where rain falls short and no run-on came from sowing to harvest, so that no ratio would have sufficed."""
        known = ~(np.isnan(self.demand_mm) | np.isnan(self.rain_mm) | np.isnan(self.runon_mm))
        return np.isnan(self.needed_ratio) & known


def seasonal_supply(
    *,
    runon_m3: FloatArray,
    rain_mm: FloatArray,
    et0_mm: FloatArray,
    seasons: Seasons,
    stage_days: tuple[int, int, int, int],
    kc: tuple[float, float, float],
    plot_area_m2: FloatArray,
    catchment_area_m2: FloatArray,
    available_water_mm: FloatArray,
    intake_capacity_mm: FloatArray,
    efficiency: float,
) -> SeasonTable:
    """
    Supply against demand, season by season.

    Demand D = sum of Kc ET0. Usable run-on: each day's depth over the plot, at most c = min(available water, intake
    capacity). Supply = rain from sowing to harvest + E x usable run-on from sowing to harvest + E x min(available
    water, usable run-on since the last harvest).

    Parameters
    ----------
    runon_m3
        Run-on by plot and day, m3.
    rain_mm, et0_mm
        Rain and reference ET by day, mm. A NaN, here or in `runon_m3`, makes unknown what its season draws from it.
    seasons
        As `season_days` gives them, with the length of `stage_days` from sowing to harvest.
    stage_days, kc
        Lengths of the four stages, days; initial, mid and end coefficient.
    plot_area_m2, catchment_area_m2
        By plot; the plot above 0, the catchment at least 0.
    available_water_mm, intake_capacity_mm
        By plot: what its soil holds at full root depth; what it takes in one event (ponding and infiltration). At
        least 0; NaN (unknown) makes the plot's supply unknown.
    efficiency
        Share E of usable run-on that serves the crop, above 0 and at most 1.

    Raises
    ------
    ConfigError
        An efficiency out of range; seasons of another length than the stages.
    InputError
        Series of another length than the days, areas or depths below zero.

    References
    ----------
    Critchley & Siegert (1991), FAO AGL/MISC/17/91, sections 2.3.8 and 4.2.
    """
    _check_settings(seasons, stage_days, efficiency)
    plots, days = _at_least_zero(runon_m3, "run-on", "m3").shape
    _check_size("day", days, {"rain": rain_mm, "reference ET": et0_mm})
    _check_size("plot", plots, {"plot area": plot_area_m2, "catchment area": catchment_area_m2})
    _check_size("plot", plots, {"available water": available_water_mm, "intake capacity": intake_capacity_mm})
    _check_areas(plot_area_m2, catchment_area_m2)
    depth = 1000.0 * runon_m3 / plot_area_m2[:, None]
    usable = np.minimum(depth, np.minimum(available_water_mm, intake_capacity_mm)[:, None])
    coefficients = daily_coefficients(stage_days=stage_days, kc=kc)
    demand = np.array([np.dot(coefficients, et0_mm[s:e]) for s, e in zip(seasons.sowing, seasons.end, strict=True)])
    rain = _sums(rain_mm[None, :], seasons.sowing, seasons.end)[0]
    in_season = _sums(usable, seasons.sowing, seasons.end)
    before = _sums(usable, seasons.first, seasons.sowing)
    stored = np.minimum(before, available_water_mm[:, None])
    supply = rain[None, :] + efficiency * (in_season + stored)
    volume = _sums(runon_m3, seasons.sowing, seasons.end)
    # a season without demand (no ET) has no ratio: NaN, never infinite
    wanted = np.where(demand > 0, demand, np.nan)
    each_plot = (plots, 1)
    return SeasonTable(
        demand_mm=np.tile(demand, each_plot),
        rain_mm=np.tile(rain, each_plot),
        runon_mm=_sums(depth, seasons.first, seasons.end),
        usable_in_season_mm=in_season,
        usable_before_mm=before,
        supply_mm=supply,
        supply_ratio=supply / wanted,
        rain_only_ratio=np.tile(rain / wanted, each_plot),
        needed_ratio=needed_ratio(demand - rain, volume, catchment_area_m2, efficiency),
    )


def _check_settings(seasons: Seasons, stage_days: tuple[int, int, int, int], efficiency: float) -> None:
    if not 0 < efficiency <= 1:
        msg = f"efficiency {efficiency:g} is outside 0 to 1; give a share, so 65 % is 0.65"
        raise ConfigError(msg)
    lengths = seasons.end - seasons.sowing
    if np.any(lengths != sum(stage_days)):
        msg = f"seasons of {lengths[0]} days and stages of {sum(stage_days)} days in all; they must agree"
        raise ConfigError(msg)


def _check_areas(plot_area_m2: FloatArray, catchment_area_m2: FloatArray) -> None:
    if not np.all(plot_area_m2 > 0):
        place = int(np.argmin(plot_area_m2 > 0))
        msg = f"plot {place + 1} of {plot_area_m2.size} has an area of {plot_area_m2[place]:g} m2; leave it out"
        raise InputError(msg)
    if np.isnan(catchment_area_m2).any():
        place = int(np.argmax(np.isnan(catchment_area_m2)))
        msg = f"plot {place + 1} of {plot_area_m2.size} has no catchment area; give 0 where nothing drains to it"
        raise InputError(msg)


def _at_least_zero(values: FloatArray, name: str, unit: str) -> FloatArray:
    bad = values[values < 0]
    if bad.size:
        msg = f"{name} of {bad[0]:g} {unit}: it cannot be below zero; correct it or leave it unknown"
        raise InputError(msg)
    return values


def _check_size(of: str, size: int, given: dict[str, FloatArray]) -> None:
    for name, values in given.items():
        if values.shape != (size,):
            msg = f"{name} has {values.size} values for {size} {of}s of run-on; give one for each {of}"
            raise InputError(msg)
        _at_least_zero(values, name, "m2" if name.endswith("area") else "mm")


def _sums(values: FloatArray, first: npt.NDArray[np.int64], end: npt.NDArray[np.int64]) -> FloatArray:
    return np.stack([values[:, f:e].sum(axis=1) for f, e in zip(first, end, strict=True)], axis=1)


def needed_ratio(
    shortage_mm: FloatArray, runon_m3: FloatArray, catchment_area_m2: FloatArray, efficiency: float
) -> FloatArray:
    """
    Catchment to cropped area that would meet a shortage: (D - rain) / (E x run-on per catchment area), at least 0.

    `shortage_mm` by season, `runon_m3` by plot and season. NaN where rain is short and no run-on came.
    """
    volume, area = np.broadcast_arrays(runon_m3, catchment_area_m2[:, None])
    per_area_mm = np.divide(1000.0 * volume, area, out=np.zeros(volume.shape), where=area > 0)
    came = per_area_mm >= LEAST_RUNON_MM
    short = np.maximum(shortage_mm, 0.0)[None, :]
    found = np.divide(short, efficiency * per_area_mm, out=np.full(volume.shape, np.nan), where=came)
    return np.where(shortage_mm[None, :] <= 0, 0.0, found)
