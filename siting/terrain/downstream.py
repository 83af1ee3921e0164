"""What lies below each cell on its flow path, and what lies above it."""

import numpy as np
import numpy.typing as npt

from siting.terrain._kernels.direction import STEP_COL, STEP_ROW
from siting.terrain._kernels.walk import carry_bits, first_target
from siting.terrain.condition import Directions, FloatArray, Mask
from siting.terrain.gather import gather

Indices = npt.NDArray[np.int64]


def step_lengths(cell_width_m: FloatArray, cell_height_m: FloatArray) -> FloatArray:
    """Return the length of a step along the row, diagonal and across rows, for each row, m."""
    return np.column_stack([cell_width_m, np.hypot(cell_width_m, cell_height_m), cell_height_m])


def first_below(
    direction: Directions,
    is_target: Mask,
    *,
    cell_width_m: FloatArray,
    cell_height_m: FloatArray,
    include_self: bool,
) -> tuple[Indices, FloatArray]:
    """
    Find the first marked cell on each cell's flow path.

    Returns
    -------
    target, distance_m
        Its flat index, -1 where the path meets none; and the length of the path, centre to centre (0 at a marked
        cell that counts for itself; NaN where there is none).
    """
    target = np.empty(direction.size, dtype=np.int64)
    distance = np.empty(direction.size, dtype=np.float64)
    stack = np.empty(direction.size, dtype=np.int64)
    lengths = step_lengths(cell_width_m, cell_height_m)
    first_target(direction, is_target, lengths, include_self, target, distance, stack)
    return target.reshape(direction.shape), distance.reshape(direction.shape)


def highest_above(
    direction: Directions, elevation: npt.NDArray[np.floating], *, threads: int = 1
) -> npt.NDArray[np.float32]:
    """Return the greatest height among each cell and all cells upstream of it, m; NaN at voids."""
    highest = np.array(elevation, dtype=np.float32, order="C")
    gather(direction, highest, largest=True, threads=threads)
    return highest


def any_above(direction: Directions, mark: Mask) -> Mask:
    """Tell of each cell whether it, or any cell upstream of it, is marked; voids tell nothing (False)."""
    bits = np.ascontiguousarray(np.where(direction == 255, False, mark), dtype=np.uint8)
    carry_bits(direction.ravel(), bits.ravel(), direction.shape[1])
    return bits.view(np.bool_)


def flow_path(direction: Directions, start: int) -> Indices:
    """Return the flat indices from a cell to the end of its flow, both included."""
    cols = direction.shape[1]
    path = [start]
    while (code := int(direction[path[-1] // cols, path[-1] % cols])) <= 8:
        path.append(path[-1] + int(STEP_ROW[code]) * cols + int(STEP_COL[code]))
    return np.array(path, dtype=np.int64)
