"""In what share of seasons a yield is reached, and how sure that share is."""

from dataclasses import dataclass
from statistics import NormalDist

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class Reliability:
    """Share of seasons by plot with its interval, each 0 to 1, NaN where no season is known; and how many are known."""

    share: FloatArray
    low: FloatArray
    high: FloatArray
    seasons: Integers


def reliability(relative_yield: FloatArray, *, target_yield: float, confidence: float = 0.90) -> Reliability:
    """
    Share of seasons in which the relative yield is at or above a target.

    Parameters
    ----------
    relative_yield
        By plot and season (last axis); 0 in a failed season, which counts; NaN (unknown) does not.
    target_yield
        Above 0 and at most 1, such as 0.7.
    confidence
        Of the interval, between 0 and 1.

    Raises
    ------
    ConfigError
        A target or a confidence out of its range.
    """
    if not 0 < target_yield <= 1:
        msg = f"target_yield {target_yield:g} is outside 0 to 1; give a share of the full yield, so 70 % is 0.7"
        raise ConfigError(msg)
    known = ~np.isnan(relative_yield)
    seasons = known.sum(axis=-1)
    met = (known & (relative_yield >= target_yield)).sum(axis=-1)
    share = np.divide(met, seasons, out=np.full(seasons.shape, np.nan), where=seasons > 0)
    low, high = wilson_interval(met, seasons, confidence=confidence)
    return Reliability(share, low, high, seasons)


def wilson_interval(met: npt.ArrayLike, count: npt.ArrayLike, *, confidence: float) -> tuple[FloatArray, FloatArray]:
    """
    Interval of a share from `met` cases out of `count`, NaN where there is none: the score interval without correction.

    Arguments broadcast; ConfigError for a confidence that is not between 0 and 1. Wilson (1927), J. Am. Stat. Assoc. 22.
    """
    if not 0 < confidence < 1:
        msg = f"confidence {confidence:g} is outside 0 to 1; give a share, so 90 % is 0.9"
        raise ConfigError(msg)
    reached, cases = np.broadcast_arrays(np.asarray(met, dtype=np.float64), np.asarray(count, dtype=np.float64))
    z = NormalDist().inv_cdf(0.5 + 0.5 * confidence)
    some = np.where(cases > 0, cases, np.nan)
    share = reached / some
    middle = share + z * z / (2.0 * some)
    half = z * np.sqrt(share * (1.0 - share) / some + (z / (2.0 * some)) ** 2)
    whole = 1.0 + z * z / some
    # rounding must not lead outside where all or none are met
    return np.maximum((middle - half) / whole, 0.0), np.minimum((middle + half) / whole, 1.0)
