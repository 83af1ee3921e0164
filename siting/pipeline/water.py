"""From ground above each plot to its water by year and by season, and to yields, a few plots at a time."""

from collections.abc import Sequence
from dataclasses import dataclass, fields
from functools import partial
from typing import Any

import numpy as np
import numpy.typing as npt

from siting.demand import CropRecord, SeasonTable, SeasonYields, daily_balance, seasonal_supply
from siting.parallel import run_all
from siting.pipeline.case import Case
from siting.pipeline.sites import MOST_UNCLASSED_SHARE, WITH_LOSSES, poorly_classed
from siting.pipeline.weather import Weather
from siting.plots import Catchments
from siting.ranking import SufficientRatio, SupportedArea, dependable, sufficient_ratio, supported_area
from siting.runoff import class_runoff_mm, delivered_m3, yearly_totals

FloatArray = npt.NDArray[np.float64]

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
    starts = range(0, case.sites.plots.count, PLOTS_AT_ONCE)
    parts = {}
    for ratio in (used, other):
        runoff = np.zeros((1, weather.rain.days.size))
        if case.classes.count:
            runoff = class_runoff_mm(weather.rain.as_dry_mm, case.classes, abstraction_ratio=ratio)
        some = partial(work.some_plots, runoff, with_yields=ratio == used)
        parts[ratio] = run_all(some, [(slice(start, start + PLOTS_AT_ONCE),) for start in starts], case.threads)
    yearly, room = (np.concatenate([getattr(part, name) for part in parts[used]]) for name in ("yearly_m3", "room_m3"))
    shares = {"dry": share, "median": 0.5, "wet": 1.0 - share}
    return Water(
        yearly,
        room,
        {name: dependable(yearly, probability=probability) for name, probability in shares.items()},
        dependable(np.concatenate([part.yearly_m3 for part in parts[other]]), probability=share),
        None if weather.record is None else _crop_results(parts[used], parts[other], share),
    )


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
            "catchment has no curve number: their run-on is unknown; extend the maps of soil and cover.",
        )
    return np.asarray(known_areas(catchments)[WITH_LOSSES])


def known_areas(catchments: Catchments) -> FloatArray:
    """Return areas by loss, plot and class, unknown (NaN) for plots of whose catchment too much has no class."""
    return np.where(poorly_classed(catchments)[:, None], np.nan, catchments.effective_area_m2)


def yearly_volumes(case: Case, weather: Weather, catchments: Catchments) -> FloatArray:
    """Return the run-on of each catchment by complete year, m3, under the abstraction ratio in use; NaN unknown."""
    settings = case.settings
    ratio = settings.runoff.abstraction_ratio
    volume = delivered_m3(
        known_areas(catchments)[WITH_LOSSES],
        settings.terrain.channel_width_m * catchments.bed_length_m,
        class_runoff_mm(weather.rain.as_dry_mm, case.classes, abstraction_ratio=ratio),
        channel_wetting_mm=settings.runoff.channel_wetting_mm,
    )
    return yearly_totals(volume, weather.rain.days, weather.years)


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

    def some_plots(self, runoff_mm: FloatArray, part: slice, *, with_yields: bool) -> _Part:
        """Simulate a few plots under one abstraction ratio."""
        settings, sites, soil = self.case.settings, self.case.sites, self.case.soil
        volume = delivered_m3(
            self.area_m2[part],
            settings.terrain.channel_width_m * sites.catchments.bed_length_m[part],
            runoff_mm,
            channel_wetting_mm=settings.runoff.channel_wetting_mm,
        )
        most_m3 = soil.intake_capacity_mm[part] * sites.plots.area_m2[part] / 1000.0
        yearly, room = (
            yearly_totals(each, self.weather.rain.days, self.weather.years)
            for each in (volume, np.minimum(volume, most_m3[:, None]))
        )
        record = self.weather.record
        if record is None:
            return _Part(yearly, room)
        table = self._seasonal(record, volume, part)
        return _Part(yearly, room, table, *(self._yields(record, volume, part) if with_yields else ()))

    def _seasonal(self, record: CropRecord, volume: FloatArray, part: slice) -> SeasonTable:
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
        self, record: CropRecord, volume: FloatArray, part: slice
    ) -> tuple[SeasonYields, SeasonYields, SupportedArea]:
        """Run the daily method with run-on and on rain alone, and find the area that the run-on supports."""
        settings = self.case.settings.crop
        area = self.case.sites.plots.area_m2[part]
        soil = self.case.soil.soil.take(np.arange(self.case.sites.plots.count)[part])

        def yields_at(places: npt.NDArray[np.int64], area_m2: FloatArray) -> SeasonYields:
            return daily_balance(record, runon_m3=volume[places], soil=soil.take(places), plot_area_m2=area_m2, threads=1)

        rain_alone = daily_balance(record, runon_m3=None, soil=soil, plot_area_m2=area, threads=1)
        supported = supported_area(
            yields_at,
            rain_alone=rain_alone,
            patch_area_m2=area,
            target_yield=settings.target_yield,
            target_reliability=settings.target_reliability,
            standing_water_days=settings.standing_water_days,
        )
        return yields_at(np.arange(area.size), area), rain_alone, supported


def _crop_results(used: list[_Part], other: list[_Part], share: float) -> CropResults:
    """Take the quantiles of each plot's own seasons."""
    seasons = _joined([part.seasons for part in used])
    ratio_other = np.concatenate([part.seasons.supply_ratio for part in other if part.seasons is not None])
    return CropResults(
        seasons,
        dependable(ratio_other, probability=share),
        sufficient_ratio(seasons.needed_ratio, lacks_runon=seasons.lacks_runon, share_of_seasons=share),
        _joined([part.yields for part in used]),
        _joined([part.rain_alone for part in used]),
        _joined([part.supported for part in used]),
    )


ALIKE = ("label", "balance")
"""Columns that hold for all plots together."""


def _joined(tables: Sequence[Any]) -> Any:
    """Put the results of several groups of plots, columns by plot, under one another."""
    first = tables[0]
    columns = {
        each.name: getattr(first, each.name)
        if each.name in ALIKE
        else np.concatenate([getattr(table, each.name) for table in tables])
        for each in fields(first)
    }
    return type(first)(**columns)
