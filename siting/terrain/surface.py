"""Slope and wetness of the surface."""

import numpy as np
import numpy.typing as npt

FloatArray = npt.NDArray[np.float64]
Heights = npt.NDArray[np.float32]

LEAST_SLOPE = 0.001
"""Floor of tan b in the wetness index, so that level ground gets a number and not infinity."""

BAND_ROWS = 256
"""Rows worked on together: their temporary arrays stay small beside the raster."""


def slope(elevation: npt.NDArray[np.floating], *, cell_width_m: FloatArray, cell_height_m: FloatArray) -> Heights:
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
    rows = elevation.shape[0]
    found = np.empty(elevation.shape, dtype=np.float32)
    for first in range(0, rows, BAND_ROWS):
        last = min(rows, first + BAND_ROWS)
        found[first:last] = _band(elevation, first, last, cell_width_m, cell_height_m)
    return found


def _band(
    elevation: npt.NDArray[np.floating], first: int, last: int, width_m: FloatArray, height_m: FloatArray
) -> Heights:
    rows, cols = elevation.shape
    window = np.full((last - first + 2, cols + 2), np.nan)
    above, below = max(0, first - 1), min(rows, last + 1)
    window[above - first + 1 : below - first + 1, 1:-1] = elevation[above:below]
    window[np.isinf(window)] = np.nan
    centre = window[1:-1, 1:-1]

    def difference(row: int, col: int) -> FloatArray:
        # heights relative to the centre: small numbers keep their digits
        near = window[1 + row : window.shape[0] - 1 + row, 1 + col : window.shape[1] - 1 + col] - centre
        far = window[1 - row : window.shape[0] - 1 - row, 1 - col : window.shape[1] - 1 - col] - centre
        return np.where(np.isnan(near), -far, near)

    def side(row: int, col: int) -> FloatArray:
        return np.nan_to_num(difference(row, col))

    def corner(row: int, col: int) -> FloatArray:
        # where neither it nor its opposite is there: a plane through the two sides
        found = difference(row, col)
        return np.where(np.isnan(found), side(row, 0) + side(0, col), found)

    north, south, west, east = side(-1, 0), side(1, 0), side(0, -1), side(0, 1)
    north_west, north_east = corner(-1, -1), corner(-1, 1)
    south_west, south_east = corner(1, -1), corner(1, 1)
    dz_dx = (north_east + 2 * east + south_east - north_west - 2 * west - south_west) / (8 * width_m[first:last, None])
    dz_dy = (north_west + 2 * north + north_east - south_west - 2 * south - south_east) / (
        8 * height_m[first:last, None]
    )
    tangent = np.hypot(dz_dx, dz_dy)
    return np.where(np.isnan(centre), np.nan, tangent).astype(np.float32)


def wetness_index(
    multiple_flow_area_m2: FloatArray,
    slope: Heights,
    *,
    cell_width_m: FloatArray,
    cell_height_m: FloatArray,
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
    for first in range(0, slope.shape[0], BAND_ROWS):
        part = slice(first, first + BAND_ROWS)
        area_m = multiple_flow_area_m2[part] / contour_m[part, None]
        found[part] = np.log(area_m / np.maximum(slope[part], LEAST_SLOPE))
    return found


def profile_curvature(
    elevation: npt.NDArray[np.floating], *, cell_width_m: FloatArray, cell_height_m: FloatArray
) -> Heights:
    """
    Curvature along the steepest line, 1/m: above zero where convex (steepens downward).

    Second derivative of a quadratic surface through the cell and its neighbours; 0 on level ground and
    beside voids, where the neighbours do not suffice; NaN at voids.

    References
    ----------
    Zevenbergen & Thorne (1987).
    """
    z = np.pad(np.asarray(elevation, dtype=np.float64), 1, constant_values=np.nan)
    centre = z[1:-1, 1:-1]
    width, height = cell_width_m[:, None], cell_height_m[:, None]
    north, south, west, east = z[:-2, 1:-1], z[2:, 1:-1], z[1:-1, :-2], z[1:-1, 2:]
    p, q = (east - west) / (2 * width), (north - south) / (2 * height)
    r, t = (east - 2 * centre + west) / width**2, (north - 2 * centre + south) / height**2
    s = (z[:-2, 2:] - z[:-2, :-2] - z[2:, 2:] + z[2:, :-2]) / (4 * width * height)
    steep = p * p + q * q
    with np.errstate(invalid="ignore", divide="ignore"):
        along = -(r * p * p + 2 * s * p * q + t * q * q) / steep
    return np.where(np.isnan(centre), np.nan, np.where(np.isfinite(along), along, 0.0)).astype(np.float32)
