"""How much catchment a plot needs: by the manual's rule, and so that it suffices in most seasons."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError
from siting.ranking.exceedance import dependable

FloatArray = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]

NO_RUN_ON = "no run-on in that season"
SHORT_RECORD = "too few seasons"
UNKNOWN = "demand or run-on unknown"


def catchment_ratio(
    *,
    crop_mm: npt.ArrayLike,
    rain_mm: npt.ArrayLike,
    runoff_coefficient: npt.ArrayLike,
    efficiency: npt.ArrayLike,
) -> FloatArray:
    """
    Catchment area over cropped area by the design rule: (CWR - DR) / (DR x K x E), at least 0.

    Parameters
    ----------
    crop_mm, rain_mm
        Crop water requirement CWR and design rain DR of the season, mm; the rain above 0.
    runoff_coefficient, efficiency
        Share K of the rain that runs off, and share E of it that the crop uses; above 0 and at most 1.

    Returns
    -------
    FloatArray
        Arguments broadcast; NaN stays NaN. ConfigError names a value outside its range.

    References
    ----------
    Critchley & Siegert (1991), FAO AGL/MISC/17/91, section 4.2.
    """
    crop = _within(crop_mm, "crop water requirement", "mm", least=0.0, most=np.inf, open_below=False)
    rain = _within(rain_mm, "design rain", "mm", least=0.0, most=np.inf)
    coefficient = _within(runoff_coefficient, "runoff coefficient", "", least=0.0, most=1.0)
    share = _within(efficiency, "efficiency", "", least=0.0, most=1.0)
    return np.asarray(np.maximum((crop - rain) / (rain * coefficient * share), 0.0))


def _within(
    values: npt.ArrayLike, name: str, unit: str, *, least: float, most: float, open_below: bool = True
) -> FloatArray:
    known = np.asarray(values, dtype=np.float64)
    bad = known[(known > most) | ((known <= least) if open_below else (known < least))]
    if bad.size:
        bound = "above" if open_below else "at least"
        limit = f" and at most {most:g}" if np.isfinite(most) else ""
        msg = f"{name} {bad[0]:g}{' ' + unit if unit else ''}: it must be {bound} {least:g}{limit}"
        raise ConfigError(msg)
    return known


@dataclass(frozen=True, slots=True, eq=False)
class SufficientRatio:
    """A ratio by plot, NaN where there is none, and then the `reason` ("" elsewhere)."""

    ratio: FloatArray
    reason: npt.NDArray[np.str_]


def sufficient_ratio(needed_ratio: FloatArray, *, lacks_runon: Flags, share_of_seasons: float) -> SufficientRatio:
    """
    Catchment to cropped area that suffices in a share of all seasons.

    A season without run-on is one that no ratio would have met: it counts, as needing more than any other, so
    that it never makes a plot look better.

    Parameters
    ----------
    needed_ratio
        By plot and season; NaN where none is known.
    lacks_runon
        By plot and season: no ratio is known because no run-on came.
    share_of_seasons
        Between 0 and 1, such as 0.8. The ratio is the one exceeded in the rest, by the plotting position of
        `exceedance`.
    """
    needed = np.where(lacks_runon, np.inf, needed_ratio)
    ratio = dependable(needed, probability=1.0 - share_of_seasons)
    counted = ~np.isnan(needed)
    # in reach where a record of as many seasons has a value at that share, whatever the seasons needed
    in_reach = ~np.isnan(dependable(np.where(counted, 0.0, np.nan), probability=1.0 - share_of_seasons))
    unreached = ~np.isfinite(ratio)
    reason = np.select([~unreached, ~counted.any(axis=-1), ~in_reach], ["", UNKNOWN, SHORT_RECORD], default=NO_RUN_ON)
    return SufficientRatio(np.where(unreached, np.nan, ratio), reason)
