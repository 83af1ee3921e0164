"""Plots together: the set, in which water is counted once."""

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from siting.pipeline.case import Case
from siting.pipeline.downstream import VILLAGE, Below
from siting.pipeline.order import Order
from siting.pipeline.sites import Sites
from siting.pipeline.water import CropResults, Water
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
    limits: dict[str, Any] = {
        "runon_m3": water.yearly_m3,
        "room_m3": water.room_m3,
        "worth": order.score,
        "rank": order.rank,
        "plot_area_m2": case.sites.plots.area_m2,
        "most_area_m2": settings.ranking.set_area_m2,
        "guard": _guard(below, settings.villages.most_lost_pct),
        "least_share": LEAST_SHARE,
    }
    chosen = choose_set(forest, most_plots=settings.ranking.set_plots, **limits)
    if settings.ranking.set_people is not None and water.crop is not None:
        enough = _enough_plots(case, water, water.crop, chosen)
        if enough < chosen.order.max():
            chosen = choose_set(forest, most_plots=enough, **limits)
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


def supported_dry_m2(case: Case, water: Water, crop: CropResults, chosen: ChosenSet) -> FloatArray:
    """Return the area that each plot supports in the dependable year on the water that the set leaves it; NaN unknown."""
    source = "assumption: its area x the supply ratio (at most 1) x the share of its water that the set leaves, dry year"
    case.notes.assume("set.supported_area", "of each plot of the set", "m2", source, "the order of villages, people fed")
    share = case.settings.ranking.dependable
    ratio = np.minimum(dependable(crop.seasons.supply_ratio, probability=share), 1.0)
    alone = dependable(np.minimum(water.yearly_m3, water.room_m3), probability=share)
    taken = dependable(chosen.taken_m3, probability=share)
    left = np.divide(taken, alone, out=np.zeros_like(alone), where=alone > 0)
    return np.where(np.isnan(ratio) | np.isnan(alone), np.nan, case.sites.plots.area_m2 * ratio * left)


def _enough_plots(case: Case, water: Water, crop: CropResults, chosen: ChosenSet) -> int:
    """Return how many plots of a set, in its order, feed the number of people asked for; all where they are too few."""
    settings = case.settings.ranking
    needed_m2 = (settings.set_people or 0) * settings.area_per_person_m2
    members = np.argsort(chosen.order, kind="stable")[np.count_nonzero(chosen.order == 0) :]
    supported = np.cumsum(np.nan_to_num(supported_dry_m2(case, water, crop, chosen)[members]))
    if supported.size == 0 or supported[-1] < needed_m2:
        reached = 0.0 if supported.size == 0 else supported[-1] / settings.area_per_person_m2
        text = f"All plots of the set together feed {reached:.0f} people in a dry year, not {settings.set_people}."
        case.notes.warn("set_too_small", text)
        return max(int(supported.size), 1)
    return int(np.searchsorted(supported, needed_m2)) + 1
