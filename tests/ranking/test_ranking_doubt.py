"""The doubt of the order: draws against the seasonal method called plainly, and laws of shared errors."""

from collections.abc import Callable
from dataclasses import fields, replace

import numpy as np
import pytest

from siting import ranking
from siting.errors import ConfigError, InputError
from siting.ranking import Spread
from tests.ranking.doubt_case import DAYS, LOSSES, NO_SPREAD, SEASONS, made_case, plain_rank, plain_ratios


@pytest.mark.parametrize("seed", range(4))
def test_a_draw_is_the_seasonal_method_called_plainly(seed: int) -> None:
    case = made_case()
    model = case.model()
    drawn = ranking.draw_inputs(model, Spread(), np.random.SeedSequence(seed))
    ratio, rain_only = model.season_ratios(drawn)
    expected, expected_rain_only = plain_ratios(case, drawn)
    np.testing.assert_allclose(ratio, expected, rtol=1e-10)
    np.testing.assert_allclose(np.tile(rain_only, (40, 1)), expected_rain_only, rtol=1e-10)
    found = ranking.rank_doubt(model, Spread(), draws=seed + 1, seed=3)
    own = ranking.draw_inputs(model, Spread(), np.random.SeedSequence(3).spawn(seed + 1)[seed])
    np.testing.assert_array_equal(found.best[seed], plain_rank(case, own))


def test_losses_between_those_summed_are_near_the_exact_sum() -> None:
    # ground spread evenly over 0 to 2 km: the area at loss k is A (1 - exp(-2 k)) / (2 k)
    case = made_case(1)
    far = np.linspace(0.0, 2.0, 4001)
    areas = 1e5 * np.exp(-LOSSES[:, None] * far).mean(axis=1)
    plots = replace(case.plots(), effective_area_m2=np.tile(areas[:, None, None], (1, 1, 4)))
    model = case.model(plots=plots)
    for loss in (0.14, 0.25, 0.4, 0.62):
        exact = replace(plots, effective_area_m2=np.full((5, 1, 4), 1e5 * np.exp(-loss * far).mean()))
        got, expected = (
            one.season_ratios(replace(model.in_use, loss_per_km=loss))[0] for one in (model, case.model(plots=exact))
        )
        np.testing.assert_allclose(got, expected, rtol=0.004)


def test_without_spread_the_interval_is_the_rank_itself() -> None:
    case = made_case()
    found = ranking.rank_doubt(case.model(), NO_SPREAD, draws=7, seed=1)
    rank = plain_rank(case, case.model().in_use)
    np.testing.assert_array_equal(found.rank_low, rank)
    np.testing.assert_array_equal(found.rank_high, rank)
    np.testing.assert_array_equal(found.share_in_top(10), rank <= 10)


def test_threads_change_no_byte() -> None:
    model = made_case().model()
    several = [ranking.rank_doubt(model, Spread(), draws=30, seed=8, threads=threads) for threads in (1, 2, 5)]
    for other in several[1:]:
        for name in ("rank_low", "rank_high", "best", "worst"):
            assert getattr(other, name).tobytes() == getattr(several[0], name).tobytes()
    swaps = [ranking.neighbour_swaps(model, Spread(), threads=threads) for threads in (1, 3)]
    for field in fields(swaps[0]):
        assert getattr(swaps[0], field.name).tobytes() == getattr(swaps[1], field.name).tobytes()


def test_another_seed_gives_the_same_interval_within_sampling_error() -> None:
    model, draws = made_case().model(), 400
    one, other = (ranking.rank_doubt(model, Spread(), draws=draws, seed=seed) for seed in (1, 2))
    assert np.any(one.best != other.best)
    # a share of 5 % told from 400 draws by an end that itself comes from 400: four standard deviations
    most = 0.05 + 4.0 * np.sqrt(2.0 * 0.05 * 0.95 / draws)
    assert np.all((other.best < one.rank_low).mean(axis=0) <= most)
    assert np.all((other.worst > one.rank_high).mean(axis=0) <= most)
    np.testing.assert_allclose(one.share_in_top(10), other.share_in_top(10), atol=4.0 * np.sqrt(2.0 * 0.25 / draws))


