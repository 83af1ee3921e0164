"""Sums and maxima down the drainage: in blocks first, then across what waited for other blocks."""

import numpy as np

from siting.terrain._kernels.direction import STEP_COL, STEP_ROW, VOID
from siting.terrain._kernels.jit import at, kernel, part

DONE = 255
"""Left in the count of inflows by a cell that waits for nobody more: none has that many."""


@kernel
def _is_astray(direction, row, col):
    """Tell whether a code is no direction, or leads off the raster or into a void."""
    code = direction[row, col]
    if code == 0 or code > 8:
        return code == 0 or (code > 10 and code != VOID)
    to_row, to_col = row + STEP_ROW[code], col + STEP_COL[code]
    inside = 0 <= to_row < direction.shape[0] and 0 <= to_col < direction.shape[1]
    return not inside or direction[to_row, to_col] == VOID


@kernel
def count_astray(direction, row0, row1):
    """Count in rows `row0` to `row1` the codes that are no direction, or lead off the raster or into a void."""
    rows, cols = direction.shape
    astray = 0
    for row in range(row0, row1):
        if row == 0 or row == rows - 1 or cols < 3:
            for col in range(cols):
                astray += _is_astray(direction, row, col)
            continue
        north, middle, south = direction[row - 1], direction[row], direction[row + 1]
        for col in range(1, cols - 1):  # selects only, so that the loop vectorises
            code = middle[col]
            wrong = (code == 0) | ((code > 10) & (code != VOID))
            wrong |= (code == 1) & (middle[col + 1] == VOID) | (code == 5) & (middle[col - 1] == VOID)
            wrong |= (code == 2) & (south[col + 1] == VOID) | (code == 6) & (north[col - 1] == VOID)
            wrong |= (code == 3) & (south[col] == VOID) | (code == 7) & (north[col] == VOID)
            wrong |= (code == 4) & (south[col - 1] == VOID) | (code == 8) & (north[col + 1] == VOID)
            astray += wrong
        astray += _is_astray(direction, row, 0) + _is_astray(direction, row, cols - 1)
    return astray


@kernel
def count_inflows(direction, inflows, row0, row1):
    """Count for rows `row0` to `row1` the neighbours that drain into each cell."""
    rows, cols = direction.shape
    for row in range(row0, row1):
        for col in range(cols):
            count = 0
            for code in range(1, 9):
                from_row, from_col = row - STEP_ROW[code], col - STEP_COL[code]
                if 0 <= from_row < rows and 0 <= from_col < cols:
                    count += 1 if direction[from_row, from_col] == code else 0
            inflows[row, col] = count


@kernel
def walk_block(direction, inflows, value, cols, limits, largest, pending):
    """
    Gather down from every source of a block: the sum of values, or the `largest`.

    Arrays are flat, `cols` cells to a row. Lists the cells whose water leaves the block; returns how many.
    """
    row0, row1, col0, col1 = limits
    waiting = 0
    for first_row in range(row0, row1):
        for first_col in range(col0, col1):
            place = first_row * cols + first_col
            if at(inflows, place) != 0 or at(direction, place) == VOID:
                continue
            row, col = first_row, first_col
            while True:
                inflows[np.uint64(place)] = DONE
                code = np.int64(at(direction, place))
                if code > 8:
                    break
                row, col = row + at(STEP_ROW, code), col + at(STEP_COL, code)
                if row < row0 or row >= row1 or col < col0 or col >= col1:
                    pending[waiting] = place
                    waiting += 1
                    break
                place = _pass_on(inflows, value, place, row * cols + col, largest)
                if place < 0:
                    break
    return waiting


@part
def _pass_on(inflows, value, place, below, largest):
    """Add a cell's value to that of the cell below; return the latter if it waits for nobody more, else -1."""
    here, there = at(value, place), at(value, below)
    value[np.uint64(below)] = max(here, there) if largest else there + here
    left = np.uint8(at(inflows, below) - np.uint8(1))
    inflows[np.uint64(below)] = left
    return below if left == 0 else -1


@kernel
def walk_rest(direction, inflows, value, cols, largest, pending):
    """Finish the walks that waited for other blocks."""
    for start in pending:
        place = start
        while place >= 0 and at(direction, place) <= 8:
            code = np.int64(at(direction, place))
            inflows[np.uint64(place)] = DONE
            below = place + at(STEP_ROW, code) * cols + at(STEP_COL, code)
            place = _pass_on(inflows, value, place, below, largest)
        if place >= 0:
            inflows[np.uint64(place)] = DONE


@kernel
def count_unfinished(direction, inflows, row0, row1):
    """Count in rows `row0` to `row1` the cells that still wait for others: flow runs in a circle there or above."""
    unfinished = 0
    for row in range(row0, row1):
        for col in range(direction.shape[1]):
            unfinished += np.int64((inflows[row, col] != DONE) & (direction[row, col] != VOID))
    return unfinished
