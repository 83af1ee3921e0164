"""Water that soil holds for roots, and when its lack slows a crop (FAO-56)."""

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError

FloatArray = npt.NDArray[np.float64]


def available_water_mm(
    *, field_capacity: npt.ArrayLike, wilting_point: npt.ArrayLike, root_depth_m: npt.ArrayLike
) -> FloatArray:
    """
    Total available water in the root zone, mm; FAO-56 eq. 82.

    Water contents in m3/m3, depth in m; arguments broadcast; NaN stays NaN. ConfigError where the wilting
    point exceeds field capacity.
    """
    capacity = np.asarray(field_capacity, dtype=np.float64)
    wilting = np.asarray(wilting_point, dtype=np.float64)
    low, high = np.broadcast_arrays(wilting, capacity)
    bad = low > high
    if bad.any():
        msg = f"wilting point {low[bad][0]:g} exceeds field capacity {high[bad][0]:g}; exchange or correct them"
        raise ConfigError(msg)
    return 1000.0 * (capacity - wilting) * np.asarray(root_depth_m, dtype=np.float64)


def depletion_fraction(table_fraction: npt.ArrayLike, *, crop_et_mm: npt.ArrayLike) -> FloatArray:
    """
    Share of available water a crop takes before stress: p + 0.04 (5 - ETc), 0.1 to 0.8.

    `table_fraction` is the printed share, which holds at 5 mm/d; `crop_et_mm` in mm/d; arguments broadcast; NaN
    stays NaN. FAO-56 Table 22, footnote.
    """
    adjusted = np.asarray(table_fraction, dtype=np.float64) + 0.04 * (5.0 - np.asarray(crop_et_mm, dtype=np.float64))
    return np.asarray(np.clip(adjusted, 0.1, 0.8))


def stress_coefficient(*, available_mm: npt.ArrayLike, depletion_mm: npt.ArrayLike, fraction: npt.ArrayLike) -> FloatArray:
    """
    Water stress coefficient Ks, 0 to 1; FAO-56 eq. 84.

    `fraction` is the share of `available_mm` that can be depleted without stress, at least 0 and below 1; arguments
    broadcast; NaN stays NaN. Soil that holds no water gives 0.
    """
    share = np.asarray(fraction, dtype=np.float64)
    bad = share[(share < 0) | (share >= 1)]
    if bad.size:
        msg = f"depletion fraction {bad[0]:g}: it must be at least 0 and below 1"
        raise ConfigError(msg)
    available = np.asarray(available_mm, dtype=np.float64)
    left, stressed = np.broadcast_arrays(available - np.asarray(depletion_mm, dtype=np.float64), (1.0 - share) * available)
    ratio = np.divide(left, stressed, out=np.zeros(left.shape), where=(stressed > 0) | np.isnan(stressed))
    return np.asarray(np.clip(ratio, 0.0, 1.0))
