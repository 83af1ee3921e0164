"""The set: plots chosen one after another, the water of each counted once."""

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError, InputError
from siting.ranking._set_kernel import Ground, State, add_each, add_plot
from siting.ranking.exceedance import dependable
from siting.ranking.ledger import Reaches, lost_share

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]
Flags = npt.NDArray[np.bool_]

NONE = -1


@dataclass(frozen=True, slots=True, eq=False)
class PlotForest:
    """
    Plots above one another: the number (from 0) of the next plot below each, -1 for none.

    `passing` is the share of what leaves a plot that reaches the next one, exp(-k L), 0 to 1; it says nothing where there
    is no next plot. `order` lists the plots, those above before those below.

    Raises
    ------
    InputError
        A next plot that is not there, a share outside 0 to 1, or plots that lead back to themselves.
    """

    next_plot: Integers
    passing: FloatArray
    order: Integers = field(init=False)

    def __post_init__(self) -> None:
        plots = self.next_plot.size
        if self.passing.shape != (plots,):
            msg = f"{self.passing.size} shares that pass for {plots} plots: give one for each plot"
            raise InputError(msg)
        wrong = np.flatnonzero((self.next_plot < NONE) | (self.next_plot >= plots))
        if wrong.size:
            msg = f"plot {wrong[0]} has {self.next_plot[wrong[0]]} for its next plot: give 0 to {plots - 1}, or -1 for none"
            raise InputError(msg)
        wrong = np.flatnonzero((self.next_plot >= 0) & ~((self.passing >= 0) & (self.passing <= 1)))
        if wrong.size:
            msg = f"of what leaves plot {wrong[0]} the share {self.passing[wrong[0]]:g} passes: give 0 to 1"
            raise InputError(msg)
        object.__setattr__(self, "order", self._from_above())

    def _from_above(self) -> Integers:
        waits_for = np.bincount(self.next_plot[self.next_plot >= 0], minlength=self.next_plot.size)
        order = [int(plot) for plot in np.flatnonzero(waits_for == 0)]
        for plot in order:  # grows as plots become free
            below = int(self.next_plot[plot])
            if below >= 0:
                waits_for[below] -= 1
                if waits_for[below] == 0:
                    order.append(below)
        if len(order) < self.next_plot.size:
            msg = f"plot {np.flatnonzero(waits_for > 0)[0]} lies below itself: next plots must lead downward to an end"
            raise InputError(msg)
        return np.array(order, dtype=np.int64)

    def below(self, plot: int) -> Integers:
        """List a plot and all plots below it, in order."""
        path = [plot]
        while (following := int(self.next_plot[path[-1]])) >= 0:
            path.append(following)
        return np.array(path, dtype=np.int64)

    def last_below(self) -> Integers:
        """Return for each plot the last one below it, itself where there is none: plots of one tree share it."""
        last = np.arange(self.next_plot.size)
        for plot in self.order[::-1]:
            if self.next_plot[plot] >= 0:
                last[plot] = last[self.next_plot[plot]]
        return last

    def reaches(self) -> Reaches:
        """Tell which plot reaches which next plot, for the ledger."""
        plots = np.flatnonzero(self.next_plot >= 0)
        return Reaches(plots, self.next_plot[plots], self.passing[plots])


@dataclass(frozen=True, slots=True, eq=False)
class SetWater:
    """By plot and step, m3: what the chosen plots above leave (NaN where run-on is unknown), and what it takes of that."""

    left_m3: FloatArray
    taken_m3: FloatArray


