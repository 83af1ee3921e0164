"""Peak flow of a storm from a small catchment, how soon it comes, and the spillway that passes it."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError
from siting.runoff.curve_number import STANDARD_RATIO, retention_mm
from siting.tables import unit_peaks

FloatArray = npt.NDArray[np.float64]
Mask = npt.NDArray[np.bool_]
ArrayLike = npt.ArrayLike

FOOT_M, MILE_M, INCH_MM = 0.3048, 1609.344, 25.4

LEAST_HOURS, MOST_HOURS = 0.1, 10.0
"""Times of concentration for which the graphical method is printed; TR-55 (1986) chapter 4."""
LEAST_IA_OVER_P, MOST_IA_OVER_P = 0.1, 0.5
"""Ratios of initial abstraction to rain for which it is printed; TR-55 (1986) chapter 4."""
LEAST_CURVE_NUMBER = 40.0
"""The graphical method asks for more; TR-55 (1986) chapter 4."""

GRAVITY_M_S2 = 9.81

LAG_OF_CONCENTRATION = 0.6
"""Lag as a share of the time of concentration; NEH-630 chapter 15."""

LEAST_WEIR_COEFFICIENT, MOST_WEIR_COEFFICIENT = 1.35, 1.83
"""Range of broad-crested weirs, m^0.5/s; HEC-22 (2009) eq. 8-22. Coefficients in feet lie above it."""


@dataclass(frozen=True, slots=True, eq=False)
class PeakFlowLimits:
    """
    Where a peak flow rests on a limit of the graphical method; False where unknown.

    Attributes
    ----------
    ia_over_p
        The ratio was held to 0.1 to 0.5: held down, the peak is on the safe side; held up, somewhat low.
    time_of_concentration
        The time was held to 0.1 to 10 h: held down, the peak is on the safe side; held up, low.
    curve_number
        The curve number is below 40, so outside the method; nothing was held.
    """

    ia_over_p: Mask
    time_of_concentration: Mask
    curve_number: Mask


def peak_flow_m3s(
    *,
    area_m2: ArrayLike,
    runoff_mm: ArrayLike,
    rain_mm: ArrayLike,
    curve_number: ArrayLike,
    time_of_concentration_h: ArrayLike,
    rain_distribution: str,
) -> FloatArray:
    """
    Peak flow of a 24-hour storm by the graphical method, without ponds on the way, m3/s.

    qp = qu A Q. The unit peak qu comes from the time of concentration at the printed ratios of initial abstraction
    to rain, Ia/P with Ia = 0.2 S, linear between them. Both are held to their printed limits; `peak_flow_limits`
    tells where.

    Parameters
    ----------
    area_m2, runoff_mm, rain_mm
        Catchment, its mean runoff and the storm's rain in 24 hours; at least 0, runoff at most the rain.
    curve_number
        Of the catchment, above 0 and at most 100.
    time_of_concentration_h
        At least 0; may be infinite, on level ground.
    rain_distribution
        "I", "IA", "II" or "III".

    Returns
    -------
    array
        m3/s; the arguments broadcast, and NaN stays NaN.

    Raises
    ------
    ConfigError
        Where a value is outside its range, or the distribution is unknown.

    References
    ----------
    SCS, TR-55 (1986) eq. 4-1, chapter 4 and appendix F.
    """
    area = _checked("catchment area", area_m2, "m2")
    rain = _checked("rain", rain_mm, "mm")
    runoff = _checked("runoff", runoff_mm, "mm")
    above = runoff > rain * (1.0 + 1e-9)  # sums by class may round up
    if np.any(above):
        row = int(np.argmax(above))
        pair = [float(values.flat[row]) for values in np.broadcast_arrays(runoff, rain)]
        msg = f"runoff of {pair[0]:g} mm is more than the rain of {pair[1]:g} mm; give both for the same storm"
        raise ConfigError(msg)
    hours = _checked("time of concentration", time_of_concentration_h, "h", may_be_infinite=True)
    ratio = np.clip(_ia_over_p(rain, curve_number), LEAST_IA_OVER_P, MOST_IA_OVER_P)
    unit = _unit_peak(np.clip(hours, LEAST_HOURS, MOST_HOURS), ratio, rain_distribution)
    per_area = runoff / INCH_MM * unit * FOOT_M**3 / MILE_M**2
    return np.asarray(area * per_area)


def peak_flow_limits(*, rain_mm: ArrayLike, curve_number: ArrayLike, time_of_concentration_h: ArrayLike) -> PeakFlowLimits:
    """Tell where `peak_flow_m3s` with these values was held to a printed limit; the arguments broadcast."""
    ratio = _ia_over_p(_checked("rain", rain_mm, "mm"), curve_number)
    hours = _checked("time of concentration", time_of_concentration_h, "h", may_be_infinite=True)
    low = np.asarray(curve_number, dtype=np.float64) < LEAST_CURVE_NUMBER
    held_ratio = (ratio < LEAST_IA_OVER_P) | (ratio > MOST_IA_OVER_P)
    held_hours = (hours < LEAST_HOURS) | (hours > MOST_HOURS)
    return PeakFlowLimits(*(np.array(mask) for mask in np.broadcast_arrays(held_ratio, held_hours, low)))


def _ia_over_p(rain: FloatArray, curve_number: ArrayLike) -> FloatArray:
    """Return the ratio of initial abstraction to rain; infinite without rain, of which nothing can run off."""
    abstraction, rain = np.broadcast_arrays(STANDARD_RATIO * retention_mm(curve_number), rain)
    nothing = np.where(np.isnan(abstraction), np.nan, np.inf)
    return np.asarray(np.divide(abstraction, rain, out=nothing, where=rain != 0))


def _unit_peak(hours: FloatArray, ratio: FloatArray, rain_distribution: str) -> FloatArray:
    """Return the unit peak discharge within the printed limits, ft3/s for each square mile and inch."""
    printed = unit_peaks(rain_distribution)
    knots = np.array([row.ia_over_p for row in printed])
    coefficients = np.array([(row.c0, row.c1, row.c2) for row in printed])
    lower = np.clip(np.searchsorted(knots, ratio, side="right") - 1, 0, knots.size - 2)
    log_hours = np.log10(hours)

    def at(place: npt.NDArray[np.int64]) -> FloatArray:
        c0, c1, c2 = np.moveaxis(coefficients[place], -1, 0)
        return np.asarray(10.0 ** (c0 + c1 * log_hours + c2 * log_hours**2))

    share = (ratio - knots[lower]) / (knots[lower + 1] - knots[lower])
    return np.asarray(at(lower) * (1.0 - share) + at(lower + 1) * share)


def lag_h(*, flow_length_m: ArrayLike, curve_number: ArrayLike, slope_pct: ArrayLike) -> FloatArray:
    """
    Lag of a catchment, h: L = l^0.8 (S + 1)^0.7 / (1900 Y^0.5), l in feet, S in inches, Y in %.

    Parameters
    ----------
    flow_length_m
        Longest flow path, m, at least 0.
    curve_number
        Above 0 and at most 100; the line was fitted to 50 to 95 (from memory).
    slope_pct
        Mean slope of the catchment's ground, %, at least 0.

    Returns
    -------
    array
        Hours; infinite on level ground, 0 without length; the arguments broadcast, and NaN stays NaN.

    Raises
    ------
    ConfigError
        Where a value is outside its range.

    References
    ----------
    NRCS, National Engineering Handbook part 630, chapter 15 (2010), eq. 15-4a.
    """
    length = _checked("flow length", flow_length_m, "m")
    slope = _checked("slope", slope_pct, "%")
    retention_in = retention_mm(curve_number) / INCH_MM
    reach = (length / FOOT_M) ** 0.8 * (retention_in + 1.0) ** 0.7 / 1900.0
    reach, root = np.broadcast_arrays(reach, np.sqrt(slope))
    level = np.where(reach > 0, np.inf, reach)
    return np.asarray(np.divide(reach, root, out=level, where=root != 0))


def time_of_concentration_h(*, lag_h: ArrayLike) -> FloatArray:
    """Time of concentration, h, from the lag: Tc = L / 0.6; NEH-630 chapter 15. NaN stays NaN."""
    return _checked("lag", lag_h, "h", may_be_infinite=True) / LAG_OF_CONCENTRATION


def critical_velocity_m_s(*, head_m: ArrayLike) -> FloatArray:
    """
    Velocity of the flow over a broad sill, m/s: critical flow at two thirds of the head, v = sqrt(2/3 g h).

    `head_m` is the depth of still water above the sill, at least 0; NaN stays NaN. Chow (1959), Open-channel hydraulics.
    """
    return np.asarray(np.sqrt(2.0 / 3.0 * GRAVITY_M_S2 * _checked("head", head_m, "m")))


def spillway_width_m(*, flow_m3s: ArrayLike, head_m: ArrayLike, coefficient: ArrayLike) -> FloatArray:
    """
    Width of a broad-crested spillway that passes a flow, m: Q / (C H^1.5).

    Parameters
    ----------
    flow_m3s
        Flow to pass, m3/s, at least 0.
    head_m
        Height of the water over the crest, m, above 0.
    coefficient
        C in m^0.5/s, 1.35 to 1.83: 1.44 for sharp corners, 1.70 for a rounded crest.

    Returns
    -------
    array
        m; the arguments broadcast, and NaN stays NaN.

    Raises
    ------
    ConfigError
        Where a value is outside its range.

    References
    ----------
    FHWA, HEC-22 Urban Drainage Design Manual (2009), eq. 8-22 and table 8-1.
    """
    flow, head = _checked("flow", flow_m3s, "m3/s"), _checked("head", head_m, "m")
    if np.any(head == 0):
        msg = "a head of 0 m passes nothing; give the depth of water over the crest"
        raise ConfigError(msg)
    weir = np.asarray(coefficient, dtype=np.float64)
    wrong = weir[(weir < LEAST_WEIR_COEFFICIENT) | (weir > MOST_WEIR_COEFFICIENT)]
    if wrong.size:
        msg = (
            f"weir coefficient {wrong.flat[0]:g} is outside {LEAST_WEIR_COEFFICIENT:g} to {MOST_WEIR_COEFFICIENT:g} "
            "m^0.5/s; divide one in feet by 1.811"
        )
        raise ConfigError(msg)
    return np.asarray(flow / (weir * head**1.5))


def _checked(name: str, given: ArrayLike, unit: str, *, may_be_infinite: bool = False) -> FloatArray:
    values = np.asarray(given, dtype=np.float64)
    wrong = values[(values < 0) | (np.isinf(values) & (not may_be_infinite))]
    if wrong.size:
        msg = f"{name} of {wrong.flat[0]:g} {unit} is below zero or has no end"
        raise ConfigError(msg)
    return values
