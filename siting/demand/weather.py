"""Daily weather at one place, checked once, and the reference ET of its days."""

from dataclasses import dataclass, fields

import numpy as np
import numpy.typing as npt

from siting.demand.reference_et import (
    daylight_h,
    extraterrestrial_radiation_mj,
    net_radiation_mj,
    reference_et_hargreaves_mm,
    reference_et_penman_monteith_mm,
    saturation_pressure_kpa,
    solar_radiation_mj,
    vapour_pressure_from_humidity_kpa,
)
from siting.errors import ConfigError, InputError

FloatArray = npt.NDArray[np.float64]
Days = npt.NDArray[np.datetime64]

# name: least, most, unit, what a value beyond usually is (bounds beyond any weather on record; from memory)
BOUNDS = {
    "et0_mm": (0.0, 30.0, "mm", "is it a total of several days, or inches?"),
    "tmin_c": (-90.0, 60.0, "deg C", "is it in Fahrenheit or kelvin?"),
    "tmax_c": (-90.0, 60.0, "deg C", "is it in Fahrenheit or kelvin?"),
    "rh_mean_pct": (0.0, 100.0, "%", "is it a share or a code for missing?"),
    "rh_min_pct": (0.0, 100.0, "%", "is it a share or a code for missing?"),
    "rh_max_pct": (0.0, 100.0, "%", "is it a share or a code for missing?"),
    "wind_2m_m_s": (0.0, 60.0, "m/s", "is it in km/h or knots?"),
    "sunshine_h": (0.0, 24.0, "h", "is it in minutes?"),
    "solar_mj": (0.0, 45.0, "MJ/m2/d", "is it in W/m2 (1 W/m2 is 0.0864 MJ/m2/d) or cal/cm2?"),
}


@dataclass(frozen=True, slots=True, eq=False)
class Climate:
    """
    Weather by day; each series is None where there is none, and NaN on days without a value.

    `days` (datetime64[D]) rise, and may have holes. `et0_mm` is reference ET from elsewhere, mm/d; temperatures in
    deg C; relative humidity in percent, mean or least and greatest of the day; wind at 2 m in m/s; `sunshine_h`
    hours of bright sun; `solar_mj` solar radiation, MJ/m2/d. Impossible values are refused with their day.
    """

    days: Days
    et0_mm: FloatArray | None = None
    tmin_c: FloatArray | None = None
    tmax_c: FloatArray | None = None
    rh_mean_pct: FloatArray | None = None
    rh_min_pct: FloatArray | None = None
    rh_max_pct: FloatArray | None = None
    wind_2m_m_s: FloatArray | None = None
    sunshine_h: FloatArray | None = None
    solar_mj: FloatArray | None = None

    def __post_init__(self) -> None:
        if self.days.ndim != 1 or self.days.size == 0:
            msg = "the climate record holds no day; give at least one year of days, or climate.reference_et"
            raise InputError(msg)
        steps = np.diff(self.days.astype("datetime64[D]").astype(np.int64))
        if np.any(steps < 1):
            place = int(np.argmax(steps < 1)) + 1
            msg = f"the climate record has {self.days[place]} twice or out of order; sort it and keep each day once"
            raise InputError(msg)
        for field in fields(self)[1:]:
            self._check(field.name)
        self._check_order("tmin_c", "tmax_c")
        self._check_order("rh_min_pct", "rh_max_pct")

    def _check(self, name: str) -> None:
        values = self.series(name)
        if values.shape != self.days.shape:
            msg = f"the climate record has {self.days.size} days and {values.size} values of {name}; each day needs one"
            raise InputError(msg)
        least, most, unit, hint = BOUNDS[name]
        bad = np.flatnonzero((values < least) | (values > most))
        if bad.size:
            msg = (
                f"{name} is {values[bad[0]]:g} {unit} on {self.days[bad[0]]}, outside {least:g} to {most:g}; {hint} "
                "Convert it, or leave the day empty"
            )
            raise InputError(msg)

    def _check_order(self, low: str, high: str) -> None:
        below, above = self.series(low), self.series(high)
        bad = np.flatnonzero(below > above)
        if bad.size:
            day = bad[0]
            msg = (
                f"on {self.days[day]} {low} {below[day]:g} exceeds {high} {above[day]:g}; exchange the columns, or "
                "correct that day or leave it empty"
            )
            raise InputError(msg)

    def series(self, name: str) -> FloatArray:
        """Return a series by its name, NaN on every day where there is none."""
        values: FloatArray | None = getattr(self, name)
        return np.full(self.days.shape, np.nan) if values is None else values


