"""The whole terrain of a place in one call."""

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError
from siting.grid import Grid, Raster
from siting.parallel import run_all
from siting.terrain.area import accumulate, multiple_flow_area
from siting.terrain.channels import channel_cells, height_above_channel_m, landscape_position
from siting.terrain.condition import (
    Conditioned,
    Directions,
    FloatArray,
    Heights,
    Mask,
    condition,
    end_in_pans,
    row_bands,
)
from siting.terrain.downstream import highest_above
from siting.terrain.edges import Sides, enclosed_voids, open_sides
from siting.terrain.given import follow, inner_ends
from siting.terrain.pans import DOUBTFUL, KEPT, Pans, find_pans
from siting.terrain.surface import BAND_ROWS, profile_curvature, slope, wetness_index

STAGES = ("drainage", "open catchments", "areas", "slope and position", "wetness")
"""What a listener hears of, in this order."""


@dataclass(frozen=True, slots=True, eq=False)
class Terrain:
    """
    Ground on a grid: heights in m, areas in m2, slope as a tangent, codes as in siting.terrain.

    `open_sides` tells from which sides each catchment may go on beyond the data, see `siting.terrain.edges`.
    `flat_share` is the share of cells whose direction had to be invented on level ground, `enclosed_voids` the
    number of holes in the data. Missing is NaN, code 255 or False. `elevation` is the DEM's own array where that is
    32-bit and without infinities, so neither is to be written to.
    """

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
    open_sides: Sides
    pans: Pans
    flat_share: float
    enclosed_voids: int
    vertical_error_m: float

    @property
    def open_catchment(self) -> Mask:
        """Whether each cell's catchment may go on beyond the data: its area is then a lower bound."""
        return np.asarray(self.open_sides != 0)


def analyse(
    dem: Raster,
    *,
    vertical_error_m: float,
    channel_area_m2: float,
    pan_min_area_m2: float,
    pan_layer: npt.NDArray[np.int8] | None,
    threads: int,
    flow_direction: Directions | None = None,
    progress: Callable[[str, int, int], None] | None = None,
) -> Terrain:
    """
    Condition the ground, keep its pans, and derive all that later rooms need.

    Parameters
    ----------
    dem
        Heights in m; NaN or infinite is void.
    vertical_error_m
        Standard deviation of the local error of the heights, m, above 0.
    channel_area_m2
        Contributing area from which a cell counts as channel, above 0.
    pan_min_area_m2, pan_layer
        See `find_pans`.
    threads
        How to compute; cannot change the result.
    flow_direction
        The user's own directions, see `follow`. They say where flow ends: a depression in which it ends is given, one
        they lead through is doubtful at most. Not together with `pan_layer`.
    progress
        Hears (stage, done, total) as each of STAGES is finished.

    Raises
    ------
    ConfigError
        A setting outside its range, or both `flow_direction` and `pan_layer`.
    """
    _check(vertical_error_m, channel_area_m2, pan_min_area_m2)
    grid = dem.grid
    size: dict[str, Any] = {"cell_width_m": grid.cell_width_m, "cell_height_m": grid.cell_height_m}
    heard = _Heard(progress)
    elevation = _finite(dem.values)
    pan_rule: dict[str, Any] = {
        "cell_area_m2": grid.cell_area_m2,
        "vertical_error_m": vertical_error_m,
        "pan_min_area_m2": pan_min_area_m2,
        "threads": threads,
    }
    # in this order, and with what is no longer needed dropped, no stage needs more memory than the results
    drained, pans = _drainage(elevation, size, pan_rule, pan_layer, flow_direction, threads)
    direction, flat_cells = drained.direction, drained.flat_cells
    heard.next()
    valid = direction != 255
    enclosed, voids = enclosed_voids(valid)
    sides = open_sides(direction, enclosed, threads=threads)
    flat_share = flat_cells / max(1, int(np.count_nonzero(valid)))
    del valid, enclosed
    heard.next()
    area = accumulate(direction, grid.cell_area_m2, threads=threads)
    shared = multiple_flow_area(drained.filled, direction, cell_area_m2=grid.cell_area_m2, threads=threads, **size)
    filled = np.ascontiguousarray(drained.filled)
    del drained
    heard.next()
    tangent = slope(elevation, threads=threads, **size)
    channel = channel_cells(area, channel_area_m2=channel_area_m2)
    height = height_above_channel_m(filled, direction, channel, threads=threads)
    position = _positions(elevation, filled, direction, height, tangent, size, vertical_error_m, threads)
    heard.next()
    wetness = wetness_index(shared, tangent, threads=threads, **size)
    heard.next()
    return Terrain(
        grid,
        elevation,
        filled,
        direction,
        area,
        shared,
        tangent,
        wetness,
        channel,
        height,
        position,
        sides,
        pans,
        flat_share,
        voids,
        vertical_error_m,
    )


