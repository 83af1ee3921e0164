"""
Directions across flats by integer steps, in blocks.

Steps are upper bounds that only fall until every cell obeys the distance equation, whose solution is unique: neither
blocks nor threads can change it. A flat cell never lies beside a void, so its neighbours are always there.
"""

import numpy as np

from siting.terrain._kernels.direction import FLAT, FLAT_ORDER, STEP_COL, STEP_ROW
from siting.terrain._kernels.jit import at, kernel, part
from siting.terrain._kernels.sorting import ascending

UNKNOWN = 2**31 - 2
"""Steps of a flat cell that nothing has reached; cells that are not flat have 0."""

ROW_UNIT, COL_MASK = 1 << 32, (1 << 32) - 1
"""A queued cell is its row times ROW_UNIT plus its column."""

IS_FLAT, BESIDE_OUT, BESIDE_HIGH = 1, 2, 4
"""Bits of the mark of a flat cell."""

WAY_OUT = -(2**40)
"""What a neighbour counts that is a way out of the flat: less than any steps."""


@kernel
def _mark_flats(filled, direction, row, col0, marks):
    """
    Mark the flat cells of a part of a row: IS_FLAT, and whether they lie BESIDE_OUT, a way out, or BESIDE_HIGH ground.

    Selects only and one store, so that the loop vectorises. The part keeps clear of the raster's edge: no cell there is
    flat.
    """
    north, middle, south = filled[row, col0:], filled[row + 1, col0:], filled[row + 2, col0:]
    above, beside, below = direction[row - 1, col0 - 1 :], direction[row, col0 - 1 :], direction[row + 1, col0 - 1 :]
    for col in range(marks.size):
        here = middle[col + 1]
        out = (north[col] == here) & (above[col] != FLAT)
        out |= (north[col + 1] == here) & (above[col + 1] != FLAT)
        out |= (north[col + 2] == here) & (above[col + 2] != FLAT)
        out |= (middle[col] == here) & (beside[col] != FLAT)
        out |= (middle[col + 2] == here) & (beside[col + 2] != FLAT)
        out |= (south[col] == here) & (below[col] != FLAT)
        out |= (south[col + 1] == here) & (below[col + 1] != FLAT)
        out |= (south[col + 2] == here) & (below[col + 2] != FLAT)
        high = (north[col] > here) | (north[col + 1] > here) | (north[col + 2] > here)
        high |= (middle[col] > here) | (middle[col + 2] > here)
        high |= (south[col] > here) | (south[col + 1] > here) | (south[col + 2] > here)
        mark = np.uint8(IS_FLAT + BESIDE_OUT * out + BESIDE_HIGH * high)
        marks[col] = mark if beside[col + 1] == FLAT else np.uint8(0)


@part
def _first_steps(marks, bit, steps):
    for col in range(marks.size):
        steps[col] = 0 if marks[col] == 0 else 1 if marks[col] & bit else UNKNOWN


@kernel
def start_flats(filled, direction, toward, away, limits, local_toward, local_away, queue):
    """
    Count steps inside one block: `toward` from cells beside a way out, `away` from cells beside higher ground.

    `filled` is padded by one. The block's own copies, `local_toward` and `local_away`, come as 0 and have a ring of 0
    that ends the walks; `queue` takes each cell of the block and one more.
    """
    row0, row1, col0, col1 = limits
    first, last = max(col0, 1), min(col1, direction.shape[1] - 1)
    marks = np.empty(max(0, last - first), np.uint8)
    for row in range(max(row0, 1), min(row1, direction.shape[0] - 1)):
        _mark_flats(filled, direction, row, first, marks)
        _first_steps(marks, BESIDE_OUT, local_toward[row - row0 + 1, first - col0 + 1 :])
        _first_steps(marks, BESIDE_HIGH, local_away[row - row0 + 1, first - col0 + 1 :])
    _spread_alone(local_toward, queue)
    _spread_alone(local_away, queue)
    for row in range(row0, row1):
        from_out, from_high = local_toward[row - row0 + 1], local_away[row - row0 + 1]
        for col in range(col0, col1):
            toward[row, col] = from_out[col - col0 + 1]
            away[row, col] = from_high[col - col0 + 1]


@kernel
def _spread_alone(steps, queue):
    """Count steps breadth first from cells with 1 through those with UNKNOWN; a ring of 0 keeps them inside."""
    rows, width = steps.shape
    flat = steps.reshape(rows * width)
    queued = 0
    for place in range(flat.size):
        queue[queued] = place  # stays there only where the count grows
        queued += flat[place] == 1
    reached = 0
    while reached < queued:
        place = np.int64(at(queue, reached))
        reached += 1
        ahead = at(flat, place) + 1
        for code in range(1, 9):
            other = place + STEP_ROW[code] * width + STEP_COL[code]
            if at(flat, other) == UNKNOWN:
                flat[np.uint64(other)] = ahead
                queue[np.uint64(queued)] = other
                queued += 1


