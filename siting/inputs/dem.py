"""A DEM of any raster format, brought to metres on its own grid, or refused with the way out."""

import warnings
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
import rasterio
from affine import Affine
from pyproj import CRS
from rasterio.enums import ColorInterp
from rasterio.errors import NotGeoreferencedWarning, RasterioError, RasterioIOError

from siting.errors import InputError
from siting.grid import Grid, Raster
from siting.inputs.georeference import row_metrics
from siting.notes import Notes
from siting.units import metres_per_unit, unit_from_text

LOWEST_M, HIGHEST_M = -500.0, 9000.0
"""Heights beyond are no ground: an undeclared nodata value, usually."""

SUSPECTS = (0.0, -9999.0, -99999.0, -32768.0, 32767.0, -32767.0, 65535.0)
"""Stored values that stand for nodata in undeclared files (common practice)."""

LONE_CELLS = 10
LONE_GAP_M = 50.0
"""So many cells of one height, so far from all others, look like undeclared nodata (assumption)."""

STEEP_STEP = 0.05
"""A step of the heights over the width of a cell beyond which slopes mean nothing: the steepest plot (assumption)."""

SUSPECT_ALONE = 0.01
"""A suspect is taken for nodata where no other stored value comes this near to it, as a share of it (assumption)."""

PICTURE = (ColorInterp.red, ColorInterp.green, ColorInterp.blue, ColorInterp.palette)
"""Bands that hold colours, not heights."""


@dataclass(frozen=True, slots=True)
class _Band:
    """One band as stored: values, where they hold, and what the file says of them."""

    stored: npt.NDArray[Any]
    valid: npt.NDArray[np.bool_]
    scale: float
    offset: float
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
    stored, valid, transform = _north_up(path, found, notes)
    if found.point:
        notes.assume("dem.pixel_is_point", "yes", "", "declared in the file", "half a cell; the reader has moved the grid")
    unit = _unit(path, found, system, elevation_unit, notes)
    heights = (stored.astype(np.float64) * found.scale + found.offset) * metres_per_unit(unit)
    heights[~valid] = np.nan
    _check_heights(path, heights, stored, valid)
    _warn_of_lone_value(path, heights, notes)
    if np.nanmin(heights) == np.nanmax(heights):
        notes.warn(
            "flat_dem", f"The DEM {path.name} is level, {np.nanmin(heights):g} m everywhere: no flow can be told from it."
        )
    width, height = row_metrics(transform, heights.shape, system)
    grid = Grid(
        heights.shape[0],
        heights.shape[1],
        (transform.a, 0.0, transform.c, 0.0, transform.e, transform.f),
        system.to_wkt(),
        width,
        height,
    )
    _warn_of_steps(path, heights, found.scale * metres_per_unit(unit), grid, notes)
    return Raster(grid, heights.astype(np.float32))


def _read(path: Path, band: int) -> _Band:
    if not path.exists():
        msg = f"the DEM {path.name} does not exist; give the path of a raster file in place.dem"
        raise InputError(msg)
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore", NotGeoreferencedWarning)  # a file without position is refused in our words
            with rasterio.open(path) as file:
                return _band(path, file, band)
    except RasterioIOError as error:
        msg = f"the DEM {path.name} cannot be read as a raster ({_first_line(error)}); check that it is whole"
        raise InputError(msg) from error
    except RasterioError as error:
        msg = f"the DEM {path.name} cannot be read ({_first_line(error)}); convert it to GeoTIFF"
        raise InputError(msg) from error


def _band(path: Path, file: Any, band: int) -> _Band:
    if not 1 <= band <= file.count:
        msg = f"the DEM {path.name} has no band {band}, only 1 to {file.count}; give place.dem_band"
        raise InputError(msg)
    if file.colorinterp[band - 1] in PICTURE:
        msg = f"the DEM {path.name} holds colours ({file.colorinterp[band - 1].name}) in band {band}; give a file of heights"
        raise InputError(msg)
    stored = file.read(band)
    return _Band(
        stored=stored,
        valid=(file.read_masks(band) > 0) & np.isfinite(stored),
        scale=float(file.scales[band - 1]),
        offset=float(file.offsets[band - 1]),
        unit_text=file.units[band - 1] or "",
        transform=file.transform,
        crs=CRS.from_user_input(file.crs) if file.crs else None,
        point=file.tags().get("AREA_OR_POINT", "").lower() == "point",
    )


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
    """Turn a south-up file over; refuse a rotated or mirrored one, and one without a place."""
    t = found.transform
    if t == Affine.identity():
        msg = (
            f"the DEM {path.name} has no position on the ground; set its corners with "
            f"`gdal_edit.py -a_ullr WEST NORTH EAST SOUTH {path.name}` or give a georeferenced file"
        )
        raise InputError(msg)
    if t.b != 0 or t.d != 0 or t.a <= 0:
        msg = (
            f"the DEM {path.name} is rotated, sheared or mirrored; mend it with "
            f"`gdalwarp -r bilinear {path.name} upright.tif` and give upright.tif"
        )
        raise InputError(msg)
    if t.e < 0:
        return found.stored, found.valid, t
    notes.assume("dem.south_up", "turned", "", "the file's row step is positive", "rows now run north to south")
    rows = found.stored.shape[0]
    turned = Affine(t.a, 0.0, t.c, 0.0, -t.e, t.f + rows * t.e)
    return found.stored[::-1], found.valid[::-1], turned


