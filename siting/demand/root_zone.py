"""The daily balance of root zone, standing water and fallow, from which the yields of seasons follow."""

from dataclasses import dataclass, field, fields
from typing import Any

import numpy as np
import numpy.typing as npt

from siting.demand import _kernels as kernels
from siting.demand.crop import relative_yield
from siting.demand.planting import CropWater, Planting
from siting.demand.plot_soil import FieldRules, PlotSoil
from siting.demand.seasons import Days, Seasons
from siting.errors import ConfigError, InputError
from siting.parallel import run_all, usable_threads

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]
Flags = npt.NDArray[np.bool_]

FAILURES = np.array(["", "no_onset", "stand_lost"])
"""Why a season failed, by the code of the kernel."""

LEAST_FITTED_ET_RATIO = 0.5
"""The yield line was fitted for ETa/ETc of this and more (FAO-33)."""

PLOTS_AT_ONCE = 32
"""Plots of one piece of work: small, so that threads end together."""


@dataclass(frozen=True, slots=True, eq=False)
class CropRecord:
    """
    Weather, seasons and crop: what the daily balance takes as alike on all plots.

    `rain_mm` and `et0_mm` by day, known on all days of the seasons; ET0 unknown on all days leaves all results
    unknown. `seasons` are those of `sowing_seasons` for `crop` and `planting`, also with some left out.

    Raises
    ------
    InputError
        Rain or ET0 unknown on a day of a season, or below zero; series of another length than the days.
    ConfigError
        Seasons of another length than window and crop.
    """

    days: Days
    rain_mm: FloatArray
    et0_mm: FloatArray
    seasons: Seasons
    crop: CropWater
    planting: Planting
    field: FieldRules = field(default_factory=FieldRules)

    def __post_init__(self) -> None:
        span = self.planting.window_days + self.crop.length_days - 1
        lengths = self.seasons.end - self.seasons.sowing
        if lengths.size == 0 or np.any(lengths != span):
            msg = f"seasons of {lengths[:1]} days, and a window and a crop of {span} days together; take sowing_seasons"
            raise ConfigError(msg)
        within = np.zeros(self.days.size, dtype=np.bool_)
        for first, end in zip(self.seasons.first, self.seasons.end, strict=True):
            within[first:end] = True
        for name, values in (("rain", self.rain_mm), ("reference ET", self.et0_mm)):
            if values.shape != self.days.shape:
                msg = f"{name} has {values.size} values for {self.days.size} days; give one for each day"
                raise InputError(msg)
            unknown = np.isnan(values) & within & (name == "rain" or self.demand_known)
            bad = np.flatnonzero(unknown | (values < 0))
            if bad.size:
                msg = f"{name} of {self.days[bad[0]]} is {values[bad[0]]:g} mm; a day of a season needs a depth of 0 or more"
                raise InputError(msg)

    @property
    def demand_known(self) -> bool:
        """Whether there is any reference ET."""
        return not bool(np.isnan(self.et0_mm).all())

    @property
    def bounds(self) -> Integers:
        """First day, first day of the window and day after the last, for each season."""
        # a perennial keeps growing on the one day that a leap year leaves between two seasons
        opens = self.seasons.first if self.crop.perennial else self.seasons.sowing
        return np.stack([self.seasons.first, opens, self.seasons.end], axis=1)

    @property
    def anew(self) -> Flags:
        """Whether a season is the first, or does not follow at once on the one before it in the list."""
        return np.append(True, self.seasons.first[1:] != self.seasons.end[:-1])

    @property
    def rules(self) -> kernels.Rules:
        """Crop and sowing as the kernel takes them."""
        crop, planting = self.crop, self.planting
        return kernels.Rules(
            root_start_m=np.inf if crop.perennial else crop.root_start_m,
            growth_days=float(crop.stage_days[0] + crop.stage_days[1]),
            depletion_fraction=crop.depletion_fraction,
            length_days=np.inf if crop.perennial else float(crop.length_days),
            window_days=float(planting.window_days),
            onset_mm=0.0 if planting.closes is None else planting.onset_mm,
            onset_days=float(planting.onset_days),
            drowned_after_days=float(self.field.standing_water_days),
            lost_after_days=np.inf if crop.perennial else float(planting.lost_after_days),
            lost_within_days=float(planting.lost_within_days),
        )


@dataclass(frozen=True, slots=True, eq=False)
class WaterBalance:
    """
    Sums by plot and period, mm over the plot; NaN where a day of the period was not simulated, or the plot is unknown.

    rain + run-on = overflow + standing loss (evaporation of standing water) + soil loss (evaporation and uptake)
    + percolation + stored (rise of all water on and in the soil). `shortage_mm` is what the crop needed and did not get.
    """

    rain_mm: FloatArray
    runon_mm: FloatArray
    overflow_mm: FloatArray
    standing_loss_mm: FloatArray
    soil_loss_mm: FloatArray
    percolation_mm: FloatArray
    stored_mm: FloatArray
    shortage_mm: FloatArray


