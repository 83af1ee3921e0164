"""Plotting positions, the design rule and the order by supply."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import mstats

from siting import ranking
from siting.errors import ConfigError

ANNUAL = [340, 305, 275, 260, 230, 212, 198, 180, 150, 120.0]


def test_plotting_positions_are_those_of_the_manual() -> None:
    # FAO AGL/MISC/17/91 section 3.4: (m - 0.375) / (N + 0.25)
    got = ranking.exceedance(ANNUAL)
    np.testing.assert_allclose(got, (np.arange(1, 11) - 0.375) / 10.25)


def test_dependable_value_is_linear_between_ranks() -> None:
    # by hand: 80 % lies between ranks 8 (0.7439) and 9 (0.8415)
    share = (0.8 - 7.625 / 10.25) / (1 / 10.25)
    assert ranking.dependable(ANNUAL, probability=0.8) == pytest.approx(180 - 30 * share)


def test_a_probability_outside_the_ranks_is_unknown() -> None:
    assert np.isnan(ranking.dependable([300, 200.0, 100], probability=0.9))
    assert np.isnan(ranking.dependable([], probability=0.5))


@given(st.lists(st.floats(0, 1000), min_size=8, max_size=40))
def test_dependable_agrees_with_scipy(values: list[float]) -> None:
    # scipy.stats.mstats.mquantiles with alphap = betap = 0.375 is the same position, counted from below
    theirs = float(mstats.mquantiles(values, [0.2], alphap=0.375, betap=0.375)[0])
    assert ranking.dependable(values, probability=0.8) == pytest.approx(theirs, abs=1e-9)


def test_plotting_positions_by_other_offsets() -> None:
    # the printed forms: Weibull m/(N+1), Gringorten (m-0.44)/(N+0.12), Hazen (m-0.5)/N, Cunnane (m-0.4)/(N+0.2)
    rank = np.arange(1, 11)
    for offset, form in (
        (0.0, rank / 11),
        (0.44, (rank - 0.44) / 10.12),
        (0.5, (rank - 0.5) / 10),
        (0.4, (rank - 0.4) / 10.2),
    ):
        np.testing.assert_allclose(ranking.plotting_position(rank, 10, offset=offset), form)
    # the ten-year set by Weibull, computed from the formula: 67 % 191.3 mm, 80 % 156.0 mm
    assert ranking.dependable(ANNUAL, probability=0.67, offset=0.0) == pytest.approx(191.3, abs=0.1)
    assert ranking.dependable(ANNUAL, probability=0.80, offset=0.0) == pytest.approx(156.0, abs=0.1)
    with pytest.raises(ConfigError, match=r"offset 0\.6 is outside 0 to 0\.5"):
        ranking.plotting_position(1, 10, offset=0.6)


def test_return_periods() -> None:
    # T = 1 / p; FAO AGL/MISC/17/91 section 3.4 rounds 67 % and 33 % to 1.5 and 3 years
    np.testing.assert_allclose(ranking.return_period_years([0.67, 0.80, 0.20, 0.04]), [1.49, 1.25, 5, 25], atol=0.01)
    with pytest.raises(ConfigError, match=r"so 80 % is 0\.8"):
        ranking.return_period_years(80)


def test_dependable_values_of_many_plots_at_once() -> None:
    rng = np.random.default_rng(3)
    many = rng.uniform(0, 500, (3, 4, 20))
    many[1, 2, 5:] = np.nan
    got = ranking.dependable(many, probability=0.8)
    assert got.shape == (3, 4)
    for place in np.ndindex(3, 4):
        np.testing.assert_array_equal(got[place], ranking.dependable(many[place], probability=0.8))


def test_an_exact_rank_is_taken_whole_beside_an_infinite_one() -> None:
    # rank 2 of 3 is the share 0.5 exactly; between rank 1 (infinite) and 2 nothing is known
    assert ranking.dependable([np.inf, 7.0, 1.0], probability=0.5) == 7.0
    assert np.isnan(ranking.dependable([np.inf, 7.0, 1.0], probability=0.4))


def test_missing_years_are_not_counted() -> None:
    got = ranking.exceedance([10.0, np.nan, 20.0])
    np.testing.assert_allclose(got, [1.625 / 2.25, np.nan, 0.625 / 2.25])


def test_catchment_ratio_of_the_manual() -> None:
    # FAO AGL/MISC/17/91 section 4.3, example 1: 7.2; no catchment needed: 0; and 6.667 by algebra
    got = ranking.catchment_ratio(
        crop_mm=[475, 400, 500], rain_mm=[250, 420, 250], runoff_coefficient=[0.25, 0.3, 0.3], efficiency=0.5
    )
    np.testing.assert_allclose(got, [7.2, 0.0, 6.667], atol=0.01)


def order(dry: list[float], **other: list[float]) -> list[int]:
    count = len(dry)
    keys = {
        name: np.array(other.get(name, [0.0] * count))
        for name in ("supply_ratio_median", "supply_ratio_mean", "gain", "peak_flow_10y_m3s")
    }
    rank = ranking.supply_order(supply_ratio_dry=np.array(dry), plot_id=np.arange(1, count + 1, dtype=np.int64), **keys)
    return [int(place) for place in rank]


def test_order_by_supply_is_capped() -> None:
    # ratios 0.60, 1.00, 0.40, 1.50: capped at 1, the second and the fourth tie, and the smaller id comes first
    assert order([0.6, 1.0, 0.4, 1.5]) == [3, 1, 4, 2]


def test_ties_are_broken_by_the_next_key() -> None:
    assert order([1.0, 1.2], supply_ratio_median=[0.8, 0.9]) == [2, 1]
    assert order([1.0, 1.2], peak_flow_10y_m3s=[2.0, 1.0]) == [2, 1]
    assert order([1.0, 1.2], peak_flow_10y_m3s=[2.0, np.nan]) == [1, 2]


def test_the_mean_of_capped_ratios_leaves_unknown_seasons_out() -> None:
    got = ranking.mean_capped_ratio(np.array([[0.5, 40.0, np.nan], [np.nan, np.nan, np.nan]]))
    np.testing.assert_array_equal(got, [0.75, np.nan])  # (0.5 + 1) / 2: the flood counts as enough


def test_an_unknown_ratio_comes_last() -> None:
    assert order([np.nan, 0.1]) == [2, 1]
