"""Which reference ET a day gets, how gaps are filled, and what is refused."""

import numpy as np
import numpy.typing as npt
import pandas as pd
import pyet
import pytest

from siting import demand
from siting.demand import reference_et as et
from siting.errors import ConfigError, InputError
from siting.notes import Notes

DAYS = np.arange(np.datetime64("2001-01-01"), np.datetime64("2005-01-01"))
LATITUDE, ALTITUDE = 30.9, 450.0


def weather(seed: int = 7, days: np.ndarray = DAYS) -> dict[str, np.ndarray]:
    rng = np.random.default_rng(seed)
    tmin = rng.uniform(2, 24, days.size)
    low = rng.uniform(10, 50, days.size)
    return {
        "tmin_c": tmin,
        "tmax_c": tmin + rng.uniform(5, 18, days.size),
        "rh_min_pct": low,
        "rh_max_pct": low + rng.uniform(5, 45, days.size),
        "wind_2m_m_s": rng.uniform(0.5, 6, days.size),
        "solar_mj": rng.uniform(8, 18, days.size),
    }


def daily(climate: demand.Climate | None, notes: Notes | None = None, **other: object) -> np.ndarray:
    given: dict[str, object] = {"days": DAYS, "monthly_mm_per_day": None} | other
    return demand.reference_et_daily(
        climate,
        days=np.asarray(given["days"]),
        latitude_deg=LATITUDE,
        altitude_m=ALTITUDE,
        monthly_mm_per_day=given["monthly_mm_per_day"],  # type: ignore[arg-type]
        notes=notes or Notes(),
    )


def series(values: np.ndarray) -> "pd.Series[float]":
    return pd.Series(values, index=pd.DatetimeIndex(DAYS))


def test_penman_monteith_from_weather_to_et_agrees_with_another_library() -> None:
    # pyet 1.x, pm_fao56 with its own radiation and humidity chain
    got = weather()
    tmean = (got["tmin_c"] + got["tmax_c"]) / 2
    theirs = pyet.pm_fao56(
        series(tmean),
        series(got["wind_2m_m_s"]),
        rs=series(got["solar_mj"]),
        tmax=series(got["tmax_c"]),
        tmin=series(got["tmin_c"]),
        rhmax=series(got["rh_max_pct"]),
        rhmin=series(got["rh_min_pct"]),
        elevation=ALTITUDE,
        lat=np.radians(LATITUDE),
    )
    np.testing.assert_allclose(daily(demand.Climate(DAYS, **got)), theirs.to_numpy(), rtol=0.005, atol=0.01)


def test_hargreaves_from_weather_to_et_agrees_with_another_library() -> None:
    # pyet hargreaves; it divides by the latent heat of the day, FAO-56 by 2.45 MJ/kg
    got = weather()
    climate = demand.Climate(DAYS, tmin_c=got["tmin_c"], tmax_c=got["tmax_c"])
    tmean = (got["tmin_c"] + got["tmax_c"]) / 2
    theirs = pyet.hargreaves(
        series(tmean), series(got["tmax_c"]), series(got["tmin_c"]), lat=np.radians(LATITUDE)
    ).to_numpy()
    latent = 2.501 - 0.002361 * tmean  # MJ/kg, FAO-56 annex 3, eq. 3-1
    np.testing.assert_allclose(daily(climate), theirs * latent / 2.45, rtol=0.005)


def test_each_day_takes_the_best_method_it_allows_and_the_counts_are_noted() -> None:
    got, notes = weather(), Notes()
    column = np.full(DAYS.size, np.nan)
    column[:100] = 4.25
    got["wind_2m_m_s"][200:] = np.nan
    found = daily(demand.Climate(DAYS, et0_mm=column, **got), notes)
    assert (found[:100] == 4.25).all()
    whole = daily(demand.Climate(DAYS, **weather()))
    np.testing.assert_array_equal(found[100:200], whole[100:200])
    only = daily(demand.Climate(DAYS, tmin_c=got["tmin_c"], tmax_c=got["tmax_c"]))
    np.testing.assert_array_equal(found[200:], only[200:])
    noted = {each.id: each.value for each in notes.assumptions}
    assert noted["reference_et_method"] == (
        "the record's own column on 100 days, Penman-Monteith on 100 days, Hargreaves on 1261 days"
    )
    assert [each.code for each in notes.warnings] == ["et_from_temperature"]


