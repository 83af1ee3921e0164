"""What reaches a plot of the runoff at the cells: losses with distance and to the bed."""

import numpy as np
import numpy.typing as npt

from siting.errors import GridError

FloatArray = npt.NDArray[np.float64]


def delivered_m3(
    effective_area_m2: FloatArray,
    bed_area_m2: FloatArray,
    runoff_mm: FloatArray,
    *,
    channel_wetting_mm: float,
) -> FloatArray:
    """
    Run-on volume by plot and day: V = max(0, sum of a exp(-k L) Q - w B).

    Parameters
    ----------
    effective_area_m2
        Area by plot and class, each cell counted exp(-k L) of its area: (plots, classes).
    bed_area_m2
        Bed upstream of each plot: (plots,).
    runoff_mm
        Runoff by class and day: (classes, days).
    channel_wetting_mm
        Depth that each event leaves in the bed.

    Returns
    -------
    array
        m3, (plots, days), never below zero.

    References
    ----------
    Outflow as a share less a threshold: NEH-630 chapter 19 (Lane).
    """
    if effective_area_m2.shape[1] != runoff_mm.shape[0]:
        msg = f"{effective_area_m2.shape[1]} classes of area meet {runoff_mm.shape[0]} of runoff"
        raise GridError(msg)
    arriving = effective_area_m2 @ runoff_mm
    wetted = channel_wetting_mm * bed_area_m2
    return np.maximum(arriving - wetted[:, None], 0.0) / 1000.0
