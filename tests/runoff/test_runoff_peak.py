"""Peak flow, lag and spillways against print, and the laws they obey."""

import csv
from importlib.resources import files

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from siting import runoff
from siting.errors import ConfigError
from siting.tables import RAIN_DISTRIBUTIONS, unit_peaks

FOOT, MILE, INCH = 0.3048, 1609.344, 25.4
DISTRIBUTIONS = st.sampled_from(RAIN_DISTRIBUTIONS)


def unit_csm_in(hours: float, ia_over_p: float, distribution: str = "II") -> float:
    """Peak of one square mile under one inch of runoff, ft3/s, at CN 80 (Ia 0.5 inches)."""
    rain_in = 0.5 / ia_over_p
    flow = runoff.peak_flow_m3s(
        area_m2=MILE**2,
        runoff_mm=min(1.0, rain_in) * INCH,
        rain_mm=rain_in * INCH,
        curve_number=80,
        time_of_concentration_h=hours,
        rain_distribution=distribution,
    )
    return float(flow) / FOOT**3 / min(1.0, rain_in)


@pytest.mark.parametrize(
    ("hours", "ia_over_p", "printed"), [(0.2, 0.10, 799.9), (0.2, 0.30, 697.5), (1.0, 0.10, 357.5), (1.0, 0.30, 292.0)]
)
def test_unit_peaks_of_type_ii_equal_the_printed_equation(hours: float, ia_over_p: float, printed: float) -> None:
    # TR-55 (1986) Table F-1, csm/in
    assert unit_csm_in(hours, ia_over_p) == pytest.approx(printed, abs=0.2)


def test_the_printed_rows_are_met_at_one_hour() -> None:
    # TR-55 (1986) Table F-1: at Tc = 1 h the logarithm vanishes and qu = 10^C0
    printed = {("I", 0.1): 2.30550, ("I", 0.3): 2.10624, ("II", 0.5): 2.20282, ("IA", 0.5): 1.63417, ("III", 0.3): 2.39628}
    for (distribution, ratio), c0 in printed.items():
        assert unit_csm_in(1.0, ratio, distribution) == pytest.approx(10**c0, rel=1e-9)


def test_two_rows_that_copies_misprint_are_right() -> None:
    # TR-55 (1986) Table F-1: HEC-22 prints the first with a minus, a public copy repeats the row above for the second
    assert next(row.c2 for row in unit_peaks("I") if row.ia_over_p == 0.35) == 0.01983
    assert next(row.c2 for row in unit_peaks("III") if row.ia_over_p == 0.5) == -0.09525


def test_a_worked_example_of_hec_22() -> None:
    # HEC-22 (2009) Example 3-5: 6.1 km2, CN 78, type II, 150 mm, Tc 0.8 h: S 72 mm, Q 89 mm, 96 m3/s (95.4 unrounded)
    depth = runoff.runoff_depth_mm(150, runoff.retention_mm(78), abstraction_ratio=0.2)
    assert float(depth) == pytest.approx(89, abs=0.5)
    flow = runoff.peak_flow_m3s(
        area_m2=6.1e6,
        runoff_mm=depth,
        rain_mm=150,
        curve_number=78,
        time_of_concentration_h=0.8,
        rain_distribution="II",
    )
    assert float(flow) == pytest.approx(95.4, rel=0.01)


def test_a_worked_example_of_the_graphical_method() -> None:
    # TR-55 (1986) Example 4-1: 250 acres, CN 75, type II, 6.0 in, Tc 1.53 h: Q 3.28 in, qu 270 csm/in, 345 ft3/s; the
    # example reads qu from a figure and rounds the area to 0.39 mi2
    depth = runoff.runoff_depth_mm(6 * INCH, runoff.retention_mm(75), abstraction_ratio=0.2)
    assert float(depth) / INCH == pytest.approx(3.28, abs=0.01)
    flow = runoff.peak_flow_m3s(
        area_m2=250 * 4046.856,
        runoff_mm=depth,
        rain_mm=6 * INCH,
        curve_number=75,
        time_of_concentration_h=1.53,
        rain_distribution="II",
    )
    assert float(flow) / FOOT**3 == pytest.approx(345, rel=0.01)