def day_of_year(days: Days) -> npt.NDArray[np.int64]:
    """Day of the year, 1 to 366."""
    since = days.astype("datetime64[D]") - days.astype("datetime64[Y]").astype("datetime64[D]")
    return np.asarray(since.astype(np.int64) + 1)


def penman_monteith_days_mm(climate: Climate, *, latitude_deg: float, altitude_m: float) -> FloatArray:
    """
    Compute reference ET by Penman-Monteith, mm by day, NaN where temperature, humidity, wind or sun is unknown.

    Humidity: least and greatest of the day (FAO-56 eq. 17), else the mean (eq. 19). Sun: solar radiation, else
    hours of sun (eq. 35). Soil heat is 0 (eq. 42).
    """
    check_place(latitude_deg, altitude_m)
    number = day_of_year(climate.days)
    outer = extraterrestrial_radiation_mj(latitude_deg, number)
    tmin, tmax = climate.series("tmin_c"), climate.series("tmax_c")
    pressure = _vapour_pressure_kpa(climate)
    by_hours = solar_radiation_mj(
        sunshine_h=climate.series("sunshine_h"),
        possible_h=daylight_h(latitude_deg, number),
        extraterrestrial_mj=outer,
    )
    measured = climate.series("solar_mj")
    solar = np.where(np.isnan(measured), by_hours, measured)
    net = net_radiation_mj(
        tmin_c=tmin,
        tmax_c=tmax,
        vapour_pressure_kpa=pressure,
        solar_mj=solar,
        extraterrestrial_mj=outer,
        altitude_m=altitude_m,
    )
    return reference_et_penman_monteith_mm(
        tmin_c=tmin,
        tmax_c=tmax,
        vapour_pressure_kpa=pressure,
        wind_2m_m_s=climate.series("wind_2m_m_s"),
        net_radiation_mj=net,
        altitude_m=altitude_m,
    )


def _vapour_pressure_kpa(climate: Climate) -> FloatArray:
    tmin, tmax = climate.series("tmin_c"), climate.series("tmax_c")
    by_range = vapour_pressure_from_humidity_kpa(
        tmin_c=tmin, tmax_c=tmax, rh_max_pct=climate.series("rh_max_pct"), rh_min_pct=climate.series("rh_min_pct")
    )
    saturation = (saturation_pressure_kpa(tmin) + saturation_pressure_kpa(tmax)) / 2.0
    by_mean = climate.series("rh_mean_pct") / 100.0 * saturation
    return np.where(np.isnan(by_range), by_mean, by_range)


def hargreaves_days_mm(climate: Climate, *, latitude_deg: float) -> FloatArray:
    """Compute reference ET by Hargreaves, mm by day, NaN where a temperature is unknown; FAO-56 eq. 52."""
    check_place(latitude_deg, 0.0)
    tmin, tmax = climate.series("tmin_c"), climate.series("tmax_c")
    outer = extraterrestrial_radiation_mj(latitude_deg, day_of_year(climate.days))
    return reference_et_hargreaves_mm(tmin, tmax, (tmin + tmax) / 2.0, outer)


def check_place(latitude_deg: float, altitude_m: float) -> None:
    """Refuse a latitude beyond the polar circles, where the sun formulas break down, and impossible heights."""
    if not -66.5 <= latitude_deg <= 66.5:
        msg = f"latitude {latitude_deg:g}: reference ET is computed from 66.5 S to 66.5 N; give a column of it instead"
        raise ConfigError(msg)
    if not -500 <= altitude_m <= 9000:
        msg = f"altitude {altitude_m:g} m is outside -500 to 9000 m; give it in metres"
        raise ConfigError(msg)
