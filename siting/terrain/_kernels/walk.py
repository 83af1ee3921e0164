"""Walks along the drainage: to the first marked cell below, and from above."""

import numpy as np

from siting.terrain._kernels.direction import STEP_COL, STEP_ROW, VOID
from siting.terrain._kernels.jit import at, kernel

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
def height_of_target(direction, is_target, height, base, cols, limits):
    """
    Write for the cells of a block the height of the first marked cell on their path, themselves included, else NaN.

    Arrays are flat, `cols` cells to a row; `base` comes as infinity. A walk goes down, out of the block if need be, to
    the first cell whose answer is known; all cells on the way share it. Two threads may answer for the same cell: they
    give the same answer.
    """
    row0, row1, col0, col1 = limits
    for row in range(row0, row1):
        for first in range(row * cols + col0, row * cols + col1):
            place, found = first, at(base, first)
            while found == np.inf:
                code = np.int64(at(direction, place))
                if code != VOID and at(is_target, place):
                    found = at(height, place)
                elif code > 8:
                    found = np.float32(np.nan)
                else:
                    place += at(STEP_ROW, code) * cols + at(STEP_COL, code)
                    found = at(base, place)
            last, place = place, first
            while place != last:
                base[np.uint64(place)] = found
                code = np.int64(at(direction, place))
                place += at(STEP_ROW, code) * cols + at(STEP_COL, code)
            base[np.uint64(last)] = found


@kernel
def carry_bits(direction, bits, cols):
    """
    Carry marks down: `bits` holds each cell's own and receives those of all cells upstream, too.

    Both are flat. A walk ends where the cell below bears the marks already: it has carried them on, or will when its
    turn comes. So only cells below marks are walked, each at most once a bit.
    """
    for first in range(bits.size):
        if bits[first] == 0 or direction[first] > 8:
            continue
        place = first
        while at(direction, place) <= 8:
            code = np.int64(at(direction, place))
            below = place + at(STEP_ROW, code) * cols + at(STEP_COL, code)
            both = at(bits, below) | at(bits, place)
            if both == at(bits, below):
                break
            bits[np.uint64(below)] = both
            place = below


@kernel
def _mark_beside_void(direction, row, beside):
    """Mark the columns of a row that lie beside a void or the raster's edge."""
    rows, cols = direction.shape
    if row == 0 or row == rows - 1:
        beside[:] = True
        return
    north, middle, south = direction[row - 1], direction[row], direction[row + 1]
    for col in range(1, cols - 1):
        void = (north[col - 1] == VOID) | (north[col] == VOID) | (north[col + 1] == VOID)
        void |= (middle[col - 1] == VOID) | (middle[col + 1] == VOID)
        void |= (south[col - 1] == VOID) | (south[col] == VOID) | (south[col + 1] == VOID)
        beside[col] = void
    beside[0], beside[cols - 1] = True, True


@kernel
def inward_sides(direction, enclosed, side_bit, void_bit, bits, first_row, last_row):
    """
    Write from which sides unseen water may enter each cell that drains inward beside the data's edge or a void.

    For rows `first_row` up to `last_row`. `side_bit` holds the sides that a missing neighbour in directions 1 to 8 lies
    on. A missing corner tells nothing that a missing side has not told, save beside an enclosed void.
    """
    rows, cols = direction.shape
    beside = np.empty(cols, np.bool_)
    for row in range(first_row, last_row):
        _mark_beside_void(direction, row, beside)
        for col in range(cols):
            sides, corners = 0, 0
            if beside[col] and direction[row, col] <= 8:
                for code in range(1, 9):
                    to_row, to_col = row + STEP_ROW[code], col + STEP_COL[code]
                    inside = 0 <= to_row < rows and 0 <= to_col < cols
                    if inside and direction[to_row, to_col] != VOID:
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
