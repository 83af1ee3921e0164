"""The whole terrain of a place in one call."""

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from siting.grid import Grid, Raster
from siting.terrain.area import accumulate, multiple_flow_area
from siting.terrain.channels import height_above_channel_m, landscape_position
from siting.terrain.condition import Conditioned, Directions, FloatArray, Heights, Mask, condition
from siting.terrain.downstream import highest_above, open_catchments
from siting.terrain.pans import Pans, find_pans
from siting.terrain.surface import profile_curvature, slope, wetness_index


@dataclass(frozen=True, slots=True, eq=False)
class Terrain:
    """Ground on a grid: heights in m, areas in m2, slope as a tangent, codes as in siting.terrain."""

    grid: Grid
    elevation: Heights
    filled: Heights
    direction: Directions
    contributing_area_m2: FloatArray
    multiple_flow_area_m2: FloatArray
    slope: Heights
    wetness_index: Heights
    channel: Mask
    height_above_channel_m: Heights
    position: npt.NDArray[np.uint8]
    open_catchment: Mask
    pans: Pans
    flat_share: float
    vertical_error_m: float


def analyse(
    dem: Raster,
    *,
    vertical_error_m: float,
    channel_area_m2: float,
    pan_min_area_m2: float,
    pan_layer: npt.NDArray[np.int8] | None,
    threads: int,
) -> Terrain:
    """
    Condition the ground, keep its pans, and derive all that later rooms need.

    Parameters
    ----------
    dem
        Heights in m, NaN void.
    vertical_error_m
        Standard deviation of the local error of the heights, m.
    channel_area_m2
        Contributing area from which a cell counts as channel.
    pan_min_area_m2, pan_layer
        See `find_pans`.
    threads
        How to compute; cannot change the result.
    """
    grid = dem.grid
    size: dict[str, Any] = {"cell_width_m": grid.cell_width_m, "cell_height_m": grid.cell_height_m}
    elevation = np.where(np.isfinite(dem.values), dem.values, np.nan).astype(np.float32)
    conditioned, pans = _conditioned(elevation, grid, vertical_error_m, pan_min_area_m2, pan_layer, threads)
    filled, direction = np.ascontiguousarray(conditioned.filled), conditioned.direction
    area = accumulate(direction, grid.cell_area_m2, threads=threads)
    shared = multiple_flow_area(filled, direction, cell_area_m2=grid.cell_area_m2, **size)
    tangent = slope(elevation, threads=threads, **size)
    with np.errstate(invalid="ignore"):
        channel = np.asarray(area >= channel_area_m2)
    height = height_above_channel_m(filled, direction, channel, **size)
    position = landscape_position(
        height_above_channel_m=height,
        drop_from_above_m=highest_above(direction, filled) - filled,
        slope=tangent,
        profile_curvature=profile_curvature(elevation, **size),
        vertical_error_m=vertical_error_m,
    )
    return Terrain(
        grid,
        elevation,
        filled,
        direction,
        area,
        shared,
        tangent,
        wetness_index(shared, tangent, threads=threads, **size),
        channel,
        height,
        position,
        open_catchments(direction, threads=threads),
        pans,
        conditioned.flat_cells / max(1, int(np.count_nonzero(direction != 255))),
        vertical_error_m,
    )


def _conditioned(
    elevation: Heights,
    grid: Grid,
    vertical_error_m: float,
    pan_min_area_m2: float,
    pan_layer: npt.NDArray[np.int8] | None,
    threads: int,
) -> tuple[Conditioned, Pans]:
    """Fill once to find the pans; where any is kept, fill again with their bottoms as ends of flow."""
    size: dict[str, Any] = {"cell_width_m": grid.cell_width_m, "cell_height_m": grid.cell_height_m}
    plain = condition(elevation, sinks=None, threads=threads, **size)
    pans = find_pans(
        plain,
        elevation,
        cell_area_m2=grid.cell_area_m2,
        vertical_error_m=vertical_error_m,
        pan_min_area_m2=pan_min_area_m2,
        pan_layer=pan_layer,
    )
    kept = np.array([status != "doubtful" for status in pans.status], dtype=np.bool_)
    if not kept.any():
        return plain, pans
    sinks = np.zeros(elevation.shape, dtype=np.bool_)
    sinks.ravel()[pans.bottom_cell[kept]] = True
    return condition(elevation, sinks=sinks, threads=threads, **size), pans
