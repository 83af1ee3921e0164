"""Rain in space: zones carried by the classes of ground, and factors laid on the rain before the curve number."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from siting import runoff
from siting.errors import InputError
from siting.notes import Notes
from siting.runoff.zones import factor_steps

DEPTHS = arrays(np.float64, st.integers(1, 30), elements=st.floats(0.0, 300.0))
NUMBERS = st.lists(st.floats(30.0, 100.0), min_size=1, max_size=6)


def ground(numbers: list[float], zone: list[int] | None = None) -> runoff.RunoffClasses:
    count = len(numbers)
    return runoff.RunoffClasses(
        np.zeros((1, 1), dtype=np.uint16),
        np.array(numbers),
        np.full(count, np.nan),
        None if zone is None else np.array(zone),
    )


def zones(station: list[int], factor: list[float]) -> runoff.RainZones:
    return runoff.RainZones(np.array(station), np.array(factor, dtype=np.float64))


def seen(rain: list[float]) -> runoff.Rain:
    return runoff.Rain(np.datetime64("2001-01-01") + np.arange(len(rain)), np.array(rain, dtype=np.float64))


def test_cells_are_classed_by_zone_and_by_curve_number() -> None:
    number = np.array([[77.0, 85.0, 77.0, 85.0, np.nan, 77.0]])
    zone = np.array([[0, 0, 1, 1, 1, -1]], dtype=np.int16)
    classes = runoff.classify(curve_number=number, runs_after_mm=None, rain_zone=zone, valid=np.ones((1, 6), np.bool_))
    np.testing.assert_array_equal(classes.class_of_cell, [[0, 1, 2, 3, 65535, 65535]])
    np.testing.assert_array_equal(classes.curve_number, [77, 85, 77, 85])
    assert classes.zone is not None
    np.testing.assert_array_equal(classes.zone, [0, 0, 1, 1])
    assert classes.label[2] == "CN 77, rain zone 2"


@given(
    number=arrays(np.int64, 40, elements=st.integers(60, 64)),
    zone=arrays(np.int16, 40, elements=st.integers(-1, 3)),
)
def test_zones_divide_the_classes_of_ground_and_change_none(number: np.ndarray, zone: np.ndarray) -> None:
    valid = np.ones((1, 40), np.bool_)
    zoned = runoff.classify(
        curve_number=number.astype(np.float64)[None], runs_after_mm=None, rain_zone=zone[None], valid=valid
    )
    known = zone >= 0
    code = zoned.class_of_cell[0]
    np.testing.assert_array_equal(code == 65535, ~known)
    assert zoned.zone is not None
    np.testing.assert_array_equal(zoned.curve_number[code[known]], number[known])
    np.testing.assert_array_equal(zoned.zone[code[known]], zone[known])
    assert zoned.count == len({*zip(number[known], zone[known], strict=True)})


def test_an_observed_threshold_keeps_its_zone() -> None:
    zone = np.array([[0, 1]], dtype=np.int16)
    classes = runoff.classify(
        curve_number=np.full((1, 2), 77.0), runs_after_mm=12.0, rain_zone=zone, valid=np.ones((1, 2), np.bool_)
    )
    assert classes.label == ["runs after 12 mm, rain zone 1", "runs after 12 mm, rain zone 2"]


def test_each_class_runs_off_the_rain_of_its_own_station() -> None:
    # TR-55 (1986) Table 2-1, in: P 4.0 on CN 80 gives 2.04, P 2.0 gives 0.56; and CN 90 gives 1.09 of 2.0
    rain = 25.4 * np.array([[4.0, 0.0], [2.0, 4.0]])
    got = runoff.class_runoff_mm(rain, ground([80, 80, 90], [0, 1, 1]), zones=zones([0, 1], [1, 1]), abstraction_ratio=0.2)
    np.testing.assert_allclose(got[:, 0] / 25.4, [2.04, 0.56, 1.09], atol=0.006)
    np.testing.assert_allclose(got[:2, 1] / 25.4, [0.0, 2.04], atol=0.006)


def test_the_factor_is_laid_on_the_rain_and_not_on_the_runoff() -> None:
    # TR-55 (1986) Table 2-1, CN 80: 2.0 in runs 0.56 in, 4.0 in runs 2.04 in: more than three times as much
    got = runoff.class_runoff_mm([50.8], ground([80, 80], [0, 1]), zones=zones([0, 0], [1.0, 2.0]), abstraction_ratio=0.2)
    np.testing.assert_allclose(got[:, 0] / 25.4, [0.56, 2.04], atol=0.006)


@given(rain=DEPTHS, numbers=NUMBERS)
def test_one_zone_of_factor_1_changes_nothing(rain: np.ndarray, numbers: list[float]) -> None:
    plain = runoff.class_runoff_mm(rain, ground(numbers), abstraction_ratio=0.2)
    zoned = runoff.class_runoff_mm(rain, ground(numbers, [0] * len(numbers)), zones=zones([0], [1.0]), abstraction_ratio=0.2)
    np.testing.assert_array_equal(zoned, plain)


@given(rain=DEPTHS, number=st.floats(30.0, 100.0), low=st.floats(0.0, 3.0), more=st.floats(0.0, 3.0))
def test_a_higher_factor_never_lowers_runoff(rain: np.ndarray, number: float, low: float, more: float) -> None:
    less, greater = runoff.class_runoff_mm(
        rain, ground([number, number], [0, 1]), zones=zones([0, 0], [low, low + more]), abstraction_ratio=0.2
    )
    assert np.all(greater >= less - 1e-9)


def test_a_day_missing_at_one_station_is_unknown_there_alone() -> None:
    got = runoff.zone_rain_mm([[np.nan, 5.0], [3.0, 4.0]], zones([0, 1, 1], [1, 1, 2]))
    np.testing.assert_array_equal(got, [[np.nan, 5.0], [3.0, 4.0], [6.0, 8.0]])


@pytest.mark.parametrize(
    ("rain", "zone", "given_zones", "message"),
    [
        ([[1.0], [2.0]], None, None, "rain of 2 stations needs rain zones"),
        ([1.0], [0], None, "classes of rain zones lack the zones"),
        ([1.0], None, zones([0], [1.0]), "zones are given for classes without them"),
        ([1.0], [1], zones([0], [1.0]), "a class lies in rain zone 2 of 1"),
        ([1.0], [0], zones([1], [1.0]), "takes the rain of station 1, and the record has 1 stations"),
    ],
)
def test_zones_that_do_not_fit_are_refused(
    rain: list[float], zone: list[int] | None, given_zones: runoff.RainZones | None, message: str
) -> None:
    with pytest.raises(InputError, match=message):
        runoff.class_runoff_mm(rain, ground([80.0], zone), zones=given_zones, abstraction_ratio=0.2)


@pytest.mark.parametrize("factor", [-0.1, np.nan, np.inf])
def test_an_impossible_factor_is_refused(factor: float) -> None:
    with pytest.raises(InputError, match="factors are finite and at least 0"):
        zones([0], [factor])


@given(factor=st.floats(0.01, 20.0))
def test_a_step_of_the_factor_is_never_far_off(factor: float) -> None:
    assert 1.05 ** float(factor_steps(factor)) == pytest.approx(factor, rel=0.025)


def test_the_mean_year_of_a_record_is_the_sum_of_its_months() -> None:
    # 1 mm a day over 365.25 days, with and without the half of a year more
    for days in (4 * 365 + 1, 4 * 365 + 180):
        assert runoff.mean_annual_mm(seen([1.0] * days)) == pytest.approx(365.25)
    assert np.isnan(runoff.mean_annual_mm(seen([1.0] * 300)))


def test_a_year_is_kept_where_every_station_is_complete() -> None:
    days = np.arange(np.datetime64("2001-01-01"), np.datetime64("2004-01-01"))
    rain = np.ones((2, days.size))
    rain[1, 400:440] = np.nan  # 40 days of 2002
    rain[0, 10:13] = np.nan
    notes = Notes()
    record = runoff.StationRain(days, rain, ("Qesh", "Rehm"))
    years = runoff.hydrological_years(record, starts_month=1, max_missing=0.05, notes=notes)
    assert (years.labels.tolist(), years.dropped) == ([2001, 2003], (2002,))
    assert {noted.id: noted.value for noted in notes.assumptions}["rain.missing_days"] == "3"
    alone = runoff.hydrological_years(record.of(0), starts_month=1, max_missing=0.05, notes=Notes())
    assert alone.dropped == ()
    assert runoff.driest_month(record) == 1


def test_stations_that_do_not_match_their_rain_are_refused() -> None:
    days = np.datetime64("2001-01-01") + np.arange(3)
    with pytest.raises(InputError, match=r"1 stations on 3 days do not match rain of shape \(2, 3\)"):
        runoff.StationRain(days, np.zeros((2, 3)), ("Qesh",))
    with pytest.raises(InputError, match="rain of -1 mm on 2001-01-02"):
        runoff.StationRain(days, np.array([[0.0, -1.0, 0.0]]), ("Qesh",))
