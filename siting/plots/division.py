"""From cells that passed to plots: patches, and their division around the strongest inflows."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.errors import GridError, InputError
from siting.plots._kernels.patches import LEFT_OVER as NO_PLOT
from siting.plots._kernels.patches import divide, outside_inflow
from siting.plots.patches import LEAST_CELLS, PlotSize, areas_and_cells, cell_areas_m2, label_parts, plot_size
from siting.plots.screening import LEFT_OVER, PATCH_TOO_SMALL
from siting.terrain.downstream import step_lengths

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]
Labels = npt.NDArray[np.int32]
Mask = npt.NDArray[np.bool_]
Codes = npt.NDArray[np.uint8]

FOUND, GIVEN = "found", "given"


@dataclass(frozen=True, slots=True, eq=False)
class PlotLabels:
    """
    Plots as cells: given ones first, in the order of their labels, then found ones in the order of their first cells.

    `label` numbers the plots from 1, 0 elsewhere; the other columns hold one value for each plot. `given_label` is the
    label a plot had among the given ones, 0 for a found one. `reason` is the screening's with 11 and 12 added.
    `slivers` counts the pieces left over in division, `coarse_cells` tells that cells, not the user, set the sizes.
    """

    label: Labels
    area_m2: FloatArray
    cells: Integers
    origin: tuple[str, ...]
    given_label: Integers
    reason: Codes
    slivers: int
    coarse_cells: bool

    @property
    def count(self) -> int:
        """Return the number of plots."""
        return len(self.origin)


@dataclass(frozen=True, slots=True, eq=False)
class _Ground:
    """What every step needs to know of the cells."""

    direction: Codes
    catchment_weight: FloatArray
    lengths: FloatArray
    cell_area_m2: FloatArray


def make_plots(
    *,
    passed: Mask,
    given: Labels | None,
    catchment_weight: FloatArray,
    direction: Codes,
    cell_width_m: FloatArray,
    cell_height_m: FloatArray,
    min_area_m2: float,
    target_area_m2: float,
    reason: Codes,
    given_names: Sequence[str] | None = None,
) -> PlotLabels:
    """
    Join cells that passed and share edges into patches, and divide each into plots near the target area.

    A patch is to hold the nearest whole number of target areas, at least one. Its plots grow one after another, each
    from the free cell that most water enters from outside the patch (ties: the cell with most weight, then lowest row,
    then column), by distance inside the patch, to an equal part of the patch's area. A part smaller than the least area
    or of fewer than 4 cells is left over. Given plots take their cells first and are never changed.

    Parameters
    ----------
    passed
        Cells that can be cropped, (rows, columns).
    given
        Labels from 1 of plots that the user drew, 0 elsewhere; cells of void are taken off them.
    catchment_weight
        Contributing area of each cell, m2.
    direction
        1 to 8 for E SE S SW W NW N NE; 9, 10 ends of flow; 255 void.
    cell_width_m, cell_height_m
        Ground metres of a cell, for each row.
    min_area_m2, target_area_m2
        Raised to 4 and 9 cells where those are larger.
    reason
        Codes of the screening; a copy gets 11 (patch too small) and 12 (left over).
    given_names
        Names of the given plots by label, for messages.

    Raises
    ------
    InputError
        Where a given plot has no cell with a known height.
    """
    if passed.shape != direction.shape or (given is not None and given.shape != direction.shape):
        msg = f"cells of shape {passed.shape} meet directions of shape {direction.shape}: both must lie on one grid"
        raise GridError(msg)
    ground = _Ground(
        direction,
        catchment_weight,
        step_lengths(cell_width_m, cell_height_m),
        cell_areas_m2(cell_width_m, cell_height_m),
    )
    size = plot_size(ground.cell_area_m2, min_area_m2=min_area_m2, target_area_m2=target_area_m2)
    label, given_label = _given_plots(given, ground, given_names)
    free = passed & (label == 0) & (direction != 255)
    reason = reason.copy()
    found, plots, slivers = _found_plots(free, reason, ground, size)
    label[found > 0] = found[found > 0] + given_label.size
    count = given_label.size + plots
    area, cells = areas_and_cells(label, count, ground.cell_area_m2)
    origin = (GIVEN,) * given_label.size + (FOUND,) * plots
    given_label = np.concatenate([given_label, np.zeros(plots, dtype=np.int64)])
    return PlotLabels(label, area, cells, origin, given_label, reason, slivers, size.coarse_cells)


def without_plots(plots: PlotLabels, dropped: Mask, *, reason: int) -> PlotLabels:
    """
    Take plots out again (marked by number from 0), their cells given a reason code; the others keep their order.

    Raises IndexError where the marks are of another number of plots.
    """
    number = np.zeros(plots.count + 1, dtype=np.int32)
    kept = np.flatnonzero(~dropped)
    number[1 + kept] = np.arange(1, kept.size + 1)
    label = number[plots.label]
    codes = plots.reason.copy()
    codes[(plots.label > 0) & (label == 0)] = reason
    return PlotLabels(
        label,
        plots.area_m2[kept],
        plots.cells[kept],
        tuple(plots.origin[place] for place in kept),
        plots.given_label[kept],
        codes,
        plots.slivers,
        plots.coarse_cells,
    )


def _given_plots(given: Labels | None, ground: _Ground, names: Sequence[str] | None) -> tuple[Labels, Integers]:
    """Label the given plots from 1; refuse those without ground."""
    label = np.zeros(ground.direction.shape, dtype=np.int32)
    if given is None:
        return label, np.zeros(0, dtype=np.int64)
    wanted = np.unique(given[given > 0]).astype(np.int64)
    on_ground = (given > 0) & (ground.direction != 255)
    for number in np.setdiff1d(wanted, np.unique(given[on_ground])):
        name = f"'{names[number - 1]}'" if names is not None else str(number)
        msg = f"given plot {name} has no cell with a known height: take it out or extend the elevation model"
        raise InputError(msg)
    label[on_ground] = np.searchsorted(wanted, given[on_ground]) + 1
    return label, wanted


def _found_plots(free: Mask, reason: Codes, ground: _Ground, size: PlotSize) -> tuple[Labels, int, int]:
    """Return plots from 1 in the order of their first cells, their number and that of the slivers; note reasons 11, 12."""
    patch, patches = label_parts(free)
    area, cells = areas_and_cells(patch, patches, ground.cell_area_m2)
    large = np.concatenate([[False], (area >= size.min_area_m2) & (cells >= LEAST_CELLS)])
    divided = large[patch]
    reason[free & ~divided] = PATCH_TOO_SMALL
    patch[~divided] = 0
    parts = np.maximum(1.0, np.round(area / size.target_area_m2))
    goal_m2 = np.concatenate([[0.0], area / parts])
    label = np.zeros(free.shape, dtype=np.int32)
    order = _by_inflow(np.flatnonzero(divided), patch, ground)
    plots, slivers = divide(
        order,
        patch,
        goal_m2,
        size.min_area_m2,
        LEAST_CELLS,
        ground.lengths,
        ground.cell_area_m2,
        label,
        np.empty(order.size, dtype=np.int64),
    )
    reason[label == NO_PLOT] = LEFT_OVER
    label[label == NO_PLOT] = 0
    return _by_first_cell(label, plots), plots, slivers


def _by_inflow(cells: Integers, patch: Labels, ground: _Ground) -> Integers:
    """Sort cells: most water from outside the patch first, then most weight, then lowest row and column."""
    inflow = np.zeros(cells.size)
    outside_inflow(cells, patch, ground.direction, ground.catchment_weight, inflow)
    return cells[np.lexsort((cells, -ground.catchment_weight.ravel()[cells], -inflow))]


def _by_first_cell(label: Labels, count: int) -> Labels:
    """Label plots anew, in the order of their first cells."""
    inside = np.flatnonzero(label)
    _, first = np.unique(label.ravel()[inside], return_index=True)
    number = np.zeros(count + 1, dtype=np.int32)
    number[1 + np.argsort(first, kind="stable")] = np.arange(1, count + 1)
    return number[label]
