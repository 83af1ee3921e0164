"""The seasonal method of all plots at once, made ready to be run again and again with changed inputs."""

from dataclasses import dataclass, fields, replace
from functools import cache

import numpy as np
import numpy.typing as npt

from siting.demand import Seasons, daily_coefficients
from siting.errors import ConfigError, InputError
from siting.ranking._kernels import usable_runon_mm
from siting.ranking.exceedance import dependable
from siting.ranking.supply import mean_capped_ratio
from siting.runoff import RunoffClasses, class_runoff_mm

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]
Flags = npt.NDArray[np.bool_]

LOWEST_CN, HIGHEST_CN = 1.0, 100.0
"""A shifted curve number stays within these."""

DRY, MEDIAN, MEAN, GAIN, PEAK = range(5)
"""Rows of the keys of the order."""


@dataclass(frozen=True, slots=True, eq=False)
class PlotInputs:
    """
    What the order by supply needs of each plot; NaN (unknown) leaves a plot without a rank, save in the peak flow.

    `effective_area_m2` is (losses, plots, runoff classes), summed at each of the rising losses `loss_per_km`; bed area
    is that of the channels upstream. A plot takes in `ponding_mm` and, in one event, `infiltration_mm`. `soil_class`
    is any number that plots of one soil share. `peak_flow_10y_m3s` and `plot_id` are as in `supply_order`.
    """

    effective_area_m2: FloatArray
    loss_per_km: FloatArray
    bed_area_m2: FloatArray
    plot_area_m2: FloatArray
    available_water_mm: FloatArray
    ponding_mm: FloatArray
    infiltration_mm: FloatArray
    soil_class: Integers
    open_catchment: Flags
    peak_flow_10y_m3s: FloatArray
    plot_id: Integers

    def __post_init__(self) -> None:
        losses, plots = self.loss_per_km, self.plot_id.size
        if self.effective_area_m2.ndim != 3 or self.effective_area_m2.shape[:2] != (losses.size, plots):
            msg = f"effective areas have shape {self.effective_area_m2.shape} for {losses.size} losses and {plots} plots"
            msg += "; give them by loss, plot and runoff class"
            raise InputError(msg)
        if losses.size == 0 or losses[0] < 0 or np.any(np.diff(losses) <= 0):
            msg = f"losses on the way of {losses.tolist()} per km: give at least one, from 0 up, each above the one before"
            raise InputError(msg)
        for each in fields(self)[2:]:
            values = getattr(self, each.name)
            if values.shape != (plots,):
                msg = f"{each.name} has shape {values.shape} for {plots} plots; give one value for each"
                raise InputError(msg)
            if each.name.endswith(("_m2", "_mm")) and np.any(values < 0):
                msg = f"{each.name} of {np.nanmin(values):g}: it cannot be below zero; correct it or leave it unknown"
                raise InputError(msg)
        if not np.all(self.plot_area_m2 > 0):
            msg = f"a plot area of {self.plot_area_m2.min():g} m2: it must be above zero; leave that plot out"
            raise InputError(msg)
        if np.any(self.effective_area_m2 < 0):
            msg = f"an effective area of {np.nanmin(self.effective_area_m2):g} m2: it cannot be below zero; correct it"
            raise InputError(msg)


@dataclass(frozen=True, slots=True, eq=False)
class Inputs:
    """
    One value of each input in doubt, shared by all plots that it concerns.

    Shifts are in units of the curve number, for the region and by cover class; factors stand on the values in use, those
    of the soil by soil class. `seasons` are places among the known seasons, repeats allowed.
    """

    region_shift: float
    cover_shift: FloatArray
    abstraction_ratio: float
    loss_per_km: float
    channel_wetting_mm: float
    kc_factor: float
    et0_factor: float
    available_water_factor: FloatArray
    infiltration_factor: FloatArray
    seasons: Integers


