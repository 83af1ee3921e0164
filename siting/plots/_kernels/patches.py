"""Loops over the cells of patches: what enters them, and how they are divided."""

import heapq
from typing import Any

import numpy.typing as npt

from siting.terrain._kernels.direction import STEP_COL, STEP_ROW
from siting.terrain._kernels.jit import kernel

Array = npt.NDArray[Any]

LEFT_OVER = -1


@kernel
def outside_inflow(cells: Array, group: Array, direction: Array, weight: Array, inflow: Array) -> None:
    """Sum for each listed cell the weight of the neighbours that drain into it from outside its group."""
    rows, cols = direction.shape
    for place in range(cells.size):
        row, col = cells[place] // cols, cells[place] % cols
        for code in range(1, 9):
            from_row, from_col = row - STEP_ROW[code], col - STEP_COL[code]
            if from_row < 0 or from_col < 0 or from_row >= rows or from_col >= cols:
                continue
            if direction[from_row, from_col] == code and group[from_row, from_col] != group[row, col]:
                inflow[place] += weight[from_row, from_col]


@kernel
def _grow(
    start: int, number: int, goal_m2: float, patch: Array, lengths: Array, area_by_row: Array, label: Array, taken: Array
) -> tuple[int, float]:
    """Give cells to a plot in order of their distance from its start inside the patch; return how many, and their area."""
    rows, cols = label.shape
    count, area = 0, 0.0
    heap = [(0.0, start)]
    while len(heap) > 0:
        far, node = heapq.heappop(heap)
        row, col = node // cols, node % cols
        if label[row, col] != 0:
            continue
        if count > 0 and area + 0.5 * area_by_row[row] > goal_m2:
            break
        label[row, col] = number
        taken[count] = node
        count += 1
        area += area_by_row[row]
        for code in range(1, 9):
            to_row, to_col = row + STEP_ROW[code], col + STEP_COL[code]
            if to_row < 0 or to_col < 0 or to_row >= rows or to_col >= cols:
                continue
            if patch[to_row, to_col] == patch[row, col] and label[to_row, to_col] == 0:
                kind = 0 if STEP_ROW[code] == 0 else 2 if STEP_COL[code] == 0 else 1
                heapq.heappush(heap, (far + lengths[row, kind], to_row * cols + to_col))
    return count, area


@kernel
def divide(
    order: Array,
    patch: Array,
    goal_m2: Array,
    least_m2: float,
    least_cells: int,
    lengths: Array,
    area_by_row: Array,
    label: Array,
    taken: Array,
) -> tuple[int, int]:
    """
    Grow plots from the cells of `order`, each to the goal of its patch; return how many, and how many slivers.

    `label` gets 1 and up in order of growth, LEFT_OVER where what is left of a patch makes no plot.
    """
    cols = label.shape[1]
    plots, slivers = 0, 0
    for start in order:
        row, col = start // cols, start % cols
        if label[row, col] != 0:
            continue
        count, area = _grow(start, plots + 1, goal_m2[patch[row, col]], patch, lengths, area_by_row, label, taken)
        if area < least_m2 or count < least_cells:
            slivers += 1
            for place in range(count):
                label[taken[place] // cols, taken[place] % cols] = LEFT_OVER
        else:
            plots += 1
    return plots, slivers