def test_mean_humidity_and_hours_of_sun_serve_where_better_is_missing() -> None:
    # FAO-56 eq. 19 and 35 by hand on one day
    day = np.array([np.datetime64("2001-04-15")])
    climate = demand.Climate(
        day,
        tmin_c=np.array([15.0]),
        tmax_c=np.array([31.0]),
        rh_mean_pct=np.array([40.0]),
        wind_2m_m_s=np.array([2.0]),
        sunshine_h=np.array([9.0]),
    )
    outer = demand.extraterrestrial_radiation_mj(LATITUDE, 105)
    pressure = 0.4 * (et.saturation_pressure_kpa(15.0) + et.saturation_pressure_kpa(31.0)) / 2
    solar = (0.25 + 0.5 * 9.0 / et.daylight_h(LATITUDE, 105)) * outer
    temperatures: dict[str, npt.ArrayLike] = {
        "tmin_c": 15.0,
        "tmax_c": 31.0,
        "vapour_pressure_kpa": pressure,
        "altitude_m": ALTITUDE,
    }
    net = et.net_radiation_mj(solar_mj=solar, extraterrestrial_mj=outer, **temperatures)
    expected = demand.reference_et_penman_monteith_mm(wind_2m_m_s=2.0, net_radiation_mj=net, **temperatures)
    assert daily(climate, days=day)[0] == pytest.approx(float(expected))


