"""Sums down the drainage: in blocks first, then across what waited for other blocks."""

from siting.terrain._kernels.direction import STEP_COL, STEP_ROW
from siting.terrain._kernels.jit import kernel


@kernel
def count_astray(direction, row0, row1):
    """Count in rows `row0` to `row1` the codes that are no direction, or lead off the raster or into a void."""
    rows, cols = direction.shape
    astray = 0
    for row in range(row0, row1):
        for col in range(cols):
            code = direction[row, col]
            if 9 <= code <= 10 or code == 255:
                continue
            if code == 0 or code > 10:
                astray += 1
                continue
            to_row, to_col = row + STEP_ROW[code], col + STEP_COL[code]
            inside = 0 <= to_row < rows and 0 <= to_col < cols
            astray += 0 if inside and direction[to_row, to_col] != 255 else 1
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
def walk_block(direction, inflows, total, row0, row1, col0, col1, pending):
    """Add down from every source of a block; list the cells whose water leaves it. Returns how many."""
    waiting = 0
    for row in range(row0, row1):
        for col in range(col0, col1):
            if inflows[row, col] != 0 or direction[row, col] == 255:
                continue
            here_row, here_col = row, col
            while True:
                inflows[here_row, here_col] = 255  # done
                code = direction[here_row, here_col]
                if code > 8:
                    break
                to_row, to_col = here_row + STEP_ROW[code], here_col + STEP_COL[code]
                if to_row < row0 or to_row >= row1 or to_col < col0 or to_col >= col1:
                    pending[waiting] = here_row * direction.shape[1] + here_col
                    waiting += 1
                    break
                total[to_row, to_col] += total[here_row, here_col]
                inflows[to_row, to_col] -= 1
                # a cell further on in the block is met by the scan: but it may lie behind it
                if inflows[to_row, to_col] != 0:
                    break
                here_row, here_col = to_row, to_col
    return waiting


@kernel
def walk_rest(direction, inflows, total, pending):
    """Finish the walks that waited for other blocks."""
    cols = direction.shape[1]
    for start in pending:
        row, col = start // cols, start % cols
        while direction[row, col] <= 8:
            code = direction[row, col]
            to_row, to_col = row + STEP_ROW[code], col + STEP_COL[code]
            total[to_row, to_col] += total[row, col]
            inflows[to_row, to_col] -= 1
            if inflows[to_row, to_col] != 0:
                break
            inflows[to_row, to_col] = 255
            row, col = to_row, to_col


@kernel
def share_down(filled, direction, weights, total, inflows, stack):
    """
    Share each cell's water among all lower neighbours in proportion to slope and contour length.

    `filled` is padded by one; `weights` is (rows, 3): contour length over distance along the row, diagonal and across
    rows. `total` holds each cell's own amount. Cells without a lower neighbour follow `direction`.
    One pass whose order depends on the raster alone.
    """
    rows, cols = direction.shape
    for row in range(rows):
        for col in range(cols):
            inflows[row, col] = _contributors(filled, direction, row, col)
    for row in range(rows):
        for col in range(cols):
            if direction[row, col] == 255 or inflows[row, col] != 0:
                continue
            stack[0] = row * cols + col
            depth = 1
            while depth > 0:
                depth -= 1
                depth = _pour(filled, direction, weights, total, inflows, stack, depth)


@kernel
def _falls(filled, row, col):
    """Tell whether a cell has a lower neighbour."""
    here = filled[row + 1, col + 1]
    lower = False
    for code in range(1, 9):
        lower |= filled[row + 1 + STEP_ROW[code], col + 1 + STEP_COL[code]] < here
    return lower


@kernel
def _contributors(filled, direction, row, col):
    rows, cols = direction.shape
    here = filled[row + 1, col + 1]
    count = 0
    for code in range(1, 9):
        from_row, from_col = row - STEP_ROW[code], col - STEP_COL[code]
        if not (0 <= from_row < rows and 0 <= from_col < cols):
            continue
        there = filled[from_row + 1, from_col + 1]
        if (there > here and direction[from_row, from_col] <= 8) or (
            direction[from_row, from_col] == code and not _falls(filled, from_row, from_col)
        ):
            count += 1
    return count


@kernel
def _pour(filled, direction, weights, total, inflows, stack, depth):
    """Share out the cell at `stack[depth]`; push those that wait for nobody more. Returns the new depth."""
    cols = direction.shape[1]
    row, col = stack[depth] // cols, stack[depth] % cols
    inflows[row, col] = 255  # done
    code = direction[row, col]
    if code > 8:
        return depth
    here = filled[row + 1, col + 1]
    sum_weight = 0.0
    for turn in range(1, 9):
        fall = here - filled[row + 1 + STEP_ROW[turn], col + 1 + STEP_COL[turn]]
        if fall > 0:
            sum_weight += fall * _weight(weights, row, turn)
    for turn in range(1, 9):
        to_row, to_col = row + STEP_ROW[turn], col + STEP_COL[turn]
        fall = here - filled[to_row + 1, to_col + 1]
        if sum_weight > 0 and fall > 0:
            total[to_row, to_col] += total[row, col] * (fall * _weight(weights, row, turn) / sum_weight)
        elif sum_weight == 0 and turn == code:
            total[to_row, to_col] += total[row, col]
        else:
            continue
        inflows[to_row, to_col] -= 1
        if inflows[to_row, to_col] == 0:
            stack[depth] = to_row * cols + to_col
            depth += 1
    return depth


@kernel
def _weight(weights, row, turn):
    if turn == 1 or turn == 5:
        return weights[row, 0]
    if turn == 3 or turn == 7:
        return weights[row, 2]
    return weights[row, 1]
