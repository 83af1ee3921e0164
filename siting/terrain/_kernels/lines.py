"""Walks along marked cells: from heads and confluences down, one line after another."""

from siting.terrain._kernels.direction import STEP_COL, STEP_ROW
from siting.terrain._kernels.jit import kernel


@kernel
def count_marked_inflows(direction, mark, inflows):
    """Count for each cell the marked neighbours that drain into it."""
    rows, cols = direction.shape
    for row in range(rows):
        for col in range(cols):
            count = 0
            for code in range(1, 9):
                from_row, from_col = row - STEP_ROW[code], col - STEP_COL[code]
                if 0 <= from_row < rows and 0 <= from_col < cols and mark[from_row, from_col]:
                    count += 1 if direction[from_row, from_col] == code else 0
            inflows[row, col] = count


@kernel
def trace_lines(direction, mark, inflows, cells, start, last):
    """
    Write the cells of all lines, where each begins, and the last cell of each above the confluence that ends it.

    A line begins where not exactly one marked cell flows in, and runs down to the next such cell, which it includes,
    or to the last marked cell. A line of a single cell is left out. Room: `last` has one entry, and `start` one more,
    for each cell where a line may begin; `cells` one for each of these and each marked cell.
    Returns the number of lines, and of marked cells on none.
    """
    rows, cols = direction.shape
    lines, end, isolated = 0, 0, 0
    start[0] = 0
    for head_row in range(rows):
        for head_col in range(cols):
            if not mark[head_row, head_col] or inflows[head_row, head_col] == 1:
                continue
            row, col = head_row, head_col
            cells[end] = row * cols + col
            size, joins = 1, 0
            while joins == 0 and direction[row, col] <= 8:
                code = direction[row, col]
                row, col = row + STEP_ROW[code], col + STEP_COL[code]
                if not mark[row, col]:
                    break
                cells[end + size] = row * cols + col
                size += 1
                joins = 1 if inflows[row, col] > 1 else 0
            if size == 1:
                isolated += 1 if inflows[head_row, head_col] == 0 else 0
                continue
            last[lines] = cells[end + size - 1 - joins]
            lines, end = lines + 1, end + size
            start[lines] = end
    return lines, isolated
