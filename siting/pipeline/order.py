"""In which order the plots stand: by supply, which a hand can follow, and by score."""

from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from siting.pipeline.case import Case
from siting.pipeline.floods import Floods
from siting.pipeline.water import CropResults, Water, storm_volumes_m3
from siting.pipeline.weather import Weather
from siting.plots import plot_means
from siting.ranking import dependable, mean_capped_ratio, reliability, supply_order
from siting.ranking.score import COMPONENTS, Components, score, score_components, score_order

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]

UNRANKED = 0


@dataclass(frozen=True, slots=True, eq=False)
class Order:
    """Ranks from 1, UNRANKED where the plot's water is unknown; score and components 0.01 to 1, NaN where unknown."""

    supply_rank: Integers
    rank: Integers
    score: FloatArray
    components: dict[str, FloatArray]
    follows_score: bool


def order_plots(case: Case, water: Water | None, floods: Floods | None) -> Order:
    """Rank the plots whose water is known, by supply and, as the settings say, by score."""
    count = case.sites.plots.count
    unknown = np.full(count, np.nan)
    nothing = Order(np.zeros(count, np.int64), np.zeros(count, np.int64), unknown, dict.fromkeys(COMPONENTS, unknown), False)
    if case.weather is None:
        return replace(nothing, rank=_storm_rank(case))
    if water is None or water.crop is None or floods is None:
        return nothing
    by_supply, known = _supply_rank(case, water.crop, floods)
    parts = _components(case, case.weather, water.crop, floods)
    judged = known & ~np.isnan(parts.water)
    weights = {name: getattr(case.settings.ranking, f"weight_{name}") for name in COMPONENTS}
    of_known = Components(**{name: getattr(parts, name)[judged] for name in COMPONENTS})
    found = score(of_known, weights)
    if found.left_out and judged.any():
        case.notes.warn("score_without", f"The score leaves out {', '.join(found.left_out)}: unknown for some or all plots.")
    by_score = np.zeros(count, dtype=np.int64)
    by_score[judged] = score_order(found.score, by_supply[judged])
    total = unknown.copy()
    total[judged] = found.score
    follows_score = case.settings.ranking.order == "score" and "water" in found.used
    components = {name: getattr(parts, name) if name in found.used else unknown for name in COMPONENTS}
    return Order(by_supply, by_score if follows_score else by_supply, total, components, follows_score)


def _storm_rank(case: Case) -> Integers:
    """Rank by the run-on of one storm over the plot, as far as the plot takes it in; then by its volume."""
    volume, area = storm_volumes_m3(case), case.sites.plots.area_m2
    usable = np.minimum(1000.0 * volume / area, case.soil.intake_capacity_mm)
    known = ~np.isnan(usable)
    rank = np.zeros(area.size, dtype=np.int64)
    order = np.lexsort((case.sites.plot_id, -np.nan_to_num(volume), np.where(known, -usable, np.inf)))
    rank[order] = np.arange(1, area.size + 1)
    return np.where(known, rank, UNRANKED)


def _supply_rank(case: Case, crop: CropResults, floods: Floods) -> tuple[Integers, npt.NDArray[np.bool_]]:
    """Rank by supply; also tell which plots have a season whose supply is known."""
    table, share = crop.seasons, case.settings.ranking.dependable
    mean = mean_capped_ratio(table.supply_ratio)
    known = ~np.isnan(mean)
    rank = supply_order(
        supply_ratio_dry=dependable(table.supply_ratio, probability=share),
        supply_ratio_median=dependable(table.supply_ratio, probability=0.5),
        supply_ratio_mean=mean,
        gain=mean - mean_capped_ratio(table.rain_only_ratio),
        peak_flow_10y_m3s=floods.peak_10y_m3s,
        plot_id=case.sites.plot_id,
    )
    return np.where(known, rank, UNRANKED), known


def _components(case: Case, weather: Weather, crop: CropResults, floods: Floods) -> Components:
    settings, catchments, ground = case.settings, case.sites.catchments, case.ground
    height = plot_means(case.sites.cells, ground.elevation, ground.grid.cell_area_m2)
    relief = np.where(catchments.area_m2 > 0, np.maximum(catchments.highest_m - height, 0.0), 0.0)
    return score_components(
        reliability=reliability(crop.yields.relative_yield, target_yield=settings.crop.target_yield).share,
        mean_yield=crop.yields.relative_yield.mean(axis=1),
        rain_only_mean_yield=crop.rain_alone.relative_yield.mean(axis=1),
        available_water_mm=case.soil.available_water_mm,
        slope=100.0 * case.own.slope,
        max_slope=settings.plots.max_slope_pct,
        peak_flow_10y_m3s=floods.peak_10y_m3s,
        standing_water_days=crop.yields.worst_standing_water_days,
        open_catchment=case.own.open_sides != 0,
        rain_years=int(weather.years.labels.size),
        catchment_relief_m=relief,
        vertical_error_m=ground.vertical_error_m,
    )
