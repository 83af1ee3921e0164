"""Design rain: a printed example, a general library of distributions, and short records."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from siting import runoff
from siting.errors import ConfigError, InputError
from siting.notes import Notes

CHICAGO_MM = 25.4 * np.array(
    [
        *(0.49, 0.66, 0.36, 0.58, 0.41, 0.47, 0.74, 0.53, 0.76, 0.57, 0.80, 0.66, 0.68, 0.68, 0.61, 0.88, 0.49, 0.33),
        *(0.96, 0.94, 0.80, 0.62, 0.71, 1.11, 0.64, 0.52, 0.64, 0.34, 0.70, 0.57, 0.92, 0.66, 0.65, 0.63, 0.60),
    ]
)
"""Annual maxima of 10-minute rain, Chicago, 1913 to 1947; Chow, Maidment & Mays (1988) Table 12.2.1 (from memory)."""

MAXIMA = st.lists(st.floats(0.0, 400.0), min_size=10, max_size=60)


def test_a_printed_series_gives_its_printed_rains() -> None:
    # Chow, Maidment & Mays (1988) Examples 12.2.1 and 12.3.2: mean 0.649 in, s 0.177 in; 5, 10 and 50 years: 0.78, 0.88
    # and 1.11 in, without the factor for fixed readings
    assert CHICAGO_MM.mean() / 25.4 == pytest.approx(0.649, abs=5e-4)
    assert CHICAGO_MM.std(ddof=1) / 25.4 == pytest.approx(0.177, abs=5e-4)
    got = runoff.design_rain_mm(CHICAGO_MM, return_period_years=[5, 10, 50]) / 1.13 / 25.4
    np.testing.assert_allclose(got, [0.78, 0.88, 1.11], atol=0.005)


@given(maxima=MAXIMA, period=st.floats(1.01, 1000.0))
def test_the_rain_is_that_of_the_distribution_with_the_same_moments(maxima: list[float], period: float) -> None:
    spread = np.std(maxima, ddof=1)
    if spread < 1e-3:
        return
    scale = spread * np.sqrt(6) / np.pi
    fitted = stats.gumbel_r(loc=np.mean(maxima) - np.euler_gamma * scale, scale=scale)
    assert fitted.mean() == pytest.approx(np.mean(maxima))
    assert fitted.std() == pytest.approx(spread)
    expected = 1.13 * max(0.0, float(fitted.ppf(1 - 1 / period)))
    assert float(runoff.design_rain_mm(maxima, return_period_years=period)) == pytest.approx(expected, rel=1e-6, abs=1e-6)


def test_the_rain_is_passed_once_in_the_return_period() -> None:
    # 200 000 years drawn from a known distribution: the fit gives back its 25-year value, passed in 4 % of years
    drawn = stats.gumbel_r(loc=30.0, scale=9.0).rvs(200_000, random_state=np.random.default_rng(7))
    level = float(runoff.design_rain_mm(np.maximum(drawn, 0.0), return_period_years=25)) / 1.13
    assert np.mean(drawn > level) == pytest.approx(0.04, abs=0.002)


def test_short_records_give_none_and_fair_ones_are_marked() -> None:
    assert np.isnan(runoff.design_rain_mm(CHICAGO_MM[:9], return_period_years=[10, 25])).all()
    gappy = np.append(CHICAGO_MM[:9], [np.nan] * 5)
    assert np.isnan(runoff.design_rain_mm(gappy, return_period_years=10))
    assert np.isfinite(runoff.design_rain_mm(CHICAGO_MM[:10], return_period_years=10))
    marked = [runoff.few_years_for_design(CHICAGO_MM[:count]) for count in (10, 19, 20, 35)]
    assert marked == [True, True, False, False]


def test_years_alike_and_shapes() -> None:
    alike = np.full(12, 40.0)
    np.testing.assert_allclose(runoff.design_rain_mm(alike, return_period_years=[[2, 10], [25, 100]]), 1.13 * 40.0)
    assert np.isnan(runoff.design_rain_mm(alike, return_period_years=[10.0, np.nan])).tolist() == [False, True]


def test_the_largest_day_of_each_kept_year() -> None:
    days = np.arange("2001-01-01", "2004-01-01", dtype="datetime64[D]")
    rain = np.zeros(days.size)
    for day, depth in (("2001-03-05", 31.0), ("2002-01-01", 12.0), ("2002-12-31", 55.0), ("2003-07-07", 8.0)):
        rain[days == np.datetime64(day)] = depth
    rain[days == np.datetime64("2003-07-08")] = np.nan
    record = runoff.Rain(days, rain)
    years = runoff.hydrological_years(record, starts_month=1, max_missing=0.05, notes=Notes())
    assert runoff.annual_max_mm(record, years).tolist() == [31.0, 55.0, 8.0]
    summer = runoff.hydrological_years(record, starts_month=7, max_missing=0.05, notes=Notes())
    assert runoff.annual_max_mm(record, summer).tolist() == [12.0, 55.0]


def test_a_year_without_a_reading_has_no_maximum() -> None:
    days = np.arange("2001-01-01", "2003-01-01", dtype="datetime64[D]")
    record = runoff.Rain(days, np.where(days < np.datetime64("2002-01-01"), 3.0, np.nan))
    years = runoff.hydrological_years(record, starts_month=1, max_missing=1.0, notes=Notes())
    np.testing.assert_array_equal(runoff.annual_max_mm(record, years), [3.0, np.nan])


def test_impossible_values_are_refused() -> None:
    with pytest.raises(ConfigError, match="a return period of 1 years is not above 1"):
        runoff.design_rain_mm(CHICAGO_MM, return_period_years=[10, 1])
    with pytest.raises(InputError, match="an annual maximum of -3 mm is below zero"):
        runoff.design_rain_mm([-3.0, *CHICAGO_MM], return_period_years=10)
    with pytest.raises(InputError, match="no single row of years"):
        runoff.design_rain_mm(CHICAGO_MM.reshape(5, 7), return_period_years=10)