@dataclass(frozen=True, slots=True, eq=False)
class SeasonYields:
    """
    Every plot (first axis) in every season (second axis); NaN, NaT and "" where a plot's inputs are unknown.

    `label` is the calendar year in which the window opens. `et_ratio` is ETa/ETc of the harvested crop, NaN in a failed
    season; `relative_yield` is 0 there. `failure` is "no_onset", "stand_lost" or "". `standing_water_days` are the days
    of the crop that begin under water. Run-on, overflow and percolation are those from harvest to harvest.
    """

    label: Integers
    et_ratio: FloatArray
    relative_yield: FloatArray
    standing_water_days: FloatArray
    sown: Days
    failure: npt.NDArray[np.str_]
    runon_m3: FloatArray
    overflow_m3: FloatArray
    percolation_m3: FloatArray
    balance: WaterBalance | None = None

    @property
    def beyond_fit(self) -> Flags:
        """Where ETa/ETc is below the least for which the yield line was fitted (FAO-33)."""
        return np.asarray(self.et_ratio < LEAST_FITTED_ET_RATIO)

    @property
    def worst_standing_water_days(self) -> FloatArray:
        """Days under water in each plot's worst season; NaN unknown."""
        return np.asarray(self.standing_water_days.max(axis=1))


@dataclass(frozen=True, slots=True, eq=False)
class DailyTrace:
    """
    One plot by day, in mm and m; NaN on days outside the seasons, and for what a fallow has not.

    `stress` is Ks under the crop and Kr in the fallow. `top_mm` is what is short in the root zone (in the fallow in the
    top 0.1 m), `below_mm` in the soil below it; both, and `standing_mm`, at the end of the day.
    """

    root_m: FloatArray
    stress: FloatArray
    needed_mm: FloatArray
    standing_loss_mm: FloatArray
    soil_loss_mm: FloatArray
    overflow_mm: FloatArray
    infiltration_mm: FloatArray
    standing_mm: FloatArray
    top_mm: FloatArray
    below_mm: FloatArray
    percolation_mm: FloatArray


def daily_balance(
    record: CropRecord,
    *,
    runon_m3: FloatArray | None,
    soil: PlotSoil,
    plot_area_m2: FloatArray,
    period: Integers | None = None,
    spin_up: bool = True,
    threads: int | None = None,
) -> SeasonYields:
    """
    Simulate every plot day by day, fallow too, and give the yield of each season.

    Water stored before sowing carries the crop, so the days run on from harvest to harvest. Seasons that follow one
    another form a run; each run begins with soil half full of available water, and its first year is run twice. Each
    day, in this order: roots grow and take over soil below; standing water evaporates; the crop takes up what its stress
    allows, or bare soil dries; rain and run-on arrive, spill over the bund, soak in and percolate.

    Parameters
    ----------
    runon_m3
        Run-on by plot and day, m3, at least 0, NaN where unknown; None shuts it off: the same plots on rain alone.
    plot_area_m2
        By plot, above 0; the run-on is spread over it.
    period
        By day: the number, from 0, of the period in whose `balance` the day counts, -1 for none; months for example.
    spin_up
        False starts at half of available water, without running the first year before.
    threads
        Number of threads; None takes all that there are. Results do not depend on it.

    Raises
    ------
    InputError
        Lengths that disagree, areas not above zero, volumes below zero.

    References
    ----------
    Allen et al. (1998), FAO-56, chapters 7 and 8, eq. 66, 74, 84, 85; Doorenbos & Kassam (1979), FAO-33, eq. 1.
    """
    volume = np.zeros((1, record.days.size)) if runon_m3 is None else runon_m3
    plots = plot_area_m2.size
    _check_plots(volume, soil, plot_area_m2, days=record.days.size, shut_off=runon_m3 is None)
    number = np.full(record.days.size, -1, dtype=np.int64) if period is None else _checked_period(period, record.days.size)
    sums = np.zeros((plots, int(number.max(initial=-1)) + 1, len(fields(WaterBalance))))
    no_trace = np.empty((0, len(fields(DailyTrace))))
    work = _Work(record, volume, soil, plot_area_m2, spin_up, number, sums, no_trace)
    parts = [(first, min(first + PLOTS_AT_ONCE, plots)) for first in range(0, plots, PLOTS_AT_ONCE)]
    run_all(work.run, parts, usable_threads(threads))
    return work.yields(None if period is None else work.balance())


def daily_trace(
    record: CropRecord, *, runon_m3: FloatArray | None, soil: PlotSoil, plot_area_m2: float, spin_up: bool = True
) -> DailyTrace:
    """
    Follow one plot day by day, as `daily_balance` simulates it; `soil` holds this plot alone, `runon_m3` is by day.

    Errors are those of `daily_balance`; a plot with unknown inputs is NaN on all days.
    """
    volume = np.zeros((1, record.days.size)) if runon_m3 is None else runon_m3[None, :]
    area = np.array([plot_area_m2], dtype=np.float64)
    _check_plots(volume, soil, area, days=record.days.size, shut_off=False)
    trace = np.full((record.days.size, len(fields(DailyTrace))), np.nan)
    none = np.full(record.days.size, -1, dtype=np.int64)
    _Work(record, volume, soil, area, spin_up, none, np.zeros((1, 0, len(fields(WaterBalance)))), trace).run(0, 1)
    return DailyTrace(*trace.T)


