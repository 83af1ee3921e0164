"""From ground above each plot to its water by year and by season, and to yields, a few plots at a time."""

from dataclasses import dataclass, fields
from functools import partial
from typing import Any

import numpy as np
import numpy.typing as npt

from siting.demand import LEAST_FITTED_ET_RATIO, CropRecord, SeasonTable, SeasonYields, daily_balance, seasonal_supply
from siting.notes import Notes
from siting.parallel import run_all
from siting.pipeline.case import Case
from siting.pipeline.runoff import daily_runoff_mm
from siting.pipeline.sites import MOST_UNCLASSED_SHARE, WITH_LOSSES, poorly_classed
from siting.pipeline.weather import Weather
from siting.plots import Catchments
from siting.ranking import SufficientRatio, SupportedArea, dependable, sufficient_ratio, supported_area
from siting.runoff import delivered_m3, runoff_depth_mm, yearly_totals

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]

OTHER_RATIO = {0.2: 0.05, 0.05: 0.2}
"""The abstraction ratio that is shown beside the one in use."""

PLOTS_AT_ONCE = 64
"""Plots whose daily run-on is held in memory together (13 000 days take 6.6 MB)."""


@dataclass(frozen=True, slots=True, eq=False)
class Water:
    """
    Water of every plot (first axis); year classes are quantiles of the plot's own series.

    `yearly_m3` and `room_m3` are run-on and what of it the plot's bund takes, by complete year; `yield_m3` is by class of
    year; `other_*` under the other abstraction ratio. `crop` is there with a crop: seasons of the seasonal method, the
    needed ratio, yields of the daily method with run-on and on rain alone, supported area.
    """

    yearly_m3: FloatArray
    room_m3: FloatArray
    yield_m3: dict[str, FloatArray]
    other_yield_dry_m3: FloatArray
    crop: "CropResults | None"


@dataclass(frozen=True, slots=True, eq=False)
class CropResults:
    """What the crop makes of each plot's water; see Water."""

    seasons: SeasonTable
    other_supply_ratio_dry: FloatArray
    needed: SufficientRatio
    yields: SeasonYields
    rain_alone: SeasonYields
    supported: SupportedArea


def plot_water(case: Case, weather: Weather) -> Water:
    """Simulate each plot's run-on over the whole record, under both abstraction ratios, and what a crop makes of it."""
    used, share = case.settings.runoff.abstraction_ratio, case.settings.ranking.dependable
    other = OTHER_RATIO[used]
    work = _Simulation(case, weather, _known_area(case))
    groups = _groups(case.own.rain_zone)
    parts = {}
    for ratio in (used, other):
        some = partial(work.some_plots, daily_runoff_mm(case, weather, ratio), with_yields=ratio == used)
        together = _in_order(run_all(some, [(plots,) for plots in groups], case.threads), np.concatenate(groups))
        parts[ratio] = _without_rain(together, case.own.rain_zone < 0)
    _note_yield_line(parts[used].yields, case.notes)
    yearly = parts[used].yearly_m3
    shares = {"dry": share, "median": 0.5, "wet": 1.0 - share}
    return Water(
        yearly,
        parts[used].room_m3,
        {name: dependable(yearly, probability=probability) for name, probability in shares.items()},
        dependable(parts[other].yearly_m3, probability=share),
        _crop_results(parts[used], parts[other], share) if weather.crops else None,
    )


def _note_yield_line(yields: SeasonYields | None, notes: Notes) -> None:
    """List that low yields lie beyond what the yield line was fitted to, and how many do."""
    if yields is None:
        return
    grown = ~np.isnan(yields.et_ratio)
    source = f"FAO-33, fitted for ETa/ETc of {LEAST_FITTED_ET_RATIO:g} and more; below, et_ratio in seasons tells which"
    value = f"extended in {int(yields.beyond_fit.sum())} of {int(grown.sum())} harvests of all plots"
    notes.assume("crop.yield_line", value, "", source, "yields of seasons short of water")


def _groups(rain_zone: Integers) -> list[Integers]:
    """Return plots of one rain zone together, a few at a time."""
    found = []
    for zone in np.unique(rain_zone):
        plots = np.flatnonzero(rain_zone == zone)
        found += [plots[first : first + PLOTS_AT_ONCE] for first in range(0, plots.size, PLOTS_AT_ONCE)]
    return found