def set_water(forest: PlotForest, chosen: Flags, *, runon_m3: FloatArray, room_m3: FloatArray) -> SetWater:
    """
    Count the water of the chosen plots once, from above downward.

    What a chosen plot takes, min(what is left to it, its room), is missing below, times `passing` at each step of the
    way; no plot can miss more than came to it. Plots that are not chosen let all pass.

    Parameters
    ----------
    chosen
        By plot.
    runon_m3, room_m3
        By plot and step (days or years): run-on with nothing taken above, and the most that the plot takes; at least 0.

    Raises
    ------
    InputError
        Shapes that disagree, volumes below zero, a chosen plot whose run-on or room is unknown (NaN).
    """
    _check_volumes(forest, runon_m3, room_m3)
    unknown = np.isnan(runon_m3).any(axis=1) | np.isnan(room_m3).any(axis=1)
    if (chosen & unknown).any():
        msg = f"plot {np.flatnonzero(chosen & unknown)[0]} is chosen, and its run-on or room is unknown: leave it out"
        raise InputError(msg)
    missing, taken = np.zeros(runon_m3.shape), np.zeros(runon_m3.shape)
    left = np.empty(runon_m3.shape)
    for plot in forest.order:
        kept_away = np.fmin(runon_m3[plot], missing[plot])  # unknown run-on: all that is missing
        left[plot] = runon_m3[plot] - kept_away
        if chosen[plot]:
            taken[plot] = np.minimum(left[plot], room_m3[plot])
        if forest.next_plot[plot] >= 0:
            missing[forest.next_plot[plot]] += forest.passing[plot] * (kept_away + taken[plot])
    return SetWater(left, taken)


def _check_volumes(forest: PlotForest, runon_m3: FloatArray, room_m3: FloatArray) -> None:
    if runon_m3.shape != room_m3.shape or runon_m3.ndim != 2 or runon_m3.shape[0] != forest.next_plot.size:
        plots = forest.next_plot.size
        msg = f"run-on of shape {runon_m3.shape} and room of {room_m3.shape} for {plots} plots: they must agree"
        raise InputError(msg)
    for name, volume in (("run-on", runon_m3), ("room", room_m3)):
        if (volume < 0).any():
            msg = f"{name} of plot {np.argwhere(volume < 0)[0, 0]} is below zero: give 0 or more"
            raise InputError(msg)


@dataclass(frozen=True, slots=True, eq=False)
class Guard:
    """
    Places (villages) that must not lose more than a share of their water.

    `came_m3` is each place's water by year with nothing taken above, NaN unknown; the limit holds in every class of year in
    `probabilities`. Where a place's water is unknown in such a class, nothing can be promised: no plot above it is chosen.
    """

    came_m3: FloatArray
    reaches: Reaches
    most_lost_share: float
    probabilities: tuple[float, ...] = (0.8, 0.5)

    def __post_init__(self) -> None:
        if not 0 <= self.most_lost_share <= 1:
            msg = f"the most that a village may lose is {self.most_lost_share:g}: give a share, so 20 % is 0.2"
            raise ConfigError(msg)

    def allows(self, plot: int, taken_m3: Callable[[Integers], FloatArray]) -> bool:
        """Tell whether all places below a plot keep enough; `taken_m3` gives by year what some plots take."""
        return all(self._keeps(int(place), taken_m3) for place in self.reaches.place[self.reaches.plot == plot])

    def _keeps(self, place: int, taken_m3: Callable[[Integers], FloatArray]) -> bool:
        above = self.reaches.place == place
        missing = self.reaches.passing[above] @ taken_m3(self.reaches.plot[above])
        came = self.came_m3[place]
        left = np.maximum(came - missing, 0.0)
        for probability in self.probabilities:
            if np.isnan(dependable(came, probability=probability)):
                return False
            # no share is lost (NaN) where nothing came in such a year
            if lost_share(came, left, probability=probability) > self.most_lost_share + 1e-12:
                return False
        return True


@dataclass(frozen=True, slots=True, eq=False)
class ChosenSet:
    """
    The set. `order` is the place in which a plot joins it, 1 for the first, 0 outside the set.

    `left_m3` and `taken_m3` are by plot and year: what the plots of the set above leave to it (for plots outside the set as
    well; NaN unknown), and what it takes. `guarded` marks plots left out because a guarded place would lose too much.
    `stopped` tells why there are no more: "area", "number", "guard", or "no gain" where no plot left adds anything.
    """

    order: Integers
    left_m3: FloatArray
    taken_m3: FloatArray
    guarded: Flags
    stopped: str


