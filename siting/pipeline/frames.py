"""Results as tables: the names of the columns are those that siting.layers declares."""

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt
import pandas as pd

from siting.layers.codes import SOIL_GROUPS
from siting.pipeline.case import Case
from siting.pipeline.doubt import RankDoubt
from siting.pipeline.floods import Floods
from siting.pipeline.order import UNRANKED, Order
from siting.pipeline.sites import Sites
from siting.pipeline.surface import POSITION_TERMS
from siting.pipeline.together import Together
from siting.pipeline.water import CropResults, Water, storm_volumes_m3
from siting.plots import slope_margin
from siting.ranking import dependable, reliability
from siting.runoff.years import SHORT_RECORD_YEARS
from siting.terrain import Terrain

FloatArray = npt.NDArray[np.float64]

LARGE_CATCHMENT_M2 = 10.0e6
"""One gauge and one storm do not cover a larger catchment (common practice)."""

FLOOD_M3S = 1.0
"""A larger 10-year peak is more than a small earth bank and its spillway should be trusted with (our assumption)."""

STEEP_DROP_M = 2.0
"""A plot that falls more than this needs levelling in steps (our assumption)."""


@dataclass(frozen=True, slots=True, eq=False)
class Findings:
    """What the later stages found; None where an input for it is missing."""

    water: Water | None
    floods: Floods | None
    order: Order
    doubt: RankDoubt | None
    together: Together | None


def plots_frame(case: Case, found: Findings) -> pd.DataFrame:
    """Give one row for each plot, in the order of plot_id; what later methods will fill is left out."""
    catchments, plots, own, order, doubt = case.sites.catchments, case.sites.plots, case.own, found.order, found.doubt
    with np.errstate(invalid="ignore", divide="ignore"):
        outside, behind = (
            np.where(catchments.area_m2 > 0, 100.0 * part / catchments.area_m2, 0.0)
            for part in (catchments.outside_m2, catchments.behind_pan_m2)
        )
    x, y = _middles(case.sites, case.ground)
    columns: dict[str, Any] = {
        "plot_id": case.sites.plot_id,
        "area_m2": plots.area_m2,
        "catchment_area_m2": catchments.area_m2,
        "open_catchment": own.open_sides != 0,
        "slope_pct": 100.0 * own.slope,
        "drop_m": own.drop_m,
        "wetness_index": own.wetness_index,
        "height_above_channel_m": own.height_above_channel_m,
        "position": _terms(own.position, POSITION_TERMS),
        "soil_group": _terms(own.soil_group, ("", *SOIL_GROUPS.values)),
        "texture": [case.place.soil.kinds[kind].texture if kind >= 0 else None for kind in own.soil_kind],
        "curve_number": case.curve_number,
        "available_water_mm": case.soil.available_water_mm,
        "catchment_ratio": catchments.area_m2 / plots.area_m2,
        "catchment_outside_pct": np.full(outside.shape, np.nan) if case.place.inside is None else outside,
        "behind_pan_pct": behind,
        "plots_upstream": catchments.plots_upstream,
        "next_plot_id": _or_null(catchments.next_plot + 1, catchments.next_plot >= 0),
        "origin": list(plots.origin),
        "given_name": [case.place.given_names[label - 1] if label else None for label in plots.given_label],
        "rank": _or_null(order.rank, order.rank > UNRANKED),
        "supply_rank": _or_null(order.supply_rank, order.supply_rank > UNRANKED),
        "rank_low": _rank_of_draws(None if doubt is None else doubt.ranks.rank_low, plots.count),
        "rank_high": _rank_of_draws(None if doubt is None else doubt.ranks.rank_high, plots.count),
        **_draw_columns(doubt, plots.count),
        "score": order.score,
        **{f"score_{name}": values for name, values in order.components.items()},
        **_set_columns(found.together, plots.count),
        "storm_yield_m3": storm_volumes_m3(case),
        **_flood_columns(found.floods, plots.count),
        **_water_columns(case, found.water),
    }
    frame = pd.DataFrame(columns)
    frame["cautions"] = _cautions(case, frame)
    return frame.assign(x=x, y=y, open_bits=own.open_sides)


def _draw_columns(doubt: RankDoubt | None, count: int) -> dict[str, Any]:
    """Return what else the draws say: how often among the best, and what other weights would do."""
    weights = None if doubt is None else doubt.weights
    return {
        "top_5_pct": np.full(count, np.nan) if doubt is None else 100.0 * doubt.ranks.share_in_top(5),
        "rank_low_weights": _rank_of_draws(None if weights is None else weights.rank_low, count),
        "rank_high_weights": _rank_of_draws(None if weights is None else weights.rank_high, count),
    }