def test_a_gap_takes_the_mean_of_its_date_and_is_counted() -> None:
    column = (3.0 + np.arange(DAYS.size) // 365).astype(np.float64)
    gap = int((np.datetime64("2002-07-03") - DAYS[0]).astype(int))
    column[gap] = np.nan
    notes = Notes()
    found = daily(demand.Climate(DAYS, et0_mm=column), notes)
    others = [column[int((np.datetime64(f"{year}-07-03") - DAYS[0]).astype(int))] for year in (2001, 2003, 2004)]
    assert found[gap] == pytest.approx(np.mean(others))
    assert {each.id: each.value for each in notes.assumptions}["reference_et_gaps"] == "1"


def test_a_record_of_common_years_serves_a_leap_year() -> None:
    # 29 February, which the record does not have, lies between its neighbours
    days = np.arange(np.datetime64("2001-01-01"), np.datetime64("2002-01-01"))
    column = np.linspace(2.0, 8.0, 365)
    leap = np.arange(np.datetime64("2004-02-28"), np.datetime64("2004-03-02"))
    found = daily(demand.Climate(days, et0_mm=column), days=leap)
    np.testing.assert_allclose(found, [column[58], (column[58] + column[59]) / 2, column[59]])


def test_part_of_a_year_is_refused_rather_than_stretched() -> None:
    days = np.arange(np.datetime64("2001-01-01"), np.datetime64("2001-07-01"))
    with pytest.raises(InputError, match="for 184 days from 07-01 on"):
        daily(demand.Climate(days, et0_mm=np.full(days.size, 5.0)))


def test_the_monthly_table_serves_where_there_is_no_record() -> None:
    table = [2.1, 2.8, 3.9, 5.2, 6.4, 7.1, 7.3, 6.8, 5.7, 4.3, 2.9, 2.2]
    found = daily(None, monthly_mm_per_day=table)
    assert [found[0], found[31], found[-1]] == [2.1, 2.8, 2.2]
    empty = demand.Climate(DAYS, tmin_c=np.full(DAYS.size, 10.0))
    notes = Notes()
    np.testing.assert_array_equal(daily(empty, notes, monthly_mm_per_day=table), found)
    assert "climate_unused" in [each.code for each in notes.warnings]


def test_without_climate_reference_et_is_unknown() -> None:
    assert np.isnan(daily(None)).all()


@pytest.mark.parametrize(
    ("table", "sentence"),
    [([5.0] * 11, "has 11 values; give twelve"), ([5.0] * 11 + [150.0], "month 12 is 150"), ([np.nan] * 12, "month 1 ")],
)
def test_a_monthly_table_that_cannot_be_one_is_refused(table: list[float], sentence: str) -> None:
    with pytest.raises(ConfigError, match=sentence):
        daily(None, monthly_mm_per_day=table)


@pytest.mark.parametrize(
    ("name", "value", "sentence"),
    [
        ("tmax_c", 104.0, "tmax_c is 104 deg C on 2001-01-03, outside -90 to 60; is it in Fahrenheit"),
        ("tmin_c", -99.9, "tmin_c is -99.9 deg C"),
        ("rh_min_pct", -9.0, "rh_min_pct is -9 %"),
        ("wind_2m_m_s", 110.0, "is it in km/h"),
        ("solar_mj", 280.0, "is it in W/m2"),
        ("tmin_c", 55.0, "on 2001-01-03 tmin_c 55 exceeds tmax_c"),
    ],
)
def test_impossible_weather_is_refused_with_its_day(name: str, value: float, sentence: str) -> None:
    got = weather()
    got[name][2] = value
    with pytest.raises(InputError, match=sentence):
        demand.Climate(DAYS, **got)


def test_days_out_of_order_or_of_another_number_are_refused() -> None:
    with pytest.raises(InputError, match="2001-01-01 twice or out of order"):
        demand.Climate(DAYS[[0, 0, 1]])
    with pytest.raises(InputError, match="1461 days and 3 values of tmin_c"):
        demand.Climate(DAYS, tmin_c=np.zeros(3))
    with pytest.raises(InputError, match="holds no day"):
        demand.Climate(DAYS[:0])


def test_a_place_beyond_the_polar_circle_is_refused() -> None:
    climate = demand.Climate(DAYS, tmin_c=np.full(DAYS.size, 1.0), tmax_c=np.full(DAYS.size, 9.0))
    with pytest.raises(ConfigError, match="latitude 70"):
        demand.reference_et_daily(climate, days=DAYS, latitude_deg=70, altitude_m=0, monthly_mm_per_day=None, notes=Notes())


def kc_of(climate: demand.Climate | None, notes: Notes) -> tuple[float, float, float]:
    return demand.climate_adjusted_kc(
        climate, kc=(0.3, 1.05, 0.55), stage_days=(20, 35, 45, 30), planting=(11, 15), height_m=1.5, notes=notes
    )


def test_coefficients_follow_wind_and_humidity_of_their_own_stages() -> None:
    # FAO-56 eq. 62, 65 by hand: mid-season 9 January to 22 February, late season 23 February to 24 March
    wind, humidity = np.full(DAYS.size, np.nan), np.full(DAYS.size, np.nan)
    date = np.array([str(day)[5:] for day in DAYS])
    middle, late = (date >= "01-09") & (date <= "02-22"), (date >= "02-23") & (date <= "03-24")
    wind[middle], humidity[middle] = 4.0, 30.0
    wind[late], humidity[late] = 3.0, 25.0
    notes = Notes()
    got = kc_of(demand.Climate(DAYS, rh_min_pct=humidity, wind_2m_m_s=wind), notes)
    assert got[0] == 0.3
    assert got[1] == pytest.approx(1.05 + (0.04 * 2 + 0.004 * 15) * 0.5**0.3)
    assert got[2] == pytest.approx(0.55 + (0.04 * 1 + 0.004 * 20) * 0.5**0.3)
    assert [each.id for each in notes.assumptions] == ["crop.kc mid-season", "crop.kc end"]


def test_coefficients_stay_where_wind_or_humidity_is_unknown() -> None:
    notes = Notes()
    assert kc_of(None, notes) == (0.3, 1.05, 0.55)
    assert kc_of(demand.Climate(DAYS, wind_2m_m_s=np.full(DAYS.size, 4.0)), notes) == (0.3, 1.05, 0.55)
    assert notes.assumptions == []
