"""The seasonal method: by hand what rain and run-on supply of what the crop needs."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.demand.crop import daily_coefficients
from siting.demand.seasons import Seasons
from siting.errors import ConfigError

FloatArray = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class SeasonTable:
    """
    Every plot (first axis) in every season (second axis); depths over the plot in mm.

    `demand_mm`, `rain_mm` and `rain_only_ratio` hold for all plots alike. `runon_mm` is all that arrives from one
    harvest to the next, usable or not. `needed_ratio` is the catchment area over the cropped area that would
    suffice, NaN where the season brought no run-on.
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
        Run-on by plot and day.
    rain_mm, et0_mm
        Rain and reference ET by day; no NaN (the caller fills or refuses gaps).
    available_water_mm, intake_capacity_mm
        By plot: what its soil holds at full root depth; what it takes in one event (ponding and infiltration).
    efficiency
        Share E of usable run-on that serves the crop, above 0 and at most 1.

    References
    ----------
    Critchley & Siegert (1991), FAO AGL/MISC/17/91, sections 2.3.8 and 4.2.
    """
    if not 0 < efficiency <= 1:
        msg = f"efficiency {efficiency:g} is outside 0 to 1"
        raise ConfigError(msg)
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
    plots = (plot_area_m2.size, 1)
    return SeasonTable(
        np.tile(demand, plots),
        np.tile(rain, plots),
        _sums(depth, seasons.first, seasons.end),
        in_season,
        before,
        supply,
        supply / demand,
        np.tile(rain / demand, plots),
        needed_ratio(demand - rain, volume, catchment_area_m2, efficiency),
    )


def _sums(values: FloatArray, first: npt.NDArray[np.int64], end: npt.NDArray[np.int64]) -> FloatArray:
    return np.stack([values[:, f:e].sum(axis=1) for f, e in zip(first, end, strict=True)], axis=1)


def needed_ratio(
    shortage_mm: FloatArray, runon_m3: FloatArray, catchment_area_m2: FloatArray, efficiency: float
) -> FloatArray:
    """
    Catchment to cropped area that would meet a shortage: (D - rain) / (E x run-on per catchment area), at least 0.

    `shortage_mm` by season, `runon_m3` by plot and season. NaN where rain is short and no run-on came.
    """
    per_area_mm = 1000.0 * runon_m3 / catchment_area_m2[:, None]
    with np.errstate(divide="ignore", invalid="ignore"):
        found = np.maximum(shortage_mm, 0.0)[None, :] / (efficiency * per_area_mm)
    return np.where(shortage_mm[None, :] <= 0, 0.0, np.where(per_area_mm > 0, found, np.nan))
