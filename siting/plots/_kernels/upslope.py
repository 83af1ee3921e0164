"""From plot to plot along the drainage, and all ground above each plot, every cell visited once."""

from typing import Any

import numpy as np
import numpy.typing as npt

from siting.terrain._kernels.direction import STEP_COL, STEP_ROW
from siting.terrain._kernels.jit import kernel

Array = npt.NDArray[Any]

OUTSIDE, DOUBTFUL_PAN, CHANNEL = 1, 2, 4
"""Bits of the marks of a cell."""

AREA, BED, AREA_OUTSIDE, AREA_BEHIND, AREA_UNCLASSED, AREA_SLOPE, AREA_WITH_SLOPE, SUMS = 0, 1, 2, 3, 4, 5, 6, 7
LONGEST, HIGHEST, PEAKS = 0, 1, 2
"""Places in the sums and in the peaks of what enters somewhere; the last of each is their number."""


@kernel
def _step_length(lengths: Array, row: int, code: int) -> Any:
    """Return the length of the step in a direction; `lengths` is along the row, diagonal, across rows."""
    return lengths[row, 0 if STEP_ROW[code] == 0 else 2 if STEP_COL[code] == 0 else 1]


@kernel
def _find(cells: Array, low: int, high: int, wanted: int) -> int:
    """Return the place of a value that is there in a rising part of a list."""
    while low < high:
        middle = (low + high) // 2
        if cells[middle] < wanted:
            low = middle + 1
        else:
            high = middle
    return low


@kernel
def next_plot_cell(
    cells: Array,
    start: Array,
    label: Array,
    direction: Array,
    lengths: Array,
    marks: Array,
    found: Array,
    far: Array,
    pan: Array,
) -> None:
    """
    Walk from each plot cell to the next plot cell on its path, of its own plot or another.

    `cells` lists plot cells by plot, rising; `start` holds where each plot begins. `found` gets places in it, -1 for
    none; `pan` tells whether the way there, its first cell included, leads through a doubtful pan.
    """
    cols = label.shape[1]
    for place in range(cells.size):
        row, col = cells[place] // cols, cells[place] % cols
        length, through = 0.0, False
        found[place], far[place], pan[place] = -1, np.nan, False
        while direction[row, col] <= 8:
            code = direction[row, col]
            length += _step_length(lengths, row, code)
            through |= (marks[row, col] & DOUBTFUL_PAN) != 0
            row, col = row + STEP_ROW[code], col + STEP_COL[code]
            plot = label[row, col]
            if plot > 0:
                found[place] = _find(cells, start[plot - 1], start[plot], row * cols + col)
                far[place], pan[place] = length, through
                break


@kernel
def leaves_plot(cells: Array, label: Array, direction: Array) -> Array:
    """Tell of each plot cell whether its water ends there or goes straight out of its plot to a neighbour."""
    cols = label.shape[1]
    leaves = np.zeros(cells.size, np.bool_)
    for place in range(cells.size):
        row, col = cells[place] // cols, cells[place] % cols
        code = direction[row, col]
        leaves[place] = code > 8 or label[row + STEP_ROW[code], col + STEP_COL[code]] != label[row, col]
    return leaves


@kernel
def skip_own(plot: Array, found: Array, far: Array, pan: Array, other: Array, stack: Array) -> None:
    """
    Follow plot cells down to the first cell of another plot: `other` gets its place, -1 where there is none.

    `far` and `pan` come as those of the way to `found`, and leave as those of the way to `other`.
    """
    other[:] = -2
    for place in range(plot.size):
        node, depth = place, 0
        while other[node] == -2:
            stack[depth] = node
            depth += 1
            below = found[node]
            if below < 0 or plot[below] != plot[node]:
                break
            node = below
        for turn in range(depth - 1, -1, -1):
            node = stack[turn]
            below = found[node]
            if below < 0 or plot[below] != plot[node]:
                other[node] = below
            else:
                other[node] = other[below]
                far[node] += far[below]
                pan[node] = pan[node] or pan[below]


@kernel
def _add_cell(
    far: float, area: float, link: float, mark: int, behind: bool, group: int, height: float, slope: float,
    loss: Array, by_class: Array, sums: Array, peaks: Array,
) -> None:  # fmt: skip
    """Add one cell, `far` metres above the plot, to the sums of what enters at one place."""
    sums[AREA] += area
    if mark & CHANNEL:
        sums[BED] += link
    if mark & OUTSIDE:
        sums[AREA_OUTSIDE] += area
    if behind:
        sums[AREA_BEHIND] += area
    if not np.isnan(slope):
        sums[AREA_SLOPE] += area * slope
        sums[AREA_WITH_SLOPE] += area
    peaks[LONGEST] = max(peaks[LONGEST], far)
    peaks[HIGHEST] = max(peaks[HIGHEST], height)
    if group >= by_class.shape[1]:
        sums[AREA_UNCLASSED] += area
        return
    for turn in range(loss.size):
        by_class[turn, group] += area * np.exp(-loss[turn] * far)


@kernel
def _hand_over(
    plot: int, far: float, behind: bool, loss: Array, by_class: Array, sums: Array, peaks: Array,
    plot_class: Array, plot_sums: Array, plot_peaks: Array,
) -> None:  # fmt: skip
    """Add what entered at one place to a plot that lies `far` metres further down."""
    for item in range(SUMS):
        plot_sums[plot, item] += sums[AREA] if item == AREA_BEHIND and behind else sums[item]
    plot_peaks[plot, LONGEST] = max(plot_peaks[plot, LONGEST], peaks[LONGEST] + far)
    plot_peaks[plot, HIGHEST] = max(plot_peaks[plot, HIGHEST], peaks[HIGHEST])
    for turn in range(loss.size):
        reaching = np.exp(-loss[turn] * far)
        for group in range(by_class.shape[1]):
            plot_class[turn, plot, group] += by_class[turn, group] * reaching


