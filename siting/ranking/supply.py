"""The order that a hand can follow: by supply in the dependable year."""

import numpy as np
import numpy.typing as npt

FloatArray = npt.NDArray[np.float64]


def mean_capped_ratio(supply_ratio: FloatArray) -> FloatArray:
    """
    Mean over seasons (last axis) of min(1, supply ratio): a flood in one season makes up for no dry one.

    NaN is not counted; NaN where no season is known.
    """
    known = ~np.isnan(supply_ratio)
    total = np.where(known, np.minimum(supply_ratio, 1.0), 0.0).sum(axis=-1)
    count = known.sum(axis=-1)
    return np.where(count > 0, total / np.maximum(count, 1), np.nan)


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
    Rank plots, the best first.

    The keys, each deciding only where those before tie: the dry, then the median ratio, both at most 1; the
    mean over seasons; the gain over rain alone; the smaller 10-year peak; the smaller `plot_id`.

    Parameters
    ----------
    supply_ratio_dry, supply_ratio_median
        Ratio reached in 80 % and in 50 % of the plot's own seasons; above 1 counts as 1.
    supply_ratio_mean
        Mean over all seasons of the capped ratio, as `mean_capped_ratio` gives it; above 1 counts as 1.
    gain
        What run-on adds over rain alone, in any one unit.
    peak_flow_10y_m3s
        NaN where unknown; one unknown peak makes all plots tie in it, for no order among the rest could
        place it.
    plot_id
        Different for each plot.

    Returns
    -------
    int64 array
        Rank of each plot, 1 to the number of plots. An unknown (NaN) ratio or gain comes last within its key.
    """
    ratios = (supply_ratio_dry, supply_ratio_median, supply_ratio_mean)
    keys = [_descending(np.minimum(ratio, 1.0)) for ratio in ratios]
    keys.append(_descending(gain))
    keys.append(np.zeros(plot_id.size) if np.isnan(peak_flow_10y_m3s).any() else peak_flow_10y_m3s)
    order = np.lexsort((plot_id, *reversed(keys)))
    rank = np.empty(plot_id.size, dtype=np.int64)
    rank[order] = np.arange(1, plot_id.size + 1)
    return rank


def _descending(values: FloatArray) -> FloatArray:
    return np.where(np.isnan(values), np.inf, -values)
