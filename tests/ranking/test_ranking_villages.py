"""Villages: worked by hand, and what may be said of those with missing data."""

from itertools import product
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from siting import ranking
from siting.errors import InputError

SEEDS = st.integers(0, 2**32 - 1)


def case(**changed: Any) -> dict[str, Any]:
    """Three villages and four plots: plot 1 lies between villages 0 and 1, plot 3 is outside the set, village 2 has none."""
    given = {
        "village": np.array([0, 0, 1, 1, 0]),
        "plot": np.array([0, 1, 1, 2, 3]),
        "distance_m": np.array([500.0, 900.0, 700.0, 100.0, 50.0]),
        "reach_cut": np.zeros(3, dtype=np.bool_),
        "located": np.ones(3, dtype=np.bool_),
        "people": np.array([100.0, 50.0, 10.0]),
        "in_set": np.array([True, True, True, False]),
        "supported_dry_m2": np.array([8000.0, 3000.0, 2000.0, 9000.0]),
        "plot_area_m2": np.array([10_000.0, 5000.0, 6000.0, 9000.0]),
        "plot_rank": np.array([3, 1, 2, 4]),
    }
    return given | changed


def with_value(name: str, place: int, value: float) -> dict[str, Any]:
    given = case()
    given[name] = given[name].copy()
    given[name][place] = value
    return given


def test_villages_worked_by_hand() -> None:
    got = ranking.rank_villages(**case())
    # village 0: plot 0 alone, 8000 / 100; village 1: plots 1 (nearer to it) and 2, 5000 / 50; village 2: none
    np.testing.assert_allclose(got.supported_dry_m2, [8000.0, 5000.0, 0.0])
    np.testing.assert_allclose(got.supported_dry_m2_per_person, [80.0, 100.0, 0.0])
    np.testing.assert_array_equal(got.rank, [2, 1, 3])
    assert got.rank_low.tolist() == got.rank_high.tolist() == [2, 1, 3]
    np.testing.assert_array_equal(got.plots_in_reach, [2, 2, 0])
    np.testing.assert_array_equal(got.plots_shared, [1, 1, 0])
    assert got.best_plot.tolist() == [1, 1, -1]
    assert got.nearest.tolist() == [True, False, True, True, True]
    assert got.status.tolist() == ["ranked"] * 3
    assert got.reason.tolist() == [""] * 3


def test_of_villages_as_near_the_first_counts_the_plot_and_equal_areas_share_a_rank() -> None:
    got = ranking.rank_villages(
        **case(distance_m=np.array([500.0, 700.0, 700.0, 100.0, 50.0]), people=np.array([110.0, 20.0, 10.0]))
    )
    np.testing.assert_allclose(got.supported_dry_m2_per_person, [100.0, 100.0, 0.0])
    np.testing.assert_array_equal(got.rank, [1, 1, 3])
    assert got.rank_low.tolist() == got.rank_high.tolist() == [1, 1, 3]


def test_unknown_people_leave_the_total_and_no_rank() -> None:
    for people in (np.nan, 0.0, -3.0):
        got = ranking.rank_villages(**with_value("people", 0, people))
        assert got.supported_dry_m2[0] == 8000.0
        assert np.isnan(got.supported_dry_m2_per_person[0]) and np.isnan(got.rank[0])
        assert got.status[0] == "unknown"
        assert got.reason[0] == "the number of people is unknown"
        # one person would have 8000 m2; very many next to nothing, which is still no less than village 2 has
        assert (got.rank_low[0], got.rank_high[0]) == (1, 2)
        np.testing.assert_array_equal(got.rank[1:], [1, 2])
        assert got.rank_high.tolist() == [2, 2, 3]


def test_a_plot_of_unknown_area_leaves_its_nearest_village_between_two_ranks() -> None:
    # plot 3, outside the set only because nothing is known of it: 0 to 9000 m2 more for village 0
    got = ranking.rank_villages(**with_value("supported_dry_m2", 3, np.nan))
    assert got.status.tolist() == ["unknown", "ranked", "ranked"]
    assert got.reason[0] == "the supported area of 1 plot in reach is unknown"
    assert np.isnan(got.rank[0]) and np.isnan(got.supported_dry_m2[0])
    assert (got.rank_low[0], got.rank_high[0]) == (1, 2)
    assert (got.rank_low[1], got.rank_high[1]) == (1, 2)
    # village 0 has 80 m2 for each at least, so village 2 is third whatever that plot supports
    np.testing.assert_array_equal(got.rank[1:], [1, 3])
    assert (got.rank_low[2], got.rank_high[2]) == (3, 3)