@kernel
def _collect(
    root: int, label: Array, direction: Array, lengths: Array, area_by_row: Array, marks: Array, groups: Array,
    heights: Array, slopes: Array, loss: Array, by_class: Array, sums: Array, peaks: Array,
    stack: Array, fars: Array, pans: Array,
) -> tuple[Array, Array, Array]:  # fmt: skip
    """Add all cells outside plots whose first plot cell is `root`; return the stacks, which may have grown."""
    rows, cols = label.shape
    stack[0], fars[0], pans[0] = root, 0.0, False
    depth = 1
    while depth > 0:
        depth -= 1
        node, below, behind_below = stack[depth], fars[depth], pans[depth]
        row, col = node // cols, node % cols
        if depth + 8 > stack.size:
            stack, fars = np.append(stack, np.empty_like(stack)), np.append(fars, np.empty_like(fars))
            pans = np.append(pans, np.empty_like(pans))
        for code in range(1, 9):
            r, c = row - STEP_ROW[code], col - STEP_COL[code]
            if r < 0 or c < 0 or r >= rows or c >= cols or direction[r, c] != code or label[r, c] > 0:
                continue
            link = _step_length(lengths, r, code)
            behind = behind_below or (marks[r, c] & DOUBTFUL_PAN) != 0
            _add_cell(
                below + link, area_by_row[r], link, marks[r, c], behind, groups[r, c], heights[r, c], slopes[r, c],
                loss, by_class, sums, peaks,
            )  # fmt: skip
            stack[depth], fars[depth], pans[depth] = r * cols + c, below + link, behind
            depth += 1
    return stack, fars, pans


@kernel
def gather(
    cells: Array, plot: Array, other: Array, far: Array, pan: Array, label: Array, direction: Array, lengths: Array,
    area_by_row: Array, marks: Array, groups: Array, heights: Array, slopes: Array, loss: Array,
    plot_class: Array, plot_sums: Array, plot_peaks: Array,
) -> None:  # fmt: skip
    """
    Sum the catchment of every plot: each cell is visited once, at the first plot cell below it.

    What enters at a cell counts for its plot and, with that cell itself, for each plot on the way further down, once,
    even where the way comes back. `loss` is per metre, `heights` and `slopes` may be NaN.
    """
    cols = label.shape[1]
    by_class = np.zeros((plot_class.shape[0], plot_class.shape[2]))
    sums, peaks = np.zeros(SUMS), np.zeros(PEAKS)
    stack, fars, pans = np.empty(64, np.int64), np.empty(64, np.float64), np.empty(64, np.bool_)
    counted = np.full(plot_sums.shape[0], -1, np.int64)
    for place in range(cells.size):
        by_class[:], sums[:], peaks[LONGEST], peaks[HIGHEST] = 0.0, 0.0, 0.0, -np.inf
        stack, fars, pans = _collect(
            cells[place], label, direction, lengths, area_by_row, marks, groups, heights, slopes,
            loss, by_class, sums, peaks, stack, fars, pans,
        )  # fmt: skip
        own = plot[place]
        _hand_over(own, 0.0, False, loss, by_class, sums, peaks, plot_class, plot_sums, plot_peaks)
        if other[place] < 0:
            continue
        counted[own] = place
        row, col = cells[place] // cols, cells[place] % cols
        link = _step_length(lengths, row, direction[row, col])
        _add_cell(
            0.0, area_by_row[row], link, marks[row, col], False, groups[row, col], heights[row, col], slopes[row, col],
            loss, by_class, sums, peaks,
        )  # fmt: skip
        node, length, behind = place, 0.0, False
        while other[node] >= 0:
            length += far[node]
            behind = behind or pan[node]
            node = other[node]
            if counted[plot[node]] != place:
                counted[plot[node]] = place
                _hand_over(plot[node], length, behind, loss, by_class, sums, peaks, plot_class, plot_sums, plot_peaks)


@kernel
def _room(values: Array, count: int) -> Array:
    """Return the list with room for eight more values."""
    return np.append(values, np.empty_like(values)) if count + 8 > values.size else values


@kernel
def cells_above(roots: Array, label: Array, direction: Array) -> Array:
    """List every cell that drains into a plot (its cells are `roots`), the plot left out."""
    rows, cols = label.shape
    own = label[roots[0] // cols, roots[0] % cols]
    found = np.empty(64, np.int64)
    count, done = 0, -roots.size
    while done < count:
        node = found[done] if done >= 0 else roots[done + roots.size]
        done += 1
        found = _room(found, count)
        for code in range(1, 9):
            r, c = node // cols - STEP_ROW[code], node % cols - STEP_COL[code]
            if r < 0 or c < 0 or r >= rows or c >= cols or direction[r, c] != code or label[r, c] == own:
                continue
            found[count] = r * cols + c
            count += 1
    return found[:count].copy()


@kernel
def walk_down(direction: Array, start: int, stop: Array) -> Array:
    """List the cells from a start down to the first one marked in `stop`, or to the end of the flow."""
    cols = direction.shape[1]
    row, col = start // cols, start % cols
    path, count = np.full(64, start, np.int64), 1
    while direction[row, col] <= 8 and (count == 1 or not stop[row, col]):
        code = direction[row, col]
        row, col = row + STEP_ROW[code], col + STEP_COL[code]
        path = _room(path, count)
        path[count] = row * cols + col
        count += 1
    return path[:count].copy()
