"""Rasters out, as cloud-optimised GeoTIFFs on the grid of the DEM."""

import tempfile
from pathlib import Path
from typing import Any, Literal

import numpy as np
import numpy.typing as npt
import rasterio
from affine import Affine
from rasterio._err import CPLE_BaseError  # what a full disk raises, and no public error holds
from rasterio.enums import ColorInterp
from rasterio.io import DatasetWriter
from rasterio.shutil import copy as copy_raster

from siting.errors import OutputError, one_line
from siting.grid import Grid
from siting.layers.model import RasterDefinition
from siting.layers.rasters import END_OF_FLOW_DEG, NO_DIRECTION

Values = npt.NDArray[Any]
Compression = Literal["deflate", "zstd"]

TILE = 512


def azimuth_deg(direction: npt.NDArray[np.uint8]) -> npt.NDArray[np.uint16]:
    """
    Turn direction codes into azimuths: 0 north, 90 east …, 999 end of flow, 65535 void.

    Codes are 1 to 8 for E, SE, S, SW, W, NW, N, NE, 9 an outlet, 10 a sink, 255 void; OutputError for any other.
    """
    table = np.zeros(256, dtype=np.uint16)
    table[1:9] = (90, 135, 180, 225, 270, 315, 0, 45)
    table[9:11] = END_OF_FLOW_DEG
    table[255] = NO_DIRECTION
    known = np.zeros(256, dtype=np.bool_)
    known[1:11] = known[255] = True
    if not bool(np.all(known[direction])):
        msg = f"direction code {int(direction[~known[direction]][0])} is unknown; codes are 1 to 10, and 255 for void"
        raise OutputError(msg)
    return table[direction]


def write_cog(
    path: Path,
    values: Values,
    grid: Grid,
    definition: RasterDefinition,
    threads: int,
    *,
    compression: Compression = "deflate",
) -> None:
    """
    Write one raster as a cloud-optimised GeoTIFF: tiles of 512 cells with overviews; same values, same bytes.

    Parameters
    ----------
    path
        File to write; its folder must exist, the file must not.
    values
        Shape of the grid. Measures are floats with NaN where missing; codes are whole numbers that already hold the
        nodata code of their definition.
    definition
        Name, unit, type, nodata, overviews and classes of the raster.
    threads
        Threads that compress; the bytes do not depend on it.

    Raises
    ------
    OutputError
        Where the file exists or cannot be written, a value is infinite, equals nodata, or does not fit the type.
    """
    if path.exists():
        msg = f"{path.name} exists already; choose another folder"
        raise OutputError(msg)
    stored = _stored(values, grid, definition)
    try:
        with tempfile.TemporaryDirectory(prefix=".cog.", dir=path.parent) as folder:
            source = _source(Path(folder), stored, grid, definition)
            copy_raster(source, path, driver="COG", **_options(definition, threads, compression))
    except (rasterio.errors.RasterioError, CPLE_BaseError, OSError) as error:
        path.unlink(missing_ok=True)
        msg = f"{path.name} cannot be written: {one_line(error)}; is there room on the disk, and may you write there?"
        raise OutputError(msg) from error


def _stored(values: Values, grid: Grid, definition: RasterDefinition) -> Values:
    """Check values and turn them into what the file holds."""
    name = definition.name
    if values.shape != grid.shape:
        msg = f"{name} has shape {values.shape}, its grid has {grid.shape}: both must be the same"
        raise OutputError(msg)
    if not definition.is_measure:
        return _codes(values, definition)
    if values.dtype.kind not in "fiu":
        msg = f"{name} holds {values.dtype}; a measure must be numbers"
        raise OutputError(msg)
    stored = values.astype(np.float32)
    if bool(np.isinf(stored).any()) or bool((stored == definition.nodata).any()):
        row, col = np.argwhere(np.isinf(stored) | (stored == definition.nodata))[0]
        msg = f"{name} is {values[row, col]} at row {row}, column {col}; it must be finite and not {definition.nodata:g}"
        raise OutputError(msg)
    stored[np.isnan(stored)] = definition.nodata
    return stored


def _codes(values: Values, definition: RasterDefinition) -> Values:
    if values.dtype.kind not in "iu":
        msg = f"{definition.name} holds {values.dtype}; codes must be whole numbers"
        raise OutputError(msg)
    known = np.array([*(int(code) for code in definition.style.values), int(definition.nodata)])
    found = np.unique(values)
    strange = found[~np.isin(found, known)]
    if strange.size:
        msg = f"{definition.name} holds code {strange[0]}; known codes are {', '.join(map(str, known))}"
        raise OutputError(msg)
    return values.astype(definition.dtype)


