"""The true size of cells on the ground, row by row, for any CRS."""

import math

import numpy as np
import numpy.typing as npt
from affine import Affine
from pyproj import CRS, Transformer

from siting.errors import InputError

FloatArray = npt.NDArray[np.float64]

CHORD_M = 200.0
"""Ground lengths are measured over about this much, and divided: a single small cell would drown in rounding."""


def row_metrics(transform: Affine, shape: tuple[int, int], crs: CRS) -> tuple[FloatArray, FloatArray]:
    """
    Measure the ground width and height of a cell in each row, m, at the middle column.

    Geodesic lengths on the CRS's ellipsoid. (A projection's published scale factors are not used: those of web maps
    are factors to a sphere, 0.2 % off the ground.)

    Parameters
    ----------
    transform, shape
        North-up position and size of the grid.
    crs
        Geographic or projected, in any unit.

    Raises
    ------
    InputError
        Where a row lies outside the CRS's range.
    """
    if not (crs.is_geographic or crs.is_projected):
        msg = f"the CRS {crs.name!r} is neither geographic nor projected; give one that is, in place.crs"
        raise InputError(msg)
    flat = crs.to_2d() if len(crs.axis_info) > 2 else crs
    rows, cols = shape
    y: FloatArray = transform.f + transform.e * (np.arange(rows, dtype=np.float64) + 0.5)
    x = np.full(rows, transform.c + transform.a * cols / 2.0)
    unit_m = flat.axis_info[0].unit_conversion_factor * (6.37e6 if flat.is_geographic else 1.0)
    cells = max(1.0, math.ceil(CHORD_M / (abs(transform.e) * unit_m)))
    aside, up = float(0.5 * cells * transform.a), float(0.5 * cells * transform.e)
    width = _ground_m(flat, x - aside, y, x + aside, y) / cells
    height = _ground_m(flat, x, y - up, x, y + up) / cells
    if not (np.isfinite(width) & np.isfinite(height) & (width > 0) & (height > 0)).all():
        msg = f"coordinates from {y.min():g} to {y.max():g} lie outside the range of the CRS {crs.name!r}; correct place.crs"
        raise InputError(msg)
    return width, height


def _ground_m(crs: CRS, x0: FloatArray, y0: FloatArray, x1: FloatArray, y1: FloatArray) -> FloatArray:
    """Geodesic length between points of a CRS, m; NaN where a point has no place on the ellipsoid."""
    geodetic = crs.geodetic_crs or crs
    if crs.is_geographic:
        degrees = math.degrees(crs.axis_info[0].unit_conversion_factor)
        ends = [x0 * degrees, y0 * degrees, x1 * degrees, y1 * degrees]
    else:
        to_ground = Transformer.from_crs(crs, geodetic.to_2d(), always_xy=True)
        ends = [*to_ground.transform(x0, y0), *to_ground.transform(x1, y1)]
    known = np.all(np.isfinite(ends), axis=0) & (np.abs(ends[1]) <= 90) & (np.abs(ends[3]) <= 90)
    lon0, lat0, lon1, lat1 = (np.where(known, end, 0.0) for end in ends)
    geod = crs.get_geod()
    if geod is None:
        msg = f"the CRS {crs.name!r} has no ellipsoid, so lengths on the ground are unknown; give another in place.crs"
        raise InputError(msg)
    length = np.asarray(geod.inv(lon0, lat0, lon1, lat1)[2])
    return np.where(known, length, np.nan)
