"""What drains onto each plot, where it enters, where surplus goes, and which plots lie above one another."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.plots._kernels import upslope
from siting.plots._kernels.patches import outside_inflow
from siting.terrain.downstream import step_lengths

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]
Labels = npt.NDArray[np.int32]
Mask = npt.NDArray[np.bool_]
Codes = npt.NDArray[np.uint8]
Heights = npt.NDArray[np.float32]

NONE = -1


@dataclass(frozen=True, slots=True, eq=False)
class Catchments:
    """
    Catchments of plots, one entry each, every plot taken alone: plots above it count as ground like any other.

    `area_m2` leaves the plot out. `effective_area_m2` is (losses, plots, runoff classes): each cell's area times
    exp(-k L), L its flow distance to the plot. `unclassed_m2` is ground without a runoff class, `outside_m2` that
    outside the boundary, `behind_pan_m2` that which drains through a doubtful pan on its way. `bed_length_m` is the
    length of channel above, `longest_path_m` the longest flow path to the plot, `mean_slope` a tangent, `highest_m`
    the highest ground; the last two NaN without catchment. `intake_cell` (flat) takes most water from outside,
    `intake_area_m2` tells how much ground that is; `exit_cell` is the one most water leaves the plot through, or ends in;
    -1 where nothing enters. `next_plot` is the number (from 0) of the first other plot below the exit, -1 for none, and
    `next_distance_m` the length of the path there (NaN for none); `plots_upstream` counts the plots from whose exits
    water comes.
    """

    area_m2: FloatArray
    effective_area_m2: FloatArray
    unclassed_m2: FloatArray
    outside_m2: FloatArray
    behind_pan_m2: FloatArray
    bed_length_m: FloatArray
    longest_path_m: FloatArray
    mean_slope: FloatArray
    highest_m: FloatArray
    intake_cell: Integers
    intake_area_m2: FloatArray
    exit_cell: Integers
    next_plot: Integers
    next_distance_m: FloatArray
    plots_upstream: Integers


@dataclass(frozen=True, slots=True, eq=False)
class PlotCells:
    """
    The cells of all plots, by plot and within it by row and column.

    `cell` holds flat indices, `plot` plot numbers from 0, `start` where each plot begins (one more at the end).
    """

    cell: Integers
    plot: Integers
    start: Integers

    def of(self, plot: int) -> Integers:
        """Return the cells of one plot (number from 0)."""
        return self.cell[self.start[plot] : self.start[plot + 1]]


def plot_cells(label: Labels, count: int) -> PlotCells:
    """List the cells of labels 1 to `count`."""
    place = np.flatnonzero(label > 0)
    order = np.argsort(label.ravel()[place], kind="stable")
    cell = place[order].astype(np.int64)
    number = label.ravel()[cell].astype(np.int64)
    return PlotCells(cell, number - 1, np.searchsorted(number, np.arange(1, count + 2)).astype(np.int64))


def trace_catchments(
    cells: PlotCells,
    *,
    label: Labels,
    direction: Codes,
    contributing_area_m2: FloatArray,
    elevation: Heights,
    slope: Heights,
    channel: Mask,
    doubtful_pan: Mask,
    inside: Mask | None,
    class_of_cell: npt.NDArray[np.uint16],
    classes: int,
    loss_per_km: Sequence[float],
    cell_area_m2: FloatArray,
    cell_width_m: FloatArray,
    cell_height_m: FloatArray,
) -> Catchments:
    """
    Sum all that drains onto each plot in one pass along the drainage.

    Parameters
    ----------
    cells, label
        The plots, as lists and as numbers from 1 on the grid.
    direction
        1 to 8 for E SE S SW W NW N NE; 9, 10 ends of flow; 255 void.
    contributing_area_m2, elevation, slope, channel, doubtful_pan
        Of each cell: m2, m, tangent (NaN: not known), marks.
    inside
        The boundary given; None where there is none, and nothing lies outside.
    class_of_cell, classes
        Runoff class of each cell; `classes` or above: none.
    loss_per_km
        The losses k on the way for which effective areas are summed, 1/km, at least 0.
    cell_area_m2, cell_width_m, cell_height_m
        Size of a cell, for each row.

    Notes
    -----
    The exit is the cell with the most contributing area of those that drain out of the plot or end the flow. Each plot
    further down has an exit with more area, so what leaves never comes back and next plots form a forest.
    """
    count = cells.start.size - 1
    lengths = step_lengths(cell_width_m, cell_height_m)
    marks = (upslope.DOUBTFUL_PAN * doubtful_pan + upslope.CHANNEL * channel).astype(np.uint8)
    if inside is not None:
        marks[~inside] |= upslope.OUTSIDE
    other, far, pan = _ways(cells, label, direction, lengths, marks)
    by_class = np.zeros((len(loss_per_km), count, classes))
    sums, peaks = np.zeros((count, upslope.SUMS)), np.zeros((count, upslope.PEAKS))
    peaks[:, upslope.HIGHEST] = -np.inf
    loss_per_m = np.asarray(loss_per_km, dtype=np.float64) / 1000.0
    upslope.gather(
        cells.cell, cells.plot, other, far, pan, label, direction, lengths, cell_area_m2, marks, class_of_cell,
        elevation, slope, loss_per_m, by_class, sums, peaks,
    )  # fmt: skip
    intake, entering = _intakes(cells, label, direction, contributing_area_m2)
    leaving, below, distance = _exits(cells, label, direction, contributing_area_m2, other, far)
    with np.errstate(invalid="ignore"):
        mean_slope = sums[:, upslope.AREA_SLOPE] / sums[:, upslope.AREA_WITH_SLOPE]
    return Catchments(
        sums[:, upslope.AREA],
        by_class,
        sums[:, upslope.AREA_UNCLASSED],
        sums[:, upslope.AREA_OUTSIDE],
        sums[:, upslope.AREA_BEHIND],
        sums[:, upslope.BED],
        peaks[:, upslope.LONGEST],
        mean_slope,
        np.where(np.isinf(peaks[:, upslope.HIGHEST]), np.nan, peaks[:, upslope.HIGHEST]),
        intake,
        entering,
        leaving,
        below,
        distance,
        _count_above(leaving, below, contributing_area_m2),
    )


def _ways(
    cells: PlotCells, label: Labels, direction: Codes, lengths: FloatArray, marks: Codes
) -> tuple[Integers, FloatArray, Mask]:
    """Find for each plot cell the first cell of another plot below, how far, and whether a doubtful pan lies between."""
    size = cells.cell.size
    found, far, pan = np.empty(size, dtype=np.int64), np.empty(size), np.empty(size, dtype=np.bool_)
    upslope.next_plot_cell(cells.cell, cells.start, label, direction, lengths, marks, found, far, pan)
    other = np.empty(size, dtype=np.int64)
    upslope.skip_own(cells.plot, found, far, pan, other, np.empty(size + 1, dtype=np.int64))
    return other, far, pan


def _best_of_each(cells: PlotCells, value: FloatArray) -> Integers:
    """Return for each plot the place of its first largest value above 0, -1 where there is none."""
    best = np.full(cells.start.size - 1, NONE, dtype=np.int64)
    for plot in range(best.size):
        first, last = int(cells.start[plot]), int(cells.start[plot + 1])
        place = first + int(np.argmax(value[first:last]))
        if value[place] > 0:
            best[plot] = place
    return best


def _intakes(cells: PlotCells, label: Labels, direction: Codes, area: FloatArray) -> tuple[Integers, FloatArray]:
    inflow = np.zeros(cells.cell.size)
    outside_inflow(cells.cell, label, direction, area, inflow)
    best = _best_of_each(cells, inflow)
    return np.where(best < 0, NONE, cells.cell[best]), np.where(best < 0, 0.0, inflow[best])


def _exits(
    cells: PlotCells, label: Labels, direction: Codes, area: FloatArray, other: Integers, far: FloatArray
) -> tuple[Integers, Integers, FloatArray]:
    """Return each plot's exit, the number of the next plot below it, and how far that is."""
    leaves = upslope.leaves_plot(cells.cell, label, direction)
    best = _best_of_each(cells, np.where(leaves, area.ravel()[cells.cell], 0.0))
    below = np.where(best < 0, NONE, other[best])
    there = below >= 0
    return (
        np.where(best < 0, NONE, cells.cell[best]),
        np.where(there, cells.plot[below], NONE),
        np.where(there, far[best], np.nan),
    )


