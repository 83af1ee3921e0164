"""Printed examples of the curve number method, and the antecedent table against published fits to it."""

from collections.abc import Callable

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given
from hypothesis import strategies as st

from siting import runoff
from siting.errors import ConfigError

Fit = Callable[[npt.NDArray[np.float64]], npt.NDArray[np.float64]]


def inches(rain_in: float, number: float) -> float:
    depth = runoff.runoff_depth_mm(rain_in * 25.4, runoff.retention_mm(number), abstraction_ratio=0.2)
    return float(depth) / 25.4


def test_initial_abstraction_equals_the_printed_table() -> None:
    # TR-55 (1986) Table 4-1, inches
    number = np.array([40, 50, 60, 70, 75, 80, 85, 90, 95, 98.0])
    printed = [3.000, 2.000, 1.333, 0.857, 0.667, 0.500, 0.353, 0.222, 0.105, 0.041]
    np.testing.assert_allclose(0.2 * runoff.retention_mm(number) / 25.4, printed, atol=0.001)


def test_worked_examples_of_the_handbook() -> None:
    # TR-55 (1986) Examples 2-1 and 2-4: they round the weighted curve number before they use it
    pasture = 0.7 * 74 + 0.3 * 61
    assert round(pasture) == 70
    assert inches(6.0, 70) == pytest.approx(2.81, abs=0.01)
    lots = (75 * 70 + 100 * 78 + 75 * 74) / 250
    assert round(lots) == 74
    assert inches(6.0, 74) == pytest.approx(3.19, abs=0.01)


def test_antecedent_conditions_move_one_event() -> None:
    # the equation in mm with NEH-630 Table 10-1: CN 75 (dry 57, wet 88), 40 mm
    number = [float(runoff.dry_curve_number(75)), 75.0, float(runoff.wet_curve_number(75))]
    got = runoff.runoff_depth_mm(40.0, runoff.retention_mm(number), abstraction_ratio=0.2)
    np.testing.assert_allclose(got, [0.015, 4.939, 16.154], atol=0.001)


def test_second_set_of_antecedent_curve_numbers() -> None:
    # NEH-630 ch. 10 Table 10-1
    middle = np.array([88, 72, 45, 35.0])
    np.testing.assert_array_equal(runoff.dry_curve_number(middle), [75, 53, 26, 18])
    np.testing.assert_array_equal(runoff.wet_curve_number(middle), [95, 86, 65, 55])


# greatest distance from the table for CN 40 to 100, as published with each fit
@pytest.mark.parametrize(
    ("dry", "wet", "most_dry", "most_wet"),
    [
        # Chow, Maidment & Mays (1988) eq. 5.5.7, 5.5.8
        (lambda cn: 4.2 * cn / (10 - 0.058 * cn), lambda cn: 23 * cn / (10 + 0.13 * cn), 2.1, 1.4),
        # Hawkins, Hjelmfelt & Zevenbergen (1985)
        (lambda cn: cn / (2.281 - 0.01281 * cn), lambda cn: cn / (0.427 + 0.00573 * cn), 2.5, 1.2),
        # Sobhani (1975)
        (lambda cn: cn / (2.334 - 0.01334 * cn), lambda cn: cn / (0.4036 + 0.0059 * cn), 2.3, 2.5),
    ],
)
def test_every_row_of_the_antecedent_table_is_near_the_published_fits(
    dry: Fit, wet: Fit, most_dry: float, most_wet: float
) -> None:
    number = np.arange(40.0, 101.0)
    assert np.abs(runoff.dry_curve_number(number) - dry(number)).max() <= most_dry + 0.05
    assert np.abs(runoff.wet_curve_number(number) - wet(number)).max() <= most_wet + 0.05


def test_the_aligner_refuses_what_falls_below_zero() -> None:
    with pytest.raises(ConfigError, match="curve number 35 of group B has no group A"):
        runoff.aligned_curve_number_a([80, 35])


def test_an_impervious_share_above_all_is_refused() -> None:
    with pytest.raises(ConfigError, match="impervious share 150 % is outside 0 to 100"):
        runoff.composite_curve_number(60, 150)


def test_an_unknown_soil_group_code_is_refused() -> None:
    with pytest.raises(ConfigError, match="soil group code 9 is unknown"):
        runoff.crusted_group(np.array([1, 9]))


def test_infinite_and_negative_rain_are_refused() -> None:
    for rain in (np.inf, -1.0):
        with pytest.raises(ConfigError, match=r"rain of .* mm is below zero or has no end"):
            runoff.runoff_depth_mm([5.0, rain], 50.0, abstraction_ratio=0.2)


@given(rain=st.floats(0.0, 2000.0))
def test_ground_that_holds_nothing_sheds_all_rain_and_no_more(rain: float) -> None:
    assert float(runoff.runoff_depth_mm(rain, runoff.retention_mm(100), abstraction_ratio=0.2)) == rain


@given(number=st.lists(st.floats(30.0, 99.0), min_size=2, max_size=6), rain=st.floats(0.0, 200.0))
def test_runoff_by_class_is_never_below_that_of_the_mean_retention(number: list[float], rain: float) -> None:
    # Q is convex in S wherever it runs, and flat at 0 elsewhere: averaging the ground loses water
    retention = runoff.retention_mm(number)
    each = runoff.runoff_depth_mm(rain, retention, abstraction_ratio=0.2).mean()
    averaged = float(runoff.runoff_depth_mm(rain, retention.mean(), abstraction_ratio=0.2))
    assert each >= averaged - 1e-9
