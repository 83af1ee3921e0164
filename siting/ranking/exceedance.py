"""How often a value is reached or bettered."""

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError

FloatArray = npt.NDArray[np.float64]

MANUAL_OFFSET = 0.375
"""Offset of the plotting position in FAO AGL/MISC/17/91 section 3.4 (Blom's), for 10 to 100 years."""


def plotting_position(rank: npt.ArrayLike, count: npt.ArrayLike, *, offset: float = MANUAL_OFFSET) -> FloatArray:
    """
    Share of years in which the value of a rank is reached or bettered: p = (m - a) / (N + 1 - 2a).

    Parameters
    ----------
    rank
        Rank m, 1 for the largest; broadcasts with `count`.
    count
        Number of years N, at least 1.
    offset
        a: 0 Weibull, 0.375 Blom and the FAO manual, 0.4 Cunnane, 0.44 Gringorten, 0.5 Hazen.

    References
    ----------
    Critchley & Siegert (1991), FAO AGL/MISC/17/91, section 3.4; Cunnane (1978), J. Hydrol. 37.
    """
    if not 0 <= offset <= 0.5:
        msg = f"plotting position offset {offset:g} is outside 0 to 0.5; the FAO manual has 0.375"
        raise ConfigError(msg)
    place, years = np.asarray(rank, dtype=np.float64), np.asarray(count, dtype=np.float64)
    return np.asarray((place - offset) / (years + 1.0 - 2.0 * offset))


def return_period_years(probability: npt.ArrayLike) -> FloatArray:
    """
    Mean number of years from one year that reaches a value to the next: T = 1 / p.

    `probability` is the share of years, above 0 and at most 1; NaN stays NaN; ConfigError outside.
    """
    share = np.asarray(probability, dtype=np.float64)
    bad = share[(share <= 0) | (share > 1)]
    if bad.size:
        msg = f"probability {bad[0]:g} is outside 0 to 1; give a share of years, so 80 % is 0.8"
        raise ConfigError(msg)
    return np.asarray(1.0 / share)


def exceedance(values: npt.ArrayLike) -> FloatArray:
    """
    Share of years in which each value is reached or bettered: p = (m - 0.375) / (N + 0.25), m = 1 for the largest.

    One dimension; NaN stays NaN and is not counted. Equal values keep their order. FAO AGL/MISC/17/91 section 3.4.
    """
    series = np.asarray(values, dtype=np.float64)
    known = np.flatnonzero(~np.isnan(series))
    found = np.full(series.shape, np.nan)
    order = known[np.argsort(-series[known], kind="stable")]
    found[order] = plotting_position(np.arange(1, known.size + 1), known.size)
    return found


def dependable(values: npt.ArrayLike, *, probability: float, offset: float = MANUAL_OFFSET) -> FloatArray:
    """
    Value that is reached or bettered in the share `probability` of years, linear between ranks.

    Parameters
    ----------
    values
        Any shape, years along the last axis; NaN is not counted. An infinite value is larger than any other.
    probability
        Share of years, between 0 and 1.
    offset
        As in `plotting_position`.

    Returns
    -------
    FloatArray
        The shape of `values` without its last axis. NaN, and not a guess, where the probability lies
        outside those of the ranks, where no value is known, or between a finite and an infinite value.
    """
    if not 0 < probability < 1:
        msg = f"probability {probability:g} is outside 0 to 1; give a share of years, so 80 % is 0.8"
        raise ConfigError(msg)
    series = np.asarray(values, dtype=np.float64)
    found = np.full(series.shape[:-1], np.nan)
    for place in np.ndindex(found.shape):
        row = series[place]
        found[place] = _at(row[~np.isnan(row)], probability, offset)
    return found


def _at(known: FloatArray, probability: float, offset: float) -> float:
    """Value at a probability among known values, NaN outside the ranks."""
    if known.size == 0:
        return float("nan")
    first, last = plotting_position([1, known.size], known.size, offset=offset)
    if not first <= probability <= last:
        return float("nan")
    ranked = np.sort(known)[::-1]
    place = probability * (known.size + 1.0 - 2.0 * offset) + offset - 1.0
    # rounding must neither step outside the ranks nor put weight on a neighbour beside an exact rank
    place = min(max(place, 0.0), known.size - 1.0)
    if abs(place - round(place)) < 1e-9:
        return float(ranked[round(place)])
    above, below, share = ranked[int(place)], ranked[int(place) + 1], place - int(place)
    if np.isinf(above) or np.isinf(below):
        return float("nan")
    return float(above + (below - above) * share)