def _count_above(leaving: Integers, below: Integers, area: FloatArray) -> Integers:
    """Count the plots above each, from the smallest exit down: a plot below has a larger one."""
    above = np.zeros(leaving.size, dtype=np.int64)
    at_exit = np.where(leaving < 0, np.inf, area.ravel()[leaving])
    for plot in np.argsort(at_exit, kind="stable"):
        if below[plot] >= 0:
            above[below[plot]] += above[plot] + 1
    return above


def catchment_cells(cells: PlotCells, plot: int, *, label: Labels, direction: Codes) -> Integers:
    """List the cells (flat) that drain onto a plot (number from 0), the plot left out."""
    return np.asarray(upslope.cells_above(cells.of(plot), label, direction))


def distances_m(path: Integers, *, cell_width_m: FloatArray, cell_height_m: FloatArray, cols: int) -> FloatArray:
    """Return the length of a flow path (flat cells) up to each of its cells, m, centre to centre."""
    lengths = step_lengths(cell_width_m, cell_height_m)
    row, col = np.divmod(path, cols)
    across, along = np.diff(row) != 0, np.diff(col) != 0
    kind = np.where(across & along, 1, np.where(across, 2, 0))
    return np.concatenate([[0.0], np.cumsum(lengths[row[:-1], kind])])


def overflow_path(exit_cell: int, *, direction: Codes, stop: Mask) -> Integers:
    """List the cells from a plot's exit to the first marked one (edge of the property, a pan), or the end of the data."""
    return np.asarray(upslope.walk_down(direction, exit_cell, stop))
