"""The crop of the daily balance, when it is sown, and the seasons that follow from both."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.demand._kernels import EVAPORATING_M
from siting.demand.crop import daily_coefficients
from siting.demand.seasons import Days, Seasons, season_days
from siting.errors import ConfigError
from siting.tables import Crop

FloatArray = npt.NDArray[np.float64]

YEAR_DAYS = 365
ROOT_START_M = 0.2
"""Depth of roots at sowing (common practice)."""

PERENNIAL_GROUPS = ("tree", "vine")
"""Groups of the crop table that stand all year round."""


@dataclass(frozen=True, slots=True)
class CropWater:
    """
    What the daily balance has to know of a crop.

    `stage_days` are the lengths of the four stages and `kc` the coefficients at the start, in mid-season and at the
    end; `root_depth_m` is that of full roots; `depletion_fraction` holds at 5 mm/d. A perennial stands all year, its
    roots are full from the first day, and after its last stage it rests at the coefficient of the first.
    """

    stage_days: tuple[int, int, int, int]
    kc: tuple[float, float, float]
    root_depth_m: float
    depletion_fraction: float
    ky: float
    root_start_m: float = ROOT_START_M
    perennial: bool = False

    def __post_init__(self) -> None:
        for name, value, least, most in (
            ("root_depth_m", self.root_depth_m, 2 * EVAPORATING_M, 10.0),
            ("root_start_m", self.root_start_m, EVAPORATING_M, 10.0),
            ("depletion_fraction", self.depletion_fraction, 0.0, 0.99),
            ("ky", self.ky, 0.0, 5.0),
        ):
            if not least <= value <= most:
                msg = f"crop.{name} is {value:g}: it must lie between {least:g} and {most:g}; correct it"
                raise ConfigError(msg)
        if not 0 < sum(self.stage_days) <= YEAR_DAYS:
            msg = f"crop.stage_days sum to {sum(self.stage_days)} days: they must last 1 to {YEAR_DAYS}; shorten a stage"
            raise ConfigError(msg)

    @classmethod
    def from_table(
        cls,
        crop: Crop,
        *,
        stage_days: tuple[int, int, int, int] | None = None,
        kc: tuple[float, float, float] | None = None,
    ) -> "CropWater":
        """
        Take a crop of the tables; stages and coefficients of your own replace the printed ones.

        Raises
        ------
        ConfigError
            Where neither the table nor the caller gives stages.
        """
        stages = stage_days or crop.stage_days
        if stages is None:
            msg = f"no stages are in print for {crop.name!r}; give crop.stage_days, four lengths in days"
            raise ConfigError(msg)
        return cls(
            stages,
            kc or crop.kc,
            crop.root_depth_m,
            crop.depletion_fraction,
            crop.ky,
            perennial=crop.group in PERENNIAL_GROUPS,
        )

    @property
    def length_days(self) -> int:
        """Days from sowing to harvest; for a perennial a common year."""
        return YEAR_DAYS if self.perennial else sum(self.stage_days)

    def coefficients(self) -> FloatArray:
        """Return the coefficient of each day of the season."""
        stages = daily_coefficients(stage_days=self.stage_days, kc=self.kc)
        return np.concatenate([stages, np.full(self.length_days - stages.size, self.kc[0])])


@dataclass(frozen=True, slots=True)
class Planting:
    """
    When the crop is sown: on a fixed day of the year, or at the onset of rains in a window.

    `opens` is the fixed day or the first of the window, month and day; `closes` its last, None for a fixed day; a
    window may cross the new year. The onset is the first day in it on which rain and run-on over `onset_days` days,
    the day itself the last, reach `onset_mm` over the plot. A stand is lost that takes up no water (Ks below 0.01) on
    `lost_after_days` days running, all within `lost_within_days` days of sowing; it is sown once more at the next onset
    in the window, of which a fixed day has none. A perennial is not lost. (All of it common practice.)
    """

    opens: tuple[int, int]
    closes: tuple[int, int] | None = None
    onset_mm: float = 20.0
    onset_days: int = 3
    lost_after_days: int = 10
    lost_within_days: int = 30

    def __post_init__(self) -> None:
        if not self.onset_mm >= 0:
            msg = f"crop.onset_mm is {self.onset_mm:g}: it must be at least 0; give the water that a farmer waits for"
            raise ConfigError(msg)
        if min(self.onset_days, self.lost_after_days, self.lost_within_days) < 1:
            msg = "counts of days that decide on sowing must be at least 1"
            raise ConfigError(msg)
        for date in (self.opens, self.closes or self.opens):
            _ordinary(date)

    @property
    def window_days(self) -> int:
        """Days on which it may be sown, by an ordinary year; 1 for a fixed day."""
        if self.closes is None:
            return 1
        first, last = _ordinary(self.opens), _ordinary(self.closes)
        return (last - first) % YEAR_DAYS + 1


def _ordinary(date: tuple[int, int]) -> int:
    """Place of a day in an ordinary year."""
    try:
        day = np.datetime64(f"2001-{date[0]:02d}-{date[1]:02d}", "D")
    except ValueError as error:
        msg = f"sowing on {date[0]:02d}-{date[1]:02d} is no day of every year; write it as month-day, like 11-15"
        raise ConfigError(msg) from error
    return int((day - np.datetime64("2001-01-01", "D")).astype(np.int64))


def sowing_seasons(
    days: Days, *, planting: Planting, crop: CropWater, second_opens: tuple[int, int] | None = None
) -> Seasons:
    """
    Find the complete seasons of a crop, from the last possible harvest to the next.

    Parameters
    ----------
    second_opens
        Month and day on which a second window of the same length opens each year, for two seasons a year.

    Returns
    -------
    Seasons
        `sowing` and `sown` are the day on which the window opens; `end` follows the harvest of the latest sowing.

    Raises
    ------
    ConfigError
        A window and a crop that last longer than a year together, or two that do not fit into it: seasons would overlap.
    InputError
        As `season_days`.
    """
    span = planting.window_days + crop.length_days - 1
    if span > YEAR_DAYS:
        msg = (
            f"a sowing window of {planting.window_days} days and a crop of {crop.length_days} days last longer than a year "
            "together; close the window earlier (crop.planting)"
        )
        raise ConfigError(msg)
    found = season_days(days, planting=planting.opens, season_length_days=span)
    if second_opens is None:
        return found
    apart = (_ordinary(second_opens) - _ordinary(planting.opens)) % YEAR_DAYS
    if min(apart, YEAR_DAYS - apart) < span:
        msg = (
            f"a crop of {span} days from the opening of its window to the last harvest does not fit between the two "
            f"sowings, {min(apart, YEAR_DAYS - apart)} days apart; move crop.second_planting or shorten the window"
        )
        raise ConfigError(msg)
    return _both(found, season_days(days, planting=second_opens, season_length_days=span))


def _both(one: Seasons, other: Seasons) -> Seasons:
    """Put the seasons of two sowings a year in order; each begins after the harvest before it, so the first is left out."""
    sowing = np.concatenate([one.sowing, other.sowing])
    order = np.argsort(sowing, kind="stable")
    label, sown, end = (
        np.concatenate([getattr(each, name) for each in (one, other)])[order] for name in ("label", "sown", "end")
    )
    return Seasons(label[1:], sown[1:], end[:-1], sowing[order][1:], end[1:])