@dataclass(frozen=True, slots=True, eq=False)
class SupplyModel:
    """
    Plots, ground, weather and crop, made ready by `supply_model`.

    `in_use` are the inputs as they stand; `season` the labels of the known seasons. Only days of these seasons with
    rain are kept: `day` is their place in the record, `rain_mm` their depth. `bounds` are a season's first day, day of
    sowing and day after harvest. `cover_class` and `soil_class` list the codes that the shifts and factors belong to,
    `cover_of_class` and `soil_of_plot` are places in these lists. Of `known` plots all that makes their supply is known.
    """

    plots: PlotInputs
    classes: RunoffClasses
    cover_class: Integers
    cover_of_class: Integers
    soil_class: Integers
    soil_of_plot: Integers
    known: Flags
    season: Integers
    day: Integers
    rain_mm: FloatArray
    bounds: Integers
    demand_mm: FloatArray
    season_rain_mm: FloatArray
    efficiency: float
    dependable_share: float
    in_use: Inputs

    def season_ratios(self, inputs: Inputs, at: Integers | None = None) -> tuple[FloatArray, FloatArray]:
        """
        Run the seasonal method on the plots at these places (default: all), for every known season.

        Returns
        -------
        supply_ratio, rain_only_ratio
            By plot and season, as `seasonal_supply` has them; and by season, for rain is the same on all plots.
        """
        plots = self.plots
        at = np.arange(plots.plot_id.size) if at is None else at
        soil = self.soil_of_plot[at]
        holds = plots.available_water_mm[at] * inputs.available_water_factor[soil]
        takes_in = plots.ponding_mm[at] + plots.infiltration_mm[at] * inputs.infiltration_factor[soil]
        runoff, day = self._runoff(inputs)
        usable = np.empty((at.size, self.season.size, 2))
        usable_runon_mm(
            self._area_m2(inputs.loss_per_km, at),
            inputs.channel_wetting_mm * plots.bed_area_m2[at],
            plots.plot_area_m2[at],
            np.minimum(holds, takes_in),
            runoff,
            np.searchsorted(day, self.bounds),
            usable,
        )
        stored = np.minimum(usable[:, :, 0], holds[:, None])
        demand = inputs.kc_factor * inputs.et0_factor * self.demand_mm
        supply = self.season_rain_mm + self.efficiency * (usable[:, :, 1] + stored)
        ratio = supply / demand
        ratio[~self.known[at]] = np.nan
        return ratio, self.season_rain_mm / demand

    def keys(self, inputs: Inputs, at: Integers | None = None) -> FloatArray:
        """
        Return what the order by supply compares, more being better: (5, plots), rows DRY, MEDIAN, MEAN, GAIN and PEAK.

        Ratios are capped at 1, the peak flow is negative. A key that decides nothing is 0 for all: a quantile outside
        the ranks, a peak flow that any plot lacks. A plot of which too little is known has -inf.
        """
        ratio, rain_only = self.season_ratios(inputs, at)
        ratio, rain_only = ratio[:, inputs.seasons], rain_only[inputs.seasons]
        ranked = np.sort(ratio, axis=1)[:, ::-1]
        mean = mean_capped_ratio(ratio)
        quantiles = [np.minimum(_at_share(ranked, share), 1.0) for share in (self.dependable_share, 0.5)]
        peak = self.plots.peak_flow_10y_m3s
        lost = np.zeros(peak.size) if np.isnan(peak).any() else peak
        keys = np.stack([*quantiles, mean, mean - mean_capped_ratio(rain_only), -(lost if at is None else lost[at])])
        keys[:, np.isnan(mean)] = -np.inf
        return np.asarray(keys)

    def _runoff(self, inputs: Inputs) -> tuple[FloatArray, Integers]:
        """Return the runoff by class on the days that have any, mm, and these days."""
        shift = inputs.region_shift + inputs.cover_shift[self.cover_of_class]
        # a limit on the shift and not on the number: without a shift any number stays as it is
        number = self.classes.curve_number
        shifted = np.where(shift == 0, number, np.clip(number + shift, LOWEST_CN, HIGHEST_CN))
        ground = replace(self.classes, curve_number=shifted)
        runoff = class_runoff_mm(self.rain_mm, ground, abstraction_ratio=inputs.abstraction_ratio)
        runs = runoff.max(axis=0, initial=0.0) > 0
        return np.ascontiguousarray(runoff[:, runs]), self.day[runs]

    def _area_m2(self, loss_per_km: float, at: Integers) -> FloatArray:
        """Return effective areas at a loss between those summed: linear in the logarithm, exact for one distance."""
        known, areas = self.plots.loss_per_km, self.plots.effective_area_m2
        above = min(int(np.searchsorted(known, loss_per_km)), known.size - 1)
        if known[above] == loss_per_km:
            return np.asarray(areas[above, at])
        share = (loss_per_km - known[above - 1]) / (known[above] - known[above - 1])
        return np.asarray(areas[above - 1, at] ** (1.0 - share) * areas[above, at] ** share)


def _at_share(ranked: FloatArray, share: float) -> FloatArray:
    """Return the value reached in a share of years from values in falling order; 0 for all outside the ranks."""
    years = ranked.shape[1]
    place = _place_of_share(years, share)
    if np.isnan(place):
        return np.zeros(ranked.shape[0])
    above = int(place)
    upper, lower = ranked[:, above], ranked[:, min(above + 1, years - 1)]
    return np.asarray(upper + (lower - upper) * (place - above))


@cache
def _place_of_share(years: int, share: float) -> float:
    """Return where among ranked years a share lies, from 0 for the first; the rule is that of `dependable`."""
    return float(-dependable(-np.arange(years, dtype=np.float64), probability=share))