def _finite(values: npt.NDArray[Any]) -> Heights:
    """Return heights in 32 bits with NaN for infinities: the values themselves where they are that already."""
    heights = np.ascontiguousarray(values, dtype=np.float32)
    infinite = np.isinf(heights)
    return np.where(infinite, np.float32(np.nan), heights) if infinite.any() else heights


def _check(vertical_error_m: float, channel_area_m2: float, pan_min_area_m2: float) -> None:
    for name, value, least in (
        ("vertical_error_m", vertical_error_m, np.nextafter(0, 1)),
        ("channel_area_m2", channel_area_m2, np.nextafter(0, 1)),
        ("pan_min_area_m2", pan_min_area_m2, 0.0),
    ):
        if not least <= value < np.inf:
            msg = f"{name} = {value}: it must be {'above' if least else 'at least'} 0 and finite"
            raise ConfigError(msg)


class _Heard:
    """Tell a listener, if there is one, of each finished stage."""

    def __init__(self, progress: Callable[[str, int, int], None] | None) -> None:
        self.progress = progress
        self.done = 0

    def next(self) -> None:
        self.done += 1
        if self.progress is not None:
            self.progress(STAGES[self.done - 1], self.done, len(STAGES))


def _drainage(
    elevation: Heights,
    size: dict[str, Any],
    pan_rule: dict[str, Any],
    pan_layer: npt.NDArray[np.int8] | None,
    flow_direction: Directions | None,
    threads: int,
) -> tuple[Conditioned, Pans]:
    """Return the conditioned surface and the pans."""
    if flow_direction is None:
        return _conditioned(elevation, size, pan_rule, pan_layer, threads)
    if pan_layer is not None:
        msg = "flow_direction and pan_layer both say where flow ends: give one of them"
        raise ConfigError(msg)
    conditioned = follow(elevation, flow_direction)
    plain = condition(elevation, sinks=None, threads=threads, **size)
    pans = find_pans(plain, elevation, pan_layer=inner_ends(conditioned.direction), **pan_rule)
    pans = replace(pans, status=tuple(DOUBTFUL if one == KEPT else one for one in pans.status))
    return conditioned, pans


def _conditioned(
    elevation: Heights,
    size: dict[str, Any],
    pan_rule: dict[str, Any],
    pan_layer: npt.NDArray[np.int8] | None,
    threads: int,
) -> tuple[Conditioned, Pans]:
    """Fill to find the pans; where any is kept, condition again with their lowest cells as ends of flow."""
    plain = condition(elevation, sinks=None, threads=threads, **size)
    pans = find_pans(plain, elevation, pan_layer=pan_layer, **pan_rule)
    kept = np.array([status != DOUBTFUL for status in pans.status], dtype=np.bool_)
    if not kept.any():
        return plain, pans
    ended = end_in_pans(
        plain,
        elevation,
        label=pans.label,
        pan_id=pans.pan_id[kept],
        bottom_cell=pans.bottom_cell[kept],
        threads=threads,
        **size,
    )
    return ended, pans


def _positions(
    elevation: Heights,
    filled: Heights,
    direction: Directions,
    height: Heights,
    tangent: Heights,
    size: dict[str, Any],
    vertical_error_m: float,
    threads: int,
) -> npt.NDArray[np.uint8]:
    """Place each cell in the landscape, band by band: the temporary arrays stay small beside the raster."""
    rows = direction.shape[0]
    highest = highest_above(direction, filled, threads=threads)
    position = np.empty(direction.shape, dtype=np.uint8)

    def work(first: int, last: int) -> None:
        above, below = max(0, first - 1), min(rows, last + 1)
        metres = {name: metres[above:below] for name, metres in size.items()}
        bend = profile_curvature(elevation[above:below], **metres)[first - above : last - above]
        position[first:last] = landscape_position(
            height_above_channel_m=height[first:last],
            drop_from_above_m=highest[first:last] - filled[first:last],
            slope=tangent[first:last],
            profile_curvature=bend,
            vertical_error_m=vertical_error_m,
        )

    run_all(work, row_bands(rows, BAND_ROWS), threads)
    return position