def choose_set(
    forest: PlotForest,
    *,
    runon_m3: FloatArray,
    room_m3: FloatArray,
    worth: FloatArray,
    rank: Integers,
    plot_area_m2: FloatArray,
    most_area_m2: float | None = None,
    most_plots: int | None = None,
    guard: Guard | None = None,
    year: Integers | None = None,
    least_share: float = 0.0,
) -> ChosenSet:
    """
    Choose plots one after another, each time the one that adds most as things then stand.

    A plot adds its worth times the share of its water that those above leave it: the mean over years of what it takes over
    what it would take alone, years in which it takes nothing alone left out. What the chosen plots below lose by it is
    subtracted. With a limit of area worth counts by area, and the plot that adds most for its area comes first.

    Parameters
    ----------
    runon_m3, room_m3
        As in `set_water`. A plot with any unknown is never chosen.
    worth
        Quality of a plot, such as its score; above 0, NaN unknown: never chosen. Only ratios count.
    rank
        Decides between plots that add the same; smaller comes first.
    plot_area_m2
        Above 0.
    most_area_m2, most_plots
        Limits; None for none. A plot that no longer fits is passed over, a smaller one may still fit.
    guard
        Places that must keep their water. A plot that would take too much is out for good: no later choice gives any back.
    year
        For each step the number of its year from 0, -1 for steps outside complete years; None where steps are years.
    least_share
        A plot is left out while it adds less than this share, 0 to 1, of what it would add alone: it would take from
        others most of what it brings.

    Raises
    ------
    ConfigError
        A limit that is not above 0.
    InputError
        Areas not above 0, worths below 0, or what `set_water` refuses.

    Notes
    -----
    Such a choice is good, not always the best. By number it came within 7 % of the best of all sets on small random forests;
    by area it may fall further short where plots are large beside the limit, for the last of it stays unused.
    With steps of years a plot takes of what is left as much as it would take alone; days are exact, and slow for many plots.
    """
    _check_volumes(forest, runon_m3, room_m3)
    _check_choice(worth, plot_area_m2, most_area_m2, most_plots)
    steps = np.arange(runon_m3.shape[1]) if year is None else year
    if steps.shape != runon_m3.shape[1:] or steps.min(initial=0) < NONE:
        msg = f"year has shape {steps.shape} for {runon_m3.shape[1]} steps: give each step a number from 0, or -1 for none"
        raise InputError(msg)
    known = ~(np.isnan(runon_m3).any(axis=1) | np.isnan(room_m3).any(axis=1) | np.isnan(worth))
    cost = np.ones(worth.size) if most_area_m2 is None else plot_area_m2
    price = _price(np.minimum(runon_m3, room_m3), steps, np.where(known, worth, 0.0) * cost)
    runon = np.where(np.isnan(runon_m3), np.inf, runon_m3)
    ground = Ground(forest.next_plot, forest.passing, runon, room_m3, price, steps)
    search = _Search(forest, ground, cost, rank, guard, known, least_share)
    search.run(plot_area_m2, np.inf if most_area_m2 is None else most_area_m2, most_plots or worth.size + 1)
    chosen = search.order > 0
    water = set_water(forest, chosen, runon_m3=runon_m3, room_m3=room_m3)
    left, taken = (_by_year(volume, steps) for volume in (water.left_m3, water.taken_m3))
    return ChosenSet(search.order, left, taken, search.guarded, search.stopped)