@pytest.mark.parametrize(("rain", "number", "printed"), [(30, 80, 0.42), (50, 75, 0.34), (100, 70, 0.22), (200, 50, 0.25)])
def test_the_ratio_of_abstraction_to_rain_is_the_printed_one(rain: float, number: float, printed: float) -> None:
    # HEC-22 (2009) Table 3-8 prints Ia/P to two places. At Tc = 1 h qu lies on the chord between the rows about it
    flow = runoff.peak_flow_m3s(
        area_m2=MILE**2,
        runoff_mm=INCH,
        rain_mm=rain,
        curve_number=number,
        time_of_concentration_h=1.0,
        rain_distribution="II",
    )
    knots = [(row.ia_over_p, 10**row.c0) for row in unit_peaks("II")]
    ratio = np.interp(-float(flow) / FOOT**3, [-unit for _, unit in knots], [share for share, _ in knots])
    assert float(ratio) == pytest.approx(printed, abs=0.005)


def test_lag_and_time_of_concentration_are_those_of_the_handbook() -> None:
    # NEH-630 ch. 15 (2010) eq. 15-4a and 15-4b: 5000 ft, CN 75, 2 %: 0.946 h and 1.576 h
    lag = runoff.lag_h(flow_length_m=5000 * FOOT, curve_number=75, slope_pct=2.0)
    assert float(lag) == pytest.approx(0.946, abs=0.002)
    assert float(runoff.time_of_concentration_h(lag_h=lag)) == pytest.approx(1.576, abs=0.002)


def test_lag_without_slope_or_without_length() -> None:
    lag = runoff.lag_h(flow_length_m=[100.0, 0.0, 0.0, np.nan], curve_number=80, slope_pct=[0.0, 0.0, 3.0, 0.0])
    np.testing.assert_array_equal(lag, [np.inf, 0.0, 0.0, np.nan])


def test_a_spillway_passes_its_flow() -> None:
    # HEC-22 (2009) eq. 8-22 and Table 8-1: crest 3.0 m long, heads 0.10 to 0.50 m; Q = C L H^1.5 of a 5 m weir
    head, weir = np.array([0.10, 0.20, 0.30, 0.50]), np.array([1.40, 1.49, 1.48, 1.46])
    flow = weir * 5.0 * head**1.5
    np.testing.assert_allclose(runoff.spillway_width_m(flow_m3s=flow, head_m=head, coefficient=weir), 5.0)
    # critical depth over a broad crest (theory): q = sqrt(g) (2/3 H)^1.5 = 1.705 H^1.5
    critical = np.sqrt(9.80665) * (2 / 3 * 0.4) ** 1.5
    width = runoff.spillway_width_m(flow_m3s=3.0 * critical, head_m=0.4, coefficient=1.705)
    assert float(width) == pytest.approx(3.0, rel=1e-3)


def held(rain: float, number: float, hours: float) -> tuple[bool, bool, bool]:
    limits = runoff.peak_flow_limits(rain_mm=rain, curve_number=number, time_of_concentration_h=hours)
    return bool(limits.ia_over_p), bool(limits.time_of_concentration), bool(limits.curve_number)


def test_limits_are_told_where_they_bind() -> None:
    # CN 80: Ia 12.7 mm, so Ia/P is 0.1 at 127 mm and 0.5 at 25.4 mm; CN 30: Ia 118.5 mm
    assert held(60, 80, 1.0) == (False, False, False)
    assert held(130, 80, 1.0) == held(25, 80, 1.0) == held(0, 80, 1.0) == (True, False, False)
    assert held(60, 80, 0.05) == held(60, 80, 11.0) == held(60, 80, np.inf) == (False, True, False)
    assert held(300, 30, 1.0) == (False, False, True)
    assert held(np.nan, np.nan, np.nan) == (False, False, False)


@given(distribution=DISTRIBUTIONS, low=st.floats(0.0, 0.1), high=st.floats(10.0, 1e4))
def test_beyond_a_limit_the_peak_is_that_at_the_limit(distribution: str, low: float, high: float) -> None:
    for hours, limit in ((low, 0.1), (high, 10.0)):
        assert unit_csm_in(hours, 0.2, distribution) == unit_csm_in(limit, 0.2, distribution)
    for ratio, limit in ((max(low, 1e-3), 0.1), (high, 0.5)):
        assert unit_csm_in(1.0, ratio, distribution) == pytest.approx(unit_csm_in(1.0, limit, distribution), rel=1e-9)