@kernel
def _spread(steps, cols, limits, seeds, seeded, queue, queued):
    """
    Count steps breadth first inside a block from `seeds`, sorted by their steps, and from `queue`.

    Whichever is nearer goes first, so each cell settles once. Returns the number of cells in the queue.
    """
    row0, row1, col0, col1 = limits
    seed, place = 0, 0
    while seed < seeded or place < queued:
        from_seed = seed < seeded
        if from_seed and place < queued:
            one, two = at(seeds, seed), at(queue, place)
            from_seed = at(steps, (one >> 32) * cols + (one & COL_MASK)) <= at(steps, (two >> 32) * cols + (two & COL_MASK))
        cell = at(seeds, seed) if from_seed else at(queue, place)
        seed, place = seed + from_seed, place + (not from_seed)
        row, col = cell >> 32, cell & COL_MASK
        ahead = np.int64(at(steps, row * cols + col)) + 1
        for code in range(1, 9):
            to_row, to_col = row + STEP_ROW[code], col + STEP_COL[code]
            inside = row0 <= to_row < row1 and col0 <= to_col < col1
            if inside and at(steps, to_row * cols + to_col) > ahead:
                steps[to_row * cols + to_col] = ahead
                queue[queued] = to_row * ROW_UNIT + to_col
                queued += 1
    return queued


@part
def _improve_border(steps, cols, limits, row, col, seeds, seeded):
    """Lower a cell to a step more than its least neighbour outside the block; list it where that helps."""
    row0, row1, col0, col1 = limits
    here = at(steps, row * cols + col)
    if here == 0:
        return seeded
    least = np.int64(here)
    for code in range(1, 9):
        to_row, to_col = row + STEP_ROW[code], col + STEP_COL[code]
        inside = row0 <= to_row < row1 and col0 <= to_col < col1
        there = np.int64(at(steps, to_row * cols + to_col))
        if not inside and there > 0:
            least = min(least, there + 1)
    if least < here:
        steps[row * cols + col] = least
        seeds[seeded] = row * ROW_UNIT + col
        seeded += 1
    return seeded


@part
def _who_gains(steps, cols, limits, cell):
    """Return as bits 1 to 8 in which directions from its block the steps of a cell can lower others."""
    row0, row1, col0, col1 = limits
    row, col = cell >> 32, cell & COL_MASK
    if row0 < row < row1 - 1 and col0 < col < col1 - 1:
        return 0
    ahead = np.int64(at(steps, row * cols + col)) + 1
    gains = 0
    for code in range(1, 9):
        to_row, to_col = row + STEP_ROW[code], col + STEP_COL[code]
        down = (to_row >= row1) - (to_row < row0)
        along = (to_col >= col1) - (to_col < col0)
        if (down != 0 or along != 0) and at(steps, to_row * cols + to_col) > ahead:
            gains |= 1 << (3 * (down + 1) + along + 1)
    return gains


@kernel
def cross_flats(steps, cols, limits, seeds, queue):
    """
    Bring steps from other blocks into a block, and spread them there. `steps` is flat, `cols` cells to a row.

    `seeds` takes the cells of the block's border, `queue` all of its cells. Returns the blocks around that gain by it:
    bit 3 (down + 1) + along + 1 for the block `down` rows and `along` columns of blocks away.
    """
    row0, row1, col0, col1 = limits
    seeded = 0
    for row in range(row0, row1):
        beside = row == row0 or row == row1 - 1
        step = 1 if beside else max(1, col1 - col0 - 1)
        for col in range(col0, col1, step):
            seeded = _improve_border(steps, cols, limits, row, col, seeds, seeded)
    if seeded == 0:
        return 0
    value = np.empty(seeded, np.int32)
    for place in range(seeded):
        value[place] = at(steps, (seeds[place] >> 32) * cols + (seeds[place] & COL_MASK))
    order = ascending(value.view(np.float32))  # the bits of whole numbers above 0 ascend as heights do
    nearest = np.empty(seeded, np.int64)
    for place in range(seeded):
        nearest[place] = seeds[order[place]]
    queued = _spread(steps, cols, limits, nearest, np.int64(seeded), queue, np.int64(0))
    gains = 0
    for place in range(seeded):
        gains |= _who_gains(steps, cols, limits, seeds[place])
    for place in range(queued):
        gains |= _who_gains(steps, cols, limits, queue[place])
    return gains


@kernel
def direct_flats(filled, toward, away, cols, direction, row0, row1):
    """
    Direct flat cells to the neighbour of equal height with the least 2 toward - away; ways out come first.

    Arrays are flat, `cols` cells to a row; `filled` is padded by one.
    """
    for row in range(row0, row1):
        for col in range(cols):
            place = row * cols + col
            if at(toward, place) == 0:
                continue
            node = place + cols + 3 + 2 * row  # of the same cell in the padded array
            here = at(filled, node)
            best = np.int64(2**62)
            for turn in range(8):
                row_step, col_step = STEP_ROW[FLAT_ORDER[turn]], STEP_COL[FLAT_ORDER[turn]]
                steps = np.int64(at(toward, place + row_step * cols + col_step))
                off = np.int64(at(away, place + row_step * cols + col_step))
                worth = 2 * steps - (off if off != UNKNOWN else 0)
                worth = worth if steps > 0 else WAY_OUT
                rank = worth * 8 + turn  # the first of equals
                level = at(filled, node + row_step * (cols + 2) + col_step) == here
                best = min(best, rank if level else best)
            direction[place] = FLAT_ORDER[best & 7]
