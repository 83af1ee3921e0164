"""From ground above each plot to its water by year and by season, a few plots at a time."""

from dataclasses import dataclass, fields
from functools import partial
from typing import Any

import numpy as np
import numpy.typing as npt

from siting.config import Project
from siting.demand.climate import reference_et_daily
from siting.demand.seasonal import SeasonTable, seasonal_supply
from siting.demand.seasons import Seasons, complete_seasons, season_days
from siting.notes import Notes
from siting.parallel import run_all
from siting.pipeline.crop import CropChoice, SoilOfPlots
from siting.pipeline.read import Place
from siting.pipeline.sites import Sites
from siting.ranking import SufficientRatio, dependable, sufficient_ratio
from siting.runoff import Rain, RunoffClasses, Years, class_runoff_mm, delivered_m3, hydrological_years, yearly_totals

FloatArray = npt.NDArray[np.float64]

OTHER_RATIO = {0.2: 0.05, 0.05: 0.2}
"""The abstraction ratio that is shown beside the one in use."""

PLOTS_AT_ONCE = 64
"""Plots whose daily run-on is held in memory together (13 000 days take 6.6 MB)."""

MOST_UNCLASSED_SHARE = 0.05
"""With more of its catchment without a curve number a plot's run-on is unknown (our assumption)."""

TREND_YEARS, TREND_SHARE = 15, 0.1


@dataclass(frozen=True, slots=True, eq=False)
class Weather:
    """Rain and reference ET (mm, NaN unknown) on the days of the record, its years, and the crop's seasons, if any."""

    rain: Rain
    et0_mm: FloatArray
    years: Years
    seasons: Seasons | None
    rain_trend: bool


@dataclass(frozen=True, slots=True, eq=False)
class Water:
    """
    Water of every plot (first axis); year classes are quantiles of the plot's own series.

    `yield_m3` by class of year; `other_*` under the other abstraction ratio; seasons and needed ratio where there
    is a crop.
    """

    yield_m3: dict[str, FloatArray]
    other_yield_dry_m3: FloatArray
    seasons: SeasonTable | None
    other_supply_ratio_dry: FloatArray
    needed: SufficientRatio | None


def weather_of(place: Place, project: Project, crop: CropChoice | None, altitude_m: float, notes: Notes) -> Weather | None:
    """Bring rain, ET, years and seasons together; None without a rain record."""
    if place.rain is None:
        notes.warn("no_rain", "No rain record is given: all that needs years of rain is unknown, and plots are not ranked.")
        return None
    settings, rain = project.settings, place.rain
    years = hydrological_years(
        rain, starts_month=settings.rain.year_starts, max_missing=settings.rain.max_missing_share, notes=notes
    )
    et0_mm = reference_et_daily(
        place.climate,
        days=rain.days,
        latitude_deg=_latitude(place, settings.climate.latitude, notes),
        altitude_m=altitude_m,
        monthly_mm_per_day=settings.climate.reference_et,
        notes=notes,
    )
    if np.isnan(et0_mm).all():
        notes.warn(
            "no_reference_et", "Neither climate.daily nor climate.reference_et is given: the crop's demand is unknown."
        )
    seasons = None
    if crop is not None:
        found = season_days(rain.days, planting=crop.planting, season_length_days=sum(crop.stage_days))
        missing = np.isnan(rain.rain_mm)
        seasons = complete_seasons(found, missing=missing, max_missing=settings.rain.max_missing_share, notes=notes)
    return Weather(rain, et0_mm, years, seasons, _rain_trend(rain, years, settings.ranking.dependable, notes))


def _latitude(place: Place, given: float | None, notes: Notes) -> float:
    if given is not None:
        return given
    latitude = place.middle_lonlat[1]
    notes.assume(
        "climate.latitude", f"{latitude:.3f}", "degree", "middle of the elevation model", "reference ET from temperature"
    )
    return latitude


def _rain_trend(rain: Rain, years: Years, share: float, notes: Notes) -> bool:
    """Tell whether the dependable rain of the last 15 years is more than 10 % off that of all; unknown is no."""
    totals = yearly_totals(rain.as_dry_mm, rain.days, years)
    if totals.size <= TREND_YEARS:
        return False
    whole, late = (float(dependable(part, probability=share)) for part in (totals, totals[-TREND_YEARS:]))
    changed = abs(late - whole) > TREND_SHARE * whole
    if changed:
        text = f"Rain reached in {100 * share:.0f} % of years is {late:.0f} mm in the last {TREND_YEARS} years, "
        text += f"{whole:.0f} mm in all."
        notes.warn("rain_trend", text)
    return changed


