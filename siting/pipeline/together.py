"""Plots together: the set, in which water is counted once."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.pipeline.case import Case
from siting.pipeline.downstream import VILLAGE, Below
from siting.pipeline.order import Order
from siting.pipeline.sites import Sites
from siting.pipeline.water import Water
from siting.ranking import ChosenSet, Guard, PlotForest, Reaches, choose_set, dependable

FloatArray = npt.NDArray[np.float64]

LEAST_SHARE = 0.5
"""A plot that adds less of its worth than this takes most of its water from the others of the set (our assumption)."""


@dataclass(frozen=True, slots=True, eq=False)
class Together:
    """Plots above one another, the set chosen of them, and the run-on that the set leaves to each in a median year."""

    forest: PlotForest
    chosen: ChosenSet
    set_yield_median_m3: FloatArray


def choose_together(case: Case, water: Water | None, order: Order, below: Below | None) -> Together | None:
    """Choose the set by the score of its plots and the water that those above leave; None without a score."""
    if water is None or below is None or np.isnan(order.score).all():
        return None
    settings, catchments = case.settings, case.sites.catchments
    loss_per_m = settings.runoff.conveyance_loss_per_km / 1000.0
    passing = np.where(catchments.next_plot >= 0, np.exp(-loss_per_m * catchments.next_distance_m), 1.0)
    forest = PlotForest(catchments.next_plot, passing)
    chosen = choose_set(
        forest,
        runon_m3=water.yearly_m3,
        room_m3=water.room_m3,
        worth=order.score,
        rank=order.rank,
        plot_area_m2=case.sites.plots.area_m2,
        most_area_m2=settings.ranking.set_area_m2,
        most_plots=settings.ranking.set_plots,
        guard=_guard(below, settings.villages.most_lost_pct),
        least_share=LEAST_SHARE,
    )
    source, effect = "assumption: less would take from other plots most of what it brings", "the set"
    case.notes.assume("set.least_share_added", f"{LEAST_SHARE:g}", "of a plot's worth", source, effect)
    return Together(forest, chosen, dependable(chosen.left_m3, probability=0.5))


def _guard(below: Below, most_lost_pct: float | None) -> Guard | None:
    """Let no village lose more than the community has said."""
    if most_lost_pct is None:
        return None
    villages = below.of(VILLAGE)
    number = np.full(len(below.kind), -1, dtype=np.int64)
    number[villages] = np.arange(villages.size)
    theirs = number[below.reaches.place] >= 0
    reaches = Reaches(below.reaches.plot[theirs], number[below.reaches.place[theirs]], below.reaches.passing[theirs])
    return Guard(below.came_m3[villages], reaches, most_lost_pct / 100.0)


def told_set(together: Together, sites: Sites) -> str:
    """Say in one line how large the set is and why it ends there."""
    members = together.chosen.order > 0
    area_ha = float(sites.plots.area_m2[members].sum()) / 10_000.0
    ended = {"area": "its area is used up", "number": "its number is reached", "guard": "a village would lose too much"}
    why = ended.get(together.chosen.stopped, "no plot left adds anything")
    return f"{int(members.sum())} plots, {area_ha:.1f} ha; it ended because {why}"
