"""Reference evapotranspiration from weather (FAO-56)."""

import numpy as np
import numpy.typing as npt

FloatArray = npt.NDArray[np.float64]
ArrayLike = npt.ArrayLike

SOLAR_CONSTANT = 0.0820
"""MJ/m2/min (FAO-56 eq. 21)."""

STEFAN_BOLTZMANN = 4.903e-9
"""MJ/K4/m2/day (FAO-56 eq. 39)."""

ALBEDO = 0.23
"""Of the reference grass (FAO-56 eq. 38)."""

LEAST_RELATIVE_SOLAR = 0.3
"""Solar radiation over that of a clear sky under the densest cloud (ASCE-EWRI 2005; FAO-56 eq. 39 tells about 0.33)."""

MM_PER_MJ = 0.408
"""Water that 1 MJ/m2 evaporates, mm (FAO-56 eq. 20)."""


def _floats(values: ArrayLike) -> FloatArray:
    return np.asarray(values, dtype=np.float64)


def solar_declination_rad(day_of_year: ArrayLike) -> FloatArray:
    """Solar declination, rad; FAO-56 eq. 24."""
    return 0.409 * np.sin(2.0 * np.pi / 365.0 * _floats(day_of_year) - 1.39)


def sunset_angle_rad(latitude_deg: ArrayLike, day_of_year: ArrayLike) -> FloatArray:
    """Sunset hour angle, rad; FAO-56 eq. 25. 0 in polar night, pi in polar day."""
    latitude = np.radians(_floats(latitude_deg))
    cosine = -np.tan(latitude) * np.tan(solar_declination_rad(day_of_year))
    return np.asarray(np.arccos(np.clip(cosine, -1.0, 1.0)))


def daylight_h(latitude_deg: ArrayLike, day_of_year: ArrayLike) -> FloatArray:
    """Possible hours of sun; FAO-56 eq. 34."""
    return 24.0 / np.pi * sunset_angle_rad(latitude_deg, day_of_year)


def extraterrestrial_radiation_mj(latitude_deg: ArrayLike, day_of_year: ArrayLike) -> FloatArray:
    """
    Extraterrestrial radiation, MJ/m2/day.

    Latitude in degrees (south negative), day of the year 1 to 366; arguments broadcast; NaN stays NaN. FAO-56 eq. 21.
    """
    latitude, day = np.radians(_floats(latitude_deg)), _floats(day_of_year)
    distance = 1.0 + 0.033 * np.cos(2.0 * np.pi / 365.0 * day)
    declination, sunset = solar_declination_rad(day), sunset_angle_rad(latitude_deg, day)
    high = sunset * np.sin(latitude) * np.sin(declination)
    low = np.cos(latitude) * np.cos(declination) * np.sin(sunset)
    return np.asarray(24.0 * 60.0 / np.pi * SOLAR_CONSTANT * distance * (high + low))


def saturation_pressure_kpa(temperature_c: ArrayLike) -> FloatArray:
    """Saturation vapour pressure, kPa; FAO-56 eq. 11."""
    temperature = _floats(temperature_c)
    return np.asarray(0.6108 * np.exp(17.27 * temperature / (temperature + 237.3)))


def vapour_pressure_from_humidity_kpa(
    *, tmin_c: ArrayLike, tmax_c: ArrayLike, rh_max_pct: ArrayLike, rh_min_pct: ArrayLike
) -> FloatArray:
    """Actual vapour pressure from greatest and least relative humidity of the day, kPa; FAO-56 eq. 17."""
    cool = saturation_pressure_kpa(tmin_c) * _floats(rh_max_pct) / 100.0
    return np.asarray((cool + saturation_pressure_kpa(tmax_c) * _floats(rh_min_pct) / 100.0) / 2.0)


def air_pressure_kpa(altitude_m: ArrayLike) -> FloatArray:
    """Air pressure, kPa; FAO-56 eq. 7."""
    return np.asarray(101.3 * ((293.0 - 0.0065 * _floats(altitude_m)) / 293.0) ** 5.26)


def psychrometric_constant_kpa(altitude_m: ArrayLike) -> FloatArray:
    """Psychrometric constant, kPa per deg C; FAO-56 eq. 8."""
    return 0.665e-3 * air_pressure_kpa(altitude_m)


def solar_radiation_mj(*, sunshine_h: ArrayLike, possible_h: ArrayLike, extraterrestrial_mj: ArrayLike) -> FloatArray:
    """Solar radiation from hours of sun, MJ/m2/day; FAO-56 eq. 35 with 0.25 and 0.50."""
    share = _floats(sunshine_h) / _floats(possible_h)
    return (0.25 + 0.50 * share) * _floats(extraterrestrial_mj)