def test_a_village_outside_the_data_may_have_any_rank() -> None:
    got = ranking.rank_villages(
        **(case(reach_cut=np.array([False, False, True])) | {"located": np.array([True, True, False])})
    )
    assert got.status[2] == "unknown"
    assert got.reason[2] == "the village lies outside the data"
    assert np.isnan(got.rank[2]) and np.isnan(got.plots_in_reach[2]) and np.isnan(got.supported_dry_m2[2])
    assert (got.rank_low[2], got.rank_high[2]) == (1, 3)
    np.testing.assert_array_equal(got.rank[:2], [2, 1])
    assert got.rank_high.tolist() == [3, 2, 3]


def test_a_cut_reach_ranks_on_its_lower_bound_and_may_be_first() -> None:
    got = ranking.rank_villages(**case(reach_cut=np.array([True, False, True])))
    assert got.status.tolist() == ["reach_cut", "ranked", "reach_cut"]
    assert got.reason.tolist() == ["the data end within reach", "", "the data end within reach"]
    np.testing.assert_array_equal(got.rank, [2, 1, 3])
    assert got.rank_low.tolist() == [1, 1, 1]
    assert got.rank_high.tolist() == [3, 3, 3]


def test_all_that_is_missing_is_told() -> None:
    given = with_value("supported_dry_m2", 3, np.nan) | {"reach_cut": np.ones(3, dtype=np.bool_)}
    given["supported_dry_m2"][0] = np.nan
    given["people"] = np.array([np.nan, 1.0, 1.0])
    got = ranking.rank_villages(**given)
    expected = (
        "the supported area of 2 plots in reach is unknown; the number of people is unknown; the data end within reach"
    )
    assert got.reason[0] == expected
    assert got.status[0] == "unknown"


def random_case(seed: int, *, exact: bool) -> dict[str, Any]:
    """Villages and plots strewn about, some with missing data unless `exact`."""
    draw = np.random.default_rng(seed)
    villages, plots = int(draw.integers(1, 7)), int(draw.integers(1, 10))
    distance = draw.uniform(0, 5000, (villages, plots))
    village, plot = np.nonzero(distance < 2000)
    supported = draw.uniform(0, 8000, plots)
    people = draw.integers(1, 300, villages).astype(np.float64)
    if not exact:
        supported[draw.random(plots) < 0.15] = np.nan
        people[draw.random(villages) < 0.2] = np.nan
    return {
        "village": village,
        "plot": plot,
        "distance_m": distance[village, plot],
        "reach_cut": np.zeros(villages, dtype=np.bool_) if exact else draw.random(villages) < 0.15,
        "located": np.ones(villages, dtype=np.bool_),
        "people": people,
        "in_set": (draw.random(plots) < 0.7) & ~np.isnan(supported),
        "supported_dry_m2": supported,
        "plot_area_m2": np.full(plots, 9000.0),
        "plot_rank": draw.permutation(plots) + 1,
    }


@settings(max_examples=100, deadline=None)
@given(seed=SEEDS)
def test_each_plot_counts_once_and_ranks_lie_within_their_bounds(seed: int) -> None:
    given = random_case(seed, exact=False)
    got = ranking.rank_villages(**given)
    assert np.bincount(given["plot"][got.nearest], minlength=given["in_set"].size).max(initial=0) <= 1
    count = given["people"].size
    assert np.all((got.rank_low >= 1) & (got.rank_low <= got.rank_high) & (got.rank_high <= count))
    known = ~np.isnan(got.rank)
    assert np.all((got.rank_low <= got.rank)[known] & (got.rank <= got.rank_high)[known])
    np.testing.assert_array_equal(known, got.status != "unknown")
    assert np.all((got.reason == "") == (got.status == "ranked"))


@settings(max_examples=100, deadline=None)
@given(seed=SEEDS)
def test_with_all_data_ranks_are_exact_and_all_area_of_plots_in_reach_is_counted(seed: int) -> None:
    given = random_case(seed, exact=True)
    got = ranking.rank_villages(**given)
    np.testing.assert_array_equal(got.rank_low, got.rank)
    np.testing.assert_array_equal(got.rank_high, got.rank)
    reached = np.isin(np.arange(given["in_set"].size), given["plot"]) & given["in_set"]
    assert got.supported_dry_m2.sum() == pytest.approx(given["supported_dry_m2"][reached].sum())


