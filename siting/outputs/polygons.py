"""From cells to shapes: outlines run along cell edges, lines and points lie on cell centres."""

from typing import Any

import numpy as np
import numpy.typing as npt
import shapely
from rasterio.features import shapes
from shapely.geometry import LineString, MultiPolygon, Point, Polygon

from siting.errors import OutputError
from siting.grid import Grid

Flat = npt.NDArray[np.int64]


def polygons_from_labels(label: npt.NDArray[Any], grid: Grid) -> dict[int, MultiPolygon]:
    """
    Outline the cells of every label.

    Parameters
    ----------
    label
        Whole numbers on the grid, 0 where there is nothing, at most 2^31 - 1.
    grid
        The grid of the labels.

    Returns
    -------
    dict
        One valid multipolygon for each label, ordered by label. Cells that touch at a corner alone are parts of their own.

    Raises
    ------
    OutputError
        Where labels are negative, too large, not whole, or of another shape than the grid.
    """
    if label.shape != grid.shape:
        msg = f"labels have shape {label.shape}, their grid has {grid.shape}: both must be the same"
        raise OutputError(msg)
    if label.dtype.kind not in "iub":
        msg = f"labels are {label.dtype}; give whole numbers"
        raise OutputError(msg)
    if int(label.min()) < 0 or int(label.max()) > np.iinfo(np.int32).max:
        msg = f"labels run from {label.min()} to {label.max()}; they must lie between 0 and {np.iinfo(np.int32).max}"
        raise OutputError(msg)
    return _outlines(label.astype(np.int32), grid, 0, 0)


def polygon_from_mask(row0: int, col0: int, mask: npt.NDArray[np.bool_], grid: Grid) -> MultiPolygon:
    """
    Outline the marked cells of a window whose upper left cell is (`row0`, `col0`) of the grid.

    The outline equals that of the same cells in the whole grid, bit for bit. A mask without a marked cell gives an
    empty multipolygon. Raises OutputError where the window leaves the grid.
    """
    rows, cols = mask.shape
    if row0 < 0 or col0 < 0 or row0 + rows > grid.rows or col0 + cols > grid.cols:
        msg = f"a window of {rows} x {cols} cells at row {row0}, column {col0} leaves the grid of {grid.shape}"
        raise OutputError(msg)
    return _outlines(mask.astype(np.int32), grid, row0, col0).get(1, MultiPolygon())


def _outlines(label: npt.NDArray[np.int32], grid: Grid, row0: int, col0: int) -> dict[int, MultiPolygon]:
    parts: dict[int, list[Polygon]] = {}
    for outline, value in shapes(label, mask=label > 0, connectivity=4):
        rings = outline["coordinates"]
        parts.setdefault(int(value), []).append(Polygon(rings[0], rings[1:]))
    return {value: _on_map(parts[value], grid, row0, col0) for value in sorted(parts)}


def _on_map(parts: list[Polygon], grid: Grid, row0: int, col0: int) -> MultiPolygon:
    """Move outlines from cell corners to the map; computed from whole corners, so neighbours share their edges exactly."""
    a, _, c, _, e, f = grid.affine
    whole = MultiPolygon(parts)
    if not whole.is_valid:  # an inner ring that meets itself at a corner
        whole = _as_multipolygon(shapely.make_valid(whole))

    def corners(xy: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
        return np.column_stack((a * (xy[:, 0] + col0) + c, e * (xy[:, 1] + row0) + f))

    moved: MultiPolygon = shapely.transform(whole, corners)
    return moved


def _as_multipolygon(shape: Any) -> MultiPolygon:
    return shape if isinstance(shape, MultiPolygon) else MultiPolygon([shape])


def point_from_cell(flat: int, grid: Grid) -> Point:
    """Return the centre of the cell with this flat index (row x columns + column); OutputError outside the grid."""
    if not 0 <= flat < grid.cells:
        msg = f"cell {flat} lies outside a grid of {grid.cells} cells"
        raise OutputError(msg)
    row, col = divmod(int(flat), grid.cols)
    return Point(grid.xy(row, col))


def line_from_cells(flat: Flat, grid: Grid) -> LineString | None:
    """
    Join the centres of cells, given by flat index from upstream to downstream.

    Fewer than two cells make no line: None, which is stored as NULL. OutputError outside the grid.
    """
    cells = np.asarray(flat, dtype=np.int64)
    if cells.size and (cells.min() < 0 or cells.max() >= grid.cells):
        msg = f"cells {cells.min()} to {cells.max()} do not lie inside a grid of {grid.cells} cells"
        raise OutputError(msg)
    if cells.size < 2:
        return None
    a, _, c, _, e, f = grid.affine
    row, col = np.divmod(cells, grid.cols)
    return LineString(np.column_stack((a * (col + 0.5) + c, e * (row + 0.5) + f)))
