"""Days drawn from monthly totals: the totals are kept, the chain and the depths are those in print, nothing is hidden."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from siting import runoff
from siting.errors import ConfigError, InputError
from siting.notes import Notes
from siting.runoff.generator import wet_chances, wet_days

TOTALS = st.lists(st.floats(0.0, 900.0), min_size=1, max_size=15)


def drawn(totals: list[float], *, wet_day_mm: float = 8.0, seed: int = 1, notes: Notes | None = None) -> runoff.Rain:
    months = np.datetime64("2001-01") + np.arange(len(totals))
    generator = runoff.RainGenerator(wet_day_mm, seed)
    return runoff.daily_from_monthly(months, np.array(totals), generator=generator, notes=notes or Notes())


@given(totals=TOTALS, seed=st.integers(0, 2**32))
def test_days_sum_to_the_totals_of_their_months(totals: list[float], seed: int) -> None:
    rain = drawn(totals, seed=seed)
    month = rain.days.astype("datetime64[M]")
    for place, total in enumerate(totals):
        here = rain.rain_mm[month == np.datetime64("2001-01") + place]
        assert here.sum() == pytest.approx(total, rel=1e-12, abs=0)
        assert (here > 0).any() == (total > 0)


def test_the_same_seed_draws_the_same_days_and_another_others() -> None:
    totals = [40.0, 0.0, 15.0, 120.0]
    np.testing.assert_array_equal(drawn(totals, seed=7).rain_mm, drawn(totals, seed=7).rain_mm)
    assert np.any(drawn(totals, seed=7).rain_mm != drawn(totals, seed=8).rain_mm)


def test_a_missing_total_leaves_its_days_missing() -> None:
    rain = drawn([10.0, np.nan, 10.0])
    assert rain.days.size == 90
    assert np.isnan(rain.rain_mm[31:59]).all()
    assert not np.isnan(np.delete(rain.rain_mm, np.s_[31:59])).any()


def test_wet_and_dry_spells_are_those_of_the_chain() -> None:
    # Gabriel & Neumann (1962), Richardson (1981): wet after dry 0.10, after wet 0.40: share of wet days 0.142857,
    # correlation of one day with the next 0.30, mean wet spell 1.667 d, mean dry spell 10 d
    wet = wet_days(np.random.default_rng(3).random((1, 400_000)), False, 0.10, 0.40)[0].astype(np.float64)
    starts = np.diff(wet)
    assert wet.mean() == pytest.approx(0.142857, rel=0.02)
    assert np.corrcoef(wet[:-1], wet[1:])[0, 1] == pytest.approx(0.30, abs=0.01)
    assert wet.sum() / (starts == 1).sum() == pytest.approx(1.667, rel=0.02)
    assert (1 - wet).sum() / (starts == -1).sum() == pytest.approx(10.0, rel=0.02)


@given(share=st.floats(0.001, 1.0))
def test_the_chances_give_the_share_of_wet_days_asked_for(share: float) -> None:
    # the stationary share of a two-state chain: p01 / (1 + p01 - p11)
    after_dry, after_wet = wet_chances(share)
    assert 0 < after_dry <= after_wet <= 1
    assert after_dry / (1 + after_dry - after_wet) == pytest.approx(share)


@given(wet_day_mm=st.floats(3.0, 50.0))
def test_gamma_depths_have_the_mean_of_a_wet_day(wet_day_mm: float) -> None:
    # Richardson & Wright (1984): mean is shape x scale; many small rains, few large ones: shape at most near 1
    shape, scale = runoff.RainGenerator(wet_day_mm, 0).gamma
    assert shape * scale == pytest.approx(wet_day_mm)
    assert 0.5 < shape < 0.91


@pytest.mark.parametrize("wet_day_mm", [5.0, 8.0, 12.0])
def test_wet_days_drawn_have_about_the_mean_and_spread_asked_for(wet_day_mm: float) -> None:
    rain = drawn([120.0] * 600, wet_day_mm=wet_day_mm).rain_mm
    wet = rain[rain > 0]
    shape, scale = runoff.RainGenerator(wet_day_mm, 1).gamma
    assert wet.mean() == pytest.approx(wet_day_mm, rel=0.05)
    # months held to one total vary a little less than free gamma depths
    assert 0.85 < wet.std() / (np.sqrt(shape) * scale) < 1.0


def test_larger_rains_run_off_more() -> None:
    classes = runoff.RunoffClasses(np.zeros((1, 1), dtype=np.uint16), np.array([80.0]), np.array([np.nan]))
    small, large = (
        runoff.class_runoff_mm(drawn([50.0] * 240, wet_day_mm=mean).rain_mm, classes, abstraction_ratio=0.2).sum()
        for mean in (5.0, 12.0)
    )
    assert large > 2 * small


def test_what_was_drawn_is_told_with_its_parameters() -> None:
    notes = Notes()
    drawn([40.0] * 24, notes=notes)
    noted = {one.id: one for one in notes.assumptions}
    assert "shape 0.641 and scale 12.5 mm; seed 1" in noted["rain.generator"].value
    assert "Geng" in noted["rain.generator"].source
    assert noted["rain.wet_day_mm"].value == "8"
    assert [warned.code for warned in notes.warnings] == ["rain_generated"]
    assert "drawn from 24 monthly totals" in notes.warnings[0].text


@pytest.mark.parametrize("wet_day_mm", [2.9, np.nan, np.inf])
def test_a_mean_wet_day_beyond_the_fit_is_refused(wet_day_mm: float) -> None:
    with pytest.raises(ConfigError, match=r"rain\.wet_day_mm is .*; it must be at least 3"):
        runoff.RainGenerator(wet_day_mm, 0)


def test_months_with_holes_are_refused() -> None:
    months = np.array(["2001-01", "2001-03"], "datetime64[M]")
    with pytest.raises(InputError, match="the months consecutive"):
        runoff.daily_from_monthly(months, np.ones(2), generator=runoff.RainGenerator(8.0, 1), notes=Notes())
