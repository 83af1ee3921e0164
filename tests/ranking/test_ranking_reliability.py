"""Reliability with its interval, and the area that a plot's run-on supports."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import binomtest

from siting import demand, ranking
from siting.errors import ConfigError

PATCH = np.array([10_000.0])


def test_the_interval_of_24_seasons_of_30() -> None:
    # Wilson (1927) by hand: 66 to 89 %
    met = np.where(np.arange(30) < 24, 0.7, 0.69)
    got = ranking.reliability(met[None, :], target_yield=0.7)
    assert got.share[0] == pytest.approx(0.8)
    assert (round(100 * got.low[0]), round(100 * got.high[0])) == (66, 89)


@given(count=st.integers(1, 60), share=st.floats(0, 1), confidence=st.floats(0.5, 0.99))
def test_the_interval_agrees_with_another_library(count: int, share: float, confidence: float) -> None:
    met = round(share * count)
    theirs = binomtest(met, count).proportion_ci(confidence, method="wilson")
    low, high = ranking.wilson_interval(met, count, confidence=confidence)
    np.testing.assert_allclose([low, high], [theirs.low, theirs.high], atol=1e-9)
    assert 0.0 <= low <= met / count + 1e-12 and met / count - 1e-12 <= high <= 1.0


def test_failed_seasons_count_and_unknown_ones_do_not() -> None:
    got = ranking.reliability(np.array([[0.9, 0.0, np.nan, 0.8], [np.nan] * 4]), target_yield=0.7)
    np.testing.assert_allclose(got.share, [2 / 3, np.nan])
    assert got.seasons.tolist() == [3, 0]
    assert np.isnan(got.low[1]) and np.isnan(got.high[1])


def test_targets_that_are_no_shares_are_refused() -> None:
    with pytest.raises(ConfigError, match=r"so 70 % is 0\.7"):
        ranking.reliability(np.ones((1, 3)), target_yield=70)
    with pytest.raises(ConfigError, match=r"so 90 % is 0\.9"):
        ranking.reliability(np.ones((1, 3)), target_yield=0.7, confidence=90)
    with pytest.raises(ConfigError, match=r"so 67 % is 0\.67"):
        search([100.0] * 10, target_reliability=67)


def yields(
    relative: np.ndarray, *, standing: np.ndarray | float = 0.0, lost_m3: float = 0.0, runon_m3: float = 100.0
) -> demand.SeasonYields:
    shape = relative.shape
    return demand.SeasonYields(
        label=np.arange(shape[1]),
        et_ratio=relative,
        relative_yield=relative,
        standing_water_days=np.broadcast_to(standing, shape),
        sown=np.full(shape, np.datetime64("2001-01-01")),
        failure=np.full(shape, ""),
        runon_m3=np.full(shape, runon_m3),
        overflow_m3=np.zeros(shape),
        percolation_m3=np.full(shape, lost_m3),
    )


def search(
    volume_m3: list[float],
    *,
    drowns_above_mm: float = np.inf,
    most_yield: float = 1.0,
    lost_m3: float = 0.0,
    rain_yield: float = 0.0,
    target_reliability: float = 0.67,
) -> ranking.SupportedArea:
    """Search on a made rule: full yield needs 100 mm of run-on, in proportion below; too deep drowns the crop."""
    volume = np.array([volume_m3])

    def at(plots: np.ndarray, area_m2: np.ndarray) -> demand.SeasonYields:
        depth = 1000.0 * volume[plots] / area_m2[:, None]
        drowned = depth > drowns_above_mm
        relative = np.where(drowned, 0.0, np.minimum(most_yield, depth / 100.0))
        return yields(relative, standing=np.where(drowned, 20.0, 0.0), lost_m3=lost_m3)

    return ranking.supported_area(
        at,
        rain_alone=yields(np.full(volume.shape, rain_yield)),
        patch_area_m2=PATCH,
        target_yield=0.7,
        target_reliability=target_reliability,
        standing_water_days=3,
    )


VOLUMES = [float(100 + 50 * each) for each in range(10)]  # 100 to 550 m3


def test_the_last_crossing_is_found_by_hand() -> None:
    # seven of ten seasons must reach 70 mm; the seventh largest volume is 250 m3: 250 / 0.07 = 3571 m2
    got = search(VOLUMES)
    assert got.area_m2[0] == pytest.approx(250 / 0.07, rel=3e-4)
    assert got.area_m2[0] <= 250 / 0.07
    assert got.limit[0] == "water" and not got.rain_suffices[0] and np.isnan(got.too_wet_below_m2[0])
    np.testing.assert_allclose(got.curve_area_m2[0, [0, -1]], [100.0, 10_000.0])
    assert got.curve_reliability[0, 0] == 1.0 and got.curve_reliability[0, -1] == 0.0
    assert (np.diff(got.curve_reliability[0]) <= 0).all()


def test_a_plot_with_plenty_is_limited_by_its_land() -> None:
    got = search([each * 10 for each in VOLUMES])
    assert got.area_m2[0] == 10_000.0 and got.limit[0] == "land"


def test_where_rain_alone_suffices_it_is_the_patch_and_says_so() -> None:
    got = search(VOLUMES, rain_yield=0.8)
    assert got.area_m2[0] == 10_000.0 and got.limit[0] == "land" and got.rain_suffices[0]


def test_below_a_lower_crossing_it_is_too_wet() -> None:
    # seven of ten must lie between 70 and 200 mm, where they drown: the seventh largest volume is 400, the third 500 m3
    got = search([*VOLUMES[4:], 2.0, 400.0, 450.0, 500.0], drowns_above_mm=200.0)
    holds = got.curve_reliability[0] >= 0.67
    assert got.area_m2[0] == pytest.approx(400 / 0.07, rel=3e-4)
    assert got.limit[0] == "water"
    assert not holds[0] and holds.any()
    assert got.too_wet_below_m2[0] == pytest.approx(500 / 0.2, rel=3e-4)


def test_a_plot_that_only_drowns_is_too_wet() -> None:
    got = search([400.0] * 10, drowns_above_mm=30.0)
    assert got.area_m2[0] == 0.0 and got.limit[0] == "too_wet"


def test_soil_that_lets_the_water_go_is_the_limit() -> None:
    got = search(VOLUMES, most_yield=0.6, lost_m3=80.0)
    assert got.area_m2[0] == 0.0 and got.limit[0] == "soil"
    got = search(VOLUMES, lost_m3=80.0)
    assert got.area_m2[0] == pytest.approx(250 / 0.07, rel=3e-4) and got.limit[0] == "soil"


def test_without_run_on_no_area_is_supported() -> None:
    got = search([0.0] * 10)
    assert got.area_m2[0] == 0.0 and got.limit[0] == "water"


def test_unknown_yields_leave_the_area_unknown() -> None:
    got = search([np.nan] * 10)
    assert np.isnan(got.area_m2[0]) and got.limit[0] == "" and not got.rain_suffices[0]


def test_the_supported_area_of_simulated_plots_keeps_the_target_and_no_larger_one_does() -> None:
    rng = np.random.default_rng(5)
    days = np.arange(np.datetime64("1991-01-01"), np.datetime64("2012-01-01"))
    rain = np.where(rng.random(days.size) < 0.05, rng.exponential(10.0, days.size), 0.0)
    crop, planting = demand.CropWater((20, 30, 40, 25), (0.3, 1.1, 0.4), 2.0, 0.5, 1.0), demand.Planting((11, 10))
    seasons = demand.sowing_seasons(days, planting=planting, crop=crop)
    record = demand.CropRecord(days, rain, np.full(days.size, 4.0), seasons, crop, planting)
    plots = 6
    soil = demand.PlotSoil(*(np.full(plots, value) for value in (170.0, 2.0, 8.0, 18.0, 12.5, 200.0)))
    runon = np.geomspace(3.0, 100.0, plots)[:, None] * np.maximum(rain - 9.0, 0.0)[None, :]

    def at(which: np.ndarray, area_m2: np.ndarray) -> demand.SeasonYields:
        return demand.daily_balance(record, runon_m3=runon[which], soil=soil.take(which), plot_area_m2=area_m2)

    patch = np.full(plots, 20_000.0)
    got = ranking.supported_area(
        at,
        rain_alone=demand.daily_balance(record, runon_m3=None, soil=soil, plot_area_m2=patch),
        patch_area_m2=patch,
        target_yield=0.7,
        target_reliability=0.67,
        standing_water_days=3,
    )
    crossed = np.flatnonzero((got.area_m2 > 0) & (got.area_m2 < patch))
    assert crossed.size >= 3
    for factor, keeps in ((1.0, True), (1.001, False)):
        again = ranking.reliability(at(crossed, got.area_m2[crossed] * factor).relative_yield, target_yield=0.7)
        assert ((again.share >= 0.67) == keeps).all()
    assert (np.diff(got.area_m2) >= -1e-9).all()  # more run-on, more land
