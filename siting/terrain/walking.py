"""How far people walk along the ground, from many starts to many goals."""

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError, InputError
from siting.parallel import run_all
from siting.terrain._kernels.walking import mean_heights, walk_out
from siting.terrain.condition import FloatArray

Integers = npt.NDArray[np.int64]
Flags = npt.NDArray[np.bool_]

WALKING_CELL_M = 50.0
"""Ways lead over cells at least this wide, of mean height: people step round a bump, and errors even out (assumption)."""

SEEN_SHARE = 0.5
"""A walking cell with less of its ground known than this is not seen (assumption)."""


@dataclass(frozen=True, slots=True, eq=False)
class Walks:
    """
    Goals in reach, an entry for each start and goal, by start and then by goal (numbers from 0).

    `distance_m` is of level ground that takes as long, right to about one walking cell. `reach_cut` tells of each start
    whether its reach meets the edge of the data or ground without heights: there may be more goals than are known.
    """

    start: Integers
    goal: Integers
    distance_m: FloatArray
    reach_cut: Flags


def walks(
    elevation: npt.NDArray[np.floating],
    *,
    start_cell: Integers,
    start: Integers,
    starts: int,
    goal_cell: Integers,
    goal: Integers,
    reach_m: float,
    cell_width_m: FloatArray,
    cell_height_m: FloatArray,
    threads: int = 1,
) -> Walks:
    """
    Find the goals that people can walk to from each start, the shortest way over the ground.

    A way is as long as the level ground that takes as long to walk, the mean of there and back; so it is never shorter
    than its length on the map, and steep ground is walked round.

    Parameters
    ----------
    elevation
        Heights in m (rows, columns), NaN void: nobody crosses a void as wide as a walking cell.
    start_cell, start
        Cells (flat) with heights, and the number of the start to which each belongs, 0 to `starts` - 1. A start may have
        several (a village drawn as an area) or none: then it reaches nothing, and its reach is cut.
    goal_cell, goal
        The same for the goals; the nearest cell counts.
    reach_m
        Longest way, above 0.
    cell_width_m, cell_height_m
        Ground size of a cell for each row.

    Raises
    ------
    ConfigError
        A reach that is not above 0.
    InputError
        Lists that disagree, a cell outside the grid, a start that is not numbered as said, or on a void.

    References
    ----------
    Speed on a slope: Tobler (1993), NCGIA technical report 93-1.
    """
    if not 0 < reach_m < np.inf:
        msg = f"the reach of a walk is {reach_m:g} m: give a length above 0"
        raise ConfigError(msg)
    _check(elevation, start_cell, start, starts, goal_cell, goal)
    ground = _WalkingGround(elevation, cell_width_m, cell_height_m)
    goals = ground.places(goal_cell, goal)
    places = ground.places(start_cell, start)
    bounds = np.searchsorted(places.number, np.arange(starts + 1))
    parts = [(places.row[first:end], places.col[first:end], goals, reach_m) for first, end in pairwise(bounds)]
    found = run_all(ground.walk, parts, threads)
    sizes = [numbers.size for numbers, _, _ in found]
    return Walks(
        np.repeat(np.arange(starts), sizes),
        np.concatenate([numbers for numbers, _, _ in found] or [np.empty(0, dtype=np.int64)]),
        np.concatenate([distance for _, distance, _ in found] or [np.empty(0)]),
        np.array([cut for _, _, cut in found], dtype=np.bool_),
    )


