"""Contributing area: sums down the drainage, whose bits no order of blocks or threads can change."""

import numpy as np
import numpy.typing as npt

from siting.errors import GridError
from siting.parallel import run_all
from siting.terrain._kernels.accumulate import count_astray
from siting.terrain._kernels.direction import VOID
from siting.terrain._kernels.share import FINAL, count_donors, find_pourers, release_outside, share_in_block
from siting.terrain.condition import Directions, FloatArray, Heights, blocks_of, row_bands, with_ring
from siting.terrain.gather import gather, unfinished

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
    _refuse_astray(direction, threads)
    by_cell = weight if weight.ndim == 2 else weight[:, None]
    total = np.empty(direction.shape, dtype=np.float64)

    def begin(first: int, last: int) -> None:
        total[first:last] = by_cell[first:last]
        total[first:last][direction[first:last] == VOID] = np.nan

    run_all(begin, row_bands(direction.shape[0], 64), threads)
    inflows = gather(direction, total, largest=False, threads=threads, block=block)
    _refuse_circles(unfinished(direction, inflows, threads))
    return total


def multiple_flow_area(
    filled: Heights,
    direction: Directions,
    *,
    cell_area_m2: FloatArray,
    cell_width_m: FloatArray,
    cell_height_m: FloatArray,
    threads: int = 1,
    block: int = 256,
) -> FloatArray:
    """
    Contributing area in m2 with each cell's water shared among all lower neighbours.

    Shares are proportional to slope (exponent 1) and contour length; a cell without a lower neighbour follows its single
    direction. A sum is taken once all its parts are final, in an order fixed by direction, so `threads` and `block`
    cannot change a bit of it. NaN at voids. Raises GridError where directions lead nowhere, or in a circle with the
    fall of the surface.

    References
    ----------
    Quinn, Beven, Chevallier & Planchon (1991).
    """
    _refuse_astray(direction, threads)
    rows, cols = direction.shape
    padded = (rows + 2, cols + 2)
    heights = with_ring(np.asarray(filled, dtype=np.float32))
    pours = np.zeros(padded, dtype=np.uint8)
    state = np.full(padded, FINAL, dtype=np.uint8)
    total = np.empty(direction.shape, dtype=np.float64)

    def begin(row0: int, row1: int) -> None:
        count_donors(heights, pours, direction, state, row0, row1)
        total[row0:row1] = np.nan

    bands = row_bands(rows, 64)
    run_all(lambda row0, row1: find_pourers(heights, direction, pours, row0, row1), bands, threads)
    run_all(begin, bands, threads)
    _share(
        heights.ravel(),
        pours.ravel(),
        state.ravel(),
        _weights(cell_width_m, cell_height_m).ravel(),
        np.pad(cell_area_m2, 1),
        total,
        threads,
        max(1, block),
    )
    _refuse_circles(int(np.count_nonzero(state != FINAL)))
    return total


def _weights(cell_width_m: FloatArray, cell_height_m: FloatArray) -> FloatArray:
    """Return contour length over distance along the row, diagonal and across rows, for each row of a padded raster."""
    slant = np.hypot(cell_width_m, cell_height_m)
    size = np.sqrt(cell_width_m * cell_height_m)
    along, across = CONTOUR_CARDINAL * size / cell_width_m, CONTOUR_CARDINAL * size / cell_height_m
    return np.pad(np.column_stack([along, CONTOUR_DIAGONAL * size / slant, across]), ((1, 1), (0, 0)))


def _share(
    heights: Heights,
    pours: Directions,
    state: Directions,
    weights: FloatArray,
    own: FloatArray,
    total: FloatArray,
    threads: int,
    block: int,
) -> None:
    """
    Share water in blocks, round by round, until all cells are final.

    A block stops where a cell waits for one outside. The next round's blocks are twice as large and moved by half their
    side, so that the borders of one round lie inside the blocks of the next; the last block is the raster.
    """
    rows, cols = total.shape
    width = cols + 2
    flux, flat_total = np.zeros(heights.size, dtype=np.float64), total.ravel()

    def work(*limits: int) -> npt.NDArray[np.int64]:
        row0, row1, col0, col1 = limits
        stack = np.empty((row1 - row0) * (col1 - col0) + 8, dtype=np.int64)
        pending = np.empty(2 * (row1 - row0 + col1 - col0), dtype=np.int64)
        count = share_in_block(heights, pours, state, weights, own, flat_total, flux, width, limits, stack, pending)
        return pending[:count].copy()

    side, shift = block, 0
    while True:
        blocks = blocks_of((rows, cols), side, shift)
        for limits, pending in zip(blocks, run_all(work, blocks, threads), strict=True):
            release_outside(heights, pours, state, width, limits, pending)
        if len(blocks) == 1:
            return
        side, shift = 2 * side, side


def _refuse_astray(direction: Directions, threads: int) -> None:
    """Refuse codes that are no direction, and directions that lead off the raster or into a void."""
    bands = row_bands(direction.shape[0], 64)
    astray = sum(run_all(lambda row0, row1: count_astray(direction, row0, row1), bands, threads))
    if astray:
        msg = (
            f"{astray} cells have flow directions that are no code or lead off the raster or into a void; "
            "use 1 to 8 inside, 9 where flow leaves the data, 10 at the end of a pan, 255 for voids"
        )
        raise GridError(msg)


def _refuse_circles(waiting: int) -> None:
    """Refuse to return sums of which some were never finished: their flow runs in a circle."""
    if waiting:
        msg = f"flow runs in a circle through or above {waiting} cells; correct the flow directions there"
        raise GridError(msg)
