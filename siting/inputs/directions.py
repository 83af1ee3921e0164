"""The user's own flow directions, as azimuths on the grid of the DEM."""

from pathlib import Path

import numpy as np
import numpy.typing as npt
import rasterio
from rasterio.errors import RasterioError

from siting.errors import InputError
from siting.grid import Grid
from siting.layers.rasters import END_OF_FLOW_DEG, NO_DIRECTION

CODE_OF_AZIMUTH = {
    **{90: 1, 135: 2, 180: 3, 225: 4, 270: 5, 315: 6, 0: 7, 360: 7, 45: 8},
    **{END_OF_FLOW_DEG: 10, NO_DIRECTION: 255},
}
"""Directions 1 to 8 for E SE S SW W NW N NE, 10 an end of flow, 255 not known."""

SAME_PLACE_CELLS = 0.01
"""Grids that differ by less than this share of a cell lie on one another."""


def read_flow_direction(path: Path, grid: Grid) -> npt.NDArray[np.uint8]:
    """
    Read directions: azimuth to which each cell drains, 0 north, 45 north-east to 315; 999 where flow ends.

    The raster must lie on the DEM's own cells, as the one that a run writes does: directions cannot be resampled.

    Raises
    ------
    InputError
        Where it cannot be read, lies on other cells, or holds another value.
    """
    try:
        with rasterio.open(path) as file:
            values, nodata, transform, shape = file.read(1), file.nodata, file.transform, (file.height, file.width)
    except RasterioError as error:
        msg = f"terrain.flow_direction {path.name} cannot be read as a raster; check that it exists and is whole"
        raise InputError(msg) from error
    a, _, c, _, e, f = grid.affine
    there = (transform.a, transform.c, transform.e, transform.f)
    off = max(abs(one - other) for one, other in zip(there, (a, c, e, f), strict=True))
    if shape != grid.shape or off > SAME_PLACE_CELLS * a or transform.b or transform.d:
        msg = (
            f"terrain.flow_direction {path.name} has {shape[0]} x {shape[1]} cells from {transform.c:g}, {transform.f:g}, "
            f"the DEM {grid.rows} x {grid.cols} from {c:g}, {f:g}: give directions on the DEM's own cells"
        )
        raise InputError(msg)
    code = np.zeros(values.shape, dtype=np.uint8)
    for azimuth, number in CODE_OF_AZIMUTH.items():
        code[values == azimuth] = number
    if nodata is not None:
        code[values == nodata] = 255
    if (code == 0).any():
        row, col = np.argwhere(code == 0)[0]
        msg = (
            f"terrain.flow_direction {path.name} is {values[row, col]} in row {row}, column {col}; directions are azimuths "
            f"0, 45 to 315 and {END_OF_FLOW_DEG}: translate them"
        )
        raise InputError(msg)
    return code
