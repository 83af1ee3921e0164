"""Maps of soil or cover, laid on the DEM's grid: the value under each cell's centre."""

from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
import rasterio
from affine import Affine
from rasterio.enums import ColorInterp
from rasterio.errors import RasterioError
from rasterio.vrt import WarpedVRT
from rasterio.warp import Resampling
from rasterio.windows import Window

from siting.errors import InputError
from siting.grid import Grid
from siting.inputs.daily_csv import read_table
from siting.inputs.vectors import NO_VALUE, burn, overlap_share, read_vector
from siting.notes import Notes

RASTER_ENDINGS = (".tif", ".tiff", ".vrt", ".img", ".asc", ".bil", ".hgt")

BAND_ROWS = 256
"""Rows read at once, so that what is made on the way stays small beside the grid."""


@dataclass(frozen=True, slots=True, eq=False)
class CodeMap:
    """A map of classes on a grid: for each cell the place of its value in `values`, -1 where unknown."""

    code: npt.NDArray[np.int32]
    values: tuple[str, ...]


def is_raster(path: Path) -> bool:
    """Tell from its ending whether a file is a raster."""
    return path.suffix.lower() in RASTER_ENDINGS


def read_map(path: Path, grid: Grid, *, column: str | None, setting: str, notes: Notes) -> CodeMap:
    """
    Read a map of classes: a raster, or polygons with a column of text or numbers.

    Parameters
    ----------
    column
        Column of a map in polygons; not used with a raster.
    setting
        Name of the setting that names the file, for messages.

    Raises
    ------
    InputError
        Where the file cannot be read, has no CRS, or does not meet the DEM.
    """
    if is_raster(path):
        found = _codes_of_raster(read_raster_on_grid(path, grid, setting=setting))
    else:
        found = _codes_of_polygons(path, grid, column, setting, notes)
    tell_covered(path, float(np.mean(found.code >= 0)), setting=setting, notes=notes)
    return found


def tell_covered(path: Path, covered: float, *, setting: str, notes: Notes) -> None:
    """Refuse a map that covers none of the DEM's cells; say what share (0 to 1) one leaves uncovered."""
    if covered == 0.0:
        msg = f"{setting} {path.name} does not meet the DEM; check the CRS of both, or give a map of the same place"
        raise InputError(msg)
    if covered < 1.0:
        notes.warn(
            f"{setting}_partial",
            f"{setting} {path.name} leaves {100 * (1 - covered):.1f} % of the DEM's cells without a value: unknown.",
        )


def tell_overlap(path: Path, shapes: list[tuple[Any, int]], grid: Grid, *, setting: str, notes: Notes) -> None:
    """Say on what share of the cells polygons of different values lie on top of each other, and which of them counts."""
    share = overlap_share(shapes, grid)
    if share:
        notes.warn(
            f"{setting}_overlap",
            f"{setting} {path.name} has polygons of different values over each other on {100 * share:.3g} % of the DEM's "
            "cells: the last of them in the file counts.",
        )


def read_raster_on_grid(path: Path, grid: Grid, *, setting: str) -> npt.NDArray[np.float64]:
    """Read a raster's first band on a grid by nearest neighbour; NaN where it has no value."""
    values = np.empty(grid.shape, dtype=np.float64)
    for band, part in raster_bands(path, grid, setting=setting):
        values[band] = part
    return values


def raster_bands(path: Path, grid: Grid, *, setting: str) -> Iterator[tuple[slice, npt.NDArray[np.float64]]]:
    """Read a raster as `read_raster_on_grid` does, a band of rows at a time: the rows, and their values."""
    a, _, c, _, e, f = grid.affine
    try:
        with rasterio.open(path) as file:
            if file.crs is None:
                msg = f"{setting} {path.name} declares no CRS; give it one with `gdal_edit.py -a_srs EPSG:… {path.name}`"
                raise InputError(msg)
            scale, offset = float(file.scales[0]), float(file.offsets[0])
            bare = file.nodata is None and ColorInterp.alpha not in file.colorinterp
            with WarpedVRT(
                file,
                crs=grid.crs,
                transform=Affine(a, 0, c, 0, e, f),
                width=grid.cols,
                height=grid.rows,
                resampling=Resampling.nearest,
                add_alpha=bare,
            ) as warped:
                for row in range(0, grid.rows, BAND_ROWS):
                    window = Window(0, row, grid.cols, min(BAND_ROWS, grid.rows - row))
                    values = warped.read(1, window=window).astype(np.float64) * scale + offset
                    # an added band tells what the file covers; as a mask it is heeded for unsigned numbers alone
                    mask = warped.read(warped.count, window=window) if bare else warped.read_masks(1, window=window)
                    yield slice(row, row + BAND_ROWS), np.where((mask > 0) & np.isfinite(values), values, np.nan)
    except RasterioError as error:
        msg = f"{setting} {path.name} cannot be read as a raster; check that it exists and is whole"
        raise InputError(msg) from error


def _codes_of_raster(values: npt.NDArray[np.float64]) -> CodeMap:
    known = ~np.isnan(values)
    found, place = np.unique(values[known], return_inverse=True)
    code = np.full(values.shape, NO_VALUE, dtype=np.int32)
    code[known] = place
    return CodeMap(code, tuple(f"{value:g}" for value in found))


def _codes_of_polygons(path: Path, grid: Grid, column: str | None, setting: str, notes: Notes) -> CodeMap:
    frame = read_vector(path, grid, setting=setting, areas=True)
    names = ", ".join(repr(str(name)) for name in frame.columns if name != frame.geometry.name)
    if column is None or column not in frame.columns:
        msg = f"{setting} {path.name} needs the name of a column, not {column!r}; it has {names}"
        raise InputError(msg)
    text = frame[column].map(plain_text)
    values = tuple(sorted(set(text) - {""}))
    shapes = [
        (shape, values.index(value))
        for shape, value in zip(frame.geometry, text, strict=True)
        if value and shape is not None and not shape.is_empty
    ]
    tell_overlap(path, shapes, grid, setting=setting, notes=notes)
    return CodeMap(burn(shapes, grid), values)


def plain_text(value: object) -> str:
    """Return a cell of a table as text: whole numbers without a point, missing as empty."""
    if value is None or (isinstance(value, float) and np.isnan(value)):
        return ""
    if isinstance(value, float) and value.is_integer():
        return str(int(value))
    return str(value).strip()


def read_meanings(path: Path, *, needed: tuple[str, ...], setting: str) -> dict[str, dict[str, str]]:
    """
    Read a CSV (comma, semicolon or tab) that says what map values mean: rows by `map_value`, as text; empty cells are empty.

    Raises InputError where the file or a column is missing or a value stands twice.
    """
    table = read_table(path, setting=setting)
    missing = [name for name in ("map_value", *needed) if name not in table.columns]
    if missing:
        msg = f"{setting} {path.name} lacks the column {missing[0]!r}; it has {', '.join(map(repr, table.columns))}"
        raise InputError(msg)
    found: dict[str, dict[str, str]] = {}
    for row in table.to_dict("records"):
        value = str(row["map_value"]).strip()
        if value in found:
            msg = f"{setting} {path.name} says twice what {value!r} means; keep one row"
            raise InputError(msg)
        found[value] = {str(name): str(cell).strip() for name, cell in row.items()}
    return found
