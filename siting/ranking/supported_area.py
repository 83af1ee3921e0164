"""How large a part of a plot its run-on can keep reliable."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.demand import SeasonYields
from siting.errors import ConfigError
from siting.ranking.reliability import reliability

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]
Flags = npt.NDArray[np.bool_]
YieldsAt = Callable[[Integers, FloatArray], SeasonYields]

SCANNED_AREAS = 24
SMALLEST_SHARE = 0.01
"""The scan begins at this share of the patch (assumption)."""

BISECTIONS = 10
"""They bring the area within 0.02 % of the crossing: a step of the scan is a factor of 1.22."""

LOST_SHARE = 0.5
"""Where more than this share of the water of failing seasons is lost, the soil and not the run-on is short (assumption)."""


@dataclass(frozen=True, slots=True, eq=False)
class SupportedArea:
    """
    Area by plot that keeps the target, and the whole curve behind it.

    `area_m2` is 0 where no area does, NaN where yields are unknown. `limit` is what holds it: "land" (the patch is used
    up), "water", "soil", "too_wet", or "" where unknown. `rain_suffices` tells that rain alone keeps the target on the
    patch. Below `too_wet_below_m2` water would stand too long: NaN where no smaller area fails. `curve_area_m2` and
    `curve_reliability` have a row for each plot.
    """

    area_m2: FloatArray
    limit: npt.NDArray[np.str_]
    rain_suffices: Flags
    too_wet_below_m2: FloatArray
    curve_area_m2: FloatArray
    curve_reliability: FloatArray


def supported_area(
    yields_at: YieldsAt,
    *,
    rain_alone: SeasonYields,
    patch_area_m2: FloatArray,
    target_yield: float,
    target_reliability: float,
    standing_water_days: int,
) -> SupportedArea:
    """
    Find the largest area over which the same run-on, spread evenly, keeps the target reliability.

    Reliability falls with area only while no water stands too long, so 24 areas are scanned, evenly on a log scale from
    1 % of the patch to all of it, and the last crossing is bisected. Where rain alone suffices it is the whole patch.

    Parameters
    ----------
    yields_at
        Gives the yields of the plots at these places, each spread over an area, m2: `daily_balance` of these plots.
    rain_alone
        Yields of all plots with the run-on shut off.
    patch_area_m2
        Largest area of each plot, above 0.
    target_yield, target_reliability
        Relative yield that counts, and the share of seasons that must reach it; above 0 and at most 1.
    standing_water_days
        Days under water that the crop bears.

    Raises
    ------
    ConfigError
        A target out of its range.
    """
    if not 0 < target_reliability <= 1:
        msg = f"target_reliability {target_reliability:g} is outside 0 to 1; give a share of seasons, so 67 % is 0.67"
        raise ConfigError(msg)
    search = _Search(yields_at, target_yield, target_reliability)
    steps = np.geomspace(SMALLEST_SHARE, 1.0, SCANNED_AREAS)
    areas = patch_area_m2[:, None] * steps[None, :]
    everyone = np.arange(patch_area_m2.size)
    curve = np.stack([search.share(everyone, areas[:, step]) for step in range(SCANNED_AREAS)], axis=1)
    holds: Flags = np.greater_equal(curve, target_reliability)
    last = SCANNED_AREAS - 1 - np.argmax(holds[:, ::-1], axis=1)  # largest area that holds, where any does
    some: Flags = np.asarray(holds.any(axis=1))
    sufficing: Flags = np.greater_equal(
        reliability(rain_alone.relative_yield, target_yield=target_yield).share, target_reliability
    )
    full: Flags = np.logical_or(sufficing, some & (last == SCANNED_AREAS - 1))
    area = np.where(full, patch_area_m2, 0.0)
    limit = np.where(full, "land", np.full(full.size, "", dtype="<U7"))
    failing_area = areas[everyone, np.argmax(curve, axis=1)]  # where no area holds: the one that comes nearest
    crossing = np.flatnonzero(some & ~full)
    if crossing.size:
        at = last[crossing]
        area[crossing], failing_area[crossing] = search.bisect(crossing, areas[crossing, at], areas[crossing, at + 1])
    short = np.flatnonzero(~full)
    if short.size:
        limit[short] = search.limits(short, failing_area[short], some[short], standing_water_days)
    wet = search.lower_crossing(areas, holds, last, some & ~sufficing)
    unknown = np.isnan(curve).any(axis=1)
    limit[unknown] = ""
    return SupportedArea(np.where(unknown, np.nan, area), limit, sufficing, wet, areas, curve)


@dataclass(frozen=True, slots=True)
class _Search:
    yields_at: YieldsAt
    target_yield: float
    target_reliability: float

    def share(self, plots: Integers, area_m2: FloatArray) -> FloatArray:
        return reliability(self.yields_at(plots, area_m2).relative_yield, target_yield=self.target_yield).share

    def bisect(self, plots: Integers, holding_m2: FloatArray, failing_m2: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Close in on a crossing between an area that holds and one that fails; return both."""
        holding, failing = holding_m2.copy(), failing_m2.copy()
        for _ in range(BISECTIONS):
            middle = np.sqrt(holding * failing)
            holds = self.share(plots, middle) >= self.target_reliability
            holding, failing = np.where(holds, middle, holding), np.where(holds, failing, middle)
        return holding, failing

    def lower_crossing(self, areas: FloatArray, holds: Flags, last: Integers, asked: Flags) -> FloatArray:
        """Smallest area of the band that holds up to `last`, NaN where no smaller area fails."""
        found = np.full(last.size, np.nan)
        below = ~holds & (np.arange(holds.shape[1])[None, :] < last[:, None])
        plots = np.flatnonzero(asked & below.any(axis=1))
        if plots.size:
            at = holds.shape[1] - 1 - np.argmax(below[plots, ::-1], axis=1)
            found[plots], _ = self.bisect(plots, areas[plots, at + 1], areas[plots, at])
        return found

    def limits(self, plots: Integers, area_m2: FloatArray, crossed: Flags, standing_water_days: int) -> npt.NDArray[np.str_]:
        """Tell what fails in the seasons that miss the target at an area just too large, or at the best of none."""
        yields = self.yields_at(plots, area_m2)
        missed = yields.relative_yield < self.target_yield
        drowned = missed & (yields.standing_water_days > standing_water_days)
        too_wet = ~crossed & (2 * drowned.sum(axis=1) > missed.sum(axis=1))
        lost = np.where(missed, yields.overflow_m3 + yields.percolation_m3, 0.0).sum(axis=1)
        came = np.where(missed, yields.runon_m3, 0.0).sum(axis=1)
        return np.select([too_wet, lost > LOST_SHARE * came], ["too_wet", "soil"], default="water")
