"""Reference ET on every day of the rain record, and crop coefficients adjusted to the climate."""

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from siting.demand.crop import adjusted_coefficient
from siting.demand.weather import BOUNDS, Climate, Days, day_of_year, hargreaves_days_mm, penman_monteith_days_mm
from siting.errors import ConfigError, InputError
from siting.notes import Notes

FloatArray = npt.NDArray[np.float64]

LONGEST_BRIDGED_DAYS = 15
"""Days of the mean year without a value in any year that are bridged in a straight line (common practice)."""


def reference_et_daily(
    climate: Climate | None,
    *,
    days: Days,
    latitude_deg: float,
    altitude_m: float,
    monthly_mm_per_day: Sequence[float] | None,
    notes: Notes,
) -> FloatArray:
    """
    Choose and compute reference ET, mm/d, on each of `days`.

    Day by day the best that there is: the record's own ET; Penman-Monteith where humidity, wind and sun are known;
    Hargreaves from temperature. A day without any takes the mean of its day of the year over the record, noted with
    its count. Without a climate record, the monthly table; without either NaN: unknown.

    Parameters
    ----------
    climate
        Daily weather, of any years; None where there is none.
    days
        Days (datetime64[D]) for which ET is wanted, those of the rain record.
    latitude_deg, altitude_m
        Of the place; south negative, -66.5 to 66.5; -500 to 9000 m.
    monthly_mm_per_day
        Twelve means, January first, mm/d; used where `climate` gives no ET at all.

    Raises
    ------
    ConfigError
        A monthly table that is not twelve values from 0 to 30 mm/d; a place out of range.
    InputError
        More than 15 days in a row of the year that no year of the record knows.

    References
    ----------
    Allen et al. (1998), FAO-56, eq. 6 and 52.
    """
    wanted = np.asarray(days, dtype="datetime64[D]")
    monthly = None if monthly_mm_per_day is None else _monthly(monthly_mm_per_day, wanted)
    if climate is not None:
        known = _by_best_method(climate, latitude_deg, altitude_m, notes)
        if not np.isnan(known).all():
            return _on_days(climate.days, known, wanted, notes)
        notes.warn("climate_unused", "The climate record has no day with ET, or with both temperatures: it was not used.")
    return np.full(wanted.shape, np.nan) if monthly is None else monthly


def _monthly(table: Sequence[float], days: Days) -> FloatArray:
    values = np.asarray(table, dtype=np.float64)
    if values.shape != (12,):
        msg = f"climate.reference_et has {values.size} values; give twelve, January first, in mm/d"
        raise ConfigError(msg)
    most = BOUNDS["et0_mm"][1]
    bad = np.flatnonzero(~((values >= 0) & (values <= most)))
    if bad.size:
        month = bad[0] + 1
        msg = f"climate.reference_et of month {month} is {values[bad[0]]:g}, outside 0 to {most:g} mm/d; give a daily mean"
        raise ConfigError(msg)
    return values[days.astype("datetime64[M]").astype(np.int64) % 12]


def _by_best_method(climate: Climate, latitude_deg: float, altitude_m: float, notes: Notes) -> FloatArray:
    found = climate.series("et0_mm").copy()
    used = {"the record's own column": int(np.count_nonzero(~np.isnan(found)))}
    if np.isnan(found).any():
        for name, candidate in (
            ("Penman-Monteith", penman_monteith_days_mm(climate, latitude_deg=latitude_deg, altitude_m=altitude_m)),
            ("Hargreaves", hargreaves_days_mm(climate, latitude_deg=latitude_deg)),
        ):
            take = np.isnan(found) & ~np.isnan(candidate)
            found[take] = candidate[take]
            used[name] = int(np.count_nonzero(take))
    shares = ", ".join(f"{name} on {count} days" for name, count in used.items() if count)
    notes.assume("reference_et_method", shares or "none", "", "FAO-56; the best that each day allows", "the crop's demand")
    if used.get("Hargreaves"):
        notes.warn(
            "et_from_temperature",
            f"Reference ET comes from temperature alone on {used['Hargreaves']} days (Hargreaves); it is low where dry "
            "wind blows.",
        )
    return found


