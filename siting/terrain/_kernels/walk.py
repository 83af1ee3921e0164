"""Walks along the drainage: to the first marked cell below, and from above."""

import numpy as np

from siting.terrain._kernels.direction import STEP_COL, STEP_ROW
from siting.terrain._kernels.jit import kernel

UNKNOWN, NONE = -2, -1

DONE = 255
"""Left in the count of inflows by a cell that waits for nobody more: none has that many."""


@kernel
def first_target(direction, is_target, lengths, include_self, target, distance, stack):
    """
    Find for each cell the first marked cell on its path, as a flat index, and the path's length.

    `lengths` is (rows, 3): along the row, diagonal, across rows. `target` gets NONE where no marked cell is met.
    Each cell is walked once: a walk stops at the first cell whose answer is known.
    """
    rows, cols = direction.shape
    target[:] = UNKNOWN
    for row in range(rows):
        for col in range(cols):
            node, depth = row * cols + col, 0
            while target[node] == UNKNOWN:
                stack[depth] = node
                depth += 1
                here_row, here_col = node // cols, node % cols
                code = direction[here_row, here_col]
                if include_self and code != 255 and is_target[here_row, here_col]:
                    target[node], distance[node] = node, 0.0
                elif code > 8:
                    target[node], distance[node] = NONE, np.nan
                else:
                    node = (here_row + STEP_ROW[code]) * cols + here_col + STEP_COL[code]
                    if not include_self and is_target[node // cols, node % cols]:
                        # a marked cell answers for those above it, not for itself
                        break
            _unwind(direction, is_target, lengths, include_self, target, distance, stack, depth)


@kernel
def _unwind(direction, is_target, lengths, include_self, target, distance, stack, depth):
    """Answer for the cells of one walk, from its end upward."""
    cols = direction.shape[1]
    for place in range(depth - 1, -1, -1):
        node = stack[place]
        if target[node] != UNKNOWN:
            continue
        row, col = node // cols, node % cols
        code = direction[row, col]
        below = (row + STEP_ROW[code]) * cols + col + STEP_COL[code]
        length = lengths[row, 0 if code == 1 or code == 5 else 2 if code == 3 or code == 7 else 1]
        if not include_self and is_target[below // cols, below % cols]:
            target[node], distance[node] = below, length
        else:
            target[node] = target[below]
            distance[node] = distance[below] + length


@kernel
def highest_upstream(direction, inflows, highest):
    """Carry the greatest height down; `highest` holds the heights and receives the answers."""
    rows, cols = direction.shape
    for row in range(rows):
        for col in range(cols):
            if inflows[row, col] != 0 or direction[row, col] == 255:
                continue
            here_row, here_col = row, col
            while True:
                inflows[here_row, here_col] = DONE
                code = direction[here_row, here_col]
                if code > 8:
                    break
                to_row, to_col = here_row + STEP_ROW[code], here_col + STEP_COL[code]
                highest[to_row, to_col] = max(highest[to_row, to_col], highest[here_row, here_col])
                inflows[to_row, to_col] -= 1
                if inflows[to_row, to_col] != 0:
                    break
                here_row, here_col = to_row, to_col


@kernel
def height_of_target(direction, is_target, height, base):
    """
    Write the height of the first marked cell on each cell's path, itself included; NaN where none is met.

    A walk goes down to the first cell whose answer is known; all cells on the way share it.
    """
    rows, cols = direction.shape
    base[:] = np.inf
    for row in range(rows):
        for col in range(cols):
            here_row, here_col = row, col
            while base[here_row, here_col] == np.inf:
                code = direction[here_row, here_col]
                if code != 255 and is_target[here_row, here_col]:
                    base[here_row, here_col] = height[here_row, here_col]
                elif code > 8:
                    base[here_row, here_col] = np.nan
                else:
                    here_row, here_col = here_row + STEP_ROW[code], here_col + STEP_COL[code]
            found = base[here_row, here_col]
            here_row, here_col = row, col
            while base[here_row, here_col] == np.inf:
                base[here_row, here_col] = found
                code = direction[here_row, here_col]
                here_row, here_col = here_row + STEP_ROW[code], here_col + STEP_COL[code]


@kernel
def carry_bits(direction, inflows, bits):
    """Carry marks down: `bits` holds each cell's own and receives its own and those of all cells upstream."""
    rows, cols = direction.shape
    for row in range(rows):
        for col in range(cols):
            if inflows[row, col] != 0 or direction[row, col] == 255:
                continue
            here_row, here_col = row, col
            while True:
                inflows[here_row, here_col] = DONE
                code = direction[here_row, here_col]
                if code > 8:
                    break
                to_row, to_col = here_row + STEP_ROW[code], here_col + STEP_COL[code]
                bits[to_row, to_col] |= bits[here_row, here_col]
                inflows[to_row, to_col] -= 1
                if inflows[to_row, to_col] != 0:
                    break
                here_row, here_col = to_row, to_col


@kernel
def inward_sides(direction, enclosed, side_bit, void_bit, bits):
    """
    Write from which sides unseen water may enter each cell that drains inward beside the data's edge or a void.

    `side_bit` holds the sides that a missing neighbour in directions 1 to 8 lies on. A missing corner tells nothing
    that a missing side has not told, save beside an enclosed void.
    """
    rows, cols = direction.shape
    for row in range(rows):
        for col in range(cols):
            sides, corners = 0, 0
            if direction[row, col] <= 8:
                for code in range(1, 9):
                    to_row, to_col = row + STEP_ROW[code], col + STEP_COL[code]
                    inside = 0 <= to_row < rows and 0 <= to_col < cols
                    if inside and direction[to_row, to_col] != 255:
                        continue
                    if inside and enclosed[to_row, to_col]:
                        sides |= void_bit
                    elif code % 2 == 1:
                        sides |= side_bit[code]
                    else:
                        corners |= side_bit[code]
            bits[row, col] = sides if sides != 0 else corners


@kernel
def raise_along(direction, height, filled, stack):
    """
    Write the lowest surface, never below `height`, that nowhere rises along the given directions.

    `filled` comes as NaN; `stack` takes the cells of one walk.
    """
    rows, cols = direction.shape
    for start in range(rows * cols):
        node, depth = start, 0
        while direction[node // cols, node % cols] != 255 and np.isnan(filled[node // cols, node % cols]):
            stack[depth] = node
            depth += 1
            code = direction[node // cols, node % cols]
            if code > 8:
                break
            node += STEP_ROW[code] * cols + STEP_COL[code]
        for place in range(depth - 1, -1, -1):
            row, col = stack[place] // cols, stack[place] % cols
            code = direction[row, col]
            level = height[row, col]
            if code <= 8:
                level = max(level, filled[row + STEP_ROW[code], col + STEP_COL[code]])
            filled[row, col] = level
