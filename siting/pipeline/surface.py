"""The ground of each plot, summed up."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.layers.codes import POSITIONS
from siting.pipeline.read import Place
from siting.pipeline.sites import Sites
from siting.plots import commonest, fit_planes, plot_means
from siting.terrain import Terrain

FloatArray = npt.NDArray[np.float64]

POSITION_TERMS = ("", *POSITIONS.values)
"""Terms by code; 0 is unknown."""

NO_SIDES = np.zeros(0, dtype=np.uint8)


@dataclass(frozen=True, slots=True, eq=False)
class PlotGround:
    """What the cells of each plot say: codes (-1 unknown) and means (NaN unknown)."""

    soil_kind: npt.NDArray[np.int64]
    soil_depth_m: FloatArray
    rain_zone: npt.NDArray[np.int64]
    soil_group: npt.NDArray[np.int64]
    position: npt.NDArray[np.int64]
    slope: FloatArray
    drop_m: FloatArray
    wetness_index: FloatArray
    height_above_channel_m: FloatArray
    open_sides: npt.NDArray[np.uint8]


def plot_ground(sites: Sites, place: Place, ground: Terrain) -> PlotGround:
    """Sum up the ground of each plot."""
    grid, cells = ground.grid, sites.cells
    # kinds run from -1, the other codes from 0, where they say nothing
    kind = commonest(cells, place.soil.code + 1, np.arange(len(place.soil.kinds) + 1) > 0) - 1
    zone = np.zeros(sites.plots.count, dtype=np.int64)
    if place.rain is not None:
        zone = commonest(cells, place.rain.zone_of_cell + 1, np.arange(place.rain.zones.count + 1) > 0) - 1
    plane = fit_planes(cells, ground.elevation, cell_width_m=grid.cell_width_m, cell_height_m=grid.cell_height_m)
    return PlotGround(
        np.maximum(kind, -1),
        plot_means(cells, place.soil.depth_m, grid.cell_area_m2),
        np.maximum(zone, -1),
        commonest(cells, place.soil.soil_group, np.arange(5) > 0),
        commonest(cells, ground.position, np.arange(len(POSITION_TERMS)) > 0),
        plane.slope,
        plane.drop_m,
        plot_means(cells, ground.wetness_index, grid.cell_area_m2),
        plot_means(cells, ground.height_above_channel_m, grid.cell_area_m2),
        np.bitwise_or.reduceat(ground.open_sides.ravel()[cells.cell], cells.start[:-1]) if sites.plots.count else NO_SIDES,
    )
