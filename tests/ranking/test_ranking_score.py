"""The score: components worked by hand, its laws, and what it refuses."""

from dataclasses import fields, replace
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from siting import ranking
from siting.errors import ConfigError

WEIGHTS = {"water": 0.40, "gain": 0.15, "soil": 0.10, "ease": 0.10, "safety": 0.15, "certainty": 0.10}
SHARES = st.floats(0.01, 1.0)


def components_of(**changed: Any) -> ranking.Components:
    """One plot whose components are worked out in the first test, with some inputs changed."""
    inputs: dict[str, Any] = {
        "reliability": np.array([0.8]),
        "mean_yield": np.array([0.85]),
        "rain_only_mean_yield": np.array([0.4]),
        "available_water_mm": np.array([120.0]),
        "slope": np.array([0.02]),
        "max_slope": 0.05,
        "peak_flow_10y_m3s": np.array([1.5]),
        "standing_water_days": np.array([12.0]),
        "open_catchment": np.array([False]),
        "rain_years": 18,
        "catchment_relief_m": np.array([6.0]),
        "vertical_error_m": 1.0,
    }
    return ranking.score_components(**(inputs | changed))


def alike(*rows: list[float]) -> ranking.Components:
    """Components of several plots, a row of six for each."""
    return ranking.Components(*np.array(rows, dtype=np.float64).T)


def test_components_worked_by_hand() -> None:
    got = components_of()
    assert got.water[0] == pytest.approx(0.8)
    assert got.gain[0] == pytest.approx(0.45 / 0.6)
    assert got.soil[0] == pytest.approx(120 / 150)
    assert got.ease[0] == pytest.approx(1 - 0.02 / 0.1)
    assert got.safety[0] == pytest.approx(1 - 12 / 30)  # worse than 1 - 1.5 / 5
    assert got.certainty[0] == pytest.approx(18 / 20)  # worse than closed 1 and 6 / 4, which counts as 1


@pytest.mark.parametrize(
    ("changed", "name", "expected"),
    [
        ({"peak_flow_10y_m3s": np.array([4.0])}, "safety", 0.2),
        ({"peak_flow_10y_m3s": np.array([9.0])}, "safety", 0.01),
        ({"standing_water_days": np.array([0.0])}, "safety", 0.7),
        ({"open_catchment": np.array([True])}, "certainty", 0.5),
        ({"rain_years": 31, "catchment_relief_m": np.array([60.0])}, "certainty", 1.0),
        ({"vertical_error_m": 3.0}, "certainty", 0.5),
        ({"available_water_mm": np.array([260.0])}, "soil", 1.0),
        ({"rain_only_mean_yield": np.array([0.9])}, "gain", 0.01),
        ({"mean_yield": np.array([1.0]), "rain_only_mean_yield": np.array([1.0])}, "gain", 0.01),
    ],
)
def test_the_least_of_several_counts_and_all_lie_between_floor_and_one(
    changed: dict[str, Any], name: str, expected: float
) -> None:
    assert getattr(components_of(**changed), name)[0] == pytest.approx(expected)


@pytest.mark.parametrize(
    ("unknown", "name"),
    [
        ("reliability", "water"),
        ("mean_yield", "gain"),
        ("rain_only_mean_yield", "gain"),
        ("available_water_mm", "soil"),
        ("slope", "ease"),
        ("peak_flow_10y_m3s", "safety"),
        ("standing_water_days", "safety"),
        ("catchment_relief_m", "certainty"),
    ],
)
def test_an_unknown_input_makes_its_component_unknown_and_no_other(unknown: str, name: str) -> None:
    got = components_of(**{unknown: np.array([np.nan])})
    assert [field.name for field in fields(got) if np.isnan(getattr(got, field.name)[0])] == [name]


def test_a_full_yield_on_rain_alone_does_not_make_an_unknown_yield_known() -> None:
    got = components_of(mean_yield=np.array([np.nan]), rain_only_mean_yield=np.array([1.0]))
    assert np.isnan(got.gain[0])