def supply_model(
    *,
    plots: PlotInputs,
    classes: RunoffClasses,
    cover_of_class: Integers,
    rain_mm: FloatArray,
    et0_mm: FloatArray,
    seasons: Seasons,
    stage_days: tuple[int, int, int, int],
    kc: tuple[float, float, float],
    abstraction_ratio: float,
    loss_per_km: float,
    channel_wetting_mm: float,
    efficiency: float,
    dependable_share: float,
) -> SupplyModel:
    """
    Make the seasonal method ready to be run again with changed inputs.

    Parameters
    ----------
    plots
        All plots of the run.
    classes, cover_of_class
        The runoff classes of `plots.effective_area_m2`; of each class any number that ground of one cover shares.
    rain_mm, et0_mm
        By day of the record. A season that lacks a day of ET is left out; missing days of rain must be given as dry.
    seasons, stage_days, kc, efficiency
        As in `seasonal_supply`.
    abstraction_ratio, loss_per_km, channel_wetting_mm
        The values in use; the loss within the range of `plots.loss_per_km`.
    dependable_share
        Share of seasons that the dependable ratio is reached in, between 0 and 1, such as 0.8.

    Raises
    ------
    InputError
        Series of different lengths, missing rain, demand known in no season.
    ConfigError
        An efficiency out of range, a loss beyond those summed, seasons of another length than the stages.
    """
    if not 0 < efficiency <= 1:
        msg = f"efficiency {efficiency:g} is outside 0 to 1; give a share, so 65 % is 0.65"
        raise ConfigError(msg)
    check_loss(plots, loss_per_km, loss_per_km)
    _check_series(rain_mm, et0_mm, seasons, stage_days)
    if not classes.count == cover_of_class.size == plots.effective_area_m2.shape[2]:
        msg = f"{classes.count} runoff classes, {cover_of_class.size} covers of classes and areas in "
        msg += f"{plots.effective_area_m2.shape[2]} classes; give one of each for each class"
        raise InputError(msg)
    coefficients = daily_coefficients(stage_days=stage_days, kc=kc)
    demand = np.array([np.dot(coefficients, et0_mm[s:e]) for s, e in zip(seasons.sowing, seasons.end, strict=True)])
    rain = np.array([rain_mm[s:e].sum() for s, e in zip(seasons.sowing, seasons.end, strict=True)])
    usable: Flags = np.greater(demand, 0.0)
    if not usable.any():
        msg = "no season has a known demand, so there is no order to doubt; give climate.daily or climate.reference_et"
        raise InputError(msg)
    bounds = np.stack([seasons.first, seasons.sowing, seasons.end], axis=1)[usable]
    inside = np.zeros(rain_mm.size, dtype=np.bool_)
    for first, _, end in bounds:
        inside[first:end] = True
    if np.isnan(rain_mm[inside]).any():
        msg = f"rain is missing on {int(np.isnan(rain_mm[inside]).sum())} days of the seasons; give them as 0, and say so"
        raise InputError(msg)
    day = np.flatnonzero(inside & (rain_mm > 0))
    covers, cover_place = np.unique(cover_of_class, return_inverse=True)
    soils, soil_place = np.unique(plots.soil_class, return_inverse=True)
    in_use = Inputs(
        region_shift=0.0,
        cover_shift=np.zeros(covers.size),
        abstraction_ratio=abstraction_ratio,
        loss_per_km=loss_per_km,
        channel_wetting_mm=channel_wetting_mm,
        kc_factor=1.0,
        et0_factor=1.0,
        available_water_factor=np.ones(soils.size),
        infiltration_factor=np.ones(soils.size),
        seasons=np.arange(int(usable.sum())),
    )
    return SupplyModel(
        plots,
        classes,
        covers,
        cover_place.astype(np.int64),
        soils,
        soil_place.astype(np.int64),
        _known(plots),
        seasons.label[usable],
        day.astype(np.int64),
        rain_mm[day],
        bounds,
        demand[usable],
        rain[usable],
        efficiency,
        dependable_share,
        in_use,
    )


def _known(plots: PlotInputs) -> Flags:
    columns = (plots.bed_area_m2, plots.available_water_mm, plots.ponding_mm, plots.infiltration_mm)
    areas = np.isnan(plots.effective_area_m2).any(axis=(0, 2))
    return np.asarray(~(areas | np.isnan(np.stack(columns)).any(axis=0)))


def check_loss(plots: PlotInputs, low: float, high: float) -> None:
    """Refuse losses on the way beyond those for which areas were summed."""
    known = plots.loss_per_km
    if not known[0] <= low <= high <= known[-1]:
        msg = f"losses of {low:g} to {high:g} per km lie beyond those summed, {known[0]:g} to {known[-1]:g}; sum areas there"
        raise ConfigError(msg)


def _check_series(rain_mm: FloatArray, et0_mm: FloatArray, seasons: Seasons, stage_days: tuple[int, int, int, int]) -> None:
    if et0_mm.shape != rain_mm.shape:
        msg = f"{rain_mm.size} days of rain and {et0_mm.size} of reference ET; give both for the same days"
        raise InputError(msg)
    if np.any(seasons.end - seasons.sowing != sum(stage_days)):
        msg = f"seasons of {(seasons.end - seasons.sowing)[0]} days and stages of {sum(stage_days)} days; they must agree"
        raise ConfigError(msg)
    if np.any(seasons.end > rain_mm.size):
        msg = f"a season ends on day {seasons.end.max()} of a record of {rain_mm.size} days; find seasons in this record"
        raise InputError(msg)