def test_the_interval_leaves_out_no_more_than_its_ends() -> None:
    found = ranking.rank_doubt(made_case().model(), Spread(), draws=60, seed=4, confidence=0.8)
    assert np.all((found.best < found.rank_low).mean(axis=0) <= 0.1)
    assert np.all((found.best <= found.rank_low).mean(axis=0) > 0.1)
    assert np.all((found.worst > found.rank_high).mean(axis=0) <= 0.1)
    assert np.all((found.worst >= found.rank_high).mean(axis=0) > 0.1)
    assert np.mean(found.rank_high - found.rank_low) > 1.0


def test_depths_told_in_half_millimetres_change_no_order() -> None:
    case = replace(made_case(), curve_number=np.full(4, np.nan), runs_after_mm=np.array([8.0, 11.0, 14.0, 20.0]))
    depths = ("water_mm", "ponding_mm", "infiltration_mm", "runs_after_mm", "rain_mm", "et0_mm", "wetting_mm")
    doubled = replace(case, **{name: 2.0 * getattr(case, name) for name in depths})
    one, other = (ranking.rank_doubt(each.model(), Spread(), draws=40, seed=6) for each in (case, doubled))
    np.testing.assert_array_equal(one.best, other.best)
    assert np.any(one.rank_high > one.rank_low)
    # and so do areas and volumes told in another unit
    areas = {name: 2.0 * getattr(case, name) for name in ("area_m2", "bed_m2", "plot_m2")}
    larger = ranking.rank_doubt(replace(case, **areas).model(), Spread(), draws=40, seed=6)
    np.testing.assert_array_equal(one.best, larger.best)


def test_what_all_plots_share_reorders_none() -> None:
    # one ground, one soil, one distance, no bed: plots differ by their share of catchment alone, too small to fill the soil
    case, shares = made_case(), np.linspace(0.2, 2.0, 40)
    alike = replace(
        case,
        area_m2=np.outer(shares * case.plot_m2, [0.1, 0.2, 0.3, 0.4]),
        distance_km=np.full((40, 4), 0.4),
        bed_m2=np.zeros(40),
        water_mm=np.full(40, 150.0),
        infiltration_mm=np.full(40, 75.0),
        soil=np.zeros(40, dtype=np.int64),
        et0_mm=4.0 * case.et0_mm,
    )
    found = ranking.rank_doubt(alike.model(), Spread(), draws=100, seed=2)
    np.testing.assert_array_equal(found.rank_low, np.arange(40, 0, -1))
    np.testing.assert_array_equal(found.rank_high, np.arange(40, 0, -1))


def test_equal_plots_share_their_ranks() -> None:
    case = made_case(6)
    twins = case.take([0, 1, 2, 3, 4, 5, 2])
    still = ranking.rank_doubt(twins.model(), NO_SPREAD, draws=3, seed=1)
    assert still.rank_high[2] == still.rank_low[2] + 1
    np.testing.assert_array_equal(still.share_in_top(int(still.rank_low[2]))[[2, 6]], 0.5)
    moved = ranking.rank_doubt(twins.model(), Spread(), draws=50, seed=1)
    for found in (still, moved):
        assert (found.rank_low[2], found.rank_high[2]) == (found.rank_low[6], found.rank_high[6])
        np.testing.assert_array_equal(found.share_in_top(3)[2], found.share_in_top(3)[6])


def test_errors_are_drawn_with_their_spread_and_one_value_for_all() -> None:
    model = made_case().model()
    drawn = [ranking.draw_inputs(model, Spread(), one) for one in np.random.SeedSequence(1).spawn(3000)]
    region = np.array([one.region_shift for one in drawn])
    cover = np.stack([one.cover_shift for one in drawn])
    assert region.std() == pytest.approx(4.0, rel=0.06) and abs(region.mean()) < 0.3
    np.testing.assert_allclose(cover.std(axis=0), 3.0, rtol=0.06)  # three covers
    assert np.abs(np.corrcoef(np.column_stack([region, cover]).T) - np.eye(4)).max() < 0.08
    assert np.mean([one.abstraction_ratio == 0.05 for one in drawn]) == pytest.approx(0.5, abs=0.04)
    loss = np.array([one.loss_per_km for one in drawn])
    assert loss.min() >= 0.1 and loss.max() <= 0.8 and np.median(loss) == pytest.approx(np.sqrt(0.08), rel=0.06)
    water = np.stack([one.available_water_factor for one in drawn])
    rate = np.stack([one.infiltration_factor for one in drawn])
    assert water.shape == rate.shape == (3000, 3)  # three soils
    assert 0.8 <= water.min() < 0.81 and 1.19 < water.max() <= 1.2
    assert 0.3 <= rate.min() < 0.31 and 1.47 < rate.max() <= 1.5
    demand = np.array([(one.kc_factor, one.et0_factor) for one in drawn])
    assert 0.9 <= demand.min() < 0.901 and 1.099 < demand.max() <= 1.1
    seasons = np.stack([one.seasons for one in drawn])
    assert seasons.shape == (3000, model.season.size) and abs(np.corrcoef(demand.T)[0, 1]) < 0.08
    # drawn with repeats, one season of n is left out of a share (1 - 1/n)^n of the draws
    left_out = 1.0 - np.mean([(seasons == place).any(axis=1).mean() for place in range(model.season.size)])
    assert left_out == pytest.approx((1.0 - 1.0 / model.season.size) ** model.season.size, abs=0.01)


