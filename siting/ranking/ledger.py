"""What a plot takes is missing below: how much of whose water."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.errors import InputError
from siting.ranking.exceedance import dependable

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class Reaches:
    """
    Which plots lie above which places: an entry for each place that the flow path from a plot's exit meets.

    A place is whatever water reaches: the next plot, the first channel of a village, the exit of the property, a pan.
    `plot` and `place` are numbers from 0; `passing` is the share of what leaves the plot that gets there, exp(-k L), 0 to 1.

    Raises
    ------
    InputError
        Lists of different lengths, a share outside 0 to 1, a number below 0, the same plot and place twice.
    """

    plot: Integers
    place: Integers
    passing: FloatArray

    def __post_init__(self) -> None:
        if not self.plot.shape == self.place.shape == self.passing.shape:
            msg = f"{self.plot.size} plots, {self.place.size} places and {self.passing.size} shares: give one of each"
            raise InputError(msg)
        bad = self.passing[~((self.passing >= 0) & (self.passing <= 1))]
        if bad.size:
            msg = f"the share of water that gets to a place is {bad[0]:g}: it must lie between 0 and 1"
            raise InputError(msg)
        if min(self.plot.min(initial=0), self.place.min(initial=0)) < 0:
            msg = "a plot or a place has a number below 0: leave out those that no flow path meets"
            raise InputError(msg)
        pairs = np.unique(np.stack([self.plot, self.place]), axis=1)
        if pairs.shape[1] != self.plot.size:
            msg = "a plot reaches the same place twice, so its water would count twice: keep the first meeting only"
            raise InputError(msg)


@dataclass(frozen=True, slots=True, eq=False)
class LostShares:
    """
    Share of water, 0 to 1, that no longer reaches a place; NaN where none came anyway, or where it is unknown.

    `by_plot` has one for each entry of the reaches, as if that plot alone were cropped; `by_set` one for each place.
    """

    by_plot: FloatArray
    by_set: FloatArray


def lost_share(came_m3: FloatArray, left_m3: FloatArray, *, probability: float) -> FloatArray:
    """
    Share of the water of a class of year that is lost: 1 - Q(left) / Q(came), each the quantile of its own series.

    Parameters
    ----------
    came_m3, left_m3
        Volume without and with what is taken above; years along the last axis. A year unknown in one counts in neither.
    probability
        Share of years that reach the volume: 0.8 for the dry year, 0.5 for the median.

    Returns
    -------
    FloatArray
        0 to 1; NaN where no water came in such a year, or the record is too short for it.
    """
    unknown = np.isnan(came_m3) | np.isnan(left_m3)
    came = dependable(np.where(unknown, np.nan, came_m3), probability=probability)
    left = dependable(np.where(unknown, np.nan, left_m3), probability=probability)
    kept = np.divide(left, came, out=np.full(came.shape, np.nan), where=came > 0)
    return np.asarray(np.clip(1.0 - kept, 0.0, 1.0))


def lost_downstream(
    *,
    came_m3: FloatArray,
    reaches: Reaches,
    taken_alone_m3: FloatArray,
    taken_in_set_m3: FloatArray,
    probability: float,
) -> LostShares:
    """
    Tell what each plot, and the set, keeps from the places below in a class of year.

    Parameters
    ----------
    came_m3
        Water of each place (first axis) by year with nothing taken above; NaN unknown.
    taken_alone_m3, taken_in_set_m3
        What each plot takes by year if it is cropped alone, and as one of the set (0 outside the set).
    probability
        As in `lost_share`.

    Notes
    -----
    A place cannot lose more than came to it: the rest would have gone into the bed on the way.
    """
    alone = reaches.passing[:, None] * taken_alone_m3[reaches.plot]
    came = came_m3[reaches.place]
    by_plot = lost_share(came, np.maximum(came - alone, 0.0), probability=probability)
    missing = np.zeros(came_m3.shape)
    np.add.at(missing, reaches.place, reaches.passing[:, None] * taken_in_set_m3[reaches.plot])
    by_set = lost_share(came_m3, np.maximum(came_m3 - missing, 0.0), probability=probability)
    return LostShares(by_plot, by_set)