def _known_area(case: Case) -> FloatArray:
    """Return effective areas by plot and class, unknown (NaN) where too much of the catchment has no class."""
    catchments = case.sites.catchments
    if case.classes.count == 0:
        case.notes.warn("no_curve_number", "Neither cover nor curve numbers are given: how much runs off is unknown.")
        return np.full((case.sites.plots.count, 1), np.nan)
    unclassed = poorly_classed(catchments)
    if unclassed.any():
        case.notes.warn(
            "curve_number_unknown",
            f"For {int(unclassed.sum())} of {unclassed.size} plots more than {100 * MOST_UNCLASSED_SHARE:.0f} % of the "
            "catchment has no curve number or no rain: their run-on is unknown; extend the maps of soil, cover and rain.",
        )
    return np.asarray(known_areas(catchments)[WITH_LOSSES])


def known_areas(catchments: Catchments) -> FloatArray:
    """Return areas by loss, plot and class, unknown (NaN) for plots of whose catchment too much has no class."""
    return np.where(poorly_classed(catchments)[:, None], np.nan, catchments.effective_area_m2)


def yearly_volumes(case: Case, weather: Weather, catchments: Catchments) -> FloatArray:
    """Return the run-on of each catchment by complete year, m3, under the abstraction ratio in use; NaN unknown."""
    settings = case.settings
    volume = delivered_m3(
        known_areas(catchments)[WITH_LOSSES],
        settings.terrain.channel_width_m * catchments.bed_length_m,
        daily_runoff_mm(case, weather, settings.runoff.abstraction_ratio),
        channel_wetting_mm=settings.runoff.channel_wetting_mm,
    )
    return yearly_totals(volume, weather.days, weather.years)


@dataclass(frozen=True, slots=True, eq=False)
class _Part:
    """Results of a few plots; what needs a crop, or the ratio in use, is None without it."""

    yearly_m3: FloatArray
    room_m3: FloatArray
    seasons: SeasonTable | None = None
    yields: SeasonYields | None = None
    rain_alone: SeasonYields | None = None
    supported: SupportedArea | None = None


@dataclass(frozen=True, slots=True, eq=False)
class _Simulation:
    """What is alike for all plots, and their effective areas by runoff class."""

    case: Case
    weather: Weather
    area_m2: FloatArray

    def some_plots(self, runoff_mm: FloatArray, part: Integers, *, with_yields: bool) -> _Part:
        """Simulate a few plots of one rain zone under one abstraction ratio."""
        settings, sites, soil = self.case.settings, self.case.sites, self.case.soil
        volume = delivered_m3(
            self.area_m2[part],
            settings.terrain.channel_width_m * sites.catchments.bed_length_m[part],
            runoff_mm,
            channel_wetting_mm=settings.runoff.channel_wetting_mm,
        )
        most_m3 = soil.intake_capacity_mm[part] * sites.plots.area_m2[part] / 1000.0
        yearly, room = (
            yearly_totals(each, self.weather.days, self.weather.years)
            for each in (volume, np.minimum(volume, most_m3[:, None]))
        )
        if not self.weather.crops:
            return _Part(yearly, room)
        record = self.weather.crops[max(int(self.case.own.rain_zone[part[0]]), 0)]
        table = self._seasonal(record, volume, part)
        return _Part(yearly, room, table, *(self._yields(record, volume, part) if with_yields else ()))

    def _seasonal(self, record: CropRecord, volume: FloatArray, part: Integers) -> SeasonTable:
        crop = record.crop
        return seasonal_supply(
            runon_m3=volume,
            rain_mm=record.rain_mm,
            et0_mm=record.et0_mm,
            seasons=self.weather.fixed_seasons,
            stage_days=crop.stage_days,
            kc=crop.kc,
            plot_area_m2=self.case.sites.plots.area_m2[part],
            catchment_area_m2=self.case.sites.catchments.area_m2[part],
            available_water_mm=self.case.soil.available_water_mm[part],
            intake_capacity_mm=self.case.soil.intake_capacity_mm[part],
            efficiency=self.case.settings.plots.efficiency,
        )

    def _yields(
        self, record: CropRecord, volume: FloatArray, part: Integers
    ) -> tuple[SeasonYields, SeasonYields, SupportedArea]:
        """Run the daily method with run-on and on rain alone, and find the area that the run-on supports."""
        settings = self.case.settings.crop
        area = self.case.sites.plots.area_m2[part]
        soil = self.case.soil.soil.take(part)

        def yields_at(places: npt.NDArray[np.int64], area_m2: FloatArray) -> SeasonYields:
            return daily_balance(record, runon_m3=volume[places], soil=soil.take(places), plot_area_m2=area_m2, threads=1)

        yields = daily_balance(
            record,
            runon_m3=volume,
            soil=soil,
            plot_area_m2=area,
            period=_month_of_season_days(record),
            threads=1,
        )
        rain_alone = daily_balance(record, runon_m3=None, soil=soil, plot_area_m2=area, threads=1)
        supported = supported_area(
            yields_at,
            rain_alone=rain_alone,
            patch_area_m2=area,
            target_yield=settings.target_yield,
            target_reliability=settings.target_reliability,
            standing_water_days=settings.standing_water_days,
        )
        return yields, rain_alone, supported