def test_a_threshold_that_people_saw_is_not_shifted() -> None:
    case = replace(made_case(), curve_number=np.full(4, np.nan), runs_after_mm=np.array([8.0, 11.0, 14.0, 20.0]))
    found = ranking.rank_doubt(case.model(), replace(NO_SPREAD, region_cn_sd=4.0, cover_cn_sd=3.0), draws=20, seed=1)
    np.testing.assert_array_equal(found.rank_low, found.rank_high)


def test_an_open_catchment_may_be_best_and_moves_no_other() -> None:
    case = made_case()
    closed = ranking.rank_doubt(case.model(), Spread(), draws=60, seed=3)
    last = int(np.argmax(closed.rank_low))
    is_open = np.arange(40) == last
    found = ranking.rank_doubt(replace(case, is_open=is_open).model(), Spread(), draws=60, seed=3)
    assert closed.rank_low[last] > 20 and found.rank_low[last] == 1
    np.testing.assert_array_equal(found.rank_high, closed.rank_high)
    np.testing.assert_array_equal(found.rank_low[~is_open], closed.rank_low[~is_open])
    np.testing.assert_array_equal(found.share_in_top(5), closed.share_in_top(5))


def test_only_a_smaller_peak_stands_before_an_open_catchment_with_enough_water() -> None:
    # little demand: many plots have enough in every season, and the peak orders them
    case = replace(made_case(), peak_m3s=np.arange(40.0), is_open=np.arange(40) == 20)
    easy = replace(case, et0_mm=0.35 * case.et0_mm)
    found = ranking.rank_doubt(easy.model(), NO_SPREAD, draws=1, seed=1)
    enough = ranking.mean_capped_ratio(plain_ratios(easy, easy.model().in_use)[0]) == 1.0
    assert 0 < enough[:20].sum() < 20 and not enough[20]
    assert found.rank_low[20] == 1 + enough[:20].sum() < found.rank_high[20]


def test_a_plot_of_which_too_little_is_known_has_no_rank() -> None:
    case = made_case()
    water = case.water_mm.copy()
    water[[4, 9]] = np.nan
    found = ranking.rank_doubt(replace(case, water_mm=water).model(), Spread(), draws=20, seed=3)
    rest = np.delete(np.arange(40), [4, 9]).tolist()
    without = ranking.rank_doubt(case.take(rest).model(), Spread(), draws=20, seed=3)
    for name in ("rank_low", "rank_high"):
        assert np.isnan(getattr(found, name)[[4, 9]]).all()
        np.testing.assert_array_equal(getattr(found, name)[rest], getattr(without, name))
    assert np.isnan(found.share_in_top(5)[[4, 9]]).all()
    np.testing.assert_array_equal(found.share_in_top(5)[rest], without.share_in_top(5))
    swaps = ranking.neighbour_swaps(replace(case, water_mm=water).model(), NO_SPREAD)
    assert not np.isin([5, 10], np.concatenate([swaps.upper_id, swaps.lower_id])).any() and swaps.upper_id.size == 37


def test_a_season_without_demand_is_left_out() -> None:
    case = made_case()
    et0 = case.et0_mm.copy()
    et0[SEASONS.sowing[3] + 5] = np.nan
    model = replace(case, et0_mm=et0).model()
    np.testing.assert_array_equal(model.season, np.delete(SEASONS.label, 3))
    everything = replace(model.in_use, seasons=np.arange(SEASONS.label.size))
    rank = plain_rank(replace(case, et0_mm=et0), everything)
    np.testing.assert_array_equal(ranking.rank_doubt(model, NO_SPREAD, draws=1, seed=0).best[0], rank)


