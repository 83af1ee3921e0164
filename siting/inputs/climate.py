"""Daily weather from a CSV, by the names of its columns."""

from pathlib import Path

import numpy as np
import numpy.typing as npt
import pandas as pd

from siting.errors import InputError
from siting.inputs.rain import read_dates, read_numbers, read_table

FloatArray = npt.NDArray[np.float64]

LIMITS = {
    "tmin_c": (-60.0, 50.0),
    "tmax_c": (-50.0, 60.0),
    "rh_mean_pct": (0.0, 100.0),
    "rh_min_pct": (0.0, 100.0),
    "rh_max_pct": (0.0, 100.0),
    "wind_2m_m_s": (0.0, 60.0),
    "sunshine_h": (0.0, 24.0),
    "radiation_mj": (0.0, 50.0),
    "et0_mm": (0.0, 25.0),
}
"""Columns that are understood, with the least and the greatest value that can be right (common practice)."""


def read_climate(path: Path, days: npt.NDArray[np.datetime64]) -> dict[str, FloatArray]:
    """
    Read daily weather on the days of the rain record; NaN where the file has no reading.

    Parameters
    ----------
    path
        CSV with a date column and any of the columns of LIMITS.
    days
        Days of the rain record.

    Raises
    ------
    InputError
        Where no column is understood, a value is outside its limits, or no day is shared.
    """
    table = read_table(path, setting="climate.daily")
    dates = read_dates(path, table, setting="climate.daily")
    found: dict[str, FloatArray] = {}
    for column in table.columns:
        name = str(column).strip().lower()
        if name in LIMITS:
            found[name] = _on_days(path, name, read_numbers(path, table[column], setting="climate.daily"), dates, days)
    if not found:
        columns = ", ".join(repr(str(column)) for column in table.columns)
        msg = f"climate.daily {path.name} has none of the columns {', '.join(LIMITS)}; it has {columns}"
        raise InputError(msg)
    if "tmin_c" in found and "tmax_c" in found and np.any(found["tmin_c"] > found["tmax_c"]):
        day = days[np.flatnonzero(found["tmin_c"] > found["tmax_c"])[0]]
        msg = f"climate.daily {path.name} has tmin_c above tmax_c on {day}; exchange or correct the columns"
        raise InputError(msg)
    return found


def _on_days(
    path: Path, name: str, values: "pd.Series[float]", dates: pd.DatetimeIndex, days: npt.NDArray[np.datetime64]
) -> FloatArray:
    low, high = LIMITS[name]
    wrong = (values < low) | (values > high)
    if wrong.any():
        msg = f"climate.daily {path.name} has {name} {values[wrong].iloc[0]:g}, not in {low:g} to {high:g}; check its unit"
        raise InputError(msg)
    if dates.has_duplicates:
        msg = f"climate.daily {path.name} has {dates[dates.duplicated()][0].date()} more than once; keep one row a day"
        raise InputError(msg)
    series = pd.Series(values.to_numpy(), index=dates).reindex(pd.DatetimeIndex(days))
    if series.notna().sum() == 0:
        msg = f"climate.daily {path.name} shares no day with the rain record, {days[0]} to {days[-1]}; give the same years"
        raise InputError(msg)
    return np.asarray(series, dtype=np.float64)
