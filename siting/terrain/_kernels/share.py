"""
Multiple flow in the pull form: each cell adds its neighbours' shares in a fixed order, once all of them are final.

So every sum is a function of the raster alone: neither blocks nor threads can change a bit of it. Arrays are padded
by one cell, which replaces all tests of the raster's edge, and flat, `width` cells to a padded row; only `total` is
not padded.
"""

import numpy as np

from siting.terrain._kernels.direction import STEP_COL, STEP_ROW
from siting.terrain._kernels.jit import at, kernel, part

KEEPS, SHARES = 0, 255
"""What a cell does with its water besides giving all of it to one neighbour (1 to 8): keep it, or share it."""

FINAL = 64
"""State of a cell that waits for nobody more and is done; also of voids and of the ring."""

COUNT_MASK = 127
"""Bits of a state that count the neighbours still waited for; 0 in a cell that is ready."""

FED_WHOLE = 128
"""Bit of a state: a neighbour without lower ground gives this cell all its water."""

ROW_UNIT, NODE_MASK = 1 << 40, (1 << 40) - 1
"""A stacked cell is its row times ROW_UNIT plus its flat index: the row is needed, and dividing for it is slow."""


@kernel
def find_pourers(heights, direction, pours, row0, row1):
    """Tell for rows `row0` to `row1` who shares (some neighbour is lower), and to whom the others give all."""
    cols = direction.shape[1]
    for row in range(row0, row1):
        north, middle, south, out = heights[row], heights[row + 1], heights[row + 2], pours[row + 1]
        for col in range(cols):
            here = middle[col + 1]
            lower = (north[col] < here) | (north[col + 1] < here) | (north[col + 2] < here)
            lower |= (middle[col] < here) | (middle[col + 2] < here)
            lower |= (south[col] < here) | (south[col + 1] < here) | (south[col + 2] < here)
            code = direction[row, col]
            given = np.uint8(SHARES) if lower else code
            out[col + 1] = given if code <= 8 else np.uint8(KEEPS)


@part
def _shares_down(pours, there, here):
    return np.uint8((pours == SHARES) & (there > here))


@kernel
def count_donors(heights, pours, direction, state, row0, row1):
    """Count for rows `row0` to `row1` the neighbours whose water each cell waits for."""
    for row in range(row0, row1):
        above, beside, below = heights[row], heights[row + 1], heights[row + 2]
        north, middle, south, out = pours[row], pours[row + 1], pours[row + 2], state[row + 1]
        for col in range(direction.shape[1]):
            here = beside[col + 1]
            shared = _shares_down(north[col], above[col], here) + _shares_down(north[col + 1], above[col + 1], here)
            shared += _shares_down(north[col + 2], above[col + 2], here) + _shares_down(middle[col], beside[col], here)
            shared += _shares_down(middle[col + 2], beside[col + 2], here) + _shares_down(south[col], below[col], here)
            shared += _shares_down(south[col + 1], below[col + 1], here)
            shared += _shares_down(south[col + 2], below[col + 2], here)
            whole = np.uint8(north[col] == 2) + np.uint8(north[col + 1] == 3) + np.uint8(north[col + 2] == 4)
            whole += np.uint8(middle[col] == 1) + np.uint8(middle[col + 2] == 5)
            whole += np.uint8(south[col] == 8) + np.uint8(south[col + 1] == 7) + np.uint8(south[col + 2] == 6)
            found = shared + whole + (FED_WHOLE if whole > 0 else 0)
            out[col + 1] = np.uint8(FINAL if direction[row, col] == 255 else found)
        out[0], out[direction.shape[1] + 1] = FINAL, FINAL


@part
def _fall(fall):
    """Return a fall where it is one, else 0, in 64 bits; NaN, the fall to or from a void, compares false."""
    return np.float64(fall) if fall > 0 else 0.0


@part
def _settle(heights, pours, weights, own, total, flux, width, row, node, fed_whole):
    """Make a cell final: its total, and its flux, which is its total by unit of weighed fall where it shares."""
    here = at(heights, node)
    up, down = node - width, node + width
    e, w = at(heights, node + 1) - here, at(heights, node - 1) - here
    n, ne, nw = at(heights, up) - here, at(heights, up + 1) - here, at(heights, up - 1) - here
    s, se, sw = at(heights, down) - here, at(heights, down + 1) - here, at(heights, down - 1) - here
    along, slant, across = at(weights, 3 * row), at(weights, 3 * row + 1), at(weights, 3 * row + 2)
    slant_n, across_n = at(weights, 3 * row - 2), at(weights, 3 * row - 1)  # the weights are those of the giver's row
    slant_s, across_s = at(weights, 3 * row + 4), at(weights, 3 * row + 5)
    # sums in pairs make short chains of additions: most cells wait for the flux of the cell just before
    sides = (_fall(e) * along * at(flux, node + 1) + _fall(w) * along * at(flux, node - 1)) + (
        _fall(s) * across_s * at(flux, down) + _fall(n) * across_n * at(flux, up)
    )
    corners = (_fall(se) * slant_s * at(flux, down + 1) + _fall(sw) * slant_s * at(flux, down - 1)) + (
        _fall(nw) * slant_n * at(flux, up - 1) + _fall(ne) * slant_n * at(flux, up + 1)
    )
    found = at(own, row) + (sides + corners)
    if fed_whole:
        for code in range(1, 9):
            giver_row = row - STEP_ROW[code]
            giver = node - STEP_ROW[code] * width - STEP_COL[code]
            if at(pours, giver) == code:
                found += at(total, giver - width + 1 - 2 * giver_row)
    total[np.uint64(node - width + 1 - 2 * row)] = found
    if at(pours, node) == SHARES:
        falls = (_fall(-e) + _fall(-w)) * along + (_fall(-s) + _fall(-n)) * across
        falls += ((_fall(-se) + _fall(-sw)) + (_fall(-nw) + _fall(-ne))) * slant
        flux[np.uint64(node)] = found * (1.0 / falls)


