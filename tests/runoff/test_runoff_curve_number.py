"""Retention, runoff and curve number conversions against print, and the laws they obey."""

import csv
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from siting import runoff
from siting.errors import ConfigError

TABLE = Path(__file__).parent.parent / "worked" / "runoff_depth_tr55_table_2_1.csv"
CN = st.floats(30.0, 100.0)
MM = st.floats(0.0, 500.0)


def depth(rain: float, number: float, ratio: float = 0.2) -> float:
    retention = runoff.retention_for_ratio(number, abstraction_ratio=ratio)
    return float(runoff.runoff_depth_mm(rain, retention, abstraction_ratio=ratio))


def test_runoff_equals_the_printed_table() -> None:
    with TABLE.open(encoding="utf-8") as file:
        for row in csv.DictReader(file):
            got = depth(float(row["rain_in"]) * 25.4, float(row["curve_number"])) / 25.4
            assert got == pytest.approx(float(row["runoff_in"]), abs=0.006), row


def test_retention_in_millimetres() -> None:
    # TR-55 eq. 2-4 in mm: CN 75
    assert float(runoff.retention_mm(75)) == pytest.approx(84.67, abs=0.01)


def test_runoff_in_millimetres_at_the_threshold() -> None:
    # the equation in mm, CN 75
    rain = np.array([10, 20, 25, 30, 40, 50, 75, 100.0])
    got = runoff.runoff_depth_mm(rain, runoff.retention_mm(75), abstraction_ratio=0.2)
    expected = [0, 0.107, 0.702, 1.747, 4.939, 9.287, 23.623, 41.137]
    np.testing.assert_allclose(got, expected, atol=0.001)


def test_season_of_storms_sums_its_events() -> None:
    # 10 ha at CN 80, each storm separate: the equation in mm
    rain = np.array([8, 15, 22, 40, 60.0])
    got = runoff.runoff_depth_mm(rain, runoff.retention_mm(80), abstraction_ratio=0.2)
    np.testing.assert_allclose(got, [0, 0.080, 1.188, 8.208, 20.192], rtol=0.005, atol=0.0005)
    assert got.sum() * 100 == pytest.approx(2967, rel=0.005)
    # the same formula on the season's total gives several times that: the wrong time step
    assert depth(float(rain.sum()), 80) > 2.5 * got.sum()


def test_antecedent_conditions_are_those_of_the_handbook() -> None:
    # NEH-630 ch. 10 Table 10-1
    middle = np.array([95, 90, 80, 70, 60, 50, 40, 30, 85, 75, 65, 55.0])
    np.testing.assert_array_equal(runoff.dry_curve_number(middle), [87, 78, 63, 51, 40, 31, 22, 15, 70, 57, 45, 35])
    np.testing.assert_array_equal(runoff.wet_curve_number(middle), [98, 96, 91, 85, 78, 70, 60, 50, 94, 88, 82, 74])


def test_smaller_abstraction_ratio_by_the_published_conversion() -> None:
    # Hawkins et al. (2002): CN 60, 70, 80, 90 -> 45.90, 58.51, 72.39, 86.95
    retention = runoff.retention_for_ratio([60, 70, 80, 90], abstraction_ratio=0.05)
    np.testing.assert_allclose(25400 / (retention + 254), [45.90, 58.51, 72.39, 86.95], atol=0.02)


def test_a_ratio_without_a_published_conversion_is_refused() -> None:
    with pytest.raises(ConfigError, match=r"0\.1 has no published conversion; use 0\.2 or 0\.05"):
        runoff.retention_for_ratio(80, abstraction_ratio=0.1)


def test_composite_and_aligned_curve_numbers() -> None:
    # TR-55 fig. 2-3 (equation form in appendix F); Woodward et al. (2002)
    np.testing.assert_allclose(runoff.composite_curve_number([61, 74], 35), [73.95, 82.4], atol=0.01)
    assert float(runoff.aligned_curve_number_a(80)) == pytest.approx(67.9, abs=0.1)


def test_slope_adjustment_is_neutral_near_five_percent() -> None:
    # Sharpley & Williams (1990): CN 75, wet 88
    got = runoff.slope_adjusted_curve_number(75, 88, [0, 0.02, 0.05, 0.10, 0.20])
    np.testing.assert_allclose(got, [70.67, 72.76, 75.00, 77.17, 78.79], atol=0.01)


def test_a_crust_moves_the_group_two_letters() -> None:
    np.testing.assert_array_equal(runoff.crusted_group(np.array([0, 1, 2, 3, 4])), [0, 3, 4, 4, 4])


def test_missing_rain_stays_missing() -> None:
    assert np.isnan(depth(float("nan"), 80))


@pytest.mark.parametrize("number", [0.0, -5.0, 101.0])
def test_impossible_curve_numbers_are_refused(number: float) -> None:
    with pytest.raises(ConfigError, match="outside 0 to 100"):
        runoff.retention_mm(number)


@given(rain=MM, number=CN)
def test_runoff_lies_between_zero_and_the_rain(rain: float, number: float) -> None:
    assert 0.0 <= depth(rain, number) <= rain


@given(rain=MM, more=st.floats(0.0, 100.0), number=CN)
def test_more_rain_never_runs_off_less(rain: float, more: float, number: float) -> None:
    assert depth(rain + more, number) >= depth(rain, number) - 1e-9


@given(rain=MM, number=st.floats(30.0, 99.0), ratio=st.sampled_from([0.2, 0.05]))
def test_a_higher_curve_number_never_runs_off_less(rain: float, number: float, ratio: float) -> None:
    assert depth(rain, number + 1.0, ratio) >= depth(rain, number, ratio) - 1e-9