def test_score_worked_by_hand() -> None:
    # two of weight 1 and 3: (0.16 x 0.81^3)^(1/4) = 0.16^0.25 x 0.81^0.75
    weights = dict.fromkeys(WEIGHTS, 0.0) | {"water": 1.0, "safety": 3.0}
    got = ranking.score(alike([0.16, 1, 1, 1, 0.81, 1]), weights)
    assert got.score[0] == pytest.approx(0.16**0.25 * 0.81**0.75)
    assert got.used == ("water", "safety")
    assert got.left_out == ()


@given(rows=st.lists(st.lists(SHARES, min_size=6, max_size=6), min_size=1, max_size=5), factor=st.floats(0.1, 10))
def test_the_score_lies_between_its_components_and_only_ratios_of_weights_count(
    rows: list[list[float]], factor: float
) -> None:
    components = alike(*rows)
    got = ranking.score(components, WEIGHTS)
    assert got.used == tuple(WEIGHTS)
    values = np.array(rows)
    assert np.all(got.score >= values.min(axis=1) - 1e-12)
    assert np.all(got.score <= values.max(axis=1) + 1e-12)
    scaled = ranking.score(components, {name: factor * weight for name, weight in WEIGHTS.items()})
    np.testing.assert_allclose(scaled.score, got.score, rtol=1e-12)


@given(row=st.lists(SHARES, min_size=6, max_size=6), name=st.sampled_from(list(WEIGHTS)))
def test_a_better_component_never_lowers_the_score(row: list[float], name: str) -> None:
    worse = alike(row)
    better = replace(worse, **{name: np.minimum(getattr(worse, name) * 1.5, 1.0)})
    assert ranking.score(better, WEIGHTS).score[0] >= ranking.score(worse, WEIGHTS).score[0]


def test_what_one_plot_lacks_is_left_out_for_all_and_named() -> None:
    # the second plot has no known peak; with it left out, the first keeps its lead though its safety is poor
    components = alike([0.9, 0.5, 0.5, 0.5, 0.01, 1.0], [0.8, 0.5, 0.5, 0.5, np.nan, 1.0])
    got = ranking.score(components, WEIGHTS)
    assert got.left_out == ("safety",)
    assert "safety" not in got.used
    assert got.score[0] > got.score[1]
    without = ranking.score(components, WEIGHTS | {"safety": 0.0})
    np.testing.assert_allclose(got.score, without.score)
    assert without.left_out == ()


def test_with_nothing_known_the_score_is_unknown() -> None:
    got = ranking.score(alike([np.nan] * 6, [0.5] * 6), WEIGHTS)
    assert np.isnan(got.score).all()
    assert got.left_out == tuple(WEIGHTS)


def test_no_plots_have_no_scores() -> None:
    got = ranking.score(ranking.Components(*[np.empty(0)] * 6), WEIGHTS)
    assert got.score.shape == (0,)


def test_rank_follows_the_score_then_the_supply_and_the_unknown_come_last() -> None:
    scores = np.array([0.5, np.nan, 0.7, 0.5, 0.1 + 0.2 + 0.2])
    rank = ranking.score_order(scores, np.array([4, 1, 5, 3, 2]))
    assert rank.tolist() == [4, 5, 1, 3, 2]


@pytest.mark.parametrize(
    ("changed", "said"),
    [
        ({"watre": 1.0}, "'watre' is unknown; the weights are water"),
        ({"water": -0.1}, "weight water is -0.1"),
        ({"water": float("nan")}, "weight water is nan"),
        (dict.fromkeys(WEIGHTS, 0.0), "all ranking weights are 0"),
    ],
)
def test_weights_that_make_no_sense_are_refused(changed: dict[str, float], said: str) -> None:
    with pytest.raises(ConfigError, match=said):
        ranking.score(alike([0.5] * 6), WEIGHTS | changed)
    with pytest.raises(ConfigError, match="gain is missing"):
        ranking.score(alike([0.5] * 6), {name: weight for name, weight in WEIGHTS.items() if name != "gain"})


@pytest.mark.parametrize("name", ["max_slope", "vertical_error_m"])
def test_limits_that_are_not_above_zero_are_refused(name: str) -> None:
    with pytest.raises(ConfigError, match=f"{name} is 0: it must be above 0"):
        components_of(**{name: 0.0})
