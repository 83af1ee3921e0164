"""Laws of the daily balance: water closes, more of it never harms but by standing, seasons shift with the calendar."""

from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from siting import demand
from siting.errors import ConfigError, InputError
from siting.tables import crop as table_crop

DAYS = np.arange(np.datetime64("2001-01-01"), np.datetime64("2006-01-01"))
CROP = demand.CropWater((20, 30, 40, 25), (0.35, 1.15, 0.4), 1.2, 0.5, 1.1)
FIXED = demand.Planting((11, 10))
ONSET = demand.Planting((11, 1), (12, 20), onset_mm=15.0)
NEVER_LOST = demand.Planting((11, 10), lost_after_days=10_000)
NEVER_DROWNS = demand.FieldRules(standing_water_days=10_000)


def record_of(
    seed: int, *, planting: demand.Planting = FIXED, field: demand.FieldRules | None = None, crop: demand.CropWater = CROP
) -> demand.CropRecord:
    rng = np.random.default_rng(seed)
    rain = np.where(rng.random(DAYS.size) < 0.07, rng.exponential(10.0, DAYS.size), 0.0)
    seasons = demand.sowing_seasons(DAYS, planting=planting, crop=crop)
    return demand.CropRecord(
        DAYS, rain, rng.uniform(0.0, 10.0, DAYS.size), seasons, crop, planting, field or demand.FieldRules()
    )


def soils(seed: int, count: int = 4) -> demand.PlotSoil:
    rng = np.random.default_rng(seed)
    limits = ((40, 180), (0.15, 2.0), (2, 9), (10, 25), (0.05, 5.0), (0, 300))
    return demand.PlotSoil(*(rng.uniform(low, high, count) for low, high in limits))


def runon_of(record: demand.CropRecord, factors: list[float]) -> np.ndarray:
    return np.array(factors)[:, None] * np.maximum(record.rain_mm - 8.0, 0.0)[None, :]


def run(record: demand.CropRecord, runon: np.ndarray | None, **other: Any) -> demand.SeasonYields:
    given: dict[str, Any] = {"soil": soils(1), "plot_area_m2": np.full(4, 2000.0)} | other
    return demand.daily_balance(record, runon_m3=runon, **given)


def season_numbers(record: demand.CropRecord) -> np.ndarray:
    number = np.full(DAYS.size, -1, dtype=np.int64)
    for season, (first, end) in enumerate(zip(record.seasons.first, record.seasons.end, strict=True)):
        number[first:end] = season
    return number


@settings(deadline=None)
@given(
    seed=st.integers(0, 10_000),
    planting=st.sampled_from([FIXED, ONSET]),
    factors=st.lists(st.floats(0, 500), min_size=4, max_size=4),
)
def test_the_water_of_every_plot_closes_in_every_year(seed: int, planting: demand.Planting, factors: list[float]) -> None:
    record = record_of(seed, planting=planting)
    got = run(record, runon_of(record, factors), soil=soils(seed + 1), period=season_numbers(record))
    each = got.balance
    assert each is not None
    inflow = each.rain_mm + each.runon_mm
    outflow = each.overflow_mm + each.standing_loss_mm + each.soil_loss_mm + each.percolation_mm
    assert (np.abs(inflow - outflow - each.stored_mm) <= 1e-9 * inflow).all()
    for part in (each.overflow_mm, each.standing_loss_mm, each.soil_loss_mm, each.percolation_mm, each.shortage_mm):
        assert (part >= 0).all()
    # the sums by season are those of the seasons
    np.testing.assert_allclose(each.overflow_mm * 2.0, got.overflow_m3, rtol=1e-9)
    np.testing.assert_allclose(each.percolation_mm * 2.0, got.percolation_m3, rtol=1e-9)


@settings(deadline=None)
@given(seed=st.integers(0, 10_000), factors=st.lists(st.floats(0, 300), min_size=4, max_size=4))
def test_run_on_never_lowers_a_yield_except_through_standing_water(seed: int, factors: list[float]) -> None:
    # a lost stand leaves its water to the next crop: the law is that of stands that live
    record = record_of(seed, planting=NEVER_LOST, field=NEVER_DROWNS)
    ground = soils(seed + 1)
    alone, fed = run(record, None, soil=ground), run(record, runon_of(record, factors), soil=ground)
    assert (fed.relative_yield >= alone.relative_yield - 1e-9).all()
    # with air needed, a lower yield means water that stood
    record = record_of(seed, planting=NEVER_LOST)
    alone, fed = run(record, None, soil=ground), run(record, runon_of(record, factors), soil=ground)
    lower = fed.relative_yield < alone.relative_yield - 1e-9
    assert (fed.standing_water_days[lower] > record.field.standing_water_days).all()


