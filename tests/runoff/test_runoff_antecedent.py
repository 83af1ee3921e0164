"""Dry and wet ground: bounds of single events, and the old rule of five days."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from siting import runoff, tables
from siting.errors import ConfigError, GridError, InputError
from siting.notes import Notes


def ground(*numbers: float, seen: float = np.nan) -> runoff.RunoffClasses:
    return runoff.RunoffClasses(np.zeros((1, 1), dtype=np.uint16), np.array(numbers), np.full(len(numbers), seen))


def condition(rain: list[float], *, growing: bool, classes: runoff.RunoffClasses | None = None) -> list[int]:
    got = runoff.antecedent_condition(rain, classes or ground(75.0), growing=np.full(len(rain), growing), notes=Notes())
    return [int(code) for code in got[0]]


def test_bounds_of_one_event_are_those_of_the_handbook_numbers() -> None:
    # the equation in mm with NEH-630 Table 10-1: CN 75 (dry 57, wet 88), 40 mm
    got = runoff.antecedent_bounds_mm(40.0, ground(75.0), abstraction_ratio=0.2)
    np.testing.assert_allclose([got.dry_mm[0], got.average_mm[0], got.wet_mm[0]], [0.015, 4.939, 16.154], atol=0.001)


def test_bounds_follow_the_rain_of_each_station() -> None:
    classes = runoff.RunoffClasses(
        np.zeros((1, 1), dtype=np.uint16), np.array([75.0, 75.0]), np.full(2, np.nan), np.array([0, 1])
    )
    zones = runoff.RainZones(np.array([1, 0]), np.ones(2))
    got = runoff.antecedent_bounds_mm([0.0, 40.0], classes, zones=zones, abstraction_ratio=0.2)
    np.testing.assert_allclose(got.wet_mm, [16.154, 0.0], atol=0.001)


@given(rain=st.floats(0.0, 300.0), number=st.floats(5.0, 100.0), ratio=st.sampled_from([0.2, 0.05]))
def test_dry_ground_never_sheds_more_than_wet(rain: float, number: float, ratio: float) -> None:
    got = runoff.antecedent_bounds_mm(rain, ground(number), abstraction_ratio=ratio)
    assert got.dry_mm[0] <= got.average_mm[0] <= got.wet_mm[0] <= rain


@pytest.mark.parametrize("ratio", [0.2, 0.05])
def test_an_observed_threshold_moves_as_that_of_its_curve_number(ratio: float) -> None:
    # CN 80 begins to run at 0.2 (25400/80 - 254) = 12.7 mm; CN 63 and 91 stand for it (NEH-630 Table 10-1)
    retention = ground(55.0, seen=12.7).antecedent_retention_mm(abstraction_ratio=ratio)[0]
    expected = 0.2 * (25400 / np.array([63, 80, 91.0]) - 254)
    np.testing.assert_allclose(ratio * retention, expected, rtol=1e-9)


def test_a_series_is_no_single_event() -> None:
    with pytest.raises(InputError, match="is more than one event"):
        runoff.antecedent_bounds_mm([[1.0, 2.0]], ground(75.0), abstraction_ratio=0.2)


def test_limits_of_the_five_day_rule_are_as_printed() -> None:
    # SCS NEH-4 (1972) Table 4.2: 13, 28, 36, 53 mm
    dormant, growing = tables.antecedent_rain("dormant"), tables.antecedent_rain("growing")
    got = [dormant.dry_below_mm, dormant.wet_above_mm, growing.dry_below_mm, growing.wet_above_mm]
    assert [round(limit) for limit in got] == [13, 28, 36, 53]


@pytest.mark.parametrize(
    ("depth", "dormant", "growing"), [(12.0, 1, 1), (20.0, 2, 1), (30.0, 3, 1), (40.0, 3, 2), (60.0, 3, 3)]
)
def test_the_rule_tells_conditions_by_the_rain_of_five_days(depth: float, dormant: int, growing: int) -> None:
    rain = [0.0, depth, 0.0, 0.0, 0.0, 0.0, 99.0]
    # unknown until five days are known; the day itself does not count
    assert condition(rain, growing=False) == [2, 2, 2, 2, 2, dormant, dormant]
    assert condition(rain, growing=True) == [2, 2, 2, 2, 2, growing, growing]


def test_a_missing_day_leaves_the_average_condition() -> None:
    rain = [0.0, np.nan, *[0.0] * 6]
    assert condition(rain, growing=True) == [2, 2, 2, 2, 2, 2, 2, 1]


@given(st.lists(st.floats(0.0, 100.0), max_size=20))
def test_five_days_are_summed_without_a_trace_of_those_before(rain: list[float]) -> None:
    got = runoff.five_day_rain_mm(rain)
    expected = [np.nan if day < 5 else sum(rain[day - 5 : day]) for day in range(len(rain))]
    np.testing.assert_allclose(got, expected, rtol=1e-12, atol=0)


def test_runoff_follows_the_condition_of_each_day() -> None:
    # CN 75: 40 mm on dry, average and wet ground
    got = runoff.class_runoff_mm(
        [40.0] * 3, ground(75.0, 100.0), condition=np.array([[1, 2, 3]], dtype=np.int8), abstraction_ratio=0.2
    )
    np.testing.assert_allclose(got, [[0.015, 4.939, 16.154], [40.0] * 3], atol=0.001)


@given(st.lists(st.floats(0.0, 100.0), min_size=1, max_size=20), st.floats(30.0, 100.0))
def test_the_average_condition_on_all_days_changes_nothing(rain: list[float], number: float) -> None:
    always = np.full((1, len(rain)), 2, dtype=np.int8)
    got = runoff.class_runoff_mm(rain, ground(number), condition=always, abstraction_ratio=0.2)
    np.testing.assert_array_equal(got, runoff.class_runoff_mm(rain, ground(number), abstraction_ratio=0.2))


def test_the_rule_says_that_it_is_withdrawn() -> None:
    notes = Notes()
    runoff.antecedent_condition([0.0] * 9, ground(75.0), growing=np.ones(9, np.bool_), notes=notes)
    assert [warned.code for warned in notes.warnings] == ["antecedent_rule"]
    assert "withdrawn from the handbook" in notes.warnings[0].text


def test_a_growing_season_runs_over_the_turn_of_the_year_or_not() -> None:
    days = np.array(["2001-10-31", "2001-11-01", "2001-12-31", "2002-01-01", "2002-04-30", "2002-05-01"], "datetime64[D]")
    winter = runoff.growing_days(days, first=(11, 1), last=(4, 30))
    np.testing.assert_array_equal(winter, [False, True, True, True, True, False])
    np.testing.assert_array_equal(runoff.growing_days(days, first=(5, 1), last=(10, 31)), ~winter)


def test_seasons_for_other_days_are_refused() -> None:
    with pytest.raises(InputError, match="told for 3 days, the rain for 9"):
        runoff.antecedent_condition([0.0] * 9, ground(75.0), growing=np.ones(3, np.bool_), notes=Notes())


def test_curve_numbers_follow_the_slope() -> None:
    # Sharpley & Williams (1990), CN 75, wet 88: 70.67, 72.76, 75.00, 77.17, 78.79; rounded to half a number
    slope = np.array([[0.0, 0.02, 0.05, 0.10, 0.20, np.nan]])
    got = runoff.slope_adjusted(np.full((1, 6), 75.0, dtype=np.float32), slope)
    np.testing.assert_array_equal(got, np.array([[70.5, 73.0, 75.0, 77.0, 79.0, np.nan]], dtype=np.float32))


@given(number=st.floats(5.0, 100.0), slope=st.floats(0.0, 3.0), steeper=st.floats(0.0, 3.0))
def test_steeper_ground_never_has_a_lower_number(number: float, slope: float, steeper: float) -> None:
    low, high = runoff.slope_adjusted(np.full((1, 2), number), np.array([[slope, slope + steeper]]))[0]
    assert 0 < low <= high <= 100


def test_many_rows_are_adjusted_as_one_by_one() -> None:
    slope = np.linspace(0.0, 0.4, 700)[:, None]
    number = np.full((700, 1), 80.0)
    got = runoff.slope_adjusted(number, slope)
    for row in (0, 255, 256, 511, 699):
        assert got[row] == runoff.slope_adjusted(number[row : row + 1], slope[row : row + 1])


def test_slopes_that_cannot_be_are_refused() -> None:
    with pytest.raises(ConfigError, match=r"slope -0\.1 is below zero"):
        runoff.slope_adjusted(np.array([[75.0]]), np.array([[-0.1]]))
    with pytest.raises(GridError, match="both must be the same"):
        runoff.slope_adjusted(np.array([[75.0]]), np.array([[0.1, 0.2]]))
