"""Curve numbers of a whole place, adjusted to its slopes."""

import numpy as np
import numpy.typing as npt

from siting.errors import GridError
from siting.runoff.curve_number import slope_adjusted_curve_number, wet_curve_number

BAND_ROWS = 256
"""Rows adjusted at once: what is made on the way stays small beside the raster."""

STEP = 0.5
"""Adjusted numbers are rounded to this, so that classes of ground stay few."""


def slope_adjusted(curve_number: npt.NDArray[np.floating], slope: npt.NDArray[np.floating]) -> npt.NDArray[np.float32]:
    """
    Adjust a raster of curve numbers to the slope of the ground; ground of 5 % keeps its number.

    Parameters
    ----------
    curve_number
        Above 0 and at most 100, (rows, cols).
    slope
        Tangent, at least 0, same shape.

    Returns
    -------
    array
        Rounded to half a number; NaN where either is NaN.

    Raises
    ------
    GridError
        Where the shapes differ.
    ConfigError
        Where a curve number or slope is out of its range.

    References
    ----------
    Sharpley & Williams (1990), EPIC, with the wet number of NEH-630 table 10-1.
    """
    if curve_number.shape != slope.shape:
        msg = f"curve numbers of shape {curve_number.shape} meet slopes of shape {slope.shape}; both must be the same"
        raise GridError(msg)
    adjusted = np.empty(slope.shape, dtype=np.float32)
    for row in range(0, slope.shape[0], BAND_ROWS):
        band = slice(row, row + BAND_ROWS)
        number = slope_adjusted_curve_number(curve_number[band], wet_curve_number(curve_number[band]), slope[band])
        adjusted[band] = np.maximum(np.round(number / STEP), 1.0) * STEP
    return adjusted