def test_long_standing_water_does_lower_a_yield() -> None:
    record = record_of(3)
    ground = demand.PlotSoil(*(np.full(4, value) for value in (150.0, 1.5, 8.0, 18.0, 0.1, 300.0)))
    flooded = runon_of(record, [400.0] * 4)
    fed, airy = run(record, flooded, soil=ground), run(record_of(3, field=NEVER_DROWNS), flooded, soil=ground)
    assert fed.relative_yield.mean() < airy.relative_yield.mean() - 0.1


@settings(deadline=None)
@given(seed=st.integers(0, 10_000), area=st.floats(100, 20_000), factor=st.floats(1, 20))
def test_a_larger_plot_never_has_a_deeper_run_on(seed: int, area: float, factor: float) -> None:
    record = record_of(seed)
    runon, number = runon_of(record, [5.0, 20.0, 80.0, 300.0]), season_numbers(record)
    small = run(record, runon, plot_area_m2=np.full(4, area), period=number).balance
    large = run(record, runon, plot_area_m2=np.full(4, area * factor), period=number).balance
    assert small is not None and large is not None
    assert (large.runon_mm <= small.runon_mm * (1 + 1e-9) + 1e-9).all()


def test_no_catchment_is_rain_alone() -> None:
    for planting in (FIXED, ONSET):
        record = record_of(5, planting=planting)
        none, shut = run(record, np.zeros((4, DAYS.size))), run(record, None)
        for name in ("et_ratio", "relative_yield", "standing_water_days", "sown", "failure", "overflow_m3"):
            np.testing.assert_array_equal(getattr(none, name), getattr(shut, name))


def test_a_season_over_the_new_year_equals_the_same_season_in_mid_year() -> None:
    # two years without 29 February: 1 February + 287 days is 15 November
    rng = np.random.default_rng(8)
    rain = np.where(rng.random(730) < 0.08, rng.exponential(10.0, 730), 0.0)
    et0, runon = rng.uniform(1, 9, 730), 30.0 * np.maximum(rain - 8.0, 0.0)[None, :]
    yields = []
    for first, planting in (("2001-01-01", demand.Planting((2, 1))), ("2001-10-15", demand.Planting((11, 15)))):
        days = np.datetime64(first) + np.arange(730)
        seasons = demand.sowing_seasons(days, planting=planting, crop=CROP)
        record = demand.CropRecord(days, rain, et0, seasons, CROP, planting)
        yields.append(demand.daily_balance(record, runon_m3=runon, soil=soils(2, 1), plot_area_m2=np.array([2000.0])))
    assert yields[0].et_ratio.shape == (1, 1)
    np.testing.assert_array_equal(yields[0].et_ratio, yields[1].et_ratio)
    assert [str(each.sown[0, 0]) for each in yields] == ["2002-02-01", "2002-11-15"]


def test_a_third_run_of_the_first_year_changes_nothing_where_a_year_wipes_out_its_start() -> None:
    # the same year again and again, with a flood in it that fills the soil
    year = np.random.default_rng(4).uniform(1, 7, 365)
    days = np.datetime64("2001-01-01") + np.arange(365 * 3)
    rain = np.zeros(365)
    rain[[30, 320, 340, 360]] = 300.0, 20.0, 30.0, 25.0
    seasons = demand.sowing_seasons(days, planting=FIXED, crop=CROP)
    record = demand.CropRecord(days, np.tile(rain, 3), np.tile(year, 3), seasons, CROP, FIXED)
    got = demand.daily_balance(record, runon_m3=None, soil=soils(2), plot_area_m2=np.full(4, 2000.0))
    assert got.et_ratio.shape[1] == 2
    np.testing.assert_allclose(got.et_ratio[:, 0], got.et_ratio[:, 1], rtol=1e-12)
    # and the first year starts from where it ended, not from half of available water
    cold = demand.daily_balance(record, runon_m3=None, soil=soils(2), plot_area_m2=np.full(4, 2000.0), spin_up=False)
    np.testing.assert_allclose(cold.et_ratio[:, 1], got.et_ratio[:, 1], rtol=1e-12)


def test_a_season_after_a_dropped_year_begins_as_the_first_does() -> None:
    record = record_of(6)
    seasons = record.seasons
    kept = demand.Seasons(*(getattr(seasons, name)[[0, 2, 3]] for name in ("label", "sown", "first", "sowing", "end")))
    tail = demand.Seasons(*(getattr(seasons, name)[[2, 3]] for name in ("label", "sown", "first", "sowing", "end")))
    with_gap, alone = (
        run(demand.CropRecord(DAYS, record.rain_mm, record.et0_mm, each, CROP, FIXED), None) for each in (kept, tail)
    )
    np.testing.assert_array_equal(with_gap.et_ratio[:, 1:], alone.et_ratio)
    whole = run(record, None)
    np.testing.assert_array_equal(with_gap.et_ratio[:, 0], whole.et_ratio[:, 0])