@given(distribution=DISTRIBUTIONS, hours=st.floats(0.1, 9.0), more=st.floats(0.01, 1.0), ratio=st.floats(0.1, 0.5))
def test_a_slower_catchment_peaks_lower(distribution: str, hours: float, more: float, ratio: float) -> None:
    assert unit_csm_in(hours + more, ratio, distribution) < unit_csm_in(hours, ratio, distribution)


@given(ratio=st.floats(0.1, 0.499), hours=st.floats(0.1, 10.0))
def test_the_peak_runs_on_without_a_step_between_printed_rows(ratio: float, hours: float) -> None:
    one, next_one = unit_csm_in(hours, ratio), unit_csm_in(hours, ratio + 1e-7)
    assert next_one == pytest.approx(one, rel=1e-5)
    assert next_one <= one * (1 + 1e-9)  # more of the rain held back: later and flatter


def test_arguments_broadcast_and_unknown_stays_unknown() -> None:
    flow = runoff.peak_flow_m3s(
        area_m2=np.array([[1e5], [2e5], [np.nan]]),
        runoff_mm=np.array([0.0, 20.0, np.nan, 20.0, 20.0]),
        rain_mm=np.array([0.0, 60.0, 60.0, np.nan, 60.0]),
        curve_number=85,
        time_of_concentration_h=np.array([0.5, 0.5, 0.5, 0.5, np.nan]),
        rain_distribution="II",
    )
    assert flow.shape == (3, 5)
    assert flow[:2, 0].tolist() == [0.0, 0.0]
    assert flow[1, 1] == 2 * flow[0, 1] > 0
    assert np.isnan(flow[:, 2:]).all() and np.isnan(flow[2]).all()


PEAK = {
    "area_m2": 1e5,
    "runoff_mm": 10.0,
    "rain_mm": 50.0,
    "curve_number": 80.0,
    "time_of_concentration_h": 0.5,
}


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"area_m2": -1.0}, r"catchment area of -1 m2 is below zero"),
        ({"runoff_mm": [10.0, 51.0]}, r"runoff of 51 mm is more than the rain of 50 mm"),
        ({"rain_mm": np.inf}, r"rain of inf mm is below zero or has no end"),
        ({"time_of_concentration_h": -0.1}, r"time of concentration of -0\.1 h is below zero"),
        ({"curve_number": 101.0}, r"curve number 101 is outside 0 to 100"),
    ],
)
def test_impossible_storms_are_refused(change: dict[str, float], message: str) -> None:
    with pytest.raises(ConfigError, match=message):
        runoff.peak_flow_m3s(**(PEAK | change), rain_distribution="II")


def test_an_unknown_distribution_is_refused_with_those_in_print() -> None:
    with pytest.raises(ConfigError, match="rain distribution 'IV' is unknown; use one of I, IA, II, III"):
        runoff.peak_flow_m3s(**PEAK, rain_distribution="IV")


def test_impossible_spillways_and_slopes_are_refused() -> None:
    with pytest.raises(ConfigError, match=r"weir coefficient 2\.6 is outside 1\.35 to 1\.83 m\^0\.5/s; divide one in feet"):
        runoff.spillway_width_m(flow_m3s=1.0, head_m=0.3, coefficient=2.6)
    with pytest.raises(ConfigError, match="a head of 0 m passes nothing"):
        runoff.spillway_width_m(flow_m3s=1.0, head_m=[0.3, 0.0], coefficient=1.5)
    with pytest.raises(ConfigError, match="slope of -1 % is below zero"):
        runoff.lag_h(flow_length_m=100, curve_number=80, slope_pct=-1)


def test_every_printed_row_names_its_source() -> None:
    text = files("siting.tables").joinpath("peak_discharge_coefficients.csv").read_text(encoding="utf-8")
    printed = list(csv.DictReader(text.splitlines()))
    assert len(printed) == sum(len(unit_peaks(distribution)) for distribution in RAIN_DISTRIBUTIONS)
    assert all(row["source"] and row["confidence"] for row in printed)
    for distribution in RAIN_DISTRIBUTIONS:
        ratios = [row.ia_over_p for row in unit_peaks(distribution)]
        assert (ratios[0], ratios[-1]) == (0.1, 0.5)
        assert ratios == sorted(set(ratios))
