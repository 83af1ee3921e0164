"""The order that a hand can follow: by supply in the dependable year."""

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError

FloatArray = npt.NDArray[np.float64]


def catchment_ratio(
    *,
    crop_mm: npt.ArrayLike,
    rain_mm: npt.ArrayLike,
    runoff_coefficient: npt.ArrayLike,
    efficiency: npt.ArrayLike,
) -> FloatArray:
    """
    Catchment area over cropped area by the design rule: (CWR - DR) / (DR x K x E), at least 0.

    Depths in mm; runoff coefficient K and efficiency E above 0 and at most 1. FAO AGL/MISC/17/91 section 4.2.
    """
    crop, rain = np.asarray(crop_mm, dtype=np.float64), np.asarray(rain_mm, dtype=np.float64)
    share = np.asarray(runoff_coefficient, dtype=np.float64) * np.asarray(efficiency, dtype=np.float64)
    if np.any(share <= 0) or np.any(rain <= 0):
        msg = "the ratio needs rain, runoff coefficient and efficiency above zero"
        raise ConfigError(msg)
    return np.asarray(np.maximum((crop - rain) / (rain * share), 0.0))


def supply_order(
    *,
    supply_ratio_dry: FloatArray,
    supply_ratio_median: FloatArray,
    supply_ratio_mean: FloatArray,
    gain: FloatArray,
    peak_flow_10y_m3s: FloatArray,
    plot_id: npt.NDArray[np.int64],
) -> npt.NDArray[np.int64]:
    """
    Rank plots from 1: by min(1, supply ratio) in the dependable year, then in the median year, then the mean of all
    seasons, then the gain over rain alone, then the smaller 10-year peak, then the smaller plot_id.

    An unknown (NaN) ratio comes last within its key; an unknown peak counts as a tie with all others.
    """  # noqa: D205
    keys = [_descending(np.minimum(ratio, 1.0)) for ratio in (supply_ratio_dry, supply_ratio_median)]
    keys += [_descending(supply_ratio_mean), _descending(gain)]
    keys.append(np.zeros(plot_id.size) if np.isnan(peak_flow_10y_m3s).any() else peak_flow_10y_m3s)
    order = np.lexsort((plot_id, *reversed(keys)))
    rank = np.empty(plot_id.size, dtype=np.int64)
    rank[order] = np.arange(1, plot_id.size + 1)
    return rank


def _descending(values: FloatArray) -> FloatArray:
    return np.where(np.isnan(values), np.inf, -values)
