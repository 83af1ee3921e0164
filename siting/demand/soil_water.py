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
    if np.any(wilting > capacity):
        msg = f"wilting point {np.max(wilting):g} exceeds field capacity {np.min(capacity):g}; exchange or correct them"
        raise ConfigError(msg)
    return 1000.0 * (capacity - wilting) * np.asarray(root_depth_m, dtype=np.float64)


def depletion_fraction(table_fraction: npt.ArrayLike, *, crop_et_mm: npt.ArrayLike) -> FloatArray:
    """Share of available water a crop takes before stress, 0.1 to 0.8; FAO-56 table 22, footnote."""
    adjusted = np.asarray(table_fraction, dtype=np.float64) + 0.04 * (5.0 - np.asarray(crop_et_mm, dtype=np.float64))
    return np.asarray(np.clip(adjusted, 0.1, 0.8))


def stress_coefficient(*, available_mm: npt.ArrayLike, depletion_mm: npt.ArrayLike, fraction: npt.ArrayLike) -> FloatArray:
    """
    Water stress coefficient Ks, 0 to 1; FAO-56 eq. 84.

    `fraction` is the share of `available_mm` that can be depleted without stress; arguments broadcast.
    """
    available = np.asarray(available_mm, dtype=np.float64)
    left = available - np.asarray(depletion_mm, dtype=np.float64)
    return np.asarray(np.clip(left / ((1.0 - np.asarray(fraction, dtype=np.float64)) * available), 0.0, 1.0))