def _check_choice(worth: FloatArray, area_m2: FloatArray, most_area_m2: float | None, most_plots: int | None) -> None:
    for name, limit in (("area", most_area_m2), ("number of plots", most_plots)):
        if limit is not None and not limit > 0:
            msg = f"the set's {name} is limited to {limit:g}: give a limit above 0, or none"
            raise ConfigError(msg)
    if (worth < 0).any():
        msg = f"the worth of plot {np.flatnonzero(worth < 0)[0]} is below zero: give 0 or more"
        raise InputError(msg)
    if not np.all(area_m2 > 0):
        msg = f"the area of plot {np.flatnonzero(~(area_m2 > 0))[0]} is not above 0 m2: every plot needs an area"
        raise InputError(msg)


def _by_year(volume: FloatArray, year: Integers) -> FloatArray:
    """Sum the steps of each year; NaN where one is unknown."""
    total = np.zeros((year.max(initial=NONE) + 1, volume.shape[0]))
    counted = year >= 0
    np.add.at(total, year[counted], volume.T[counted])
    return total.T.copy()


def _price(alone_m3: FloatArray, year: Integers, worth: FloatArray) -> FloatArray:
    """Return the worth of a cubic metre by plot and year, so that all that a plot takes alone is worth its worth."""
    total = _by_year(alone_m3, year)
    some = total > 0
    shares = np.maximum(some.sum(axis=1, keepdims=True), 1) * np.where(some, total, 1.0)
    largest = worth.max(initial=0.0)
    return np.where(some, worth[:, None] / (largest if largest > 0 else 1.0) / shares, 0.0)


class _Search:
    """The choice as it stands."""

    def __init__(
        self,
        forest: PlotForest,
        ground: Ground,
        cost: FloatArray,
        rank: Integers,
        guard: Guard | None,
        known: Flags,
        least_share: float,
    ) -> None:
        self.forest, self.ground, self.cost, self.rank, self.guard = forest, ground, cost, rank, guard
        plots = cost.size
        self.tree = forest.last_below()
        self.open = known.copy()
        self.order, self.guarded = np.zeros(plots, dtype=np.int64), np.zeros(plots, dtype=np.bool_)
        shape = ground.runon.shape
        self.state = State(np.zeros(plots, dtype=np.bool_), np.zeros(shape), np.zeros(shape))
        self.adds, self.stopped = np.zeros(plots), ""
        add_each(np.flatnonzero(self.open), ground, self.state, self.adds)
        self.least = least_share * self.adds

    def run(self, area_m2: FloatArray, area_left_m2: float, most_plots: int) -> None:
        number = 0
        while number < most_plots:
            # rounded, so that plots that add the same tie whatever the order of sums
            by_cost = np.round(self.adds / self.cost * self.cost.max(initial=0.0), 12)
            adding = self.open & (by_cost > 0) & (self.adds >= self.least)
            fitting = np.flatnonzero(adding & (area_m2 <= area_left_m2))
            if fitting.size == 0:
                self.stopped = "area" if adding.any() else "guard" if self.guarded.any() else "no gain"
                return
            plot = int(fitting[np.lexsort((self.rank[fitting], -by_cost[fitting]))[0]])
            self.open[plot] = False
            if self._take(plot):
                number, area_left_m2 = number + 1, area_left_m2 - float(area_m2[plot])
                self.order[plot] = number
                again = np.flatnonzero(self.open & (self.tree == self.tree[plot]))
                add_each(again, self.ground, self.state, self.adds)
        self.stopped = "number"

    def _take(self, plot: int) -> bool:
        """Enter a plot, unless a guarded place would lose too much: then put all back as it was."""
        path = self.forest.below(plot)
        before = self.state.missing[path], self.state.taken[path]
        add_plot(plot, self.ground, self.state, np.empty(self.ground.runon.shape[1]), True)
        if self.guard is None or self.guard.allows(plot, self._taken_by_year):
            return True
        self.state.missing[path], self.state.taken[path] = before
        self.state.chosen[plot] = False
        self.guarded[plot] = True
        return False

    def _taken_by_year(self, plots: Integers) -> FloatArray:
        return _by_year(self.state.taken[plots], self.ground.year)
