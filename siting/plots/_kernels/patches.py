"""Loops over the cells of patches: what enters them, and how they are divided."""

import heapq
from typing import Any

import numpy.typing as npt

from siting.terrain._kernels.direction import STEP_COL, STEP_ROW
from siting.terrain._kernels.jit import kernel

Array = npt.NDArray[Any]

LEFT_OVER = -1

ACROSS_EDGES = (1, 3, 5, 7)
"""Directions to the neighbours that share an edge: cells that touch at a corner alone make no field."""


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
def label_edge_patches(mask: Array, label: Array, stack: Array) -> int:
    """Label the patches of a mask whose cells share edges, from 1 in row order; return how many."""
    rows, cols = mask.shape
    count = 0
    for row in range(rows):
        for col in range(cols):
            if not mask[row, col] or label[row, col] != 0:
                continue
            count += 1
            label[row, col] = count
            stack[0], depth = row * cols + col, 1
            while depth > 0:
                depth -= 1
                here_row, here_col = stack[depth] // cols, stack[depth] % cols
                for code in ACROSS_EDGES:
                    to_row, to_col = here_row + STEP_ROW[code], here_col + STEP_COL[code]
                    if to_row < 0 or to_col < 0 or to_row >= rows or to_col >= cols:
                        continue
                    if mask[to_row, to_col] and label[to_row, to_col] == 0:
                        label[to_row, to_col] = count
                        stack[depth] = to_row * cols + to_col
                        depth += 1
    return count


@kernel
def _grow(
    start: int, number: int, goal_m2: float, patch: Array, lengths: Array, area_by_row: Array, label: Array, taken: Array
) -> tuple[int, float]:
    """Give cells to a plot by their distance from its start inside the patch, across edges; return number and area."""
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
        for code in ACROSS_EDGES:
            to_row, to_col = row + STEP_ROW[code], col + STEP_COL[code]
            if to_row < 0 or to_col < 0 or to_row >= rows or to_col >= cols:
                continue
            if patch[to_row, to_col] == patch[row, col] and label[to_row, to_col] == 0:
                kind = 0 if STEP_ROW[code] == 0 else 2
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
