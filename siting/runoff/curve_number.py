"""Retention and curve numbers: conversions and published adjustments."""

from typing import Any

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError
from siting.tables import arc_rows

FloatArray = npt.NDArray[np.float64]
ArrayLike = npt.ArrayLike

STANDARD_RATIO = 0.2
"""The abstraction ratio for which printed curve numbers hold."""


def checked(curve_number: ArrayLike) -> FloatArray:
    """Return curve numbers as 64-bit floats; refuse any outside 0 to 100 (0 excluded)."""
    values = np.asarray(curve_number, dtype=np.float64)
    wrong = values[(values <= 0) | (values > 100)]
    if wrong.size:
        msg = f"curve number {wrong.flat[0]:g} is outside 0 to 100"
        raise ConfigError(msg)
    return values


def retention_mm(curve_number: ArrayLike) -> FloatArray:
    """
    Potential retention S = 25400 / CN - 254, mm.

    Any shape; above 0 and at most 100, else ConfigError; NaN stays NaN. TR-55 (1986) eq. 2-4, metric.
    """
    return 25400.0 / checked(curve_number) - 254.0


def retention_for_ratio(curve_number: ArrayLike, *, abstraction_ratio: float) -> FloatArray:
    """
    Potential retention, mm, for an initial abstraction ratio other than 0.2.

    For 0.05 the published conversion S0.05 = 1.33 S0.20^1.15 (inches) is used (Hawkins et al. 2002;
    ASCE/EWRI 2009). There is none in print for other ratios: ConfigError.
    """
    retention = retention_mm(curve_number)
    if abstraction_ratio == STANDARD_RATIO:
        return retention
    if abstraction_ratio == 0.05:
        return 25.4 * 1.33 * (retention / 25.4) ** 1.15
    msg = f"abstraction ratio {abstraction_ratio:g} has no published conversion; use 0.2 or 0.05"
    raise ConfigError(msg)


def dry_curve_number(cn: ArrayLike) -> FloatArray:
    """Curve number for dry antecedent conditions; NEH-630 table 10-1, linear between its rows."""
    return _from_arc_table(cn, "curve_number_dry")


def wet_curve_number(cn: ArrayLike) -> FloatArray:
    """Curve number for wet antecedent conditions; NEH-630 table 10-1, linear between its rows."""
    return _from_arc_table(cn, "curve_number_wet")


def _from_arc_table(cn: ArrayLike, column: str) -> FloatArray:
    values = checked(cn)
    known, other = (np.array(part) for part in zip(*arc_rows(column), strict=True))
    if np.nanmin(values, initial=known[0]) < known[0]:
        msg = f"curve number {np.nanmin(values):g} is below {known[0]:g}, the least of the table"
        raise ConfigError(msg)
    return np.asarray(np.interp(values, known, other), dtype=np.float64)


def slope_adjusted_curve_number(cn: ArrayLike, cn_wet: ArrayLike, slope: ArrayLike) -> FloatArray:
    """
    Curve number for a slope (tangent); neutral near 5 %.

    Sharpley & Williams (1990): CN + (CN_wet - CN) / 3 (1 - 2 exp(-13.86 slope)). Arguments broadcast.
    """
    middle, wet = checked(cn), checked(cn_wet)
    tangent = np.asarray(slope, dtype=np.float64)
    if np.any(tangent < 0):
        msg = f"slope {np.nanmin(tangent):g} is below zero"
        raise ConfigError(msg)
    return np.asarray((wet - middle) / 3.0 * (1.0 - 2.0 * np.exp(-13.86 * tangent)) + middle)


def composite_curve_number(pervious: ArrayLike, impervious_pct: ArrayLike) -> FloatArray:
    """
    Composite for connected impervious ground (CN 98), its share in %; TR-55 figure 2-3.

    Arguments broadcast; NaN stays NaN; a share outside 0 to 100 is refused with ConfigError.
    """
    base = checked(pervious)
    share = np.asarray(impervious_pct, dtype=np.float64)
    wrong = share[(share < 0) | (share > 100)]
    if wrong.size:
        msg = f"impervious share {wrong.flat[0]:g} % is outside 0 to 100"
        raise ConfigError(msg)
    return base + share / 100.0 * (98.0 - base)


def aligned_curve_number_a(cn_b: ArrayLike) -> FloatArray:
    """
    Curve number of group A from that of group B: -60.8 + 1.6083 CN_B; Woodward et al. (2002).

    Any shape; NaN stays NaN. Below CN_B 37.8 the line falls under 0: ConfigError.
    """
    aligned = -60.8 + 1.6083 * checked(cn_b)
    if np.any(aligned <= 0):
        msg = f"curve number {np.nanmin(np.asarray(cn_b, dtype=np.float64)):g} of group B has no group A by the aligner; "
        msg += "give a curve number of your own"
        raise ConfigError(msg)
    return np.minimum(aligned, 100.0)


def crusted_group(code: Any) -> Any:
    """
    Move a soil group (1 to 4 for A to D, 0 unknown) two letters towards D; our assumption.

    One code or an array of them; any other code is refused with ConfigError.
    """
    groups = np.asarray(code)
    if np.any((groups < 0) | (groups > 4)):
        msg = f"soil group code {groups[(groups < 0) | (groups > 4)].flat[0]} is unknown; the codes are 0 to 4"
        raise ConfigError(msg)
    moved = np.where(groups == 0, 0, np.minimum(groups + 2, 4)).astype(groups.dtype)
    return moved if groups.ndim else int(moved)