def _on_days(known_days: Days, known: FloatArray, wanted: Days, notes: Notes) -> FloatArray:
    found = np.full(wanted.shape, np.nan)
    place = np.searchsorted(known_days, wanted)
    inside = place < known_days.size
    same = np.zeros(wanted.shape, dtype=np.bool_)
    same[inside] = known_days[place[inside]] == wanted[inside]
    found[same] = known[place[same]]
    gaps = np.isnan(found)
    if gaps.any():
        found[gaps] = _mean_year(known_days, known)[_slot(wanted[gaps])]
        notes.assume(
            "reference_et_gaps",
            int(gaps.sum()),
            "days",
            f"mean of that day of the year over the climate record; {wanted.size} days in all",
            "the crop's demand on those days",
        )
    return found


def _slot(days: Days) -> npt.NDArray[np.int64]:
    """Place of a day in a leap year, 0 to 365, so that a date keeps its place in every year."""
    number = day_of_year(days) - 1
    year = days.astype("datetime64[Y]")
    length = ((year + 1).astype("datetime64[D]") - year.astype("datetime64[D]")).astype(np.int64)
    return np.where((length == 365) & (number >= 59), number + 1, number)


def _mean_year(days: Days, values: FloatArray) -> FloatArray:
    """Mean of each of the 366 dates; short stretches that no year knows are bridged, long ones refused."""
    here = ~np.isnan(values)
    slot = _slot(days[here])
    count = np.bincount(slot, minlength=366)
    total = np.bincount(slot, weights=values[here], minlength=366)
    known = np.flatnonzero(count)
    if known.size == 366:
        return np.asarray(total / count)
    holes = np.diff(np.append(known, known[0] + 366)) - 1
    if holes.max() > LONGEST_BRIDGED_DAYS:
        first = np.datetime64("2000-01-01") + int(known[int(np.argmax(holes))] + 1) % 366
        msg = (
            f"no year of the climate record tells reference ET for {holes.max()} days from {str(first)[5:]} on; give a "
            "record of whole years, or climate.reference_et without climate.daily"
        )
        raise InputError(msg)
    return np.interp(np.arange(366), known, total[known] / count[known], period=366)


def climate_adjusted_kc(
    climate: Climate | None,
    *,
    kc: tuple[float, float, float],
    stage_days: tuple[int, int, int, int],
    planting: tuple[int, int],
    height_m: float,
    notes: Notes,
) -> tuple[float, float, float]:
    """
    Adjust the mid-season and end coefficient to the wind and least humidity of their stages, where both are known.

    The means are over all years of the record: of the mid-season for the second coefficient, of the late season for
    the third. Where wind or least humidity is not known in a stage, its printed coefficient stays; both are noted.

    Parameters
    ----------
    kc, stage_days
        Initial, mid and end coefficient; lengths of the four stages, days.
    planting
        Month and day of sowing.
    height_m
        Height of the grown crop, m.

    References
    ----------
    Allen et al. (1998), FAO-56, eq. 62 and 65: for wind of 1 to 6 m/s, least humidity of 20 to 80 %.
    """
    adjusted = list(kc)
    starts = np.cumsum((0, *stage_days))
    for place, stage, name in ((1, 2, "mid-season"), (2, 3, "end")):
        means = None if climate is None else _stage_means(climate, planting, int(starts[stage]), stage_days[stage])
        if means is None:
            continue
        wind, humidity = means
        adjusted[place] = float(adjusted_coefficient(kc[place], wind_2m_m_s=wind, rh_min_pct=humidity, height_m=height_m))
        notes.assume(
            f"crop.kc {name}",
            f"{adjusted[place]:.3f}",
            "",
            f"FAO-56 eq. 62, 65: {kc[place]:g} in print, wind {wind:.1f} m/s, least humidity {humidity:.0f} %",
            "the crop's demand",
        )
    return adjusted[0], adjusted[1], adjusted[2]


def _stage_means(climate: Climate, planting: tuple[int, int], first_day: int, length: int) -> tuple[float, float] | None:
    """Mean wind and least humidity on the dates of a stage, None where one is not known on any of them."""
    sown = np.datetime64(f"2000-{planting[0]:02d}-{planting[1]:02d}")
    dates = (int(_slot(np.array([sown]))[0]) + first_day + np.arange(length)) % 366
    here = np.isin(_slot(climate.days), dates)
    wind, humidity = climate.series("wind_2m_m_s")[here], climate.series("rh_min_pct")[here]
    if np.isnan(wind).all() or np.isnan(humidity).all():
        return None
    return float(np.nanmean(wind)), float(np.nanmean(humidity))
