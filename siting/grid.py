"""A grid is a frozen value that refuses nonsense at birth."""

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from siting.errors import GridError

FloatArray = npt.NDArray[np.float64]
"""64-bit measures; missing is NaN."""

AREA_UNIT_M2 = 1.0 / 1024.0
"""Cell areas are multiples of this, so that 64-bit sums of them are exact in any order."""


@dataclass(frozen=True, slots=True, eq=False)
class Grid:
    """
    North-up cells of one CRS, with their true size on the ground by row.

    `affine` is (a, b, c, d, e, f): x = a col + b row + c, y = d col + e row + f, of the
    upper left corner of a cell; b = d = 0, a > 0, e < 0. `crs` is WKT2 text or
    an `EPSG:` code. `cell_width_m` and `cell_height_m` hold the ground metres of one cell for each
    row, so a geographic or Mercator grid is analysed on its own cells.
    """

    rows: int
    cols: int
    affine: tuple[float, float, float, float, float, float]
    crs: str
    cell_width_m: FloatArray
    cell_height_m: FloatArray

    def __post_init__(self) -> None:
        if self.rows < 1 or self.cols < 1:
            msg = f"a grid of {self.rows} rows x {self.cols} columns holds no cell"
            raise GridError(msg)
        a, b, _, d, e, _ = self.affine
        if b != 0 or d != 0 or not a > 0 or not e < 0:
            msg = f"the grid is rotated, sheared or not north-up (affine {self.affine})"
            raise GridError(msg)
        for name in ("cell_width_m", "cell_height_m"):
            metres = np.ascontiguousarray(getattr(self, name), dtype=np.float64)
            if metres.shape != (self.rows,):
                msg = f"{name} has shape {metres.shape}; it must have one value per row"
                raise GridError(msg)
            if not bool(np.all(metres > 0)) or not bool(np.all(np.isfinite(metres))):
                msg = f"{name} must be above zero and finite in every row"
                raise GridError(msg)
            metres.setflags(write=False)
            object.__setattr__(self, name, metres)

    @property
    def shape(self) -> tuple[int, int]:
        """Rows and columns."""
        return (self.rows, self.cols)

    @property
    def cells(self) -> int:
        """Number of cells."""
        return self.rows * self.cols

    @property
    def cell_area_m2(self) -> FloatArray:
        """Ground area of one cell for each row, rounded to AREA_UNIT_M2."""
        area = self.cell_width_m * self.cell_height_m
        return np.maximum(np.round(area / AREA_UNIT_M2), 1.0) * AREA_UNIT_M2

    @property
    def typical_cell_m(self) -> float:
        """Square root of the middle row's cell area: one number to speak of."""
        return float(np.sqrt(self.cell_area_m2[self.rows // 2]))

    def xy(self, row: float, col: float) -> tuple[float, float]:
        """Map coordinates of the centre of a cell."""
        a, _, c, _, e, f = self.affine
        return (a * (col + 0.5) + c, e * (row + 0.5) + f)

    def cell(self, x: float, y: float) -> tuple[int, int]:
        """Row and column of the cell that holds a point; may lie outside the grid."""
        a, _, c, _, e, f = self.affine
        return (int(np.floor((y - f) / e)), int(np.floor((x - c) / a)))

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Grid):
            return NotImplemented
        return self.shape == other.shape and self.affine == other.affine and self.crs == other.crs

    def __hash__(self) -> int:
        return hash((self.shape, self.affine, self.crs))


def metric_grid(
    rows: int,
    cols: int,
    cell_m: float,
    *,
    west: float = 0.0,
    north: float = 0.0,
    crs: str = "EPSG:32636",
) -> Grid:
    """Make a grid of square cells in a metric CRS whose map metres are ground metres."""
    return Grid(
        rows,
        cols,
        (cell_m, 0.0, west, 0.0, -cell_m, north),
        crs,
        np.full(rows, cell_m),
        np.full(rows, cell_m),
    )


@dataclass(frozen=True, slots=True, eq=False)
class Raster:
    """Values on a grid; their shape is checked once, here. Missing is NaN where values are floats."""

    grid: Grid
    values: npt.NDArray[Any]

    def __post_init__(self) -> None:
        if self.values.shape != self.grid.shape:
            msg = f"values have shape {self.values.shape}, their grid has {self.grid.shape}: both must be the same"
            raise GridError(msg)