@part
def _receives(heights, pours, node, other, code):
    """Tell whether the neighbour `other`, in direction `code`, receives water of a cell."""
    gives = at(pours, node)
    return gives == code or (gives == SHARES and at(heights, other) < at(heights, node))


@part
def _tell(state, stack, depth, stacked, lower):
    """Tell one receiver that a giver is final; stack it if it is ready now. Returns the new depth."""
    place = np.uint64(stacked & NODE_MASK)
    left = np.uint8(state[place] - np.uint8(lower))
    state[place] = left
    stack[np.uint64(depth)] = stacked  # stays there only where the depth grows: no branch to miss
    return depth + np.int64(lower & (left & COUNT_MASK == 0))


@part
def _release_inside(heights, state, width, stacked, stack, depth):
    """Tell the lower neighbours of a sharing cell, all in its block, that it is final; stack those that are ready."""
    node = stacked & NODE_MASK
    here, up, down = at(heights, node), node - width, node + width
    above, below = stacked - ROW_UNIT - width, stacked + ROW_UNIT + width
    e, w = at(heights, node + 1) < here, at(heights, node - 1) < here
    s, se, sw = at(heights, down) < here, at(heights, down + 1) < here, at(heights, down - 1) < here
    n, ne, nw = at(heights, up) < here, at(heights, up + 1) < here, at(heights, up - 1) < here
    depth = _tell(state, stack, depth, stacked + 1, e)
    depth = _tell(state, stack, depth, below + 1, se)
    depth = _tell(state, stack, depth, below, s)
    depth = _tell(state, stack, depth, below - 1, sw)
    depth = _tell(state, stack, depth, stacked - 1, w)
    depth = _tell(state, stack, depth, above - 1, nw)
    depth = _tell(state, stack, depth, above, n)
    return _tell(state, stack, depth, above + 1, ne)


@kernel
def _release_border(heights, pours, state, width, limits, stacked, stack, depth):
    """Do the same for any cell on the border of its block; neighbours outside are let be."""
    row0, row1, col0, col1 = limits
    node = stacked & NODE_MASK
    row = stacked >> 40
    col = node - row * width
    for code in range(1, 9):
        to_row, to_col = row + STEP_ROW[code], col + STEP_COL[code]
        other = to_row * width + to_col
        inside = row0 < to_row <= row1 and col0 < to_col <= col1
        if inside and _receives(heights, pours, node, other, code):
            left = np.uint8(at(state, other) - np.uint8(1))
            state[np.uint64(other)] = left
            if left & COUNT_MASK == 0:
                stack[depth] = to_row * ROW_UNIT + other
                depth += 1
    return depth


@kernel
def share_in_block(heights, pours, state, weights, own, total, flux, width, limits, stack, pending):
    """
    Make all cells of a block final that wait for no cell outside it; list those on its border that now are final.

    `limits` is (first row, row after, first column, column after) without the ring. `weights` holds three numbers a
    padded row: contour length over distance along the row, diagonal and across rows. `own` is the cells' own amount
    for each padded row; `flux` comes as 0. Returns how many are `pending`, see `release_outside`.
    """
    row0, row1, col0, col1 = limits
    waiting = 0
    for first_row in range(row0 + 1, row1 + 1):
        for first_col in range(col0 + 1, col1 + 1):
            first = first_row * width + first_col
            if at(state, first) & COUNT_MASK != 0:
                continue
            stack[0], depth = first_row * ROW_UNIT + first, 1
            while depth > 0:
                depth -= 1
                stacked = at(stack, depth)
                node, row = stacked & NODE_MASK, stacked >> 40
                fed_whole = at(state, node) >= FED_WHOLE
                state[np.uint64(node)] = FINAL
                _settle(heights, pours, weights, own, total, flux, width, row, node, fed_whole)
                gives = np.int64(at(pours, node))
                col = node - row * width
                on_border = row == row0 + 1 or row == row1 or col == col0 + 1 or col == col1
                if gives == KEEPS:
                    continue
                if on_border:
                    depth = _release_border(heights, pours, state, width, limits, stacked, stack, depth)
                    pending[waiting] = stacked
                    waiting += 1
                elif gives == SHARES:
                    depth = _release_inside(heights, state, width, stacked, stack, depth)
                else:
                    row_step, col_step = at(STEP_ROW, gives), at(STEP_COL, gives)
                    receiver = stacked + row_step * (ROW_UNIT + width) + col_step
                    depth = _tell(state, stack, depth, receiver, True)
    return waiting


@kernel
def release_outside(heights, pours, state, width, limits, pending):
    """Tell the receivers beyond a block's border that the `pending` cells are final."""
    row0, row1, col0, col1 = limits
    for stacked in pending:
        node, row = stacked & NODE_MASK, stacked >> 40
        col = node - row * width
        for code in range(1, 9):
            to_row, to_col = row + STEP_ROW[code], col + STEP_COL[code]
            inside = row0 < to_row <= row1 and col0 < to_col <= col1
            other = to_row * width + to_col
            if not inside and _receives(heights, pours, node, other, code):
                state[other] -= np.uint8(1)