def _check(
    elevation: npt.NDArray[np.floating],
    start_cell: Integers,
    start: Integers,
    starts: int,
    goal_cell: Integers,
    goal: Integers,
) -> None:
    for name, cell, number in (("start", start_cell, start), ("goal", goal_cell, goal)):
        if cell.shape != number.shape:
            msg = f"{cell.size} cells of {number.size} {name}s: give the number of the {name} for each cell"
            raise InputError(msg)
        outside = cell[(cell < 0) | (cell >= elevation.size)]
        if outside.size:
            msg = f"cell {outside[0]} of a {name} lies outside the grid of {elevation.size} cells: leave it out"
            raise InputError(msg)
    bad = start[(start < 0) | (start >= starts)]
    if bad.size:
        msg = f"start {bad[0]} is not one of the {starts} starts: number them from 0"
        raise InputError(msg)
    void = start_cell[~np.isfinite(elevation.ravel()[start_cell])]
    if void.size:
        msg = f"a walk starts on cell {void[0]}, which has no height: leave it out, its reach is then unknown"
        raise InputError(msg)


@dataclass(frozen=True, slots=True, eq=False)
class _Places:
    """Walking cells of numbered things, each once, by number."""

    number: Integers
    row: Integers
    col: Integers


class _WalkingGround:
    """Walking cells: heights, sizes, and where they lie beside ground that is not seen."""

    def __init__(self, elevation: npt.NDArray[np.floating], cell_width_m: FloatArray, cell_height_m: FloatArray) -> None:
        rows, cols = elevation.shape
        narrowest = float(min(cell_width_m.min(), cell_height_m.min()))
        self.size, self.cols = max(1, int(np.ceil(WALKING_CELL_M / narrowest))), cols
        shape = (-(-rows // self.size), -(-cols // self.size))
        self.height, known = np.empty(shape), np.empty(shape, dtype=np.int64)
        mean_heights(elevation, self.size, self.height, known)
        self.beside_unseen = _beside(known < SEEN_SHARE * self.size**2)
        first = np.arange(0, rows, self.size)
        counts = np.diff(np.append(first, rows))
        self.width_m = self.size * np.add.reduceat(cell_width_m, first) / counts
        self.depth_m = np.add.reduceat(cell_height_m, first)
        self.middle_m = np.cumsum(self.depth_m) - 0.5 * self.depth_m

    def places(self, cell: Integers, number: Integers) -> _Places:
        row, col = cell // self.cols // self.size, cell % self.cols // self.size
        once = np.unique(np.stack([number, row, col]), axis=1)
        return _Places(*once)

    def walk(self, row: Integers, col: Integers, goals: _Places, reach_m: float) -> tuple[Integers, FloatArray, bool]:
        """Return the goals in reach of one start, their distances, and whether the reach is cut."""
        if row.size == 0:
            return np.empty(0, dtype=np.int64), np.empty(0), True
        top, bottom = self._window(self.depth_m, row, reach_m)
        left, right = self._window(np.full(self.height.shape[1], self.width_m[top:bottom].min()), col, reach_m)
        distance = np.empty((bottom - top, right - left))
        starts = (row - top) * distance.shape[1] + col - left
        cut = walk_out(starts, self.height, self.beside_unseen, self.width_m, self.middle_m, top, left, reach_m, distance)
        inside = (goals.row >= top) & (goals.row < bottom) & (goals.col >= left) & (goals.col < right)
        far = distance[goals.row[inside] - top, goals.col[inside] - left]
        near = np.isfinite(far)
        number, first = np.unique(goals.number[inside][near], return_index=True)
        nearest = np.minimum.reduceat(far[near], first) if number.size else np.empty(0)
        return number, nearest, bool(cut)

    @staticmethod
    def _window(size_m: FloatArray, place: Integers, reach_m: float) -> tuple[int, int]:
        """Return first and last (one more) row or column that a walk from these places could reach."""
        steps = int(reach_m // size_m.min()) + 1
        return max(0, int(place.min()) - steps), min(size_m.size, int(place.max()) + steps + 1)


def _beside(unseen: Flags) -> Flags:
    """Mark cells that are not seen or have such a neighbour; beyond the edge nothing is seen."""
    rows, cols = unseen.shape
    padded = np.pad(unseen, 1, constant_values=True)
    found = np.zeros(unseen.shape, dtype=np.bool_)
    for row in range(3):
        for col in range(3):
            found |= padded[row : row + rows, col : col + cols]
    return found