def test_threads_do_not_change_a_bit() -> None:
    record = record_of(7, planting=ONSET)
    many = {"soil": soils(3, 100), "plot_area_m2": np.full(100, 1500.0)}
    runon = runon_of(record, list(np.linspace(0, 200, 100)))
    one, two = run(record, runon, threads=1, **many), run(record, runon, threads=2, **many)
    np.testing.assert_array_equal(one.relative_yield, two.relative_yield)
    np.testing.assert_array_equal(one.sown, two.sown)


def storms(*given: tuple[str, float]) -> np.ndarray:
    rain = np.zeros(DAYS.size)
    for date, depth in given:
        rain[int((np.datetime64(date) - DAYS[0]).astype(int))] = depth
    return rain


def sown_by(rain: np.ndarray, planting: demand.Planting = ONSET) -> demand.SeasonYields:
    """Sow on soil of 40 mm/m, dry but for these storms."""
    seasons = demand.sowing_seasons(DAYS, planting=planting, crop=CROP)
    record = demand.CropRecord(DAYS, rain, np.full(DAYS.size, 5.0), seasons, CROP, planting)
    dry = demand.PlotSoil(*(np.full(4, value) for value in (40.0, 1.0, 8.0, 18.0, 12.5, 200.0)))
    return run(record, None, soil=dry)


def test_sowing_waits_for_three_days_of_rain_in_the_window() -> None:
    # seasons of 2001 to 2004; 15 mm over three days: 5 + 4 + 6 on the 12th; 30 mm in October are before the window
    wet = [(f"2002-11-{day}", 5.0) for day in range(15, 31)]
    got = sown_by(storms(("2002-10-20", 30.0), ("2002-11-10", 5.0), ("2002-11-11", 4.0), ("2002-11-12", 6.0), *wet))
    assert str(got.sown[0, 1]) == "2002-11-12"
    assert got.failure[0].tolist() == ["no_onset", "", "no_onset", "no_onset"]
    assert np.isnat(got.sown[0, 3]) and got.relative_yield[0, 3] == 0.0 and np.isnan(got.et_ratio[0, 3])


def test_a_lost_stand_is_sown_once_more_and_no_third_time() -> None:
    # the crop of 2001 leaves dry soil behind; 16 mm on it keep the stand of 2002 for a few days
    before, first, second, third = "2001-11-05", "2002-11-01", "2002-11-28", "2002-12-20"
    saved = [(f"2002-12-{day:02d}", 6.0) for day in range(1, 32)]
    again = sown_by(storms((before, 16.0), (first, 16.0), (second, 16.0), *saved))
    assert str(again.sown[0, 1]) == second and again.failure[0, 1] == "" and again.et_ratio[0, 1] > 0
    twice = sown_by(storms((before, 16.0), (first, 16.0), (second, 16.0), (third, 16.0)))
    assert twice.failure[0, 1] == "stand_lost" and twice.relative_yield[0, 1] == 0.0
    assert str(twice.sown[0, 1]) == second


def test_a_stand_lost_on_a_fixed_day_is_lost() -> None:
    got = sown_by(storms(("2002-12-25", 100.0)), FIXED)
    assert got.failure[0, 1] == "stand_lost"
    assert str(got.sown[0, 1]) == "2002-11-10"


def test_a_perennial_stands_all_year_and_takes_up_water_from_its_full_depth() -> None:
    olive = demand.CropWater.from_table(table_crop("olive, 40-60 % cover"))
    assert olive.perennial and olive.length_days == 365
    np.testing.assert_array_equal(olive.coefficients()[270:], 0.65)  # after its last stage it rests
    planting = demand.Planting((3, 1))
    record = record_of(9, planting=planting, crop=olive)
    trace = demand.daily_trace(record, runon_m3=None, soil=soils(2, 1), plot_area_m2=1000.0)
    stands = ~np.isnan(trace.root_m)
    assert stands[record.seasons.first[0] : record.seasons.end[-1]].all()  # also on the day a leap year adds
    assert set(trace.root_m[stands]) == {min(1.7, float(soils(2, 1).soil_depth_m[0]))}
    got = run(record, None)
    assert (got.failure == "").all() and (got.et_ratio > 0).all()


