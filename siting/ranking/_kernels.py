"""Usable run-on of plots by season, compiled: arrays in, arrays out; the caller checks."""

from typing import Any

import numpy as np
import numpy.typing as npt

from siting.terrain._kernels.jit import kernel

Array = npt.NDArray[Any]


@kernel
def usable_runon_mm(
    area_m2: Array, wetted_m2_mm: Array, plot_area_m2: Array, most_mm: Array, runoff_mm: Array, bounds: Array, found: Array
) -> None:
    """
    Sum each plot's usable depth from harvest to sowing and from sowing to harvest.

    `area_m2` is by plot and class, `runoff_mm` by class and day. `bounds` has the first day, that of sowing and the day
    after harvest of each season; `found` gets (plots, seasons, before and after sowing). Every plot is summed in the
    same order, so equal plots give equal bits.
    """
    days = runoff_mm.shape[1]
    arriving = np.empty(days)
    for plot in range(area_m2.shape[0]):
        arriving[:] = -wetted_m2_mm[plot]
        for ground in range(area_m2.shape[1]):
            share = area_m2[plot, ground]
            if share != 0.0:
                for day in range(days):
                    arriving[day] += share * runoff_mm[ground, day]
        for season in range(bounds.shape[0]):
            for part in range(2):
                total = 0.0
                for day in range(bounds[season, part], bounds[season, part + 1]):
                    total += min(max(arriving[day], 0.0) / plot_area_m2[plot], most_mm[plot])
                found[plot, season, part] = total
