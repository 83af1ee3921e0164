"""The downstream ledger: worked by hand, never more than there was, and unknown where it is unknown."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from siting import ranking
from siting.errors import InputError

YEARS = np.array([500.0, 400, 300, 200, 100, 450, 350, 250, 150, 50])


def test_lost_share_is_that_of_the_quantiles_by_hand() -> None:
    # ten years: 50 % lies half-way between ranks 5 (300) and 6 (250); 80 % between ranks 8 and 9: 150 - 50 x 0.575
    dry, median = 150 - 50 * 0.575, 275.0
    left = np.maximum(YEARS - 110.0, 0.0)
    got_dry = ranking.lost_share(YEARS[None], left[None], probability=0.8)
    got_median = ranking.lost_share(YEARS[None], left[None], probability=0.5)
    assert got_median[0] == pytest.approx(110 / median)
    # of 150 are left 40, of 100 nothing
    assert got_dry[0] == pytest.approx(1 - (40 - 40 * 0.575) / dry)


def test_a_share_of_nothing_is_unknown() -> None:
    came = np.array([[0.0] * 10, [np.nan] * 10, YEARS])
    got = ranking.lost_share(came, came, probability=0.8)
    np.testing.assert_array_equal(got, [np.nan, np.nan, 0.0])
    assert np.isnan(ranking.lost_share(YEARS[None, :2], YEARS[None, :2], probability=0.8))


def test_a_year_unknown_in_one_series_counts_in_neither() -> None:
    left = np.where(YEARS >= 450, np.nan, YEARS)
    assert ranking.lost_share(YEARS[None], left[None], probability=0.5)[0] == 0.0


@given(share=st.floats(0, 1), factor=st.floats(0.01, 100))
def test_a_like_share_of_every_year_is_lost_in_every_class_and_size_does_not_count(share: float, factor: float) -> None:
    came = factor * YEARS[None]
    for probability in (0.5, 0.8):
        got = ranking.lost_share(came, (1 - share) * came, probability=probability)
        assert got[0] == pytest.approx(share, abs=1e-9)


def ledger(came: np.ndarray, alone: list[float], in_set: list[float], probability: float = 0.5) -> ranking.LostShares:
    """Plots 0 and 1 above place 0 (half and all of their water gets there), plot 1 above place 1 too (a quarter)."""
    reaches = ranking.Reaches(np.array([0, 1, 1]), np.array([0, 0, 1]), np.array([0.5, 1.0, 0.25]))
    return ranking.lost_downstream(
        came_m3=came,
        reaches=reaches,
        taken_alone_m3=np.array(alone)[:, None] * np.ones(came.shape[1]),
        taken_in_set_m3=np.array(in_set)[:, None] * np.ones(came.shape[1]),
        probability=probability,
    )


def test_what_a_plot_takes_is_missing_below_after_losses_on_the_way() -> None:
    came = np.array([[100.0] * 5, [200.0] * 5])
    got = ledger(came, alone=[40.0, 30.0], in_set=[40.0, 24.0])
    np.testing.assert_allclose(got.by_plot, [20 / 100, 30 / 100, 7.5 / 200])
    np.testing.assert_allclose(got.by_set, [(20 + 24) / 100, 6 / 200])


def test_no_place_loses_more_than_came_to_it() -> None:
    came = np.array([[10.0] * 5, [200.0] * 5])
    got = ledger(came, alone=[40.0, 30.0], in_set=[40.0, 0.0])
    np.testing.assert_allclose(got.by_plot[:2], [1.0, 1.0])
    np.testing.assert_allclose(got.by_set, [1.0, 0.0])


def test_what_an_unknown_plot_takes_alone_is_unknown_and_the_rest_is_not() -> None:
    got = ledger(np.full((2, 5), 100.0), alone=[np.nan, 30.0], in_set=[0.0, 30.0])
    np.testing.assert_allclose(got.by_plot, [np.nan, 0.3, 0.075])
    np.testing.assert_allclose(got.by_set, [0.3, 0.075])


def test_the_ledger_of_the_forest_agrees_with_the_water_of_the_set() -> None:
    # three in a row: what the set keeps from the last is what set_water says
    forest = ranking.PlotForest(np.array([1, 2, -1]), np.array([0.9, 0.8, np.nan]))
    runon = np.random.default_rng(4).gamma(2.0, 100.0, (3, 12)) + np.array([[0.0], [300.0], [900.0]])
    room = np.full((3, 12), 120.0)
    alone = np.minimum(runon, room)
    by_plot = ranking.lost_downstream(
        came_m3=runon, reaches=forest.reaches(), taken_alone_m3=alone, taken_in_set_m3=0 * alone, probability=0.8
    ).by_plot
    for plot in (0, 1):
        one = ranking.set_water(forest, np.arange(3) == plot, runon_m3=runon, room_m3=room)
        expected = ranking.lost_share(runon, one.left_m3, probability=0.8)[plot + 1]
        assert by_plot[plot] == pytest.approx(expected)
        assert expected > 0


@pytest.mark.parametrize(
    ("plot", "place", "passing", "said"),
    [
        ([0, 0], [1, 1], [0.5, 0.4], "reaches the same place twice"),
        ([0], [-1], [0.5], "number below 0"),
        ([0], [0], [1.01], "is 1.01: it must lie between 0 and 1"),
        ([0], [0], [np.nan], "is nan"),
        ([0, 1], [0], [0.5], "2 plots, 1 places and 1 shares"),
    ],
)
def test_reaches_that_cannot_be_are_refused(plot: list[int], place: list[int], passing: list[float], said: str) -> None:
    with pytest.raises(InputError, match=said):
        ranking.Reaches(np.array(plot), np.array(place), np.array(passing))


def test_with_no_reaches_nothing_is_lost() -> None:
    none = np.empty(0, dtype=np.int64)
    got = ranking.lost_downstream(
        came_m3=YEARS[None],
        reaches=ranking.Reaches(none, none, np.empty(0)),
        taken_alone_m3=np.ones((2, 10)),
        taken_in_set_m3=np.ones((2, 10)),
        probability=0.5,
    )
    assert got.by_plot.size == 0
    np.testing.assert_array_equal(got.by_set, [0.0])
