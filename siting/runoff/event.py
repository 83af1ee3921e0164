"""Runoff of one day's rain by the curve number method."""

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError

FloatArray = npt.NDArray[np.float64]


def runoff_depth_mm(rain_mm: npt.ArrayLike, retention_mm: npt.ArrayLike, *, abstraction_ratio: float) -> FloatArray:
    """
    Runoff depth of one event: Q = (P - l S)^2 / (P - l S + S) where P exceeds l S, else 0.

    Parameters
    ----------
    rain_mm, retention_mm
        Rain P and potential retention S, mm, at least 0; any shapes that broadcast.
    abstraction_ratio
        Share l of S that is lost before runoff begins, above 0 and below 1.

    Returns
    -------
    array
        Runoff in mm, never below zero and never above the rain; NaN stays NaN.

    Raises
    ------
    ConfigError
        Where the ratio is outside its range, or a rain or retention is below zero or infinite.

    References
    ----------
    NRCS, National Engineering Handbook part 630, chapter 10, eq. 10-9.
    """
    if not 0 < abstraction_ratio < 1:
        msg = f"abstraction ratio {abstraction_ratio:g} is outside 0 to 1"
        raise ConfigError(msg)
    rain = np.asarray(rain_mm, dtype=np.float64)
    retention = np.asarray(retention_mm, dtype=np.float64)
    for name, values in (("rain", rain), ("retention", retention)):
        if np.any(values < 0) or np.any(np.isinf(values)):
            wrong = np.nanmin(values) if np.any(values < 0) else np.inf
            msg = f"{name} of {wrong:g} mm is below zero or has no end"
            raise ConfigError(msg)
    excess = rain - abstraction_ratio * retention
    effective = np.maximum(excess, 0.0)
    # with S = 0 and no rain the quotient is 0/0: nothing runs off
    below = np.where(effective > 0, effective + retention, 1.0)
    # a share of at most 1 times the excess: rounding cannot lift it above the rain
    return np.asarray(np.where(np.isnan(excess), np.nan, effective * (effective / below)))
