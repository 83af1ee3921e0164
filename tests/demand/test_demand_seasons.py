"""The seasonal method on a case worked by hand, and its laws."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from siting import demand
from siting.errors import ConfigError, InputError

DAYS = np.arange(np.datetime64("2001-01-01"), np.datetime64("2003-12-31"))
SOWING = int((np.datetime64("2002-06-01") - DAYS[0]).astype(int))


def worked(storms: dict[int, tuple[float, float]], area_m2: float = 2400.0) -> demand.SeasonTable:
    """One plot of the V-valley: a 20-day crop, ET0 6 mm; storms are (rain mm, run-on m3) by day after sowing."""
    rain, runon = np.zeros(DAYS.size), np.zeros((1, DAYS.size))
    for day, (depth, volume) in storms.items():
        rain[SOWING + day], runon[0, SOWING + day] = depth, volume
    seasons = demand.season_days(DAYS, planting=(6, 1), season_length_days=20)
    return demand.seasonal_supply(
        runon_m3=runon,
        rain_mm=rain,
        et0_mm=np.full(DAYS.size, 6.0),
        seasons=seasons,
        stage_days=(4, 4, 8, 4),
        kc=(0.3, 1.1, 0.5),
        plot_area_m2=np.array([area_m2]),
        catchment_area_m2=np.array([48_000.0]),
        available_water_mm=np.array([78.0]),
        intake_capacity_mm=np.array([275.0]),
        efficiency=0.65,
    )


STORMS = {-4: (18.0, 59.3459), 8: (30.0, 297.3805), 13: (12.0, 0.0)}
YEAR = 0  # of the two complete seasons, 2002 is the first


def test_daily_coefficients_of_the_worked_crop() -> None:
    got = demand.daily_coefficients(stage_days=(4, 4, 8, 4), kc=(0.3, 1.1, 0.5))
    expected = [0.3] * 4 + [0.4, 0.6, 0.8, 1.0] + [1.1] * 8 + [1.025, 0.875, 0.725, 0.575]
    np.testing.assert_allclose(got, expected)


def test_the_season_worked_by_hand() -> None:
    got = worked(STORMS)
    assert got.demand_mm[0, YEAR] == pytest.approx(96.0)
    assert got.rain_mm[0, YEAR] == 42.0
    assert got.usable_before_mm[0, YEAR] == pytest.approx(24.7275, rel=1e-5)
    assert got.usable_in_season_mm[0, YEAR] == pytest.approx(78.0)  # of 123.9085: full soil takes no more
    assert got.supply_mm[0, YEAR] == pytest.approx(108.7728, rel=1e-5)
    assert got.supply_ratio[0, YEAR] == pytest.approx(1.1331, rel=1e-4)
    assert got.rain_only_ratio[0, YEAR] == pytest.approx(0.4375)
    assert got.needed_ratio[0, YEAR] == pytest.approx(13.4094, rel=1e-4)


def test_a_storm_moved_past_the_harvest_takes_its_stored_water_away() -> None:
    moved = worked({25: STORMS[-4], 8: STORMS[8], 13: STORMS[13]})
    fall = worked(STORMS).supply_mm[0, YEAR] - moved.supply_mm[0, YEAR]
    assert fall == pytest.approx(0.65 * 24.7275, rel=1e-5)
    # nothing else moves: the 18 mm that fell with it were in neither season's rain
    for name in ("demand_mm", "rain_mm", "usable_in_season_mm", "needed_ratio"):
        assert getattr(moved, name)[0, YEAR] == getattr(worked(STORMS), name)[0, YEAR]
    # the season after has it in store
    assert moved.usable_before_mm[0, YEAR + 1] == pytest.approx(24.7275, rel=1e-5)


def test_a_season_without_run_on_has_no_needed_ratio() -> None:
    dry = worked({8: (30.0, 0.0)})
    assert np.isnan(dry.needed_ratio[0, YEAR])
    assert dry.lacks_runon[0, YEAR]
    assert not worked(STORMS).lacks_runon[0, YEAR]
    assert worked({8: (200.0, 0.0)}).needed_ratio[0, YEAR] == 0.0  # rain alone suffices


def test_doubling_the_plot_halves_the_depth_of_run_on() -> None:
    one, two = worked(STORMS), worked(STORMS, area_m2=4800.0)
    np.testing.assert_allclose(two.runon_mm, one.runon_mm / 2)


@given(area=st.floats(100, 50_000), factor=st.floats(1, 20))
def test_a_larger_plot_never_has_a_deeper_run_on(area: float, factor: float) -> None:
    small, large = worked(STORMS, area_m2=area), worked(STORMS, area_m2=area * factor)
    for name in ("runon_mm", "usable_in_season_mm", "usable_before_mm", "supply_mm"):
        assert np.all(getattr(large, name) <= getattr(small, name) * (1 + 1e-12))


@given(volume=st.floats(0, 1e6), day=st.integers(-300, 19))
def test_supply_never_counts_more_run_on_than_arrived_or_soil_holds(volume: float, day: int) -> None:
    got = worked({day: (0.0, volume)})
    used = got.supply_mm[0, YEAR] - got.rain_mm[0, YEAR]
    assert used <= 0.65 * min(1000 * volume / 2400, 78.0) + 1e-9


@given(day=st.integers(-300, 19), rain=st.floats(0, 60), volume=st.floats(0, 500))
def test_more_rain_or_run_on_never_lowers_supply(day: int, rain: float, volume: float) -> None:
    old = STORMS.get(day, (0.0, 0.0))
    more = worked(STORMS | {day: (old[0] + rain, old[1] + volume)})
    assert more.supply_mm[0, YEAR] >= worked(STORMS).supply_mm[0, YEAR] - 1e-9


def test_a_season_over_the_new_year_belongs_to_the_year_of_sowing() -> None:
    seasons = demand.season_days(DAYS, planting=(11, 15), season_length_days=135)
    assert seasons.label.tolist() == [2001, 2002]
    assert str(seasons.sown[1]) == "2002-11-15"
    assert str(DAYS[seasons.first[1]]) == "2002-03-30"  # the day after the harvest before
    assert seasons.end[1] - seasons.sowing[1] == 135


def test_a_day_that_most_years_lack_is_refused() -> None:
    with pytest.raises(ConfigError, match="give 02-28 or 03-01"):
        demand.season_days(DAYS, planting=(2, 29), season_length_days=100)
    with pytest.raises(ConfigError, match="is no day of the year"):
        demand.season_days(DAYS, planting=(13, 1), season_length_days=100)


def test_a_record_without_a_whole_season_is_refused() -> None:
    with pytest.raises(InputError, match="holds no complete season sown on 06-01"):
        demand.season_days(DAYS[:300], planting=(6, 1), season_length_days=120)


def test_planting_on_new_years_day_and_the_day_before() -> None:
    first = demand.season_days(DAYS, planting=(1, 1), season_length_days=100)
    assert first.label.tolist() == [2002, 2003]  # that of 2001, sown on day one, has no harvest before it in the record
    assert str(first.sown[0]) == "2002-01-01"
    last = demand.season_days(DAYS, planting=(12, 31), season_length_days=365)
    assert last.label.tolist() == [2001, 2002]  # 2002 ends on the last day of the record
    np.testing.assert_array_equal(last.first, last.sowing)  # sown the day after the harvest: no fallow
    assert last.end[-1] == DAYS.size
