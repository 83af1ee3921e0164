"""Slope and wetness of the surface."""

import numpy as np
import numpy.typing as npt

from siting.parallel import run_all
from siting.terrain._kernels.stencil import bend, horn, wetness
from siting.terrain.condition import FloatArray, Heights, row_bands

LEAST_SLOPE = 0.001
"""Floor of tan b in the wetness index, so that level ground gets a number and not infinity."""

STRAIGHT_M = 0.002
"""Bend over a cell below which a profile is straight: 32-bit heights at 8000 m may show 0.0012 m on a plane."""

BAND_ROWS = 64
"""Rows worked on together: their temporary arrays stay small beside the raster."""


def slope(
    elevation: npt.NDArray[np.floating],
    *,
    cell_width_m: FloatArray,
    cell_height_m: FloatArray,
    threads: int = 1,
) -> Heights:
    """
    Slope of every cell as a tangent (0.05 is 5 %), from its eight neighbours.

    Parameters
    ----------
    elevation
        Heights in m (rows, columns), NaN void.
    cell_width_m, cell_height_m
        Ground size of a cell for each row, m.

    Returns
    -------
    array
        float32, NaN at voids. A missing neighbour is mirrored through the cell: where its opposite is there, it counts
        as far below as that is above; else as high as the cell, or for a corner on a plane through the sides. So a
        plane keeps its slope right up to the edge.

    References
    ----------
    Horn (1981), Proceedings of the IEEE 69(1).
    """
    rows, cols = elevation.shape
    found = np.empty(elevation.shape, dtype=np.float32)

    def work(first: int, last: int) -> None:
        window = np.full((last - first + 2, cols + 2), np.nan, dtype=np.float32)
        above, below = max(0, first - 1), min(rows, last + 1)
        window[above - first + 1 : below - first + 1, 1:-1] = elevation[above:below]
        window[np.isinf(window)] = np.nan
        horn(window, cell_width_m[first:last], cell_height_m[first:last], found[first:last])

    run_all(work, row_bands(rows, BAND_ROWS), threads)
    return found


def wetness_index(
    multiple_flow_area_m2: FloatArray,
    slope: Heights,
    *,
    cell_width_m: FloatArray,
    cell_height_m: FloatArray,
    threads: int = 1,
) -> Heights:
    """
    Topographic wetness index ln(a / tan b).

    `a` is the multiple-flow area per metre of contour, m; the contour's length is the mean of the cell's width and
    height. tan b is floored at LEAST_SLOPE. NaN stays NaN.

    References
    ----------
    Beven & Kirkby (1979).
    """
    contour_m = 0.5 * (cell_width_m + cell_height_m)
    found = np.empty(slope.shape, dtype=np.float32)

    def work(first: int, last: int) -> None:
        part = slice(first, last)
        wetness(multiple_flow_area_m2[part], slope[part], contour_m[part], LEAST_SLOPE, found[part])

    run_all(work, row_bands(slope.shape[0], BAND_ROWS), threads)
    return found


def profile_curvature(
    elevation: npt.NDArray[np.floating], *, cell_width_m: FloatArray, cell_height_m: FloatArray
) -> Heights:
    """
    Curvature along the steepest line, 1/m: above zero where convex (steepens downward).

    Second derivative of a quadratic surface through the cell and its neighbours; 0 on level ground, where the ground
    bends by less than STRAIGHT_M over a cell, and beside voids, where the neighbours do not suffice; NaN at voids.

    References
    ----------
    Zevenbergen & Thorne (1987).
    """
    z = np.ascontiguousarray(elevation, dtype=np.float64)
    found = np.empty(z.shape, dtype=np.float32)
    bend(z, cell_width_m, cell_height_m, STRAIGHT_M, found)
    return found
