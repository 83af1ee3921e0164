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
