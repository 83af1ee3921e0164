"""Villages in the order of the area that the plots of the set can support for each person."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.errors import InputError

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]
Flags = npt.NDArray[np.bool_]

NONE = -1


@dataclass(frozen=True, slots=True, eq=False)
class VillageRanks:
    """
    One entry for each village; NaN where something is unknown.

    `rank` is 1 for the largest area per person; villages with the same area share a rank; NaN where the status is "unknown".
    `rank_low` and `rank_high` are the best and the worst rank that what is unknown leaves, always there.
    `plots_in_reach` counts plots of the set in reach, `plots_shared` those of them that other villages reach as well.
    `supported_dry_m2` is the area of the plots for which the village is the nearest. `best_plot` is the best ranked plot of
    the set in reach (number from 0), -1 for none. `status` is "ranked", "reach_cut" (lower bounds) or "unknown"; `reason`
    tells why, "" where ranked. `nearest` tells of each pair in reach, set or not, whether no other village is nearer.
    """

    rank: FloatArray
    rank_low: Integers
    rank_high: Integers
    plots_in_reach: FloatArray
    plots_shared: FloatArray
    supported_dry_m2: FloatArray
    supported_dry_m2_per_person: FloatArray
    best_plot: Integers
    status: npt.NDArray[np.str_]
    reason: npt.NDArray[np.str_]
    nearest: Flags


def rank_villages(
    *,
    village: Integers,
    plot: Integers,
    distance_m: FloatArray,
    reach_cut: Flags,
    located: Flags,
    people: FloatArray,
    in_set: Flags,
    supported_dry_m2: FloatArray,
    plot_area_m2: FloatArray,
    plot_rank: Integers,
) -> VillageRanks:
    """
    Rank villages by the area that plots of the set in walking reach support in the dependable year, per person.

    Each plot counts for its nearest village alone (of villages as near, the first). Ranks go by lower bounds.

    Parameters
    ----------
    village, plot, distance_m
        Pairs in reach: numbers from 0, and how far to walk.
    reach_cut, located, people
        By village: whether its reach meets the end of the data; whether it lies on the data at all; how many live there,
        NaN (or 0 and less) where that is unknown.
    in_set, supported_dry_m2, plot_area_m2, plot_rank
        By plot: whether it is in the set; area supported in the dependable year (NaN unknown); its area; its rank.

    Raises
    ------
    InputError
        Lists that disagree, a number without a village or a plot, the same pair twice, an area below zero.

    Notes
    -----
    What is unknown leaves a village between a least and a most area per person, and so between two ranks; it is never last
    by default. A plot of unknown supported area might be in the set: it may add anything up to its area. Unknown people are
    one or more. A reach that is cut may hold any area, and so may that of a village outside the data; that such a village
    might be nearest to plots which count for others here is not in the bounds.
    """
    pairs = _Pairs(village, plot, distance_m, villages=people.size, plots=in_set.size)
    _check_plots(supported_dry_m2, plot_area_m2)
    unknown_plot = np.isnan(supported_dry_m2)
    counted = in_set & ~unknown_plot
    nearest, member = pairs.nearest(), counted[plot]
    area = pairs.sum(np.where(counted, supported_dry_m2, 0.0), where=nearest)
    could_add = pairs.sum(np.where(unknown_plot, plot_area_m2, 0.0), where=nearest)
    unknown_plots = pairs.count(where=nearest & unknown_plot[plot])
    counted_well = located & (unknown_plots == 0)
    inhabited: Flags = np.greater(people, 0)
    heads = np.where(inhabited, people, 1.0)
    least = np.where(inhabited, area / heads, 0.0)
    most = np.where(located & ~reach_cut, (area + could_add) / heads, np.inf)
    ranked: Flags = np.logical_and(counted_well, inhabited)
    place = 1 + (least[None, :] > least[:, None]).sum(axis=1)
    return VillageRanks(
        rank=np.where(ranked, place, np.nan),
        rank_low=1 + (least[None, :] > most[:, None]).sum(axis=1),
        rank_high=1 + _others(most[None, :] > least[:, None]).sum(axis=1),
        plots_in_reach=np.where(located, pairs.count(where=member), np.nan),
        plots_shared=np.where(located, pairs.count(where=member & pairs.shared()), np.nan),
        supported_dry_m2=np.where(counted_well, area, np.nan),
        supported_dry_m2_per_person=np.where(ranked, area / heads, np.nan),
        best_plot=pairs.best(plot_rank, where=member),
        status=np.select([~ranked, reach_cut], ["unknown", "reach_cut"], default="ranked"),
        reason=_reasons(located, unknown_plots, inhabited, reach_cut),
        nearest=nearest,
    )


def _others(better: Flags) -> Flags:
    """Leave each village out of the comparison with itself."""
    np.fill_diagonal(better, False)
    return better


def _reasons(located: Flags, unknown_plots: Integers, inhabited: Flags, reach_cut: Flags) -> npt.NDArray[np.str_]:
    found = []
    for on_data, unknown, lived_in, cut in zip(located, unknown_plots, inhabited, reach_cut, strict=True):
        said = {
            "the village lies outside the data": not on_data,
            f"the supported area of {unknown} {'plot' if unknown == 1 else 'plots'} in reach is unknown": unknown > 0,
            "the number of people is unknown": not lived_in,
            "the data end within reach": on_data and cut,
        }
        found.append("; ".join(text for text, holds in said.items() if holds))
    return np.array(found, dtype=np.str_)


def _check_plots(supported_m2: FloatArray, area_m2: FloatArray) -> None:
    for name, values in (("supported area", supported_m2), ("area", area_m2)):
        if (values < 0).any():
            msg = f"the {name} of plot {np.flatnonzero(values < 0)[0]} is below zero: give 0 or more"
            raise InputError(msg)


class _Pairs:
    """Villages and the plots that each reaches."""

    def __init__(self, village: Integers, plot: Integers, distance_m: FloatArray, *, villages: int, plots: int) -> None:
        if not village.shape == plot.shape == distance_m.shape:
            msg = f"{village.size} villages, {plot.size} plots and {distance_m.size} distances: give one of each for a pair"
            raise InputError(msg)
        for name, number, count in (("village", village, villages), ("plot", plot, plots)):
            wrong = number[(number < 0) | (number >= count)]
            if wrong.size:
                msg = f"a pair in reach has {name} {wrong[0]} of {count}: number them from 0"
                raise InputError(msg)
        if np.unique(village * max(plots, 1) + plot).size != village.size:
            msg = "a village reaches the same plot twice, so it would count twice: keep the shorter way"
            raise InputError(msg)
        self.village, self.plot, self.distance_m = village, plot, distance_m
        self.villages, self.plots = villages, plots

    def nearest(self) -> Flags:
        """Tell of each pair whether no other village is nearer to the plot."""
        order = np.lexsort((self.village, self.distance_m, self.plot))
        _, first = np.unique(self.plot[order], return_index=True)
        found = np.zeros(self.plot.size, dtype=np.bool_)
        found[order[first]] = True
        return found

    def shared(self) -> Flags:
        """Tell of each pair whether other villages reach the plot as well."""
        return np.asarray(np.bincount(self.plot, minlength=self.plots)[self.plot] > 1)

    def count(self, *, where: Flags) -> Integers:
        """Count for each village its pairs that are marked."""
        return np.bincount(self.village[where], minlength=self.villages)

    def sum(self, value: FloatArray, *, where: Flags) -> FloatArray:
        """Sum for each village a value of its plots, over the pairs that are marked."""
        weights = value[self.plot[where]]
        return np.asarray(np.bincount(self.village[where], weights=weights, minlength=self.villages), dtype=np.float64)

    def best(self, plot_rank: Integers, *, where: Flags) -> Integers:
        """Return for each village the plot with the smallest rank, over the pairs that are marked; -1 for none."""
        marked = np.flatnonzero(where)
        order = marked[np.lexsort((plot_rank[self.plot[marked]], self.village[marked]))]
        some, first = np.unique(self.village[order], return_index=True)
        found = np.full(self.villages, NONE, dtype=np.int64)
        found[some] = self.plot[order[first]]
        return found
