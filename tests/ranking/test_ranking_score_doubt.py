"""The doubt of the order by score: it agrees with the score where nothing is in doubt, and moves as its inputs do."""

from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from siting.errors import InputError
from siting.ranking import Components, Spread, score, score_order
from siting.ranking.score_doubt import ScoreBasis, score_doubt
from tests.ranking.doubt_case import NO_SPREAD, Case, made_case

WEIGHTS = {"water": 0.40, "gain": 0.15, "soil": 0.10, "ease": 0.10, "safety": 0.15, "certainty": 0.10}


def basis_of(case: Case, seed: int = 3) -> ScoreBasis:
    """Invent what the daily balance would say, not far from the seasonal method."""
    rng = np.random.default_rng(seed)
    ratio, _ = case.model().season_ratios(case.model().in_use)
    plots, seasons = ratio.shape
    near = np.round(np.clip((ratio >= 0.8).mean(axis=1) + rng.normal(0, 0.05, plots), 0, 1) * seasons) / seasons
    fed = np.clip(np.minimum(ratio, 1).mean(axis=1) + rng.normal(0, 0.03, plots), 0.1, 1.0)
    alone = np.full(plots, 0.35)
    components = Components(
        water=np.clip(near, 0.01, 1),
        gain=np.clip((fed - alone) / (1 - alone), 0.01, 1),
        soil=np.clip(case.water_mm / 150.0, 0.01, 1),
        ease=np.asarray(0.5 + 0.5 * rng.random(plots)),
        safety=np.asarray(0.5 + 0.5 * rng.random(plots)),
        certainty=np.ones(plots),
    )
    return ScoreBasis(components, WEIGHTS, near, fed, alone, 0.7)


def doubt(case: Case, spread: Spread = NO_SPREAD, **changed: Any) -> Any:
    basis = changed.pop("basis", None) or basis_of(case)
    return score_doubt(case.model(), spread, basis, **({"draws": 40, "seed": 1, "threads": 2} | changed))


def test_without_spread_the_interval_is_the_rank_by_score() -> None:
    case = made_case()
    basis = basis_of(case)
    rank = score_order(score(basis.components, WEIGHTS).score, np.arange(1, 41))
    found = doubt(case, basis=basis)
    ties = score(basis.components, WEIGHTS).score
    assert np.unique(np.round(ties, 12)).size == 40
    np.testing.assert_array_equal(found.rank_low, rank)
    np.testing.assert_array_equal(found.rank_high, rank)


def test_with_spread_the_interval_holds_the_rank_of_most_plots_and_is_seeded() -> None:
    case = replace(made_case(), is_open=np.zeros(40, dtype=np.bool_))
    basis = basis_of(case)
    rank = score_order(score(basis.components, WEIGHTS).score, np.arange(1, 41))
    found = doubt(case, Spread(), basis=basis, draws=200)
    assert ((found.rank_low <= rank) & (rank <= found.rank_high)).mean() > 0.9
    assert (found.rank_high > found.rank_low).any()
    again = doubt(case, Spread(), basis=basis, draws=200, threads=1)
    np.testing.assert_array_equal(found.best, again.best)
    other = doubt(case, Spread(), basis=basis, draws=200, seed=2)
    assert np.abs(found.rank_low - other.rank_low).mean() < 2.5


def test_an_open_catchment_may_be_as_good_as_enough_water_would_make_it() -> None:
    case = made_case()
    shut = replace(case, is_open=np.zeros(40, dtype=np.bool_))
    opened = replace(case, is_open=np.arange(40) == 17)
    low, full = doubt(shut), doubt(opened)
    others = np.arange(40) != 17
    np.testing.assert_array_equal(low.rank_low[others], full.rank_low[others])
    np.testing.assert_array_equal(low.rank_high, full.rank_high)
    assert full.rank_low[17] <= low.rank_low[17]


def test_a_plot_of_unknown_yield_has_no_rank_and_moves_no_other() -> None:
    case = made_case()
    basis = basis_of(case)
    unknown = basis.reliability.copy()
    unknown[5] = np.nan
    found = doubt(case, basis=replace(basis, reliability=unknown))
    assert np.isnan(found.rank_low[5])
    assert np.isnan(found.rank_high[5])
    assert sorted(found.rank_high[np.arange(40) != 5]) == list(range(1, 40))


def test_a_basis_of_other_plots_is_refused() -> None:
    with pytest.raises(InputError, match="30 plots of a score meet a model of 40"):
        score_doubt(made_case().model(), NO_SPREAD, basis_of(made_case(30)), draws=1, seed=0)
