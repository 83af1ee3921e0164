"""Contributing area: sums down the drainage, whose bits no order of blocks or threads can change."""

import numpy as np
import numpy.typing as npt

from siting.errors import GridError
from siting.parallel import run_all
from siting.terrain._kernels.accumulate import count_astray, count_inflows, share_down, walk_block, walk_rest
from siting.terrain.condition import Directions, FloatArray, Heights, blocks_of, row_bands

CONTOUR_CARDINAL, CONTOUR_DIAGONAL = 0.5, 0.354
"""Contour lengths of Quinn et al. (1991), in cells, towards a side and towards a corner."""


def accumulate(direction: Directions, weight: FloatArray, *, threads: int, block: int = 256) -> FloatArray:
    """
    Sum a weight over each cell and all cells upstream of it.

    Parameters
    ----------
    direction
        1 to 8 for E SE S SW W NW N NE; 9, 10 ends of flow; 255 void.
    weight
        One value for each row, or for each cell. Sums are exact, and so free of order, where weights are
        multiples of one power of two, as the cell areas of a Grid are.
    threads, block
        How to compute.

    Returns
    -------
    array
        float64 (rows, columns), NaN at voids.

    Raises
    ------
    GridError
        Where a cell has no direction, flow leaves the raster or enters a void, or flow runs in a circle.
    """
    if weight.shape not in (direction.shape, direction.shape[:1]):
        msg = f"a weight of shape {weight.shape} does not fit directions of shape {direction.shape}"
        raise GridError(msg)
    _refuse_astray(direction)
    by_cell = weight if weight.ndim == 2 else weight[:, None]
    total = np.empty(direction.shape, dtype=np.float64)
    total[...] = by_cell
    inflows = np.empty(direction.shape, dtype=np.uint8)
    bands = row_bands(direction.shape[0], 64)
    run_all(lambda r0, r1: count_inflows(direction, inflows, r0, r1), bands, threads)

    def work(row0: int, row1: int, col0: int, col1: int) -> npt.NDArray[np.int64]:
        pending = np.empty(2 * (row1 - row0 + col1 - col0), dtype=np.int64)
        waiting = walk_block(direction, inflows, total, row0, row1, col0, col1, pending)
        return pending[:waiting]

    waiting = run_all(work, blocks_of((direction.shape[0], direction.shape[1]), block), threads)
    walk_rest(direction, inflows, total, np.concatenate(waiting))
    _refuse_waiting(direction, inflows)
    total[direction == 255] = np.nan
    return total


def multiple_flow_area(
    filled: Heights,
    direction: Directions,
    *,
    cell_area_m2: FloatArray,
    cell_width_m: FloatArray,
    cell_height_m: FloatArray,
) -> FloatArray:
    """
    Contributing area in m2 with each cell's water shared among all lower neighbours.

    Shares are proportional to slope (exponent 1) and contour length; a cell without a lower neighbour
    follows its single direction. The order of work depends on the raster alone. NaN at voids. Raises
    GridError where directions lead nowhere, or in a circle with the fall of the surface.

    References
    ----------
    Quinn, Beven, Chevallier & Planchon (1991).
    """
    _refuse_astray(direction)
    rows, cols = direction.shape
    padded = np.full((rows + 2, cols + 2), np.nan, dtype=np.float32)
    padded[1:-1, 1:-1] = filled
    slant = np.hypot(cell_width_m, cell_height_m)
    size = np.sqrt(cell_width_m * cell_height_m)
    weights = np.column_stack(
        [
            CONTOUR_CARDINAL * size / cell_width_m,
            CONTOUR_DIAGONAL * size / slant,
            CONTOUR_CARDINAL * size / cell_height_m,
        ]
    )
    total = np.empty(direction.shape, dtype=np.float64)
    total[...] = cell_area_m2[:, None]
    inflows = np.empty(direction.shape, dtype=np.uint8)
    stack = np.empty(direction.size + 8, dtype=np.int64)
    share_down(padded, direction, weights, total, inflows, stack)
    _refuse_waiting(direction, inflows)
    total[direction == 255] = np.nan
    return total


def _refuse_astray(direction: Directions) -> None:
    """Refuse codes that are no direction, and directions that lead off the raster or into a void."""
    bands = row_bands(direction.shape[0], 1024)
    astray = sum(count_astray(direction, row0, row1) for row0, row1 in bands)
    if astray:
        msg = (
            f"{astray} cells have flow directions that are no code or lead off the raster or into a void; "
            "use 1 to 8 inside, 9 where flow leaves the data, 10 at the end of a pan, 255 for voids"
        )
        raise GridError(msg)


def _refuse_waiting(direction: Directions, inflows: npt.NDArray[np.uint8]) -> None:
    """Refuse to return sums of cells that were never finished: their flow runs in a circle."""
    waiting = int(np.count_nonzero((inflows != 255) & (direction != 255)))
    if waiting:
        msg = f"flow runs in a circle through or above {waiting} cells; correct the flow directions there"
        raise GridError(msg)