def test_crops_come_from_the_table() -> None:
    sorghum = demand.CropWater.from_table(table_crop("sorghum"))
    assert sorghum.stage_days == (20, 35, 45, 30) and sorghum.kc == (0.3, 1.05, 0.55)
    assert (sorghum.root_depth_m, sorghum.depletion_fraction, sorghum.ky) == (2.0, 0.55, 0.9)
    own = demand.CropWater.from_table(table_crop("sorghum"), stage_days=(10, 20, 30, 20))
    assert own.length_days == 80 and not own.perennial
    with pytest.raises(ConfigError, match="no stages are in print for 'date palm'"):
        demand.CropWater.from_table(table_crop("date palm"))


def test_an_unknown_plot_is_unknown_and_no_other() -> None:
    record = record_of(2)
    ground = soils(1)
    ground.available_mm_per_m[2] = np.nan
    runon = runon_of(record, [1.0, 2.0, 3.0, 4.0])
    runon[0, 700] = np.nan
    got = run(record, runon, soil=ground, period=season_numbers(record))
    assert np.isnan(got.relative_yield[[0, 2]]).all() and np.isnat(got.sown[[0, 2]]).all()
    assert (got.failure[[0, 2]] == "").all() and np.isnan(got.standing_water_days[[0, 2]]).all()
    assert got.balance is not None and np.isnan(got.balance.rain_mm[[0, 2]]).all()
    assert not np.isnan(got.relative_yield[[1, 3]]).any()


def test_without_reference_et_all_yields_are_unknown() -> None:
    known = record_of(2)
    record = demand.CropRecord(DAYS, known.rain_mm, np.full(DAYS.size, np.nan), known.seasons, CROP, FIXED)
    assert np.isnan(run(record, None).relative_yield).all()


def test_a_period_that_was_not_simulated_as_a_whole_has_no_balance() -> None:
    record = record_of(2)
    year = (DAYS.astype("datetime64[Y]").astype(np.int64) - 31).astype(np.int64)  # 2001 is 0
    balance = run(record, None, period=year).balance
    assert balance is not None and balance.rain_mm.shape == (4, 5)
    np.testing.assert_array_equal(np.isnan(balance.rain_mm[0]), [True, False, False, False, True])
    np.testing.assert_allclose(balance.rain_mm[0, 1], record.rain_mm[year == 1].sum())


def test_what_cannot_be_simulated_is_refused() -> None:
    record = record_of(2)
    hole = record.rain_mm.copy()
    hole[800] = np.nan
    with pytest.raises(InputError, match=r"rain of 2003-03-12 is nan mm; a day of a season needs a depth"):
        demand.CropRecord(DAYS, hole, record.et0_mm, record.seasons, CROP, FIXED)
    outside = record.rain_mm.copy()
    outside[0] = np.nan  # before the first season: not simulated
    demand.CropRecord(DAYS, outside, record.et0_mm, record.seasons, CROP, FIXED)
    with pytest.raises(ConfigError, match="take sowing_seasons"):
        demand.CropRecord(DAYS, record.rain_mm, record.et0_mm, record.seasons, CROP, ONSET)
    with pytest.raises(InputError, match="plot 2 of 4 has an area of 0 m2"):
        run(record, None, plot_area_m2=np.array([1.0, 0.0, 1.0, 1.0]))
    with pytest.raises(InputError, match="run-on of -1 m3"):
        run(record, np.full((4, DAYS.size), -1.0))
    with pytest.raises(InputError, match="they must agree"):
        run(record, np.zeros((3, DAYS.size)))
    with pytest.raises(InputError, match="leave out plots with"):
        demand.PlotSoil(*(np.array([value]) for value in (130.0, 0.1, 9.0, 19.0, 12.5, 200.0)))
    with pytest.raises(InputError, match="rew_mm 20 of plot 1 exceeds its tew_mm 19"):
        demand.PlotSoil(*(np.array([value]) for value in (130.0, 1.0, 20.0, 19.0, 12.5, 200.0)))
    with pytest.raises(ConfigError, match="last longer than a year together"):
        demand.sowing_seasons(DAYS, planting=demand.Planting((1, 1), (12, 1)), crop=CROP)
    with pytest.raises(ConfigError, match="02-29 is no day of every year"):
        demand.Planting((2, 29))
    with pytest.raises(ConfigError, match=r"root_depth_m is 0\.1"):
        demand.CropWater((20, 30, 40, 25), (0.35, 1.15, 0.4), 0.1, 0.5, 1.1)


def test_a_window_over_the_new_year_has_its_days() -> None:
    assert demand.Planting((11, 1), (1, 15)).window_days == 76
    assert demand.Planting((11, 1), (11, 1)).window_days == 1
    seasons = demand.sowing_seasons(DAYS, planting=demand.Planting((12, 20), (1, 10)), crop=CROP)
    assert seasons.label.tolist() == [2001, 2002, 2003, 2004]
    assert (seasons.end - seasons.sowing == 22 + 115 - 1).all()