def solar_radiation_from_temperature_mj(
    tmin_c: ArrayLike, tmax_c: ArrayLike, extraterrestrial_mj: ArrayLike, *, coefficient: float
) -> FloatArray:
    """Solar radiation from the daily range of temperature, MJ/m2/day; FAO-56 eq. 50 (0.16 inland, 0.19 at coasts)."""
    span = np.maximum(_floats(tmax_c) - _floats(tmin_c), 0.0)
    return coefficient * np.sqrt(span) * _floats(extraterrestrial_mj)


def net_longwave_mj(
    *, tmin_c: ArrayLike, tmax_c: ArrayLike, vapour_pressure_kpa: ArrayLike, relative_solar: ArrayLike
) -> FloatArray:
    """
    Net outgoing long-wave radiation, MJ/m2/day; FAO-56 eq. 39.

    `relative_solar` is solar radiation over that of a clear sky; it counts as 0.3 below that, and as 1 above 1.
    """
    cloud = 1.35 * np.clip(_floats(relative_solar), LEAST_RELATIVE_SOLAR, 1.0) - 0.35
    fourth = ((_floats(tmax_c) + 273.16) ** 4 + (_floats(tmin_c) + 273.16) ** 4) / 2.0
    return np.asarray(STEFAN_BOLTZMANN * fourth * (0.34 - 0.14 * np.sqrt(_floats(vapour_pressure_kpa))) * cloud)


def net_radiation_mj(
    *,
    tmin_c: ArrayLike,
    tmax_c: ArrayLike,
    vapour_pressure_kpa: ArrayLike,
    solar_mj: ArrayLike,
    extraterrestrial_mj: ArrayLike,
    altitude_m: ArrayLike,
) -> FloatArray:
    """
    Net radiation of the reference grass (albedo 0.23), MJ/m2/day; FAO-56 eq. 37 to 40.

    Temperatures in deg C, vapour pressure in kPa, solar and extraterrestrial radiation in MJ/m2/day, altitude in m;
    arguments broadcast; NaN stays NaN.
    """
    solar = _floats(solar_mj)
    clear = (0.75 + 2e-5 * _floats(altitude_m)) * _floats(extraterrestrial_mj)
    outgoing = net_longwave_mj(
        tmin_c=tmin_c, tmax_c=tmax_c, vapour_pressure_kpa=vapour_pressure_kpa, relative_solar=solar / clear
    )
    return np.asarray((1.0 - ALBEDO) * solar - outgoing)


def reference_et_penman_monteith_mm(
    *,
    tmin_c: ArrayLike,
    tmax_c: ArrayLike,
    vapour_pressure_kpa: ArrayLike,
    wind_2m_m_s: ArrayLike,
    net_radiation_mj: ArrayLike,
    altitude_m: ArrayLike,
    soil_heat_mj: ArrayLike = 0.0,
) -> FloatArray:
    """
    Compute reference ET by Penman-Monteith, mm/day, never below zero.

    Temperatures in deg C, pressure in kPa, wind at 2 m in m/s, radiation and soil heat in MJ/m2/day (0 for days,
    eq. 42), altitude in m; arguments broadcast; NaN stays NaN. FAO-56 eq. 6.
    """
    tmin, tmax = _floats(tmin_c), _floats(tmax_c)
    mean = (tmin + tmax) / 2.0
    saturation = (saturation_pressure_kpa(tmin) + saturation_pressure_kpa(tmax)) / 2.0
    steepness = 4098.0 * saturation_pressure_kpa(mean) / (mean + 237.3) ** 2
    gamma, wind = psychrometric_constant_kpa(altitude_m), _floats(wind_2m_m_s)
    energy = MM_PER_MJ * steepness * (_floats(net_radiation_mj) - _floats(soil_heat_mj))
    drying = gamma * 900.0 / (mean + 273.0) * wind * (saturation - _floats(vapour_pressure_kpa))
    found = (energy + drying) / (steepness + gamma * (1.0 + 0.34 * wind))
    return np.asarray(np.maximum(found, 0.0))


def reference_et_hargreaves_mm(
    tmin_c: ArrayLike, tmax_c: ArrayLike, tmean_c: ArrayLike, radiation_mj: ArrayLike
) -> FloatArray:
    """
    Compute reference ET from temperature alone, mm/day, never below zero; low where dry wind blows.

    `radiation_mj` is extraterrestrial, MJ/m2/day. FAO-56 eq. 52 (Hargreaves).
    """
    span = np.maximum(_floats(tmax_c) - _floats(tmin_c), 0.0)
    found = 0.0023 * (_floats(tmean_c) + 17.8) * np.sqrt(span) * MM_PER_MJ * _floats(radiation_mj)
    return np.asarray(np.maximum(found, 0.0))
