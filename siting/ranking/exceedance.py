"""How often a value is reached or bettered."""

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError

FloatArray = npt.NDArray[np.float64]


def exceedance(values: npt.ArrayLike) -> FloatArray:
    """
    Share of years in which each value is reached or bettered: p = (m - 0.375) / (N + 0.25), m = 1 for the largest.

    One dimension; NaN stays NaN and is not counted. Equal values keep their order. FAO AGL/MISC/17/91 section 3.4.
    """
    series = np.asarray(values, dtype=np.float64)
    known = np.flatnonzero(~np.isnan(series))
    found = np.full(series.shape, np.nan)
    order = known[np.argsort(-series[known], kind="stable")]
    found[order] = (np.arange(1, known.size + 1) - 0.375) / (known.size + 0.25)
    return found


def dependable(values: npt.ArrayLike, *, probability: float) -> float:
    """
    Value that is reached or bettered in the share `probability` (0 to 1) of years, linear between ranks.

    NaN, and not a guess, where the probability lies outside those of the ranks, or no value is known.
    """
    if not 0 < probability < 1:
        msg = f"probability {probability:g} is outside 0 to 1"
        raise ConfigError(msg)
    series = np.asarray(values, dtype=np.float64)
    ranked = np.sort(series[~np.isnan(series)])[::-1]
    if ranked.size == 0:
        return float("nan")
    shares = (np.arange(1, ranked.size + 1) - 0.375) / (ranked.size + 0.25)
    if not shares[0] <= probability <= shares[-1]:
        return float("nan")
    return float(np.interp(probability, shares, ranked))
