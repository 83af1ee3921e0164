"""Walking over the ground: mean heights of walking cells, and the least way from a start to all cells in reach."""

import heapq

import numpy as np

from siting.terrain._kernels.jit import kernel

GENTLE, STEEPNESS = 0.05, 3.5
"""Tobler (1993): speed = 6 km/h x exp(-3.5 |tangent + 0.05|), tangent above 0 uphill; fastest down a slope of 5 %."""

STEPS = np.array(
    [
        *((0, 1), (1, 1), (1, 0), (1, -1), (0, -1), (-1, -1), (-1, 0), (-1, 1)),
        *((1, 2), (2, 1), (2, -1), (1, -2), (-1, -2), (-2, -1), (-2, 1), (-1, 2)),
    ],
    dtype=np.int64,
)
"""Rows and columns of a step to a neighbour, and of one that passes between two: then no way is over 2.8 % too long."""


@kernel
def mean_heights(elevation, size, height, known):
    """Write the mean height of each walking cell of `size` cells a side, NaN where none is known, and how many are."""
    rows, cols = elevation.shape
    height[:] = 0.0
    known[:] = 0
    for row in range(rows):
        for col in range(cols):
            here = elevation[row, col]
            if np.isfinite(here):
                height[row // size, col // size] += here
                known[row // size, col // size] += 1
    for row in range(height.shape[0]):
        for col in range(height.shape[1]):
            count = known[row, col]
            height[row, col] = height[row, col] / count if count > 0 else np.nan


@kernel
def slowness(tangent):
    """Return the time that a length takes on a slope, there and back, over the time that it takes on the level."""
    there = np.exp(STEEPNESS * (abs(tangent + GENTLE) - GENTLE))
    back = np.exp(STEEPNESS * (abs(GENTLE - tangent) - GENTLE))
    return 0.5 * (there + back)


@kernel
def walk_out(starts, height, beside_unseen, width_m, middle_m, first_row, first_col, reach_m, distance):
    """
    Write the distance from the nearest start to every cell of a window that lies in reach, infinite elsewhere.

    `starts` are flat places in the window, whose corner lies at `first_row`, `first_col` of the whole. `width_m` and
    `middle_m` (how far south its middle lies) are by row of the whole. Return whether a cell in reach lies beside
    ground that is not seen.
    """
    rows, cols = distance.shape
    distance[:] = np.inf
    heap = [(0.0, starts[0])]
    for start in starts:
        distance[start // cols, start % cols] = 0.0
        heapq.heappush(heap, (0.0, start))
    cut = False
    while len(heap) > 0:
        far, node = heapq.heappop(heap)
        row, col = node // cols, node % cols
        if far > distance[row, col]:
            continue
        here = height[first_row + row, first_col + col]
        cut = cut or beside_unseen[first_row + row, first_col + col]
        for turn in range(STEPS.shape[0]):
            to_row, to_col = row + STEPS[turn, 0], col + STEPS[turn, 1]
            if to_row < 0 or to_col < 0 or to_row >= rows or to_col >= cols:
                continue
            there = height[first_row + to_row, first_col + to_col]
            across = middle_m[first_row + to_row] - middle_m[first_row + row]
            along = STEPS[turn, 1] * 0.5 * (width_m[first_row + row] + width_m[first_row + to_row])
            length = np.hypot(along, across)
            if abs(STEPS[turn, 0]) + abs(STEPS[turn, 1]) < 3:
                way = length * slowness((there - here) / length)
            else:
                # half-way it passes between two cells, so that it leaps over no ridge and no void
                near_row, near_col = first_row + row + int(STEPS[turn, 0] / 2), first_col + col + int(STEPS[turn, 1] / 2)
                far_row, far_col = first_row + to_row - int(STEPS[turn, 0] / 2), first_col + to_col - int(STEPS[turn, 1] / 2)
                between, half = 0.5 * (height[near_row, near_col] + height[far_row, far_col]), 0.5 * length
                way = half * (slowness((between - here) / half) + slowness((there - between) / half))
            # a void has no height: then the comparison is false
            if far + way <= reach_m and far + way < distance[to_row, to_col]:
                distance[to_row, to_col] = far + way
                heapq.heappush(heap, (far + way, to_row * cols + to_col))
    return cut
