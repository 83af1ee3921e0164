"""Plots for the doubt of the order, and their ratios and ranks by the public functions of runoff and demand alone."""

from dataclasses import dataclass, fields, replace
from typing import Any

import numpy as np
import numpy.typing as npt

from siting import ranking
from siting.demand import Seasons, season_days, seasonal_supply
from siting.ranking import Inputs, PlotInputs, Spread, SupplyModel
from siting.runoff import RunoffClasses, class_runoff_mm, delivered_m3

FloatArray = npt.NDArray[np.float64]

LOSSES = np.array([0.1, 0.2, 0.3, 0.5, 0.8])
STAGES, KC = (20, 35, 45, 30), (0.3, 1.05, 0.55)
NO_SPREAD = Spread(
    0.0, 0.0, (0.2,), (0.3, 0.3), (1.0, 1.0), (1.0, 1.0), (1.0, 1.0), (1.0, 1.0), (1.0, 1.0), resample_seasons=False
)


@dataclass(frozen=True)
class Case:
    """Plots whose ground lies, by class, at one distance: effective areas are known at any loss."""

    area_m2: FloatArray
    distance_km: FloatArray
    bed_m2: FloatArray
    plot_m2: FloatArray
    water_mm: FloatArray
    ponding_mm: FloatArray
    infiltration_mm: FloatArray
    soil: npt.NDArray[np.int64]
    is_open: npt.NDArray[np.bool_]
    peak_m3s: FloatArray
    curve_number: FloatArray
    runs_after_mm: FloatArray
    rain_mm: FloatArray
    et0_mm: FloatArray
    wetting_mm: float = 25.0

    def classes(self, shift: FloatArray | float = 0.0) -> RunoffClasses:
        return RunoffClasses(np.zeros((0, 0), np.uint16), np.minimum(self.curve_number + shift, 100.0), self.runs_after_mm)

    def plots(self) -> PlotInputs:
        areas = self.area_m2 * np.exp(-LOSSES[:, None, None] * self.distance_km)
        ids = np.arange(1, self.plot_m2.size + 1)
        return PlotInputs(
            areas, LOSSES, self.bed_m2, self.plot_m2, self.water_mm, self.ponding_mm, self.infiltration_mm, self.soil,
            self.is_open, self.peak_m3s, ids,
        )  # fmt: skip

    def model(self, **other: Any) -> SupplyModel:
        given: dict[str, Any] = dict(
            plots=self.plots(), classes=self.classes(), cover_of_class=COVER, rain_mm=self.rain_mm, et0_mm=self.et0_mm,
            seasons=SEASONS, stage_days=STAGES, kc=KC, abstraction_ratio=0.2, loss_per_km=0.3,
            channel_wetting_mm=self.wetting_mm, efficiency=0.65, dependable_share=0.8,
        )  # fmt: skip
        return ranking.supply_model(**(given | other))

    def take(self, places: list[int]) -> "Case":
        by_plot = [field.name for field in fields(self)][:10]
        return replace(self, **{name: getattr(self, name)[places] for name in by_plot})


def days_of(years: int) -> npt.NDArray[np.datetime64]:
    return np.arange(np.datetime64("1990-04-01"), np.datetime64(f"{1990 + years}-08-01"))


DAYS = days_of(22)
SEASONS: Seasons = season_days(DAYS, planting=(11, 15), season_length_days=sum(STAGES))
COVER = np.array([7, 7, 4, 9])


def made_case(plots: int = 40, seed: int = 5) -> Case:
    rng = np.random.default_rng(seed)
    winter = np.cos(2.0 * np.pi * ((DAYS - DAYS[0]).astype(np.int64) - 290) / 365.25)
    wet = rng.random(DAYS.size) < 0.02 + 0.16 * np.maximum(winter, 0.0)
    area = rng.uniform(1000.0, 10_000.0, plots)
    soil = rng.integers(0, 3, plots)
    return Case(
        rng.dirichlet([0.5] * 4, plots) * (area * np.exp(rng.uniform(0.0, 4.0, plots)))[:, None],
        rng.uniform(0.05, 2.0, (plots, 4)),
        rng.uniform(0.0, 2000.0, plots),
        area,
        np.array([90.0, 150.0, 220.0])[soil],
        np.full(plots, 60.0),
        np.array([150.0, 75.0, 45.0])[soil],
        soil + 3,
        np.zeros(plots, dtype=np.bool_),
        np.full(plots, np.nan),
        np.array([76.0, 84.0, 91.0, np.nan]),
        np.array([np.nan, np.nan, np.nan, 14.0]),
        np.where(wet, rng.exponential(9.0, DAYS.size), 0.0),
        6.5 - 2.5 * winter,
    )


def plain_ratios(case: Case, inputs: Inputs) -> tuple[FloatArray, FloatArray]:
    """Ratios by the public functions of runoff and demand alone, with effective areas straight from distances."""
    cover = np.searchsorted(np.unique(COVER), COVER)
    soil = np.searchsorted(np.unique(case.soil), case.soil)
    runoff = class_runoff_mm(
        case.rain_mm,
        case.classes(inputs.region_shift + inputs.cover_shift[cover]),
        abstraction_ratio=inputs.abstraction_ratio,
    )
    volume = delivered_m3(
        case.area_m2 * np.exp(-inputs.loss_per_km * case.distance_km),
        case.bed_m2,
        runoff,
        channel_wetting_mm=inputs.channel_wetting_mm,
    )
    table = seasonal_supply(
        runon_m3=volume,
        rain_mm=case.rain_mm,
        et0_mm=case.et0_mm * inputs.et0_factor,
        seasons=SEASONS,
        stage_days=STAGES,
        kc=(KC[0] * inputs.kc_factor, KC[1] * inputs.kc_factor, KC[2] * inputs.kc_factor),
        plot_area_m2=case.plot_m2,
        catchment_area_m2=case.area_m2.sum(axis=1),
        available_water_mm=case.water_mm * inputs.available_water_factor[soil],
        intake_capacity_mm=case.ponding_mm + case.infiltration_mm * inputs.infiltration_factor[soil],
        efficiency=0.65,
    )
    return table.supply_ratio, table.rain_only_ratio


def plain_rank(case: Case, inputs: Inputs) -> npt.NDArray[np.int64]:
    ratio, rain_only = (part[:, inputs.seasons] for part in plain_ratios(case, inputs))
    mean = ranking.mean_capped_ratio(ratio)
    return ranking.supply_order(
        supply_ratio_dry=ranking.dependable(ratio, probability=0.8),
        supply_ratio_median=ranking.dependable(ratio, probability=0.5),
        supply_ratio_mean=mean,
        gain=mean - ranking.mean_capped_ratio(rain_only),
        peak_flow_10y_m3s=case.peak_m3s,
        plot_id=np.arange(1, case.plot_m2.size + 1),
    )
