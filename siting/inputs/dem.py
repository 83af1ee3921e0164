"""A DEM of any raster format, brought to metres on its own grid, or refused with the way out."""

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
import rasterio
from affine import Affine
from pyproj import CRS
from rasterio.errors import RasterioError, RasterioIOError

from siting.errors import InputError
from siting.grid import Grid, Raster
from siting.inputs.georeference import row_metrics
from siting.notes import Notes
from siting.units import metres_per_unit, unit_from_text

LOWEST_M, HIGHEST_M = -500.0, 9000.0
"""Heights beyond are no ground: an undeclared nodata value, usually."""

SUSPECTS = (-9999.0, -99999.0, -32768.0, 32767.0, -32767.0, 65535.0)
"""Values that stand for nodata in undeclared files (common practice)."""


@dataclass(frozen=True, slots=True)
class _Band:
    """One band as read: values, where they hold, and what the file says of them."""

    values: npt.NDArray[np.float64]
    valid: npt.NDArray[np.bool_]
    unit_text: str
    transform: Affine
    crs: CRS | None
    point: bool


def read_dem(
    path: Path, *, band: int = 1, crs: str | None = None, elevation_unit: str | None = None, notes: Notes
) -> Raster:
    """
    Read a DEM.

    Parameters
    ----------
    path
        Anything that GDAL opens.
    band
        Band number, from 1.
    crs
        CRS of a file that declares none (or to override a wrong one), as `EPSG:32636` or WKT.
    elevation_unit
        "metre", "foot" or "us_survey_foot"; None takes it from the band or the vertical CRS, else assumes metres.

    Returns
    -------
    Raster
        float32 heights in m, NaN where missing, rows from north to south.

    Raises
    ------
    InputError
        In one sentence: what is wrong, its value, and the way out.
    """
    found = _read(path, band)
    system = _crs_of(path, found.crs, crs, notes)
    values, valid, transform = _north_up(path, found, notes)
    if found.point:
        notes.assume("dem.pixel_is_point", "yes", "", "declared in the file", "half a cell; the reader has moved the grid")
    unit = _unit(found, system, elevation_unit, notes)
    heights = np.where(valid, values * metres_per_unit(unit), np.nan)
    _check_heights(path, heights, values, valid)
    if np.nanmin(heights) == np.nanmax(heights):
        notes.warn(
            "flat_dem", f"The DEM {path.name} is level, {np.nanmin(heights):g} m everywhere: no flow can be told from it."
        )
    width, height = row_metrics(transform, values.shape, system)
    grid = Grid(
        values.shape[0],
        values.shape[1],
        (transform.a, 0.0, transform.c, 0.0, transform.e, transform.f),
        system.to_wkt(),
        width,
        height,
    )
    return Raster(grid, heights.astype(np.float32))


def _read(path: Path, band: int) -> _Band:
    if not path.exists():
        msg = f"the DEM {path.name} does not exist; give the path of a raster file in place.dem"
        raise InputError(msg)
    try:
        with rasterio.open(path) as file:
            if not 1 <= band <= file.count:
                msg = f"the DEM {path.name} has {file.count} bands, not {band}; give one of them"
                raise InputError(msg)
            raw = file.read(band)
            valid = file.read_masks(band) > 0
            values = raw.astype(np.float64)
            valid &= np.isfinite(values)
            values = values * float(file.scales[band - 1]) + float(file.offsets[band - 1])
            crs = CRS.from_user_input(file.crs) if file.crs else None
            point = file.tags().get("AREA_OR_POINT", "").lower() == "point"
            return _Band(values, valid, file.units[band - 1] or "", file.transform, crs, point)
    except RasterioIOError as error:
        msg = f"the DEM {path.name} cannot be read as a raster ({_first_line(error)}); check that it is whole"
        raise InputError(msg) from error
    except RasterioError as error:
        msg = f"the DEM {path.name} cannot be read ({_first_line(error)}); convert it to GeoTIFF"
        raise InputError(msg) from error


