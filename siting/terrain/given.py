"""Directions that the user brings: checked, completed, and given a surface that agrees with them."""

import numpy as np
import numpy.typing as npt

from siting.errors import GridError, InputError
from siting.terrain._kernels.accumulate import DONE
from siting.terrain._kernels.direction import STEP_COL, STEP_ROW
from siting.terrain._kernels.walk import raise_along
from siting.terrain.condition import Conditioned, Directions, Heights, Mask
from siting.terrain.edges import beside_void
from siting.terrain.gather import gather

LAST_STEP, OUTLET, SINK, VOID = 8, 9, 10, 255


def follow(elevation: Heights, flow_direction: Directions) -> Conditioned:
    """
    Condition heights by given directions instead of by the heights.

    Parameters
    ----------
    elevation
        Heights in m (rows, columns), NaN void.
    flow_direction
        1 to 8 for E SE S SW W NW N NE; 9, 10 ends of flow; 255 not known. A step over the edge or into a void ends there
        (9), as does an unknown direction beside the edge or a void. What is given at voids is left out.

    Returns
    -------
    Conditioned
        `filled` is the lowest surface, never below the heights, that nowhere rises along the directions.

    Raises
    ------
    GridError
        Directions of another shape than the heights.
    InputError
        Codes other than these, unknown directions inside the data, or directions that run in a circle.
    """
    if flow_direction.shape != elevation.shape:
        msg = f"flow_direction has shape {flow_direction.shape}, the heights {elevation.shape}: give both on one grid"
        raise GridError(msg)
    valid = ~np.isnan(elevation)
    known = ((flow_direction >= 1) & (flow_direction <= SINK)) | (flow_direction == VOID)
    _refuse(valid & ~known, "hold a code other than 1 to 10 and 255", "translate them to the codes of this project")
    direction = np.where(valid, flow_direction, VOID).astype(np.uint8)
    lost = valid & (direction == VOID)
    direction[lost & beside_void(valid)] = OUTLET
    _refuse(valid & (direction == VOID), "have heights but no direction", "give one, or 10 where flow ends in a pan")
    direction[_steps_out(direction)] = OUTLET
    inflows = gather(direction, np.zeros(direction.shape, dtype=np.float32), largest=True, threads=1)
    _refuse(valid & (inflows != DONE), "run in a circle", "let them end (10) or lead out")
    filled = np.full(elevation.shape, np.nan, dtype=np.float32)
    raise_along(direction, elevation, filled, np.empty(direction.size + 1, dtype=np.int64))
    return Conditioned(filled, direction, 0)


def inner_ends(direction: Directions) -> npt.NDArray[np.int8]:
    """Return a layer of pans that keeps (1) each end of flow away from voids and the edge, and says nothing else (0)."""
    ends = (direction == OUTLET) | (direction == SINK)
    return np.asarray(ends & ~beside_void(direction != VOID), dtype=np.int8)


def _steps_out(direction: Directions) -> Mask:
    """Mark the cells whose direction leads over the edge or into a void."""
    valid = np.pad(direction != VOID, 1, constant_values=False)
    rows, cols = direction.shape
    out = np.zeros(direction.shape, dtype=np.bool_)
    for code in range(1, LAST_STEP + 1):
        row, col = 1 + int(STEP_ROW[code]), 1 + int(STEP_COL[code])
        out |= (direction == code) & ~valid[row : row + rows, col : col + cols]
    return out


def _refuse(wrong: Mask, what: str, way_out: str) -> None:
    if wrong.any():
        row, col = np.unravel_index(int(np.argmax(wrong)), wrong.shape)
        msg = (
            f"flow_direction: {int(wrong.sum())} cells {what}, the first in row {row}, column {col} "
            f"(counted from 0): {way_out}"
        )
        raise InputError(msg)
