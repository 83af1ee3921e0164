"""What comes together down the drainage: sums and maxima over all cells upstream, in blocks on threads."""

from typing import Any

import numpy as np
import numpy.typing as npt

from siting.parallel import run_all
from siting.terrain._kernels.accumulate import count_inflows, count_unfinished, walk_block, walk_rest
from siting.terrain.condition import Directions, blocks_of, row_bands

BAND_ROWS = 64


def gather(direction: Directions, value: npt.NDArray[Any], *, largest: bool, threads: int, block: int = 256) -> Directions:
    """
    Turn each cell's own value, in place, into the sum or the `largest` of its own and those of all cells upstream.

    Returns the state of each cell: DONE, save for voids and for cells that wait in vain because flow runs in a circle
    there or above.
    """
    rows, cols = direction.shape
    inflows = np.empty(direction.shape, dtype=np.uint8)
    run_all(lambda row0, row1: count_inflows(direction, inflows, row0, row1), row_bands(rows, BAND_ROWS), threads)
    codes, states, values = direction.ravel(), inflows.ravel(), value.ravel()

    def work(*limits: int) -> npt.NDArray[np.int64]:
        pending = np.empty(2 * (limits[1] - limits[0] + limits[3] - limits[2]), dtype=np.int64)
        waiting = walk_block(codes, states, values, cols, limits, largest, pending)
        return pending[:waiting]

    waiting = run_all(work, blocks_of((rows, cols), max(1, block)), threads)
    walk_rest(codes, states, values, cols, largest, np.concatenate(waiting))
    return inflows


def unfinished(direction: Directions, inflows: Directions, threads: int) -> int:
    """Count the cells that `gather` could not finish."""
    bands = row_bands(direction.shape[0], BAND_ROWS)
    return int(sum(run_all(lambda row0, row1: count_unfinished(direction, inflows, row0, row1), bands, threads)))