def _rank_of_draws(rank: FloatArray | None, count: int) -> "pd.Series[Any]":
    return whole_or_null(np.full(count, np.nan) if rank is None else np.where(rank > UNRANKED, rank, np.nan))


def _set_columns(together: Together | None, count: int) -> dict[str, Any]:
    order = np.zeros(count, dtype=np.int64) if together is None else together.chosen.order
    left = np.full(count, np.nan) if together is None else together.set_yield_median_m3
    return {"set_order": _or_null(order, order > 0), "set_yield_median_m3": left}


def _flood_columns(floods: Floods | None, count: int) -> dict[str, Any]:
    unknown = np.full(count, np.nan)
    names = {
        "peak_flow_10y_m3s": "peak_10y_m3s",
        "peak_flow_25y_m3s": "peak_25y_m3s",
        "spillway_width_m": "spillway_width_m",
        "spillway_velocity_m_s": "spillway_velocity_m_s",
        "permissible_velocity_m_s": "permissible_velocity_m_s",
    }
    return {column: unknown if floods is None else getattr(floods, name) for column, name in names.items()}


def _terms(code: npt.NDArray[np.int64], terms: tuple[str, ...]) -> list[str | None]:
    """Name codes; below 0 is unknown."""
    return [terms[number] if number >= 0 else None for number in code]


def _or_null(values: npt.NDArray[np.int64], known: npt.NDArray[np.bool_]) -> "pd.Series[Any]":
    return pd.Series(values, dtype="Int64").where(pd.Series(known))


def whole_or_null(values: FloatArray) -> "pd.Series[Any]":
    """Return whole numbers, NULL where they are unknown (NaN)."""
    known = ~np.isnan(values)
    return _or_null(np.where(known, values, 0.0).astype(np.int64), known)


def _middles(sites: Sites, ground: Terrain) -> tuple[FloatArray, FloatArray]:
    """Return map coordinates of the plot cell nearest to the mean place of each plot's cells, so inside the plot."""
    cells, count = sites.cells, sites.plots.count
    row, col = np.divmod(cells.cell, ground.grid.cols)
    size = np.bincount(cells.plot, minlength=count)
    mean_row, mean_col = (np.bincount(cells.plot, weights=at, minlength=count) / size for at in (row, col))
    far = (row - mean_row[cells.plot]) ** 2 + (col - mean_col[cells.plot]) ** 2
    order = np.lexsort((np.arange(far.size), far, cells.plot))
    nearest = order[cells.start[:-1]]
    places = [ground.grid.xy(int(row[one]), int(col[one])) for one in nearest]
    return np.array([x for x, _ in places]), np.array([y for _, y in places])


def _water_columns(case: Case, water: Water | None) -> dict[str, Any]:
    """Return the columns that need a rain record; unknown without one."""
    if water is None:
        return {"yield_dry_m3": np.nan, "supply_ratio_dry": np.nan}
    found: dict[str, Any] = {f"yield_{name}_m3": values for name, values in water.yield_m3.items()}
    found["yield_dry_other_ratio_m3"] = water.other_yield_dry_m3
    if water.crop is None:
        return found | {"supply_ratio_dry": np.nan}
    share, table = case.settings.ranking.dependable, water.crop.seasons
    usable = table.usable_in_season_mm + np.minimum(table.usable_before_mm, case.soil.available_water_mm[:, None])
    demand = dependable(table.demand_mm, probability=0.5)
    dry, median = (dependable(table.supply_ratio, probability=part) for part in (share, 0.5))
    return (
        found
        | {
            "supply_ratio_dry_other_ratio": water.crop.other_supply_ratio_dry,
            "needed_ratio": water.crop.needed.ratio,
            "runon_dry_mm": dependable(usable, probability=share),
            "runon_median_mm": dependable(usable, probability=0.5),
            "crop_demand_mm": demand,
            "crop_demand_m3": demand * case.sites.plots.area_m2 / 1000.0,
            "supply_ratio_dry": dry,
            "supply_ratio_median": median,
            "rain_only_ratio_dry": dependable(table.rain_only_ratio, probability=share),
        }
        | _yield_columns(water.crop, case.settings.crop.target_yield)
    )


def _yield_columns(crop: CropResults, target_yield: float) -> dict[str, Any]:
    """Return what the daily method says of each plot."""
    with_runon, alone = (
        reliability(yields.relative_yield, target_yield=target_yield) for yields in (crop.yields, crop.rain_alone)
    )
    return {
        "reliability_pct": 100.0 * with_runon.share,
        "reliability_low_pct": 100.0 * with_runon.low,
        "reliability_high_pct": 100.0 * with_runon.high,
        "rain_only_reliability_pct": 100.0 * alone.share,
        "supported_area_m2": crop.supported.area_m2,
        "limit": [limit or None for limit in crop.supported.limit],
        "mean_yield_pct": 100.0 * crop.yields.relative_yield.mean(axis=1),
        "standing_water_days": whole_or_null(crop.yields.worst_standing_water_days),
    }


