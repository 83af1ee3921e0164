"""Villages: which plots people can walk to, and what the set would support for each person."""

from dataclasses import dataclass

import geopandas as gpd
import numpy as np
import numpy.typing as npt
import pandas as pd

from siting.inputs import cells_of_shapes
from siting.layers import layer
from siting.pipeline.case import Case
from siting.pipeline.downstream import Ledger
from siting.pipeline.frames import whole_or_null
from siting.pipeline.order import Order
from siting.pipeline.read import Place
from siting.pipeline.together import supported_dry_m2
from siting.pipeline.water import Water
from siting.ranking import ChosenSet, VillageRanks, rank_villages
from siting.terrain import Terrain
from siting.terrain.walking import WALKING_CELL_M, walks

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]

MUCH_LOST_PCT = 20.0
"""A village that would lose more of its water is named in a warning (our assumption)."""

NAMED_VILLAGES = 5

NOT_RANKED = "no plot could be ranked: rain, crop or cover is missing"


@dataclass(frozen=True, slots=True, eq=False)
class VillageCells:
    """Cells (flat) with heights in or under each village, and the village each belongs to, from 0."""

    cell: Integers
    village: Integers
    count: int

    @property
    def located(self) -> npt.NDArray[np.bool_]:
        """Tell which villages lie on the data at all."""
        return np.bincount(self.village, minlength=self.count) > 0


def village_cells(place: Place, ground: Terrain) -> VillageCells:
    """Find the cells of each village; none for one that lies off the data."""
    count = 0 if place.villages is None else len(place.villages)
    none = np.zeros(0, dtype=np.int64)
    if place.villages is None:
        return VillageCells(none, none, 0)
    cell, village = cells_of_shapes(list(place.villages.geometry), ground.grid)
    known = ground.direction.ravel()[cell] != 255
    return VillageCells(cell[known], village[known], count)


def villages_layer(
    case: Case, cells: VillageCells, water: Water | None, order: Order, chosen: ChosenSet | None, lost: Ledger | None
) -> gpd.GeoDataFrame | None:
    """Rank the villages by the area that the set supports for each person; their own columns stand first."""
    villages = case.place.villages
    if villages is None:
        return None
    own = {column.name for column in layer("villages").columns}
    found = villages.rename(columns={name: f"given_{name}" for name in villages.columns if name in own})
    found = found.assign(village_id=np.arange(1, cells.count + 1))
    if water is None or water.crop is None or chosen is None or lost is None:
        return found.assign(status="unknown", reason=NOT_RANKED)
    _warn_of_losses(case, villages, lost)
    supported = supported_dry_m2(case, water, water.crop, chosen)
    ranks = _ranks(case, cells, order, chosen, _people(case, villages), supported)
    per_person = ranks.supported_dry_m2_per_person if case.settings.villages.people else np.full(cells.count, np.nan)
    return found.assign(
        rank=whole_or_null(ranks.rank),
        rank_low=ranks.rank_low,
        rank_high=ranks.rank_high,
        plots_in_reach=whole_or_null(ranks.plots_in_reach),
        plots_shared=whole_or_null(ranks.plots_shared),
        supported_dry_m2=ranks.supported_dry_m2,
        supported_dry_m2_per_person=per_person,
        best_plot_id=whole_or_null(np.where(ranks.best_plot < 0, np.nan, ranks.best_plot + 1.0)),
        runoff_lost_dry_pct=lost.village_dry_pct,
        runoff_lost_median_pct=lost.village_median_pct,
        status=list(ranks.status),
        reason=[reason or None for reason in ranks.reason],
    )


def _warn_of_losses(case: Case, villages: gpd.GeoDataFrame, lost: Ledger) -> None:
    """Name the villages from which the set would take much of what they have in a dry year."""
    most = lost.village_dry_pct
    hit = np.flatnonzero(np.nan_to_num(most) > MUCH_LOST_PCT)
    if hit.size:
        names = villages[case.settings.villages.name].astype(str).to_numpy()
        worst = hit[np.argsort(-most[hit], kind="stable")]
        told = ", ".join(f"{names[village]} ({most[village]:.0f} %)" for village in worst[:NAMED_VILLAGES])
        if worst.size > NAMED_VILLAGES:
            told += f" and {worst.size - NAMED_VILLAGES} more"
        case.notes.warn(
            "village_loses",
            f"The set would take more than {MUCH_LOST_PCT:g} % of the dry year's water in the nearest channel from: {told}. "
            "Ask first; villages.most_lost_pct sets a limit.",
        )


def _people(case: Case, villages: gpd.GeoDataFrame) -> FloatArray:
    """Return the number of people by village, NaN unknown; one each where no column is named, so that area alone ranks."""
    column = case.settings.villages.people
    if column is None:
        case.notes.warn("no_people", "No column of people is named: villages are ranked by area in all, not per person.")
        return np.ones(len(villages))
    return np.asarray(pd.to_numeric(villages[column], errors="coerce"), dtype=np.float64)


def _ranks(
    case: Case,
    cells: VillageCells,
    order: Order,
    chosen: ChosenSet,
    people: FloatArray,
    supported_dry_m2: FloatArray,
) -> VillageRanks:
    """Walk from every village to the plots in its reach, and rank."""
    walk_km, ground, sites = case.settings.villages.walk_km, case.ground, case.sites
    found = walks(
        ground.elevation,
        start_cell=cells.cell,
        start=cells.village,
        starts=cells.count,
        goal_cell=sites.cells.cell,
        goal=sites.cells.plot,
        reach_m=1000.0 * walk_km,
        cell_width_m=ground.grid.cell_width_m,
        cell_height_m=ground.grid.cell_height_m,
        threads=case.threads,
    )
    source = f"Tobler (1993), there and back, over cells of {WALKING_CELL_M:g} m or more"
    case.notes.assume("villages.walking", f"{walk_km:g} km of level ground", "", source, "which plots a village reaches")
    return rank_villages(
        village=found.start,
        plot=found.goal,
        distance_m=found.distance_m,
        reach_cut=found.reach_cut,
        located=cells.located,
        people=people,
        in_set=chosen.order > 0,
        supported_dry_m2=supported_dry_m2,
        plot_area_m2=sites.plots.area_m2,
        plot_rank=np.where(order.rank > 0, order.rank, order.rank.size + 1),
    )