class _Work:
    """Arrays that the kernel reads and writes, and what they mean."""

    def __init__(
        self,
        record: CropRecord,
        volume: FloatArray,
        soil: PlotSoil,
        area_m2: FloatArray,
        spin_up: bool,
        period: Integers,
        sums: FloatArray,
        trace: FloatArray,
    ) -> None:
        self.record, self.area_m2, self.sums, self.period = record, area_m2, sums, period
        table = _soil_table(soil, record.crop, record.field)
        unknown = np.isnan(table).any(axis=1) | np.isnan(volume).any(axis=1)
        self.known: Flags = np.logical_not(unknown) & record.demand_known
        shape = (area_m2.size, record.seasons.label.size)
        self.results, self.events = np.full((*shape, 6), np.nan), np.full((*shape, 2), -1, dtype=np.int64)
        run = (self.known, volume, 1000.0 / area_m2, table, record.rules, record.crop.coefficients())
        weather = (record.bounds, record.anew, spin_up, record.rain_mm, record.et0_mm)
        self.arguments: tuple[Any, ...] = (*run, *weather, period, sums, trace, self.results, self.events)

    def run(self, first: int, end: int) -> None:
        kernels.run_plots((first, end), *self.arguments)

    def balance(self) -> WaterBalance:
        simulated = np.zeros(self.record.days.size, dtype=np.bool_)
        for first, end in zip(self.record.seasons.first, self.record.seasons.end, strict=True):
            simulated[first:end] = True
        counted = self.period >= 0
        whole = np.ones(self.sums.shape[1], dtype=np.bool_)
        whole[self.period[counted & ~simulated]] = False
        known = self.known[:, None] & whole[None, :]
        return WaterBalance(*np.moveaxis(np.where(known[:, :, None], self.sums, np.nan), 2, 0))

    def yields(self, balance: WaterBalance | None) -> SeasonYields:
        used, needed, under, *depths = np.moveaxis(self.results, 2, 0)
        day, failure = self.events[:, :, 0], np.where(self.known[:, None], self.events[:, :, 1], kernels.NOT_FAILED)
        failed = failure != kernels.NOT_FAILED
        ratio = np.divide(used, needed, out=np.full(used.shape, np.nan), where=(needed > 0) & ~failed)
        runon, overflow, percolation = (depth * self.area_m2[:, None] / 1000.0 for depth in depths)
        return SeasonYields(
            label=self.record.seasons.label,
            et_ratio=ratio,
            relative_yield=np.where(failed, 0.0, relative_yield(et_ratio=ratio, ky=self.record.crop.ky)),
            standing_water_days=under,
            sown=np.where(day >= 0, self.record.days[day], np.datetime64("NaT")).astype("datetime64[D]"),
            failure=FAILURES[failure],
            runon_m3=runon,
            overflow_m3=overflow,
            percolation_m3=percolation,
            balance=balance,
        )


def _soil_table(soil: PlotSoil, crop: CropWater, rules: FieldRules) -> FloatArray:
    """Return the kernel's figures of each plot, in the order of its Soil."""
    rate = soil.infiltration_mm_h
    columns = (
        soil.available_mm_per_m,
        np.minimum(crop.root_depth_m, soil.soil_depth_m),
        soil.rew_mm,
        soil.tew_mm,
        24.0 * rate,
        soil.ponding_mm + rules.event_hours * rate,
    )
    return np.stack(columns, axis=1)


def _checked_period(period: Integers, days: int) -> Integers:
    if period.shape != (days,) or period.min(initial=0) < -1:
        msg = f"period has shape {period.shape} for {days} days; give each day a number from 0, or -1 for none"
        raise InputError(msg)
    return period


def _check_plots(volume: FloatArray, soil: PlotSoil, area_m2: FloatArray, *, days: int, shut_off: bool) -> None:
    plots = area_m2.size
    if volume.shape != (1 if shut_off else plots, days) or soil.available_mm_per_m.size != plots:
        msg = (
            f"run-on of shape {volume.shape} and soil of {soil.available_mm_per_m.size} plots for {plots} plot areas and "
            f"{days} days; they must agree"
        )
        raise InputError(msg)
    small = np.flatnonzero(~((area_m2 > 0) & np.isfinite(area_m2)))
    if small.size:
        msg = f"plot {small[0] + 1} of {plots} has an area of {area_m2[small[0]]:g} m2; leave it out"
        raise InputError(msg)
    if np.any(volume < 0):
        msg = f"run-on of {volume[volume < 0][0]:g} m3: it cannot be below zero; correct it or leave it unknown"
        raise InputError(msg)