def _unit(path: Path, found: _Band, system: CRS, given: str | None, notes: Notes) -> str:
    if any(axis.direction == "down" for axis in system.axis_info):
        msg = f"the DEM {path.name} holds depths ({system.name}), not heights; turn their sign and give a height CRS"
        raise InputError(msg)
    if given is not None:
        return unit_from_text(given, "place.elevation_unit")
    if found.unit_text:
        return unit_from_text(found.unit_text, "the unit of the DEM's band")
    vertical = [axis for axis in system.axis_info if axis.direction == "up"]
    if vertical:
        return unit_from_text(vertical[0].unit_name, "the unit of the DEM's vertical CRS")
    ground = [axis.unit_name for axis in system.axis_info if not system.is_geographic]
    if ground and unit_from_text(ground[0], "the unit of the DEM's CRS") != "metre":
        msg = (
            f"the DEM {path.name} counts its ground in units of {ground[0]} and does not say in what its heights are; give "
            "place.elevation_unit, such as metre or us_survey_foot"
        )
        raise InputError(msg)
    notes.assume("place.elevation_unit", "metre", "", "the file names no unit", "all heights, slopes and volumes")
    return "metre"


def _check_heights(
    path: Path,
    heights: npt.NDArray[np.float64],
    stored: npt.NDArray[Any],
    valid: npt.NDArray[np.bool_],
) -> None:
    if not valid.any():
        msg = f"the DEM {path.name} holds no height: all {valid.size} cells are nodata; give another file"
        raise InputError(msg)
    if min(valid.shape) == 1:
        msg = f"the DEM {path.name} has {valid.shape[0]} x {valid.shape[1]} cells; it must have 2 rows and columns at least"
        raise InputError(msg)
    if valid.sum() == 1:
        msg = f"the DEM {path.name} has 1 cell that is not nodata; give a DEM of the whole place"
        raise InputError(msg)
    with np.errstate(invalid="ignore"):
        wrong = (heights < LOWEST_M) | (heights > HIGHEST_M)
    nodata_like = wrong | _suspects(heights, stored, valid)
    if nodata_like.any():
        row, col = (int(place) for place in np.argwhere(nodata_like)[0])
        what = f"outside {LOWEST_M:g} to {HIGHEST_M:g} m" if wrong.any() else "that look like nodata"
        msg = (
            f"the DEM {path.name} has {int(nodata_like.sum())} cells {what}, the first "
            f"{stored[row, col]:g} at row {row}, column {col}; if that means nodata, declare it with "
            f"`gdal_edit.py -a_nodata {stored[row, col]:.17g} {path.name}`, else correct the unit in place.elevation_unit"
        )
        raise InputError(msg)


def _collar(heights: npt.NDArray[np.float64], valid: npt.NDArray[np.bool_], hit: npt.NDArray[np.bool_]) -> bool:
    """Tell whether marked cells lie far from all other heights and touch the edge of the raster, as that of a cut DEM."""
    edge = np.zeros(valid.shape, dtype=np.bool_)
    edge[[0, -1]], edge[:, [0, -1]] = True, True
    others = heights[valid & ~hit]
    if not (hit & edge).any() or others.size == 0:
        return False
    return float(np.abs(others - heights[hit][0]).min()) > LONE_GAP_M


def _warn_of_lone_value(path: Path, heights: npt.NDArray[np.float64], notes: Notes) -> None:
    """Warn where many cells share the lowest or highest height, far from all others: undeclared nodata looks like that."""
    for extreme in (float(np.nanmin(heights)), float(np.nanmax(heights))):
        alike = heights == extreme
        others = heights[~alike & ~np.isnan(heights)]
        number = int(np.count_nonzero(alike))
        if others.size == 0 or number < LONE_CELLS:
            continue
        gap = float(np.abs(others - extreme).min())
        if gap > LONE_GAP_M:
            row, col = (int(place) for place in np.argwhere(alike)[0])
            notes.warn(
                "lone_height",
                f"{number} cells of the DEM {path.name} are {extreme:g} m, {gap:.0f} m from all others, the first at row "
                f"{row}, column {col}, and count as ground; if they are none, declare them with gdal_edit.py -a_nodata.",
            )


def _warn_of_steps(path: Path, heights: npt.NDArray[np.float64], step_m: float, grid: Grid, notes: Notes) -> None:
    """Warn where heights come in whole units so large that a slope is either none or steep."""
    if not step_m / grid.typical_cell_m > STEEP_STEP or np.nanmin(heights) == np.nanmax(heights):
        return
    with np.errstate(invalid="ignore"):
        whole = np.abs(heights / step_m - np.round(heights / step_m)) < 1e-6
    if bool(np.all(whole | np.isnan(heights))):
        notes.warn(
            "height_steps",
            f"The heights of the DEM {path.name} come in steps of {step_m:g} m on cells of {grid.typical_cell_m:.3g} m, so "
            f"a slope is 0 or {100 * step_m / grid.typical_cell_m:.0f} %: slopes and plots mean little; take finer heights.",
        )


def _suspects(
    heights: npt.NDArray[np.float64], stored: npt.NDArray[Any], valid: npt.NDArray[np.bool_]
) -> npt.NDArray[np.bool_]:
    """Mark cells of a value that stands for nodata by custom, where no ground is near that value."""
    marked = np.zeros(valid.shape, dtype=np.bool_)
    for suspect in SUSPECTS:
        hit = valid & (stored == suspect)
        if suspect == 0.0 and not _collar(heights, valid, hit):
            continue
        if hit.any():
            near = np.abs(stored.astype(np.float64) - suspect) <= SUSPECT_ALONE * abs(suspect)
            if not (valid & near & ~hit).any():
                marked |= hit
    return marked
