"""A daily rain record."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.errors import InputError

Days = npt.NDArray[np.datetime64]


@dataclass(frozen=True, slots=True, eq=False)
class Rain:
    """Rain by day: consecutive `days` (datetime64[D]) and depths in mm, NaN where missing."""

    days: Days
    rain_mm: npt.NDArray[np.float64]

    def __post_init__(self) -> None:
        if self.days.shape != self.rain_mm.shape or self.days.ndim != 1 or self.days.size == 0:
            msg = f"{self.days.size} days and {self.rain_mm.size} depths of rain do not match"
            raise InputError(msg)
        if np.any(np.diff(self.days.astype("datetime64[D]").astype(np.int64)) != 1):
            msg = "the days of the rain record are not consecutive; missing days must be NaN"
            raise InputError(msg)
        wrong = (self.rain_mm < 0) | np.isinf(self.rain_mm)
        if np.any(wrong):
            first = int(np.argmax(wrong))
            msg = f"rain of {self.rain_mm[first]:g} mm on {self.days[first]}: a depth is finite and not below zero"
            raise InputError(msg)

    @property
    def as_dry_mm(self) -> npt.NDArray[np.float64]:
        """Depths with missing days as dry; whoever uses it says so."""
        return np.nan_to_num(self.rain_mm, nan=0.0)
