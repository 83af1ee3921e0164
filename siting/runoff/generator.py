"""Days of rain drawn from monthly totals, for places without a daily record: invented, and said to be."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError, InputError
from siting.notes import Notes
from siting.runoff.rain import Rain

FloatArray = npt.NDArray[np.float64]
Months = npt.NDArray[np.datetime64]

WET_SHARE_SLOPE, PERSISTENCE = 0.75, 0.25
"""Chance of a wet day after a dry one as a share of that of any wet day, and how much more it is after a wet one."""
SCALE_SLOPE, SCALE_AT_0_MM = 1.83, -2.16
"""Scale of the gamma depths against the mean depth of a wet day, mm."""
GENERATOR_SOURCE = "Geng, Penning de Vries & Supit (1986), Agric. For. Meteorol. 36:363 (coefficients from memory)"

LEAST_WET_DAY_MM = 3.0
"""The scale of the depths was fitted to larger means (assumption)."""

DRAWS = 100
"""Months drawn for each total; the one whose sum is nearest is taken, so that scaling it changes little."""


@dataclass(frozen=True, slots=True)
class RainGenerator:
    """How days are drawn: mean rain of a wet day, mm (at least 3), and the seed; the same seed gives the same days."""

    wet_day_mm: float
    seed: int

    def __post_init__(self) -> None:
        if not self.wet_day_mm >= LEAST_WET_DAY_MM or np.isinf(self.wet_day_mm):
            msg = f"rain.wet_day_mm is {self.wet_day_mm:g}; it must be at least {LEAST_WET_DAY_MM:g} and have an end"
            raise ConfigError(msg)

    @property
    def gamma(self) -> tuple[float, float]:
        """Shape and scale (mm) of the depths of wet days; their product is the mean."""
        scale = SCALE_AT_0_MM + SCALE_SLOPE * self.wet_day_mm
        return self.wet_day_mm / scale, scale


def daily_from_monthly(months: Months, total_mm: FloatArray, *, generator: RainGenerator, notes: Notes) -> Rain:
    """
    Draw days of rain that sum to the monthly totals.

    Wet and dry days follow a two-state Markov chain whose share of wet days is total / mean rain of a wet day; depths
    are gamma. Of 100 such months the one nearest to the total is scaled to it; so held, depths vary a little less than
    free ones.

    Parameters
    ----------
    months
        Consecutive (datetime64[M]).
    total_mm
        Total of each month, mm; NaN leaves its days missing.

    Returns
    -------
    Rain
        From the first day of the first month to the last of the last.

    References
    ----------
    Richardson (1981), Water Resour. Res. 17:182; Richardson & Wright (1984), ARS-8; Geng et al. (1986).
    """
    if months.shape != total_mm.shape or np.any(np.diff(months.astype("datetime64[M]").astype(np.int64)) != 1):
        msg = f"{months.size} months and {total_mm.size} totals must be one for one, and the months consecutive"
        raise InputError(msg)
    draw = np.random.default_rng(generator.seed)
    first = np.append(months, months[-1] + 1).astype("datetime64[D]")
    parts: list[FloatArray] = []
    wet = False
    for count, total in zip(np.diff(first).astype(np.int64), total_mm, strict=True):
        parts.append(_month(float(total), int(count), wet, generator, draw))
        wet = bool(parts[-1][-1] > 0)
    _tell(months.size, generator, notes)
    return Rain(np.arange(first[0], first[-1]), np.concatenate(parts))


def _month(total_mm: float, days: int, wet: bool, generator: RainGenerator, draw: np.random.Generator) -> FloatArray:
    """Draw the days of one month; `wet` is the day before."""
    if not total_mm > 0:
        return np.full(days, total_mm)
    chances = wet_chances(total_mm / generator.wet_day_mm / days)
    shape, scale = generator.gamma
    depth = draw.gamma(shape, scale, (DRAWS, days)) * wet_days(draw.random((DRAWS, days)), wet, *chances)
    sums = depth.sum(axis=1)
    best = int(np.argmin(np.abs(sums - total_mm)))
    month = np.asarray(depth[best])
    if sums[best] == 0:
        month[draw.integers(days)] = total_mm
        return month
    month *= total_mm / sums[best]
    month[np.argmax(month)] += total_mm - month.sum()  # what rounding left over
    return month


def wet_chances(wet_share: float) -> tuple[float, float]:
    """
    Chances of a wet day after a dry and after a wet one, from the share of wet days (more than all counts as all).

    So chosen that the chain's share of wet days is the one given; Geng et al. (1986).
    """
    share = min(wet_share, 1.0)
    return WET_SHARE_SLOPE * share, PERSISTENCE + WET_SHARE_SLOPE * share


def wet_days(chance: FloatArray, wet: bool, after_dry: float, after_wet: float) -> npt.NDArray[np.bool_]:
    """
    Follow a two-state Markov chain of wet and dry days.

    `chance` are uniform numbers 0 to 1, (draws, days); `wet` is the day before the first, for all draws.
    """
    states = np.empty(chance.shape, dtype=np.bool_)
    before = np.full(chance.shape[0], wet)
    for day in range(chance.shape[1]):
        before = chance[:, day] < np.where(before, after_wet, after_dry)
        states[:, day] = before
    return states


def _tell(months: int, generator: RainGenerator, notes: Notes) -> None:
    shape, scale = generator.gamma
    effect = "all runoff: it depends on the size of single rains, which monthly totals do not tell"
    notes.assume(
        "rain.generator",
        f"Markov chain, wet after dry {WET_SHARE_SLOPE:g} f, after wet {PERSISTENCE:g} + {WET_SHARE_SLOPE:g} f, f the share "
        f"of wet days; gamma depths of shape {shape:.3g} and scale {scale:.3g} mm; seed {generator.seed}",
        "",
        GENERATOR_SOURCE,
        effect,
    )
    notes.assume("rain.wet_day_mm", f"{generator.wet_day_mm:g}", "mm", "as set, or else an assumption", effect)
    notes.warn(
        "rain_generated",
        f"No day of the rain record was measured: its days were drawn from {months} monthly totals; run-on rests on a mean "
        f"wet day of {generator.wet_day_mm:g} mm, so compare other values of rain.wet_day_mm and rain.seed.",
    )
