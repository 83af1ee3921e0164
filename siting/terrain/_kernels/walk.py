"""Walks along the drainage: to the first marked cell below, and from above."""

import numpy as np

from siting.terrain._kernels.direction import STEP_COL, STEP_ROW
from siting.terrain._kernels.jit import kernel

UNKNOWN, NONE = -2, -1


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
                if include_self and is_target[here_row, here_col]:
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
                inflows[here_row, here_col] = 255  # done
                code = direction[here_row, here_col]
                if code > 8:
                    break
                to_row, to_col = here_row + STEP_ROW[code], here_col + STEP_COL[code]
                highest[to_row, to_col] = max(highest[to_row, to_col], highest[here_row, here_col])
                inflows[to_row, to_col] -= 1
                if inflows[to_row, to_col] != 0:
                    break
                here_row, here_col = to_row, to_col