def _cautions(case: Case, frame: pd.DataFrame) -> list[str | None]:
    """List each plot's caution codes, `;` between them; None where there is none."""
    limit, weather, ground = case.settings.plots.max_slope_pct, case.weather, case.ground
    doubt = 100.0 * slope_margin(ground.vertical_error_m, ground.grid.typical_cell_m)
    everywhere = np.ones(len(frame), dtype=np.bool_)
    held = {
        "open_catchment": frame["open_catchment"],
        "short_record": everywhere & (weather is not None and weather.years.labels.size < SHORT_RECORD_YEARS),
        "rain_trend": everywhere & (weather is not None and weather.rain_trend),
        "coarse_cells": everywhere & case.sites.plots.coarse_cells,
        "marginal_slope": (frame["slope_pct"] - limit).abs() < doubt,
        "channel_in_plot": case.sites.channel_in_plot,
        "doubtful_pan": frame["behind_pan_pct"] > 0,
        "outside_boundary": frame["catchment_outside_pct"] > 0,
        "large_catchment": frame["catchment_area_m2"] > LARGE_CATCHMENT_M2,
        "flood": frame["peak_flow_10y_m3s"] > FLOOD_M3S,
        "standing_water": _stands_too_long(frame, case.settings.crop.standing_water_days),
        "steep_drop": frame["drop_m"] > STEEP_DROP_M,
        "no_exclusions": everywhere & (case.place.excluded is None),
        "no_runon_in_dry_year": frame["yield_dry_m3"] == 0,
        "takes_from_below": frame["next_plot_id"].notna(),
    }
    table = np.column_stack([np.asarray(flags, dtype=np.bool_) for flags in held.values()])
    codes = np.array(list(held))
    return [";".join(codes[row]) or None for row in table]


def _stands_too_long(frame: pd.DataFrame, days: int) -> "pd.Series[Any]":
    """Tell where water stands longer than the crop bears in the worst season; no caution where that is unknown."""
    if "standing_water_days" not in frame:
        return pd.Series(False, index=frame.index)
    return (frame["standing_water_days"] > days).fillna(False)


def seasons_frame(sites: Sites, crop: CropResults) -> pd.DataFrame:
    """Give one row for each plot and season."""
    table, yields = crop.seasons, crop.yields
    count, years = table.supply_ratio.shape
    return pd.DataFrame(
        {
            "plot_id": np.repeat(sites.plot_id, years),
            "season": np.tile(yields.label, count),
            "sown": yields.sown.ravel().astype("datetime64[s]"),
            "rain_mm": table.rain_mm.ravel(),
            "runon_mm": table.runon_mm.ravel(),
            "supply_ratio": table.supply_ratio.ravel(),
            "et_ratio": yields.et_ratio.ravel(),
            "relative_yield": yields.relative_yield.ravel(),
            "rain_only_relative_yield": crop.rain_alone.relative_yield.ravel(),
            "standing_water_days": whole_or_null(yields.standing_water_days.ravel()),
            "failure": [failure or None for failure in yields.failure.ravel()],
        }
    )


def area_curves_frame(sites: Sites, crop: CropResults) -> pd.DataFrame:
    """Give the scanned areas of each plot with their reliability."""
    areas, shares = crop.supported.curve_area_m2, crop.supported.curve_reliability
    return pd.DataFrame(
        {
            "plot_id": np.repeat(sites.plot_id, areas.shape[1]),
            "area_m2": areas.ravel(),
            "reliability_pct": 100.0 * shares.ravel(),
        }
    )


def months_frame(sites: Sites, crop: CropResults, years: float) -> pd.DataFrame:
    """Give one row for each plot and month: means over the years of what came, was too much, and was missing."""
    balance = crop.yields.balance
    assert balance is not None  # the water stage asks for it
    count = sites.plots.count
    surplus = balance.overflow_mm + balance.percolation_mm
    return pd.DataFrame(
        {
            "plot_id": np.repeat(sites.plot_id, 12),
            "month": np.tile(np.arange(1, 13), count),
            "rain_mm": balance.rain_mm.ravel() / years,
            "runon_mm": balance.runon_mm.ravel() / years,
            "surplus_mm": surplus.ravel() / years,
            "shortage_mm": balance.shortage_mm.ravel() / years,
        }
    )