def plot_water(
    sites: Sites,
    classes: RunoffClasses,
    weather: Weather,
    crop: CropChoice | None,
    soil: SoilOfPlots,
    project: Project,
    threads: int,
    notes: Notes,
) -> Water:
    """Simulate the run-on of every plot over the whole record, under both abstraction ratios."""
    used, days = project.settings.runoff.abstraction_ratio, weather.rain.days
    work = partial(_some_plots, sites, weather, crop, soil, project, _known_area(sites, classes, notes))
    starts = range(0, sites.plots.count, PLOTS_AT_ONCE)
    found = {}
    for ratio in (used, OTHER_RATIO[used]):
        runoff = np.zeros((1, days.size))
        if classes.count:
            runoff = class_runoff_mm(weather.rain.as_dry_mm, classes, abstraction_ratio=ratio)
        found[ratio] = run_all(work, [(runoff, slice(start, start + PLOTS_AT_ONCE)) for start in starts], threads)
    return _year_classes(found[used], found[OTHER_RATIO[used]], project.settings.ranking.dependable)


def _known_area(sites: Sites, classes: RunoffClasses, notes: Notes) -> FloatArray:
    """Return effective areas by plot and class, unknown (NaN) where too much of the catchment has no class."""
    catchments = sites.catchments
    if classes.count == 0:
        notes.warn("no_curve_number", "Neither cover nor curve numbers are given: how much runs off is unknown.")
        return np.full((sites.plots.count, 1), np.nan)
    area = catchments.effective_area_m2[0].copy()
    unclassed = catchments.unclassed_m2 > MOST_UNCLASSED_SHARE * catchments.area_m2
    if unclassed.any():
        notes.warn(
            "curve_number_unknown",
            f"For {int(unclassed.sum())} of {unclassed.size} plots more than {100 * MOST_UNCLASSED_SHARE:.0f} % of the "
            "catchment has no curve number: their run-on is unknown; extend the maps of soil and cover.",
        )
    area[unclassed] = np.nan
    return np.asarray(area)


def _some_plots(
    sites: Sites,
    weather: Weather,
    crop: CropChoice | None,
    soil: SoilOfPlots,
    project: Project,
    area_m2: FloatArray,
    runoff_mm: FloatArray,
    part: slice,
) -> tuple[FloatArray, SeasonTable | None]:
    """Return the yearly volumes and the seasons of a few plots."""
    settings, catchments = project.settings, sites.catchments
    volume = delivered_m3(
        area_m2[part],
        settings.terrain.channel_width_m * catchments.bed_length_m[part],
        runoff_mm,
        channel_wetting_mm=settings.runoff.channel_wetting_mm,
    )
    yearly = yearly_totals(volume, weather.rain.days, weather.years)
    if crop is None or weather.seasons is None:
        return yearly, None
    return yearly, seasonal_supply(
        runon_m3=volume,
        rain_mm=weather.rain.as_dry_mm,
        et0_mm=weather.et0_mm,
        seasons=weather.seasons,
        stage_days=crop.stage_days,
        kc=crop.kc,
        plot_area_m2=sites.plots.area_m2[part],
        catchment_area_m2=catchments.area_m2[part],
        available_water_mm=soil.available_water_mm[part],
        intake_capacity_mm=soil.intake_capacity_mm[part],
        efficiency=settings.plots.efficiency,
    )


def _year_classes(used: list[Any], other: list[Any], share: float) -> Water:
    """Take the quantiles of each plot's own series."""
    yearly, yearly_other = (np.concatenate([volumes for volumes, _ in parts]) for parts in (used, other))
    shares = {"dry": share, "median": 0.5, "wet": 1.0 - share}
    yields = {name: dependable(yearly, probability=probability) for name, probability in shares.items()}
    other_dry = dependable(yearly_other, probability=share)
    if used[0][1] is None:
        return Water(yields, other_dry, None, np.full(other_dry.shape, np.nan), None)
    seasons, seasons_other = (_joined([table for _, table in parts]) for parts in (used, other))
    needed = sufficient_ratio(seasons.needed_ratio, lacks_runon=seasons.lacks_runon, share_of_seasons=share)
    return Water(yields, other_dry, seasons, dependable(seasons_other.supply_ratio, probability=share), needed)


def _joined(tables: list[SeasonTable]) -> SeasonTable:
    """Put the seasons of several groups of plots under one another."""
    columns = {field.name: np.concatenate([getattr(table, field.name) for table in tables]) for field in fields(SeasonTable)}
    return SeasonTable(**columns)
