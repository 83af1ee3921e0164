"""The day's rain that is reached once in so many years."""

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError, InputError
from siting.runoff.rain import Rain
from siting.runoff.years import Years

FloatArray = npt.NDArray[np.float64]

FIXED_INTERVAL_FACTOR = 1.13
"""From one reading a day to the largest rain of any 24 hours; Hershfield (1961), WMO-168."""
LEAST_YEARS = 10
"""With fewer annual maxima no design rain is told (common practice)."""
ENOUGH_YEARS = 20
"""With fewer annual maxima a design rain is marked (common practice)."""


def annual_max_mm(rain: Rain, years: Years) -> FloatArray:
    """
    Largest daily rain of each kept year, mm; NaN where no day of the year is known.

    Missing days are passed over: a year with its greatest day missing is too low.
    """
    origin = rain.days[0]
    first = (years.first_day - origin).astype(np.int64)
    after = (years.end_day - origin).astype(np.int64)
    known = np.where(np.isnan(rain.rain_mm), -np.inf, rain.rain_mm)
    largest = np.array([known[start:stop].max() for start, stop in zip(first, after, strict=True)])
    return np.where(np.isneginf(largest), np.nan, largest)


def design_rain_mm(annual_max_mm: npt.ArrayLike, *, return_period_years: npt.ArrayLike) -> FloatArray:
    """
    Rain of 24 hours that is reached or passed once in a return period, mm.

    Gumbel's distribution fitted by moments to the annual maxima of daily readings, times 1.13 for readings at a
    fixed hour: x = 1.13 (m + K s), K = -sqrt(6)/pi (0.5772 + ln ln(T / (T - 1))).

    Parameters
    ----------
    annual_max_mm
        Largest reading of each year, mm, at least 0; one row of years. NaN years are left out.
    return_period_years
        T, above 1; any shape.

    Returns
    -------
    array
        mm, in the shape of the return periods, never below zero; NaN where fewer than 10 years are known.
        `few_years_for_design` tells whether to mark it.

    Raises
    ------
    ConfigError
        Where a return period is not above 1 year, or infinite.
    InputError
        Where a maximum is below zero or infinite, or the maxima are no single row.

    References
    ----------
    Chow, Maidment & Mays (1988), Applied Hydrology, eq. 12.3.8.
    """
    period = np.asarray(return_period_years, dtype=np.float64)
    wrong = period[(period <= 1) | np.isinf(period)]
    if wrong.size:
        msg = f"a return period of {wrong.flat[0]:g} years is not above 1 or has no end"
        raise ConfigError(msg)
    known = _known(annual_max_mm)
    if known.size < LEAST_YEARS:
        return np.full(period.shape, np.nan)
    factor = -np.sqrt(6.0) / np.pi * (np.euler_gamma + np.log(-np.log1p(-1.0 / period)))
    reading = known.mean() + factor * known.std(ddof=1)
    return np.asarray(FIXED_INTERVAL_FACTOR * np.maximum(reading, 0.0))


def few_years_for_design(annual_max_mm: npt.ArrayLike) -> bool:
    """Tell whether a design rain from these annual maxima rests on fewer than 20 known years."""
    return _known(annual_max_mm).size < ENOUGH_YEARS


def _known(annual_max_mm: npt.ArrayLike) -> FloatArray:
    maxima = np.asarray(annual_max_mm, dtype=np.float64)
    if maxima.ndim != 1:
        msg = f"annual maxima of shape {maxima.shape} are no single row of years"
        raise InputError(msg)
    wrong = maxima[(maxima < 0) | np.isinf(maxima)]
    if wrong.size:
        msg = f"an annual maximum of {wrong[0]:g} mm is below zero or has no end; correct that year"
        raise InputError(msg)
    return maxima[~np.isnan(maxima)]
