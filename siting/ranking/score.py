"""One figure for a plot from six qualities, so that no strong point hides a weak one."""

from collections.abc import Mapping
from dataclasses import dataclass, fields

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError

FloatArray = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]

LEAST = 0.01
"""Floor of a component: a weak point lowers the score and does not hide all else (assumption)."""

FULL_SOIL_MM = 150.0
"""Available water at and above which the soil counts in full (assumption)."""

WORST_PEAK_M3S = 5.0
"""10-year peak flow at which nothing is left of safety (assumption)."""

WORST_STANDING_DAYS = 30.0
"""Days under water in the worst season at which nothing is left of safety (assumption)."""

FULL_YEARS = 20.0
"""Complete years of rain from which on a record counts in full (assumption)."""

SURE_RELIEF = 4.0
"""Relief of a catchment, in vertical errors, from which on its outline counts as sure (assumption)."""

OPEN_CERTAINTY = 0.5
"""Certainty of a plot whose catchment goes on beyond the data (assumption)."""


@dataclass(frozen=True, slots=True, eq=False)
class Components:
    """Qualities by plot, each 0.01 (poor) to 1 (as good as counts); NaN where something that it rests on is unknown."""

    water: FloatArray
    gain: FloatArray
    soil: FloatArray
    ease: FloatArray
    safety: FloatArray
    certainty: FloatArray


COMPONENTS = tuple(field.name for field in fields(Components))
"""Names of the six components, in the order in which they are shown."""


@dataclass(frozen=True, slots=True, eq=False)
class Score:
    """
    Score by plot, 0.01 to 1, NaN for all where no component is left.

    `used` names the components that it rests on, `left_out` those with a weight that some plot lacks.
    """

    score: FloatArray
    used: tuple[str, ...]
    left_out: tuple[str, ...]


def score_components(
    *,
    reliability: FloatArray,
    mean_yield: FloatArray,
    rain_only_mean_yield: FloatArray,
    available_water_mm: FloatArray,
    slope: FloatArray,
    max_slope: float,
    peak_flow_10y_m3s: FloatArray,
    standing_water_days: FloatArray,
    open_catchment: Flags,
    rain_years: int,
    catchment_relief_m: FloatArray,
    vertical_error_m: float,
) -> Components:
    """
    Bring what is known of each plot to six components.

    Parameters
    ----------
    reliability
        Share of seasons that reach the target yield, 0 to 1.
    mean_yield, rain_only_mean_yield
        Mean relative yield over all seasons, 0 to 1, with run-on and on rain alone. Where rain alone gives the full yield
        there is nothing to gain, and the component is at its floor.
    available_water_mm
        Water that the root zone can hold for plants.
    slope, max_slope
        Tangent of the plot and the steepest that may be cropped, in one unit; the latter above 0.
    peak_flow_10y_m3s, standing_water_days
        Peak flow reached once in ten years, and days under water in the worst season; the worse of the two counts.
    open_catchment, rain_years, catchment_relief_m, vertical_error_m
        Whether the catchment goes on beyond the data; complete years of rain; height from the plot to the highest ground
        above it (0 where nothing drains to it); standard deviation of local heights, above 0. The worst of them counts.

    Returns
    -------
    Components
        Clipped to 0.01 to 1; NaN wherever an input of the component is NaN.

    Raises
    ------
    ConfigError
        A steepest slope or a vertical error that is not above 0.
    """
    for name, value in (("max_slope", max_slope), ("vertical_error_m", vertical_error_m)):
        if not value > 0:
            msg = f"{name} is {value:g}: it must be above 0"
            raise ConfigError(msg)
    missing_yield = 1.0 - rain_only_mean_yield
    gain = np.divide(
        mean_yield - rain_only_mean_yield, missing_yield, out=mean_yield * 0.0, where=np.not_equal(missing_yield, 0.0)
    )
    closed = np.where(open_catchment, OPEN_CERTAINTY, 1.0)
    record = min(rain_years / FULL_YEARS, 1.0)
    return Components(
        water=_clipped(reliability),
        gain=_clipped(gain),
        soil=_clipped(available_water_mm / FULL_SOIL_MM),
        ease=_clipped(1.0 - slope / (2.0 * max_slope)),
        safety=_clipped(
            np.minimum(1.0 - peak_flow_10y_m3s / WORST_PEAK_M3S, 1.0 - standing_water_days / WORST_STANDING_DAYS)
        ),
        certainty=_clipped(np.minimum(np.minimum(closed, record), catchment_relief_m / (SURE_RELIEF * vertical_error_m))),
    )


def _clipped(values: FloatArray) -> FloatArray:
    return np.clip(values, LEAST, 1.0)


def score(components: Components, weights: Mapping[str, float]) -> Score:
    """
    Weighted geometric mean of the components.

    A component that any plot lacks is left out for all of them, or missing data would win; so is one of weight 0.

    Parameters
    ----------
    weights
        One for each of COMPONENTS, at least 0, some above 0. Only their ratios count.

    Raises
    ------
    ConfigError
        A weight that is unknown, missing, below 0 or no number, or none above 0.
    """
    _check(weights)
    weighted = [name for name in COMPONENTS if weights[name] > 0]
    used = tuple(name for name in weighted if not np.isnan(getattr(components, name)).any())
    left_out = tuple(name for name in weighted if name not in used)
    if not used:
        return Score(np.full(components.water.shape, np.nan), used, left_out)
    total = sum(weights[name] for name in used)
    logarithm = sum((weights[name] / total * np.log(getattr(components, name)) for name in used), start=np.zeros(1))
    return Score(np.exp(logarithm).reshape(components.water.shape), used, left_out)


def _check(weights: Mapping[str, float]) -> None:
    for name in weights:
        if name not in COMPONENTS:
            msg = f"ranking weight {name!r} is unknown; the weights are {', '.join(COMPONENTS)}"
            raise ConfigError(msg)
    for name in COMPONENTS:
        if name not in weights:
            msg = f"ranking weight {name} is missing; give 0 to leave it out"
            raise ConfigError(msg)
        if not 0 <= weights[name] < np.inf:
            msg = f"ranking weight {name} is {weights[name]:g}: it must be a number of at least 0"
            raise ConfigError(msg)
    if not any(weights.values()):
        msg = "all ranking weights are 0; give at least one above 0"
        raise ConfigError(msg)


def score_order(score: FloatArray, supply_rank: npt.NDArray[np.int64]) -> npt.NDArray[np.int64]:
    """
    Rank plots by score, the highest first; equal scores by the rank that supply gives them; unknown (NaN) last.

    Scores that agree to 12 digits are equal, so that rounding orders nothing.
    """
    # -NaN stays NaN, which sorts last
    order = np.lexsort((supply_rank, -np.round(score, 12)))
    rank = np.empty(score.size, dtype=np.int64)
    rank[order] = np.arange(1, score.size + 1)
    return rank
