"""
Directions across flats by integer steps, in blocks.

Steps are upper bounds that only fall until every cell obeys the distance equation, whose solution is unique: neither
blocks nor threads can change it. A flat cell never lies beside a void, so its neighbours are always there. Arrays of
steps and directions are flat, `cols` cells to a row; `filled` is padded by one and flat.
"""

import numpy as np

from siting.terrain._kernels.direction import FLAT, FLAT_ORDER, STEP_COL, STEP_ROW
from siting.terrain._kernels.jit import at, kernel, part
from siting.terrain._kernels.sorting import ascending

UNKNOWN = 2**31 - 2
"""Steps of a flat cell that nothing has reached; cells that are not flat have 0."""

ROW_UNIT, COL_MASK = 1 << 32, (1 << 32) - 1
"""A queued cell is its row times ROW_UNIT plus its column."""

WAY_OUT = -(2**40)
"""What a neighbour counts that is a way out of the flat: less than any steps."""


@kernel
def start_flats(filled, direction, cols, toward, away, limits, outs, highs):
    """
    Count steps inside one block: `toward` from cells beside a way out, `away` from cells beside higher ground.

    Both come as 0. `outs` and `highs` are queues that take each cell of the block.
    """
    row0, row1, col0, col1 = limits
    last_out = last_high = 0
    for row in range(row0, row1):
        for col in range(col0, col1):
            place = row * cols + col
            if at(direction, place) != FLAT:
                continue
            node = place + cols + 3 + 2 * row  # of the same cell in the padded array
            here = at(filled, node)
            way_out = higher = False
            for code in range(1, 9):
                there = at(filled, node + STEP_ROW[code] * (cols + 2) + STEP_COL[code])
                flat = at(direction, place + STEP_ROW[code] * cols + STEP_COL[code]) == FLAT
                way_out |= (there == here) & (not flat)
                higher |= there > here
            toward[place] = 1 if way_out else UNKNOWN
            away[place] = 1 if higher else UNKNOWN
            outs[last_out] = highs[last_high] = row * ROW_UNIT + col  # stays there only where the count grows
            last_out += way_out
            last_high += higher
    none = np.int64(0)  # typed: a bare number would be compiled for by itself
    _spread(toward, cols, limits, outs, none, outs, np.int64(last_out))
    _spread(away, cols, limits, highs, none, highs, np.int64(last_high))


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
    Bring steps from other blocks into a block, and spread them there.

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
    """Direct flat cells to the neighbour of equal height with the least 2 toward - away; ways out come first."""
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