def test_other_weights_move_what_they_weigh() -> None:
    # the third plot is weakest in all; the first and second trade water against safety
    columns = {name: np.array([0.8, 0.8, 0.3]) for name in ranking.COMPONENTS}
    columns |= {"water": np.array([0.9, 0.6, 0.3]), "safety": np.array([0.6, 0.89, 0.3])}
    components = ranking.Components(**columns)
    weights = dict(zip(ranking.COMPONENTS, (0.4, 0.15, 0.1, 0.1, 0.4, 0.1), strict=True))
    moved = ranking.weight_doubt(components, weights, draws=200, seed=1)
    np.testing.assert_array_equal(moved.rank_low, [1, 1, 3])
    np.testing.assert_array_equal(moved.rank_high, [2, 2, 3])
    # 0.4 w ln(0.9/0.6) against 0.4 s ln(0.89/0.6): the first wins where w > 0.9725 s, with ln w and ln s even over +- ln 2,
    # and the difference of two even draws is triangular over +- 2 ln 2
    edge = np.log(np.log(0.89 / 0.6) / np.log(0.9 / 0.6)) / (2.0 * np.log(2.0))
    expected = 1.0 - 0.5 * (1.0 + edge) ** 2
    many = ranking.weight_doubt(components, weights, draws=4000, seed=1)
    assert many.share_in_top(1)[0] == pytest.approx(expected, abs=4.0 * np.sqrt(0.25 / 4000))
    still = ranking.weight_doubt(components, weights, factor=1.0, draws=5, seed=1)
    order = ranking.score_order(ranking.score(components, weights).score, np.arange(1, 4))
    np.testing.assert_array_equal(still.rank_low, order)
    np.testing.assert_array_equal(still.rank_high, order)


@pytest.mark.parametrize(
    ("wrong", "message"),
    [
        (lambda: Spread(region_cn_sd=-1.0), "region_cn_sd of -1"),
        (lambda: Spread(loss_per_km=(0.8, 0.1)), r"loss_per_km from 0\.8 to 0\.1: .* the smaller one first"),
        (lambda: Spread(abstraction_ratios=()), "give 0.2, 0.05 or both"),
        (lambda: made_case().model(loss_per_km=1.0), r"1 to 1 per km lie beyond those summed, 0\.1 to 0\.8"),
        (lambda: made_case().model(efficiency=65.0), "65 % is 0.65"),
        (lambda: made_case().model(stage_days=(1, 1, 1, 1)), "stages of 4 days"),
        (lambda: made_case().model(et0_mm=np.full(DAYS.size, np.nan)), "no season has a known demand"),
        (lambda: made_case().model(rain_mm=np.full(DAYS.size, np.nan)), "rain is missing on"),
        (lambda: made_case().model(rain_mm=np.zeros(3)), "3 days of rain and"),
        (lambda: made_case().model(cover_of_class=np.array([1])), "4 runoff classes, 1 covers"),
        (lambda: replace(made_case(), plot_m2=np.zeros(40)).plots(), "a plot area of 0 m2"),
        (lambda: replace(made_case(), water_mm=np.full(40, -1.0)).plots(), "available_water_mm of -1"),
        (lambda: replace(made_case(), water_mm=np.zeros(3)).plots(), r"available_water_mm has shape \(3,\) for 40 plots"),
        (lambda: replace(made_case().plots(), loss_per_km=LOSSES[::-1]), "each above the one before"),
        (lambda: replace(made_case().plots(), loss_per_km=LOSSES[:2]), "for 2 losses and 40 plots"),
        (
            lambda: ranking.rank_doubt(made_case().model(), Spread(loss_per_km=(0.1, 2.0)), draws=1, seed=1),
            "0.1 to 2 per km",
        ),
        (lambda: ranking.rank_doubt(made_case().model(), Spread(), draws=0, seed=1), "0 draws from seed 1"),
        (lambda: ranking.rank_doubt(made_case().model(), Spread(), draws=1, seed=1, confidence=90.0), "90 % is 0.9"),
        (lambda: ranking.rank_doubt(made_case().model(), Spread(), draws=1, seed=1).share_in_top(0), "the best 0 plots"),
    ],
)
def test_wrong_values_are_refused_with_a_way_out(wrong: Callable[[], object], message: str) -> None:
    with pytest.raises((ConfigError, InputError), match=message):
        wrong()