@settings(max_examples=100, deadline=None)
@given(seed=SEEDS)
def test_whatever_the_unknown_turns_out_to_be_the_ranks_stay_within_the_bounds(seed: int) -> None:
    given = random_case(seed, exact=False)
    given["reach_cut"] = np.zeros(given["people"].size, dtype=np.bool_)
    bounds = ranking.rank_villages(**given)
    unknown, unknown_people = np.isnan(given["supported_dry_m2"]), np.isnan(given["people"])
    for share, people in product((0.0, 0.4, 1.0), (1.0, 40.0, 1e9)):
        turned_out = given | {
            "supported_dry_m2": np.where(unknown, share * given["plot_area_m2"], given["supported_dry_m2"]),
            "people": np.where(unknown_people, people, given["people"]),
            "in_set": given["in_set"] | unknown,
        }
        rank = ranking.rank_villages(**turned_out).rank
        assert np.all((bounds.rank_low <= rank) & (rank <= bounds.rank_high))


@given(seed=SEEDS)
@settings(max_examples=50, deadline=None)
def test_a_village_without_data_is_not_last_by_default(seed: int) -> None:
    given = random_case(seed, exact=True)
    count = given["people"].size
    nothing_known = given | {
        "people": np.append(given["people"], np.nan),
        "located": np.append(given["located"], False),
        "reach_cut": np.append(given["reach_cut"], True),
    }
    got = ranking.rank_villages(**nothing_known)
    assert got.status[-1] == "unknown"
    assert np.isnan(got.rank[-1])
    assert got.rank_low[-1] == 1
    # its place is open: the others keep theirs, and each may fall behind it by one
    before = ranking.rank_villages(**given)
    np.testing.assert_array_equal(got.rank[:count], before.rank)
    np.testing.assert_array_equal(got.rank_low[:count], before.rank_low)
    np.testing.assert_array_equal(got.rank_high[:count], before.rank_high + 1)


@given(seed=SEEDS)
@settings(max_examples=50, deadline=None)
def test_doubling_all_areas_changes_no_rank(seed: int) -> None:
    given = random_case(seed, exact=False)
    twice = given | {name: 2 * given[name] for name in ("supported_dry_m2", "plot_area_m2")}
    once, again = ranking.rank_villages(**given), ranking.rank_villages(**twice)
    np.testing.assert_array_equal(once.rank, again.rank)
    np.testing.assert_array_equal(once.rank_low, again.rank_low)
    np.testing.assert_array_equal(once.rank_high, again.rank_high)


def test_no_plots_in_reach_and_no_villages_at_all() -> None:
    none = np.empty(0, dtype=np.int64)
    got = ranking.rank_villages(**case(village=none, plot=none, distance_m=np.empty(0)))
    np.testing.assert_array_equal(got.rank, [1, 1, 1])
    np.testing.assert_array_equal(got.supported_dry_m2, [0.0, 0.0, 0.0])
    flags = np.empty(0, dtype=np.bool_)
    empty = case(village=none, plot=none, distance_m=np.empty(0), people=np.empty(0), located=flags, reach_cut=flags)
    assert ranking.rank_villages(**empty).rank.size == 0


@pytest.mark.parametrize(
    ("changed", "said"),
    [
        ({"village": np.array([0, 0, 1, 1, 3])}, "has village 3 of 3"),
        ({"plot": np.array([0, 1, 1, -1, 3])}, "has plot -1 of 4"),
        ({"plot": np.array([0, 0, 1, 2, 3])}, "reaches the same plot twice"),
        ({"distance_m": np.array([1.0])}, "5 villages, 5 plots and 1 distances"),
        ({"supported_dry_m2": np.array([1.0, -1.0, 1.0, 1.0])}, "supported area of plot 1 is below zero"),
        ({"plot_area_m2": np.array([1.0, 1.0, -1.0, 1.0])}, "the area of plot 2 is below zero"),
    ],
)
def test_what_makes_no_sense_is_refused(changed: dict[str, Any], said: str) -> None:
    with pytest.raises(InputError, match=said):
        ranking.rank_villages(**case(**changed))
