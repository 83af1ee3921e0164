"""The share of each cell that a strip along the channels covers: sample points as the bits of one number."""

from typing import Any

import numpy as np
import numpy.typing as npt

from siting.terrain._kernels.direction import STEP_COL, STEP_ROW
from siting.terrain._kernels.jit import kernel

Array = npt.NDArray[Any]

FULL = np.uint64(0xFFFFFFFFFFFFFFFF)
SAMPLES = 8


@kernel
def _to_segment(x: float, y: float, bx: float, by: float) -> float:
    """Return the squared distance from a point to the segment from the origin to (bx, by)."""
    length = bx * bx + by * by
    along = 0.0 if length == 0.0 else min(1.0, max(0.0, (x * bx + y * by) / length))
    return (x - along * bx) ** 2 + (y - along * by) ** 2


@kernel
def _strip_in_cell(x: float, y: float, width: float, height: float, bx: float, by: float, half_m: float) -> np.uint64:
    """Return the sample points of one cell (centre x, y) that the strip about a segment covers, as bits."""
    covered = np.uint64(0)
    for place in range(SAMPLES * SAMPLES):
        dx = ((place % SAMPLES + 0.5) / SAMPLES - 0.5) * width
        dy = ((place // SAMPLES + 0.5) / SAMPLES - 0.5) * height
        if _to_segment(x + dx, y + dy, bx, by) < half_m * half_m:
            covered |= np.uint64(1) << np.uint64(place)
    return covered


@kernel
def mark_strips(
    channel: Array, direction: Array, width_m: Array, height_m: Array, y_m: Array, half_m: float, row0: int, covered: Array
) -> None:
    """
    Mark in `covered` (rows from `row0` on, 64 sample points a cell) what lies nearer than `half_m` to a channel link.

    `y_m` holds the ground distance of each row's centre from the north edge. Links of rows far from the band do nothing.
    """
    rows, cols = channel.shape
    row1 = row0 + covered.shape[0]
    for row in range(rows):
        if y_m[row] < y_m[row0] - half_m - 3 * height_m[row] or y_m[row] > y_m[row1 - 1] + half_m + 3 * height_m[row]:
            continue
        width = width_m[row]
        side = int(half_m / width) + 2
        for col in range(cols):
            if not channel[row, col]:
                continue
            code = direction[row, col]
            down, right = (STEP_ROW[code], STEP_COL[code]) if code <= 8 else (0, 0)
            bx, by = right * width, y_m[row + down] - y_m[row]
            for near_row in range(row0, row1):
                y = y_m[near_row] - y_m[row]
                half_diagonal = 0.5 * np.sqrt(width * width + height_m[near_row] * height_m[near_row])
                if y < min(0.0, by) - half_m - half_diagonal or y > max(0.0, by) + half_m + half_diagonal:
                    continue
                for near_col in range(max(0, col - side), min(cols, col + side + 1)):
                    if covered[near_row - row0, near_col] == FULL:
                        continue
                    x = (near_col - col) * width
                    far = np.sqrt(_to_segment(x, y, bx, by))
                    if far + half_diagonal < half_m:
                        covered[near_row - row0, near_col] = FULL
                    elif far - half_diagonal < half_m:
                        covered[near_row - row0, near_col] |= _strip_in_cell(x, y, width, height_m[near_row], bx, by, half_m)