def _first_line(error: Exception) -> str:
    text = str(error).splitlines()
    return Path(text[0]).name if text else type(error).__name__


def _crs_of(path: Path, found: CRS | None, given: str | None, notes: Notes) -> CRS:
    if given is not None:
        try:
            chosen = CRS.from_user_input(given)
        except Exception as error:  # pyproj raises several kinds
            msg = f"place.crs is {given!r}, which is no known CRS; write it as EPSG:32636, for example"
            raise InputError(msg) from error
        if found is not None and not chosen.equals(found, ignore_axis_order=True):
            notes.warn(
                "crs_overridden", f"The DEM {path.name} declares {found.name}; place.crs puts {chosen.name} in its place."
            )
        return chosen
    if found is None:
        msg = f"the DEM {path.name} declares no CRS; give it in place.crs, for example EPSG:32636"
        raise InputError(msg)
    return found


def _north_up(path: Path, found: _Band, notes: Notes) -> tuple[npt.NDArray[Any], npt.NDArray[np.bool_], Affine]:
    """Turn a south-up file over; refuse a rotated or mirrored one."""
    t = found.transform
    if t.b != 0 or t.d != 0 or t.a <= 0:
        msg = (
            f"the DEM {path.name} is rotated, sheared or mirrored; mend it with "
            f"`gdalwarp -r bilinear {path.name} upright.tif` and give upright.tif"
        )
        raise InputError(msg)
    if t.e < 0:
        return found.values, found.valid, t
    if found.crs is None and t == Affine.identity():
        msg = f"the DEM {path.name} has no position on the ground; give a georeferenced file"
        raise InputError(msg)
    notes.assume("dem.south_up", "turned", "", "the file's row step is positive", "rows now run north to south")
    rows = found.values.shape[0]
    turned = Affine(t.a, 0.0, t.c, 0.0, -t.e, t.f + rows * t.e)
    return found.values[::-1], found.valid[::-1], turned


def _unit(found: _Band, system: CRS, given: str | None, notes: Notes) -> str:
    if given is not None:
        return unit_from_text(given, "place.elevation_unit")
    if found.unit_text:
        return unit_from_text(found.unit_text, "the unit of the DEM's band")
    vertical = [axis for axis in system.axis_info if axis.direction == "up"]
    if vertical:
        return unit_from_text(vertical[0].unit_name, "the unit of the DEM's vertical CRS")
    notes.assume("place.elevation_unit", "metre", "", "the file names no unit", "all heights, slopes and volumes")
    return "metre"


def _check_heights(
    path: Path,
    heights: npt.NDArray[np.float64],
    values: npt.NDArray[Any],
    valid: npt.NDArray[np.bool_],
) -> None:
    if not valid.any():
        msg = f"the DEM {path.name} holds no height: all {valid.size} cells are nodata; give another file"
        raise InputError(msg)
    if valid.sum() == 1 or min(valid.shape) == 1:
        msg = f"the DEM {path.name} has {valid.shape[0]} x {valid.shape[1]} cells; it must have 2 rows and columns at least"
        raise InputError(msg)
    wrong = valid & ((heights < LOWEST_M) | (heights > HIGHEST_M))
    for suspect in SUSPECTS:
        wrong |= valid & (values == suspect)
    if wrong.any():
        row, col = (int(place) for place in np.argwhere(wrong)[0])
        msg = (
            f"the DEM {path.name} has {int(wrong.sum())} cells outside {LOWEST_M:g} to {HIGHEST_M:g} m, the first "
            f"{values[row, col]:g} at row {row}, column {col}; if that means nodata, declare it with "
            f"`gdal_edit.py -a_nodata {values[row, col]:g} {path.name}`, else correct the unit in place.elevation_unit"
        )
        raise InputError(msg)