def _options(definition: RasterDefinition, threads: int, compression: Compression) -> dict[str, Any]:
    overviews = (
        {"overviews": "FORCE_USE_EXISTING"}
        if definition.overview == "max"
        else {"overviews": "IGNORE_EXISTING", "overview_resampling": definition.overview.upper()}
    )
    return {
        "blocksize": TILE,
        "compress": compression.upper(),
        "level": 1,
        "predictor": "FLOATING_POINT" if definition.dtype == "float32" else "NO",
        "num_threads": max(1, threads),
        "bigtiff": "IF_SAFER",
        "statistics": "AUTO",  # keeps those in the tags, which are from all cells
        **overviews,
    }


def _source(folder: Path, stored: Values, grid: Grid, definition: RasterDefinition) -> Path:
    """Write what the final file is made from, with its own overviews where they are the largest values."""
    levels = _maximum_pyramid(stored, definition) if definition.overview == "max" else []
    affine = Affine(*grid.affine)
    plain = folder / "level_0.tif"
    with _plain_file(plain, stored, affine, grid.crs, definition) as file:
        _describe(file, stored, definition)
    for level, values in enumerate(levels, start=1):
        wider, taller = grid.cols / values.shape[1], grid.rows / values.shape[0]
        coarser = Affine(affine.a * wider, 0.0, affine.c, 0.0, affine.e * taller, affine.f)
        with _plain_file(folder / f"level_{level}.tif", values, coarser, grid.crs, definition):
            pass
    return _with_overviews(plain, len(levels)) if levels else plain


def _plain_file(path: Path, values: Values, affine: Affine, crs: str, definition: RasterDefinition) -> DatasetWriter:
    file = rasterio.open(
        path,
        "w",
        driver="GTiff",
        height=values.shape[0],
        width=values.shape[1],
        count=1,
        dtype=definition.dtype,
        nodata=definition.nodata,
        crs=crs,
        transform=affine,
        tiled=True,
        blockxsize=TILE,
        blockysize=TILE,
        bigtiff="IF_SAFER",
    )
    file.write(values, 1)
    return file


def _describe(file: DatasetWriter, stored: Values, definition: RasterDefinition) -> None:
    file.set_band_description(1, definition.title)
    file.units = (definition.unit,)
    file.update_tags(TITLE=definition.title, DESCRIPTION=definition.description)
    if definition.is_measure:
        file.update_tags(1, **_statistics(stored, definition.nodata))
        return
    file.update_tags(1, **{f"CLASS_{item.value}": item.label for item in definition.style.items})
    if definition.dtype == "uint8":
        file.colorinterp = (ColorInterp.palette,)
        file.write_colormap(1, {int(item.value): _rgba(item.colour) for item in definition.style.items})


def _rgba(colour: str) -> tuple[int, int, int, int]:
    return (int(colour[1:3], 16), int(colour[3:5], 16), int(colour[5:7], 16), 255)


def _statistics(stored: Values, nodata: float) -> dict[str, str]:
    known = stored[stored != np.float32(nodata)].astype(np.float64)
    if known.size == 0:
        return {}
    return {
        "STATISTICS_MINIMUM": repr(float(known.min())),
        "STATISTICS_MAXIMUM": repr(float(known.max())),
        "STATISTICS_MEAN": repr(float(known.mean())),
        "STATISTICS_STDDEV": repr(float(known.std())),
        "STATISTICS_VALID_PERCENT": f"{100.0 * known.size / stored.size:.4g}",
    }


def _maximum_pyramid(stored: Values, definition: RasterDefinition) -> list[Values]:
    """Halve the raster until it fits one tile; every cell is the largest of up to four, nodata only where all are."""
    lowest = np.float32(-np.inf)
    level = np.where(stored == np.float32(definition.nodata), lowest, stored)
    levels = []
    while max(level.shape) > TILE:
        by_rows = np.maximum.reduceat(level, np.arange(0, level.shape[0], 2), axis=0)
        level = np.maximum.reduceat(by_rows, np.arange(0, level.shape[1], 2), axis=1)
        levels.append(np.where(level == lowest, np.float32(definition.nodata), level))
    return levels


def _with_overviews(plain: Path, count: int) -> Path:
    """Say in a virtual raster which files are its overviews: the way to bring along overviews of one's own."""
    virtual = plain.with_name("source.vrt")
    copy_raster(plain, virtual, driver="VRT")
    band = "".join(
        f'<Overview><SourceFilename relativeToVRT="1">level_{level}.tif</SourceFilename>'
        "<SourceBand>1</SourceBand></Overview>"
        for level in range(1, count + 1)
    )
    text = virtual.read_text(encoding="utf-8")
    virtual.write_text(text.replace("</VRTRasterBand>", f"{band}</VRTRasterBand>"), encoding="utf-8")
    return virtual
