"""How sure the ranks are: the same order under many draws of what is not known for sure."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.demand import CropRecord
from siting.notes import Notes
from siting.pipeline.case import Case
from siting.pipeline.floods import Floods
from siting.pipeline.order import Order
from siting.pipeline.water import CropResults, Water, known_areas
from siting.pipeline.weather import Weather
from siting.ranking import (
    COMPONENTS,
    Components,
    Doubt,
    PlotInputs,
    Spread,
    SupplyModel,
    Swaps,
    neighbour_swaps,
    rank_doubt,
    reliability,
    score_doubt,
    supply_model,
    weight_doubt,
)
from siting.ranking.score_doubt import ScoreBasis

FloatArray = npt.NDArray[np.float64]

TOLD_PAIRS = 5
"""Neighbours, from the best, of which is told what would swap them."""

SPREAD = Spread()


@dataclass(frozen=True, slots=True, eq=False)
class RankDoubt:
    """Ranks in all draws, what swaps the best neighbours, and apart from them the ranks under other weights of the score."""

    ranks: Doubt
    swaps: Swaps
    weights: Doubt | None


def doubt_ranks(case: Case, water: Water | None, floods: Floods | None, order: Order) -> RankDoubt | None:
    """Draw what is in doubt, rank by the order in use each time, and keep the middle 90 % of the ranks."""
    draws, seed = case.settings.ranking.draws, case.settings.ranking.seed
    if draws == 0 or water is None or water.crop is None or floods is None or case.weather is None:
        return None
    crops = case.weather.crops
    if case.classes.count == 0 or not crops or not crops[0].demand_known or not (order.rank > 0).any():
        return None
    if len(crops) > 1 or case.settings.runoff.antecedent == "rule":
        text = (
            "Rank intervals are not drawn with several rain zones or the antecedent rule: rank_low, rank_high are unknown."
        )
        case.notes.warn("no_rank_interval", text)
        return None
    if case.settings.rain.generator:
        text = "The days of rain were drawn, and rank_low and rank_high do not hold the doubt of that: they are too near."
        case.notes.warn("rank_interval_of_drawn_days", text)
    model = _model(case, case.weather, crops[0], floods)
    _note(case.notes)
    if order.follows_score:
        basis = _basis(case, water.crop, order)
        ranks = score_doubt(model, SPREAD, basis, draws=draws, seed=seed, threads=case.threads)
        weights = _other_weights(case, basis, draws, seed)
    else:
        ranks = rank_doubt(model, SPREAD, draws=draws, seed=seed, threads=case.threads)
        weights = None
    return RankDoubt(ranks, neighbour_swaps(model, SPREAD, pairs=TOLD_PAIRS, threads=case.threads), weights)


def _other_weights(case: Case, basis: ScoreBasis, draws: int, seed: int) -> Doubt:
    """Rank the plots that have a score under other weights; those without keep none."""
    known = ~np.isnan(basis.reliability)
    some = Components(**{name: getattr(basis.components, name)[known] for name in COMPONENTS})
    found = weight_doubt(some, basis.weights, draws=draws, seed=seed, threads=case.threads)
    low, high = (np.full(known.size, np.nan) for _ in range(2))
    low[known], high[known] = found.rank_low, found.rank_high
    return Doubt(low, high, found.best, found.worst)


def _model(case: Case, weather: Weather, record: CropRecord, floods: Floods) -> SupplyModel:
    """Make the seasonal method ready to be run again with other inputs."""
    settings, sites, soil = case.settings, case.sites, case.soil
    losses, at = np.unique(sites.loss_per_km, return_index=True)
    plots = PlotInputs(
        effective_area_m2=known_areas(sites.catchments)[at],
        loss_per_km=losses,
        bed_area_m2=settings.terrain.channel_width_m * sites.catchments.bed_length_m,
        plot_area_m2=sites.plots.area_m2,
        available_water_mm=soil.available_water_mm,
        ponding_mm=soil.soil.ponding_mm,
        infiltration_mm=soil.soil.infiltration_mm_h * settings.plots.event_hours,
        soil_class=case.own.soil_kind,
        open_catchment=case.own.open_sides != 0,
        peak_flow_10y_m3s=floods.peak_10y_m3s,
        plot_id=sites.plot_id,
    )
    return supply_model(
        plots=plots,
        classes=case.classes,
        cover_of_class=_covers(case),
        rain_mm=record.rain_mm,
        et0_mm=record.et0_mm,
        seasons=weather.fixed_seasons,
        stage_days=record.crop.stage_days,
        kc=record.crop.kc,
        abstraction_ratio=settings.runoff.abstraction_ratio,
        loss_per_km=settings.runoff.conveyance_loss_per_km,
        channel_wetting_mm=settings.runoff.channel_wetting_mm,
        efficiency=settings.plots.efficiency,
        dependable_share=settings.ranking.dependable,
    )


def _covers(case: Case) -> npt.NDArray[np.int64]:
    """Return a number that classes of one cover and soil group share: classes that the slope alone tells apart do."""
    classes = case.classes
    known = classes.class_of_cell < classes.count
    group = classes.class_of_cell[known]
    before = np.nan_to_num(case.place.curve_number[known].astype(np.float64))
    mean = np.bincount(group, weights=before, minlength=classes.count) / np.bincount(group, minlength=classes.count)
    seen = ~np.isnan(classes.runs_after_mm)
    shared = np.where(seen, -1.0 - np.arange(classes.count), np.round(mean, 1))
    return np.unique(shared, return_inverse=True)[1].astype(np.int64)


def _basis(case: Case, crop: CropResults, order: Order) -> ScoreBasis:
    settings = case.settings
    share = reliability(crop.yields.relative_yield, target_yield=settings.crop.target_yield).share
    used = {name: getattr(settings.ranking, f"weight_{name}") for name in COMPONENTS}
    return ScoreBasis(
        Components(**order.components),
        used,
        np.where(order.rank > 0, share, np.nan),
        crop.yields.relative_yield.mean(axis=1),
        crop.rain_alone.relative_yield.mean(axis=1),
        settings.crop.target_yield,
    )


def _note(notes: Notes) -> None:
    """List how far each input is taken to be off."""
    source, effect = "assumption: errors drawn as nature shares them, see docs/methods", "rank_low and rank_high"
    for name, value, unit in (
        ("doubt.curve_number", f"{SPREAD.region_cn_sd:g} for all, {SPREAD.cover_cn_sd:g} by class", "sd"),
        ("doubt.conveyance_loss_per_km", "{:g} to {:g}".format(*SPREAD.loss_per_km), "1/km"),
        ("doubt.channel_wetting", "x {:g} to {:g}".format(*SPREAD.wetting_factor), ""),
        ("doubt.crop_demand", "x {:g} to {:g}, for Kc and for ET0".format(*SPREAD.kc_factor), ""),
        ("doubt.available_water", "x {:g} to {:g} by soil".format(*SPREAD.available_water_factor), ""),
        ("doubt.infiltration", "x {:g} to {:g} by soil".format(*SPREAD.infiltration_factor), ""),
    ):
        notes.assume(name, value, unit, source, effect)


def told_swaps(swaps: Swaps) -> list[dict[str, object]]:
    """Return what would swap the best neighbours, one mapping for each pair."""
    return [
        {
            "upper_plot_id": int(swaps.upper_id[pair]),
            "lower_plot_id": int(swaps.lower_id[pair]),
            "input": str(swaps.input[pair]) or None,
            "change": None if np.isnan(swaps.change[pair]) else float(swaps.change[pair]),
            "unit": str(swaps.unit[pair]),
            "change_sd": None if np.isnan(swaps.change_sd[pair]) else float(swaps.change_sd[pair]),
        }
        for pair in range(swaps.upper_id.size)
    ]
