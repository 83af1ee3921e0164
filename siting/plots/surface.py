"""The ground of each plot: a fitted plane, means by area, and the commonest class."""

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from siting.plots.catchments import PlotCells

FloatArray = npt.NDArray[np.float64]
Heights = npt.NDArray[np.float32]

SLOPE_ERROR_SHARE = 0.43
"""Standard deviation of a Horn slope over e / cell, e the standard deviation of the heights' local error."""

LINE_SHARE = 1e-9
"""Cells whose spread across a line is below this share of that along it count as lying in the line."""


@dataclass(frozen=True, slots=True, eq=False)
class PlotPlane:
    """Plane of least squares through the cells of each plot: slope (tangent), and drop (m) from upper to lower edge."""

    slope: FloatArray
    drop_m: FloatArray


def fit_planes(cells: PlotCells, elevation: Heights, *, cell_width_m: FloatArray, cell_height_m: FloatArray) -> PlotPlane:
    """
    Fit a plane to the heights of each plot.

    A plot whose cells lie in one line has no fall known across it: it is taken as level there; one of a single cell has
    neither slope nor drop (NaN). The drop is taken to the outer edges of the cells.

    Parameters
    ----------
    elevation
        Heights, m, known at all cells of plots.
    cell_width_m, cell_height_m
        Ground metres of a cell, for each row.
    """
    row, col = np.divmod(cells.cell, elevation.shape[1])
    width = _means(cells, cell_width_m[row])
    height = _means(cells, cell_height_m[row])
    south_m = np.cumsum(cell_height_m) - 0.5 * cell_height_m
    x = width[cells.plot] * (col - _means(cells, col)[cells.plot])
    y = south_m[row] - _means(cells, south_m[row])[cells.plot]
    z = elevation[row, col].astype(np.float64)
    z -= _means(cells, z)[cells.plot]
    right, down = _gradient(*(_sums(cells, product) for product in (x * x, x * y, y * y, x * z, y * z)))
    on_plane = right[cells.plot] * x + down[cells.plot] * y
    span = np.maximum.reduceat(on_plane, cells.start[:-1]) - np.minimum.reduceat(on_plane, cells.start[:-1])
    return PlotPlane(np.hypot(right, down), span + np.abs(right) * width + np.abs(down) * height)


def _gradient(
    xx: FloatArray, xy: FloatArray, yy: FloatArray, xz: FloatArray, yz: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Solve the normal equations of each plane; where its cells lie in one line, by the solution of least norm."""
    determinant = xx * yy - xy * xy
    in_line = determinant <= LINE_SHARE * xx * yy
    with np.errstate(invalid="ignore", divide="ignore"):
        right = np.where(in_line, xz / (xx + yy), (yy * xz - xy * yz) / determinant)
        down = np.where(in_line, yz / (xx + yy), (xx * yz - xy * xz) / determinant)
    return right, down


def _sums(cells: PlotCells, values: npt.NDArray[Any]) -> FloatArray:
    return np.bincount(cells.plot, weights=values, minlength=cells.start.size - 1).astype(np.float64)


def _means(cells: PlotCells, values: npt.NDArray[Any]) -> FloatArray:
    return _sums(cells, values) / np.diff(cells.start)


def plot_means(cells: PlotCells, values: npt.NDArray[np.floating], cell_area_m2: FloatArray) -> FloatArray:
    """Return each plot's mean of a raster by area, unknown cells left out; NaN where all are unknown."""
    value = values[np.divmod(cells.cell, values.shape[1])].astype(np.float64)
    weight = np.where(np.isnan(value), 0.0, cell_area_m2[cells.cell // values.shape[1]])
    with np.errstate(invalid="ignore"):
        return np.asarray(_sums(cells, weight * np.nan_to_num(value)) / _sums(cells, weight))


def commonest(cells: PlotCells, codes: npt.NDArray[Any], known: npt.NDArray[np.bool_]) -> npt.NDArray[np.int64]:
    """
    Return the code on most cells of each plot, the lowest of equals; -1 where none is known.

    `codes` is a raster of small whole numbers from 0, `known` tells of each code (by number) whether it says something.
    """
    count, kinds = cells.start.size - 1, known.size
    code = codes[np.divmod(cells.cell, codes.shape[1])].astype(np.int64)
    tally = np.bincount(cells.plot * kinds + code, minlength=count * kinds).reshape(count, kinds)
    tally[:, ~known] = 0
    return np.where(tally.max(axis=1) > 0, tally.argmax(axis=1), -1)


def slope_margin(vertical_error_m: float, cell_m: float) -> float:
    """Return the tangent by which a slope can be off through the heights' error alone, one standard deviation."""
    return SLOPE_ERROR_SHARE * vertical_error_m / cell_m
