"""Soil and bund of each plot, as the daily balance sees them."""

from dataclasses import dataclass, fields

import numpy as np
import numpy.typing as npt

from siting.demand._kernels import EVAPORATING_M
from siting.errors import ConfigError, InputError

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class PlotSoil:
    """
    Soil and bund of each plot; NaN (unknown) makes the plot's results unknown.

    `available_mm_per_m` is what the soil holds for the crop; `soil_depth_m` caps the roots, infinite where nothing
    does; `rew_mm` and `tew_mm` are what its top 0.1 m evaporates readily and in all; `infiltration_mm_h` is the rate at
    which it takes water in, and `ponding_mm` the mean depth that the bund holds.
    """

    available_mm_per_m: FloatArray
    soil_depth_m: FloatArray
    rew_mm: FloatArray
    tew_mm: FloatArray
    infiltration_mm_h: FloatArray
    ponding_mm: FloatArray

    def __post_init__(self) -> None:
        for each in fields(self):
            values = getattr(self, each.name)
            if values.ndim != 1 or values.shape != self.available_mm_per_m.shape:
                msg = (
                    f"{each.name} has shape {values.shape} for {self.available_mm_per_m.size} plots; give one value for each"
                )
                raise InputError(msg)
            bad = np.flatnonzero((values < 0) | (np.isinf(values) & (each.name != "soil_depth_m")))
            if bad.size:
                msg = f"{each.name} of plot {bad[0] + 1} is {values[bad[0]]:g}: it must be 0 or more, or unknown; correct it"
                raise InputError(msg)
        shallow = np.flatnonzero(self.soil_depth_m <= EVAPORATING_M)
        if shallow.size:
            depth = self.soil_depth_m[shallow[0]]
            msg = f"plot {shallow[0] + 1} has {depth:g} m of soil; leave out plots with {EVAPORATING_M} m or less"
            raise InputError(msg)
        turned = np.flatnonzero(self.rew_mm > self.tew_mm)
        if turned.size:
            rew, tew = self.rew_mm[turned[0]], self.tew_mm[turned[0]]
            msg = f"rew_mm {rew:g} of plot {turned[0] + 1} exceeds its tew_mm {tew:g}; exchange or correct them"
            raise InputError(msg)

    def take(self, plots: Integers) -> "PlotSoil":
        """Return the soil of some plots, in the order of their places."""
        return PlotSoil(*(getattr(self, each.name)[plots] for each in fields(self)))


@dataclass(frozen=True, slots=True)
class FieldRules:
    """Hours for which the water of an event soaks in (assumption); days under water that a crop bears (common practice)."""

    event_hours: float = 6.0
    standing_water_days: int = 3

    def __post_init__(self) -> None:
        if not 0 <= self.event_hours <= 24:
            msg = f"plots.event_hours is {self.event_hours:g}: it must lie between 0 and 24; give hours of one day"
            raise ConfigError(msg)
        if self.standing_water_days < 0:
            msg = f"plots.standing_water_days is {self.standing_water_days}: it must be at least 0; give whole days"
            raise ConfigError(msg)


def total_evaporable_water_mm(*, field_capacity: npt.ArrayLike, wilting_point: npt.ArrayLike) -> FloatArray:
    """
    Water that the top 0.1 m of soil can lose to evaporation, mm: 1000 (FC - 0.5 WP) 0.1; FAO-56 eq. 73.

    Water contents in m3/m3; arguments broadcast; NaN stays NaN.
    """
    capacity, wilting = np.asarray(field_capacity, dtype=np.float64), np.asarray(wilting_point, dtype=np.float64)
    return np.asarray(1000.0 * (capacity - 0.5 * wilting) * EVAPORATING_M)


def mean_ponding_mm(bund_ponding_mm: npt.ArrayLike, *, drop_m: npt.ArrayLike) -> FloatArray:
    """
    Mean depth behind the bund of a plot that is not levelled.

    A plot that falls by d from its upper edge to the bund holds a wedge: H^2 / (2 d) over its whole area where the depth
    H at the bund is less than d, else H - d / 2. On a slope a bund ponds a strip and not a field.

    Parameters
    ----------
    bund_ponding_mm
        Depth at the bund H, mm, at least 0.
    drop_m
        Fall across the plot d, m, at least 0; 0 is level. Arguments broadcast; NaN stays NaN.
    """
    depth, drop = np.broadcast_arrays(
        np.asarray(bund_ponding_mm, dtype=np.float64), 1000.0 * np.asarray(drop_m, dtype=np.float64)
    )
    for name, values, unit in (("the depth at the bund", depth, "mm"), ("the drop across the plot", drop, "mm")):
        bad = values[values < 0]
        if bad.size:
            msg = f"{name} is {bad[0]:g} {unit}: it must be at least 0; correct it"
            raise InputError(msg)
    wedge = np.divide(depth**2, 2.0 * drop, out=np.zeros(depth.shape), where=drop > 0)
    return np.where(depth < drop, wedge, depth - 0.5 * drop)
