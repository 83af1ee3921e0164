"""Crop coefficients and responses (FAO-56, FAO-33)."""

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError

FloatArray = npt.NDArray[np.float64]

HIGHEST_KC = 2.0
"""Beyond any coefficient in print (the highest of FAO-56 Table 12 is about 1.25)."""


def crop_coefficient(
    day: npt.ArrayLike, *, stage_days: tuple[int, int, int, int], kc: tuple[float, float, float]
) -> FloatArray:
    """
    Read the crop coefficient curve.

    Parameters
    ----------
    day
        Days since sowing (0 at sowing; season day d is read at d - 0.5); NaN outside the season.
    stage_days
        Length of the initial, development, mid and late stage, days.
    kc
        Coefficient of the initial and the mid stage, and at the end.

    References
    ----------
    FAO-56 eq. 66: level, then linear, level, then linear.
    """
    if min(stage_days) < 0 or sum(stage_days) <= 0:
        msg = f"stage lengths {stage_days} days: none may be below zero, and not all zero; give four lengths in days"
        raise ConfigError(msg)
    if not (min(kc) >= 0 and max(kc) <= HIGHEST_KC):
        msg = f"crop coefficients {kc}: each must lie between 0 and {HIGHEST_KC:g}; give initial, mid-season and end"
        raise ConfigError(msg)
    initial, development, middle, _ = np.cumsum(stage_days)
    total = float(sum(stage_days))
    when = np.asarray(day, dtype=np.float64)
    found = np.interp(when, [0, initial, development, middle, total], [kc[0], kc[0], kc[1], kc[1], kc[2]])
    return np.where((when >= 0) & (when <= total), found, np.nan)


def daily_coefficients(*, stage_days: tuple[int, int, int, int], kc: tuple[float, float, float]) -> FloatArray:
    """Return the coefficient of each season day, taken at its middle."""
    days = np.arange(sum(stage_days)) + 0.5
    return crop_coefficient(days, stage_days=stage_days, kc=kc)


def adjusted_coefficient(
    kc: npt.ArrayLike, *, wind_2m_m_s: npt.ArrayLike, rh_min_pct: npt.ArrayLike, height_m: npt.ArrayLike
) -> FloatArray:
    """
    Adjust a mid-season or end coefficient for wind and humidity; below 0.45 it stays as it is.

    The printed ranges hold: wind 1 to 6 m/s, least humidity 20 to 80 %, height 0.1 to 10 m; values beyond are
    brought to the nearest limit. FAO-56 eq. 62, 65.
    """
    table = np.asarray(kc, dtype=np.float64)
    wind = np.clip(np.asarray(wind_2m_m_s, dtype=np.float64), 1.0, 6.0)
    humidity = np.clip(np.asarray(rh_min_pct, dtype=np.float64), 20.0, 80.0)
    height = np.clip(np.asarray(height_m, dtype=np.float64), 0.1, 10.0)
    change = (0.04 * (wind - 2.0) - 0.004 * (humidity - 45.0)) * (height / 3.0) ** 0.3
    return np.asarray(np.where(table >= 0.45, table + change, table))


def relative_yield(*, et_ratio: npt.ArrayLike, ky: npt.ArrayLike) -> FloatArray:
    """
    Yield relative to that of an unstressed crop: 1 - Ky (1 - ETa/ETc), at least 0.

    Arguments broadcast; NaN stays NaN. FAO-33 (1979) eq. 1; FAO-56 eq. 90.
    """
    ratio = np.asarray(et_ratio, dtype=np.float64)
    return np.asarray(np.maximum(1.0 - np.asarray(ky, dtype=np.float64) * (1.0 - ratio), 0.0))
