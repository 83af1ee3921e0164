"""The limits of the data: where water comes in that the data do not hold."""

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from siting.parallel import run_all
from siting.terrain._kernels.depressions import label_patches
from siting.terrain._kernels.walk import carry_bits, inward_sides
from siting.terrain.condition import Directions, Mask, row_bands

Sides = npt.NDArray[np.uint8]

SIDES = ("N", "E", "S", "W", "void")
"""Names of the bits 1, 2, 4, 8, 16 of `open_sides`."""

NORTH, EAST, SOUTH, WEST, VOID = 1, 2, 4, 8, 16
SIDE_OF_DIRECTION = np.array(
    [0, EAST, EAST | SOUTH, SOUTH, SOUTH | WEST, WEST, WEST | NORTH, NORTH, NORTH | EAST], dtype=np.uint8
)
"""Sides on which a missing neighbour in direction 0 (none) to 8 lies."""


def beside_void(valid: Mask) -> Mask:
    """Mark valid cells beside a void or the edge of the raster: where flow may leave or unseen water come in."""
    padded = np.pad(valid, 1, constant_values=False)
    rows, cols = valid.shape
    around = np.ones_like(valid)
    for row in range(3):
        for col in range(3):
            around &= padded[row : row + rows, col : col + cols]
    return valid & ~around


def enclosed_voids(valid: Mask) -> tuple[Mask, int]:
    """Mark the void cells that no 8-connected path of voids joins to the raster's edge; count their patches."""
    void = ~valid
    if not void.any():
        return void, 0
    label = np.zeros(valid.shape, dtype=np.int32)
    count = label_patches(void, label, np.empty(np.count_nonzero(void) + 1, dtype=np.int64))
    enclosed = np.ones(count + 1, dtype=np.bool_)
    enclosed[0] = False
    for border in (label[0], label[-1], label[:, 0], label[:, -1]):
        enclosed[border] = False
    return np.asarray(enclosed[label]), int(enclosed.sum())


def open_sides(direction: Directions, enclosed: Mask, *, threads: int = 1) -> Sides:
    """
    Tell of each cell from which sides its catchment may go on beyond the data; 0 where it is closed.

    Unseen water may come in wherever a cell beside the edge or a void drains on to a neighbour: all below such a cell
    carries its sides.

    Parameters
    ----------
    direction
        1 to 8 for E SE S SW W NW N NE; 9, 10 ends of flow; 255 void.
    enclosed
        Void cells that lie inside the data, see `enclosed_voids`. Other voids are ground outside the data's
        outline, and count by the side on which they lie.
    threads
        How to compute; cannot change the result.

    Returns
    -------
    array
        uint8: the sum of N 1, E 2, S 4, W 8, enclosed void 16 (see SIDES).
    """
    bits = np.empty(direction.shape, dtype=np.uint8)
    bands = row_bands(direction.shape[0], 64)
    run_all(lambda row0, row1: inward_sides(direction, enclosed, SIDE_OF_DIRECTION, VOID, bits, row0, row1), bands, threads)
    carry_bits(direction.ravel(), bits.ravel(), direction.shape[1])
    return bits


def sides_feeding(sides: Sides, cells: Sequence[int] | npt.NDArray[np.int64]) -> tuple[str, ...]:
    """Name the sides from which unseen water may reach a set of cells (flat indices); empty where it is closed."""
    bits = int(np.bitwise_or.reduce(sides.ravel()[np.asarray(cells, dtype=np.int64)], initial=0))
    return tuple(name for place, name in enumerate(SIDES) if bits >> place & 1)
