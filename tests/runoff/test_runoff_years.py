"""Years with gaps: what is said, what is refused, and what a gap may not touch."""

import numpy as np
import pytest

from siting import runoff
from siting.errors import ConfigError, InputError
from siting.notes import Notes


def three_years() -> runoff.Rain:
    days = np.arange(np.datetime64("2000-01-01"), np.datetime64("2003-01-01"))
    return runoff.Rain(days, np.ones(days.size))


def years_of(rain: runoff.Rain, month: int | None = 1, share: float = 0.05, notes: Notes | None = None) -> runoff.Years:
    return runoff.hydrological_years(rain, starts_month=month, max_missing=share, notes=notes or Notes())


def test_a_gap_stays_in_its_own_year() -> None:
    rain = three_years()
    rain.rain_mm[3] = np.nan
    years = years_of(rain)
    np.testing.assert_array_equal(runoff.yearly_totals(rain.rain_mm, rain.days, years), [np.nan, 365, 365])
    np.testing.assert_array_equal(runoff.yearly_totals(rain.as_dry_mm, rain.days, years), [365, 365, 365])


def test_missing_days_of_a_kept_year_are_said_to_count_as_dry() -> None:
    rain = three_years()
    rain.rain_mm[[3, 500]] = np.nan
    notes = Notes()
    years_of(rain, notes=notes)
    noted = {assumption.id: assumption for assumption in notes.assumptions}
    assert noted["rain.missing_days"].value == "2"
    assert noted["rain.missing_days"].effect == "count as dry"


def test_a_flood_does_not_round_away_a_later_drizzle() -> None:
    rain = three_years()
    volume = np.zeros((1, rain.days.size))
    volume[0, 5], volume[0, 800] = 1e12, 1e-6
    np.testing.assert_array_equal(runoff.yearly_totals(volume, rain.days, years_of(rain)), [[1e12, 0.0, 1e-6]])


def test_values_that_do_not_cover_the_years_are_refused() -> None:
    rain = three_years()
    with pytest.raises(InputError, match="100 values on 100 days from 2000-01-01 do not cover the years"):
        runoff.yearly_totals(np.ones(100), rain.days[:100], years_of(rain))


def test_a_record_of_gaps_is_refused_with_the_years_named() -> None:
    rain = three_years()
    rain.rain_mm[:] = np.nan
    with pytest.raises(InputError, match="more than 5 % of the days are missing in 2000, 2001, 2002"):
        years_of(rain)


@pytest.mark.parametrize("month", [0, 13])
def test_a_month_that_is_none_is_refused(month: int) -> None:
    with pytest.raises(ConfigError, match=f"rain.year_starts is month {month}; the months are 1 to 12"):
        years_of(three_years(), month)


def test_a_share_given_in_percent_is_refused() -> None:
    with pytest.raises(ConfigError, match="lies between 0 and 1"):
        years_of(three_years(), share=5.0)


@pytest.mark.parametrize("depth", [-0.1, np.inf])
def test_rain_that_cannot_be_is_refused_with_its_day(depth: float) -> None:
    days = np.arange(np.datetime64("2000-01-01"), np.datetime64("2000-01-04"))
    with pytest.raises(InputError, match="on 2000-01-02: a depth is finite and not below zero"):
        runoff.Rain(days, np.array([0.0, depth, 1.0]))