def _without_rain(part: Any, unknown: npt.NDArray[np.bool_]) -> Any:
    """Forget all but the demand of plots on which no rain is known."""
    if not unknown.any():
        return part
    columns: dict[str, Any] = {}
    for each in fields(part):
        values = getattr(part, each.name)
        if values is None or each.name in (*ALIKE, "demand_mm"):
            columns[each.name] = values
        elif isinstance(values, np.ndarray):
            columns[each.name] = values.copy()
            columns[each.name][unknown] = _NOTHING[values.dtype.kind]
        else:
            columns[each.name] = _without_rain(values, unknown)
    return type(part)(**columns)


_NOTHING: dict[str, Any] = {"f": np.nan, "M": np.datetime64("NaT"), "U": "", "b": False}
"""What stands for unknown in an array of a kind."""


def _month_of_season_days(record: CropRecord) -> Integers:
    """Return the month of each day, from 0, and -1 for days that belong to no season."""
    month = record.days.astype("datetime64[M]").astype(np.int64) % 12
    within = np.zeros(month.size, dtype=np.bool_)
    for first, end in zip(record.seasons.first, record.seasons.end, strict=True):
        within[first:end] = True
    return np.where(within, month, -1)


def storm_volumes_m3(case: Case) -> FloatArray:
    """Return the run-on of one design storm at each plot, m3, under the abstraction ratio in use; NaN unknown."""
    settings, catchments = case.settings, case.sites.catchments
    if case.classes.count == 0:
        return np.full(case.sites.plots.count, np.nan)
    ratio = settings.runoff.abstraction_ratio
    depth = runoff_depth_mm(
        settings.rain.design_storm_mm, case.classes.retention_mm(abstraction_ratio=ratio), abstraction_ratio=ratio
    )
    volume = delivered_m3(
        known_areas(catchments)[WITH_LOSSES],
        settings.terrain.channel_width_m * catchments.bed_length_m,
        depth[:, None],
        channel_wetting_mm=settings.runoff.channel_wetting_mm,
    )
    return np.asarray(volume[:, 0])


def _crop_results(used: _Part, other: _Part, share: float) -> CropResults:
    """Take the quantiles of each plot's own seasons."""
    assert used.seasons is not None and used.yields is not None  # there is a crop
    assert used.rain_alone is not None and used.supported is not None and other.seasons is not None
    seasons = used.seasons
    return CropResults(
        seasons,
        dependable(other.seasons.supply_ratio, probability=share),
        sufficient_ratio(seasons.needed_ratio, lacks_runon=seasons.lacks_runon, share_of_seasons=share),
        used.yields,
        used.rain_alone,
        used.supported,
    )


ALIKE = ("label",)
"""Columns that hold for all plots together."""


def _in_order(parts: list[Any], plots: Integers) -> Any:
    """Put the results of several groups of plots together again, in the order of the plots."""
    first, back = parts[0], np.argsort(plots)
    columns: dict[str, Any] = {}
    for each in fields(first):
        values = [getattr(part, each.name) for part in parts]
        if each.name in ALIKE or values[0] is None:
            columns[each.name] = values[0]
        elif isinstance(values[0], np.ndarray):
            columns[each.name] = np.concatenate(values)[back]
        else:
            columns[each.name] = _in_order(values, plots)
    return type(first)(**columns)
