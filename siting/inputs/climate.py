"""Daily weather from a CSV, by the names of its columns."""

from pathlib import Path

import numpy as np
import numpy.typing as npt

from siting.demand.weather import BOUNDS, Climate
from siting.errors import InputError
from siting.inputs.daily_csv import read_dates, read_numbers, read_table


def read_climate(path: Path) -> Climate:
    """
    Read daily weather of any years.

    The CSV has a date column and any of et0_mm, tmin_c, tmax_c, rh_mean_pct, rh_min_pct, rh_max_pct, wind_2m_m_s,
    sunshine_h and solar_mj, in any order and case; other columns are passed over. Days may come in any order and
    leave holes. Empty cells are unknown (NaN).

    Raises
    ------
    InputError
        Where no column is understood, a column or a day stands twice, or a value is impossible.
    """
    table = read_table(path, setting="climate.daily")
    dates = read_dates(path, table, setting="climate.daily").to_numpy()
    order = np.argsort(dates, kind="stable")
    columns = [str(column) for column in table.columns]
    series: dict[str, npt.NDArray[np.float64]] = {}
    for column in columns:
        name = column.strip().lower()
        if name in series:
            msg = f"climate.daily {path.name} has the column {name} twice; keep one"
            raise InputError(msg)
        if name in BOUNDS:
            values = read_numbers(path, table[column], setting="climate.daily")
            series[name] = np.asarray(values, dtype=np.float64)[order]
    if not series:
        listed = ", ".join(repr(column) for column in columns)
        msg = f"climate.daily {path.name} has none of the columns {', '.join(BOUNDS)}; it has {listed}"
        raise InputError(msg)
    return Climate(dates[order].astype("datetime64[D]"), **series)
