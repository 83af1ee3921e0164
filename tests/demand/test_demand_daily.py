"""The daily balance: a case worked by hand, published examples, and a plain form of the same equations."""

from typing import Any

import numpy as np
import pytest

from siting import demand
from siting.demand import _kernels as kernels
from siting.demand.seasons import Seasons

DAYS = np.arange(np.datetime64("2001-06-01"), np.datetime64("2001-06-26"))  # day 1 of the crop is 6 June
VALLEY = demand.CropWater((4, 4, 8, 4), (0.3, 1.1, 0.5), root_depth_m=2.0, depletion_fraction=0.55, ky=1.0)
RUNON = np.zeros(25)
RUNON[[1, 13]] = 59.3459, 297.3805


def soil_of(count: int = 1, **changed: Any) -> demand.PlotSoil:
    """Soil and bund of the valley case for some plots."""
    figures = {
        "available_mm_per_m": 130.0,
        "soil_depth_m": 0.6,
        "rew_mm": 9.0,
        "tew_mm": 19.0,
        "infiltration_mm_h": 12.5,
        "ponding_mm": 200.0,
    }
    return demand.PlotSoil(**{name: np.full(count, float(value)) for name, value in (figures | changed).items()})


def valley() -> demand.CropRecord:
    rain = np.zeros(25)
    rain[[1, 13, 18]] = 18.0, 30.0, 12.0
    seasons = Seasons(np.array([2001]), DAYS[5:6], np.array([0]), np.array([5]), np.array([25]))
    return demand.CropRecord(DAYS, rain, np.full(25, 6.0), seasons, VALLEY, demand.Planting((6, 6)))


# by hand, day by day: root m, Ks or Kr, ETc, soil loss, infiltration, top and below at the end of the day, percolation
WITH_RUNON = """
- 1.0000 - 6.9000 0.0000 13.4000 32.5000 0
- 0.5600 - 3.8640 42.7275 0.0000 7.0365 0
- 1.0000 - 6.9000 0.0000 6.9000 7.0365 0
- 1.0000 - 6.9000 0.0000 13.8000 7.0365 0
- 0.5200 - 3.5880 0.0000 17.3880 7.0365 0
0.20 0.8606 1.8000 1.5490 0.0000 20.3443 5.6292 0
0.25 1.0000 1.8000 1.8000 0.0000 22.8480 4.9256 0
0.30 1.0000 1.8000 1.8000 0.0000 25.3516 4.2219 0
0.35 1.0000 1.8000 1.8000 0.0000 27.8553 3.5183 0
0.40 1.0000 2.4000 2.4000 0.0000 30.9589 2.8146 0
0.45 1.0000 3.6000 3.6000 0.0000 35.2626 2.1110 0
0.50 1.0000 4.8000 4.8000 0.0000 40.7663 1.4073 0
0.55 0.8571 6.0000 5.1429 0.0000 46.6128 0.7037 0
0.60 0.7653 6.6000 5.0512 153.9085 0.0000 0.0000 101.5409
0.60 1.0000 6.6000 6.6000 0.0000 6.6000 0.0000 0
0.60 1.0000 6.6000 6.6000 0.0000 13.2000 0.0000 0
0.60 1.0000 6.6000 6.6000 0.0000 19.8000 0.0000 0
0.60 1.0000 6.6000 6.6000 0.0000 26.4000 0.0000 0
0.60 1.0000 6.6000 6.6000 12.0000 21.0000 0.0000 0
0.60 1.0000 6.6000 6.6000 0.0000 27.6000 0.0000 0
0.60 1.0000 6.6000 6.6000 0.0000 34.2000 0.0000 0
0.60 1.0000 6.1500 6.1500 0.0000 40.3500 0.0000 0
0.60 1.0000 5.2500 5.2500 0.0000 45.6000 0.0000 0
0.60 0.9797 4.3500 4.2616 0.0000 49.8616 0.0000 0
0.60 0.9298 3.4500 3.2077 0.0000 53.0693 0.0000 0
"""
# the same with the run-on shut off: Ks or Kr, soil loss, top and below at the end of the day
RAIN_ALONE = """
1.0000 6.9000 13.4000 32.5000
0.5600 3.8640 0.0000 31.7640
1.0000 6.9000 6.9000 31.7640
1.0000 6.9000 13.8000 31.7640
0.5200 3.5880 17.3880 31.7640
0.2699 0.4857 24.2265 25.4112
0.4871 0.8767 28.2796 22.2348
0.6007 1.0813 32.5374 19.0584
0.6680 1.2023 36.9161 15.8820
0.6618 1.5884 41.6809 12.7056
0.5919 2.1308 46.9881 9.5292
0.5164 2.4786 52.6431 6.3528
0.4476 2.6854 58.5049 3.1764
0.4070 2.6864 34.3677 0.0000
1.0000 6.6000 40.9677 0.0000
0.9237 6.0963 47.0640 0.0000
0.7716 5.0927 52.1567 0.0000
0.6446 4.2544 56.4111 0.0000
0.5385 3.5540 47.9651 0.0000
0.7491 4.9444 52.9095 0.0000
0.6258 4.1304 57.0399 0.0000
0.5418 3.3319 60.3718 0.0000
0.4913 2.5794 62.9512 0.0000
0.4550 1.9794 64.9306 0.0000
0.4318 1.4899 66.4204 0.0000
"""


def figures(text: str) -> np.ndarray:
    return np.array([[np.nan if word == "-" else float(word) for word in line.split()] for line in text.split("\n") if line])


def test_each_day_of_the_valley_is_the_one_worked_by_hand() -> None:
    got = demand.daily_trace(valley(), runon_m3=RUNON, soil=soil_of(), plot_area_m2=2400.0, spin_up=False)
    columns = (got.root_m, got.stress, got.needed_mm, got.soil_loss_mm, got.infiltration_mm, got.top_mm, got.below_mm)
    np.testing.assert_allclose(np.stack([*columns, got.percolation_mm], axis=1), figures(WITH_RUNON), rtol=1e-3, atol=1e-4)
    for none in (got.standing_loss_mm, got.overflow_mm, got.standing_mm):
        assert (none == 0.0).all()


def test_each_day_of_the_valley_on_rain_alone_is_the_one_worked_by_hand() -> None:
    got = demand.daily_trace(valley(), runon_m3=None, soil=soil_of(), plot_area_m2=2400.0, spin_up=False)
    columns = np.stack([got.stress, got.soil_loss_mm, got.top_mm, got.below_mm], axis=1)
    np.testing.assert_allclose(columns, figures(RAIN_ALONE), rtol=1e-3, atol=1e-4)


def test_the_valley_season_and_its_balance_worked_by_hand() -> None:
    one: dict[str, Any] = {"soil": soil_of(), "plot_area_m2": np.array([2400.0]), "spin_up": False}
    whole = np.zeros(25, dtype=np.int64)
    got = demand.daily_balance(valley(), runon_m3=RUNON[None, :], period=whole, **one)
    assert got.et_ratio[0, 0] == pytest.approx(93.0124 / 96.0, rel=1e-5)
    assert got.relative_yield[0, 0] == pytest.approx(0.9689, rel=1e-4)
    assert str(got.sown[0, 0]) == "2001-06-06" and got.failure[0, 0] == "" and not got.beyond_fit[0, 0]
    balance = got.balance
    assert balance is not None
    assert balance.rain_mm[0, 0] + balance.runon_mm[0, 0] == pytest.approx(208.6360, rel=1e-6)
    assert balance.soil_loss_mm[0, 0] == pytest.approx(121.1644, rel=1e-6)
    assert balance.percolation_mm[0, 0] == pytest.approx(101.5409, rel=1e-6)
    assert balance.stored_mm[0, 0] == pytest.approx(-14.0693, rel=1e-5)
    assert balance.shortage_mm[0, 0] == pytest.approx(96.0 - 93.0124, rel=1e-4)
    assert got.percolation_m3[0, 0] == pytest.approx(101.5409 * 2.4, rel=1e-6)
    assert got.runon_m3[0, 0] == pytest.approx(356.7264, rel=1e-9)
    alone = demand.daily_balance(valley(), runon_m3=None, **one)
    assert alone.et_ratio[0, 0] == pytest.approx(59.2684 / 96.0, rel=1e-5)
    assert alone.relative_yield[0, 0] == pytest.approx(0.6174, rel=1e-4)


def test_evaporation_reduction_of_a_published_example() -> None:
    # FAO-56 example 35: TEW 18, REW 8 mm; eq. 74
    got = [kernels.evaporation_reduction(depletion, 8.0, 18.0) for depletion in (0.0, 8.0, 13.0, 18.0, 25.0)]
    assert got == [1.0, 1.0, 0.5, 0.0, 0.0]
    # soil that evaporates nothing beyond the ready water, where eq. 74 divides by zero
    assert kernels.evaporation_reduction(9.0, 8.0, 8.0) == 0.0


def test_stress_of_the_kernel_is_that_of_the_print() -> None:
    # FAO-56 eq. 84: TAW 100 mm, p 0.35
    got = [kernels.water_stress(depletion, 100.0, 0.35) for depletion in (20.0, 35.0, 67.5, 100.0, 130.0)]
    np.testing.assert_allclose(got, [1.0, 1.0, 0.5, 0.0, 0.0])
    assert kernels.water_stress(0.0, 0.0, 0.5) == 0.0


def test_root_zone_depletion_of_the_print() -> None:
    # FAO-56 eq. 85: depletion 20, rain 8 and irrigation 4, ETc 5 -> 13; rain 60 -> 0, and 35 mm percolate
    ground = kernels.Soil(100.0, 1.0, 8.0, 18.0, 1000.0, 1000.0)
    loss = kernels.Loss(1.0, 5.0, 5.0, 0.0, 5.0)
    water = kernels.Water(0.0, 20.0, 0.0, 1.0, 0.0)
    after, intake = kernels.receive(water, ground, loss, 12.0)
    assert (after.top, intake.percolation) == (13.0, 0.0)
    after, intake = kernels.receive(water, ground, loss, 60.0)
    assert (after.top, intake.percolation) == (0.0, 35.0)


def test_evaporable_water_of_the_worked_soil() -> None:
    # FAO-56 eq. 73 by hand: 1000 (0.25 - 0.06) 0.1
    assert float(demand.total_evaporable_water_mm(field_capacity=0.25, wilting_point=0.12)) == pytest.approx(19.0)


def test_ponding_on_a_slope_is_a_wedge() -> None:
    # by hand: level 200; a fall of 0.1 m takes off half of it; at 5 % over 100 m the wedge is 4 m long: 400 / 100 mm
    got = demand.mean_ponding_mm(200.0, drop_m=[0.0, 0.1, 0.2, 5.0])
    np.testing.assert_allclose(got, [200.0, 150.0, 100.0, 4.0])


def plain_seasons(record: demand.CropRecord, arrival: np.ndarray, plot: dict[str, float], rounds: int) -> list[list[Any]]:
    """Simulate one plot by the same equations in plain Python, the days of all seasons one after another."""
    kc, stages = record.crop.coefficients(), record.crop.stage_days
    per_m, full = plot["available_mm_per_m"], min(record.crop.root_depth_m, plot["soil_depth_m"])
    rate, rows = plot["infiltration_mm_h"], []
    order = [0] * rounds + list(range(len(record.seasons.label)))
    top, below, standing, wet_days = 0.05 * per_m, 0.5 * per_m * (full - 0.1), 0.0, 0
    for turn, season in enumerate(order):
        layer, sown, crop, done, tries = 0.1, -1, False, False, 0
        for day in range(record.seasons.first[season], record.seasons.end[season]):
            wet_days = wet_days + 1 if standing > 0 else 0
            opens = record.seasons.sowing[season]
            in_window = opens <= day <= opens + record.planting.window_days - 1
            enough = record.planting.closes is None or arrival[max(0, day - 2) : day + 1].sum() >= record.planting.onset_mm
            if in_window and enough and not crop and not done and tries < 2:
                sown, crop, tries, eta, etc, under, dry = day, True, tries + 1, 0.0, 0.0, 0, 0
            et0 = record.et0_mm[day]
            evaporated = min(standing, 1.05 * et0)
            if crop:
                share = min(1.0, (day - sown) / (stages[0] + stages[1]))
                start = min(record.crop.root_start_m, full)
                deeper = start + (full - start) * share
                if deeper > layer:
                    moved = below * (deeper - layer) / (full - layer)
                    top, below, layer = top + moved, below - moved, deeper
                need, available = kc[day - sown] * et0, per_m * layer
                p = float(demand.depletion_fraction(record.crop.depletion_fraction, crop_et_mm=need))
                ks = float(demand.stress_coefficient(available_mm=available, depletion_mm=top, fraction=p))
                ks = 0.0 if wet_days > record.field.standing_water_days else ks
                loss = min(max(0.0, ks * need - evaporated), max(0.0, available - top))
                eta, etc, under = eta + min(ks * need, evaporated + loss), etc + need, under + (wet_days > 0)
                dry = dry + 1 if ks < 0.01 else 0
            else:
                tew, rew = plot["tew_mm"], plot["rew_mm"]
                kr = min(1.0, max(0.0, (tew - top) / (tew - rew)))
                loss = min(max(0.0, 1.15 * et0 * kr - evaporated), max(0.0, tew - top))
            pool = standing - evaporated + arrival[day]
            pool -= max(0.0, pool - plot["ponding_mm"] - rate * record.field.event_hours)
            soaked = min(pool, 24.0 * rate)
            standing = pool - soaked
            top += loss - soaked
            if top < 0:
                top, below = 0.0, max(0.0, below + top)
            lost = crop and dry >= 10 and day - sown < 30
            done = done or (crop and not lost and day - sown + 1 == len(kc))
            if lost or (crop and done):
                crop = False
                top, below, layer = top * 0.1 / layer, below + top * (layer - 0.1) / layer, 0.1
        if turn >= rounds:
            failure = "" if done else "no_onset" if sown < 0 else "stand_lost"
            rows.append([eta / etc if done else np.nan, sown, failure, under if sown >= 0 else 0])
    return rows


@pytest.mark.parametrize("planting", [demand.Planting((11, 10)), demand.Planting((11, 1), (1, 10), onset_mm=12.0)])
def test_random_plots_agree_with_a_plain_form(planting: demand.Planting) -> None:
    rng = np.random.default_rng(11)
    days = np.arange(np.datetime64("2001-02-01"), np.datetime64("2008-06-01"))
    rain = np.where(rng.random(days.size) < 0.06, rng.exponential(9.0, days.size), 0.0)
    et0 = rng.uniform(1.0, 9.0, days.size)
    crop = demand.CropWater((20, 30, 40, 25), (0.35, 1.15, 0.4), 1.2, 0.5, 1.1)
    seasons = demand.sowing_seasons(days, planting=planting, crop=crop)
    record = demand.CropRecord(days, rain, et0, seasons, crop, planting)
    plots = 24
    ranges = {
        "available_mm_per_m": (60, 180),
        "soil_depth_m": (0.3, 2.0),
        "rew_mm": (3, 9),
        "tew_mm": (12, 25),
        "infiltration_mm_h": (0.1, 2.0),
        "ponding_mm": (50, 300),
    }
    drawn = {name: rng.uniform(*limits, plots) for name, limits in ranges.items()}
    area = rng.uniform(1000, 10_000, plots)
    runon = rng.uniform(0, 40, plots)[:, None] * np.maximum(rain - 6.0, 0.0)[None, :]
    got = demand.daily_balance(record, runon_m3=runon, soil=demand.PlotSoil(**drawn), plot_area_m2=area)
    for plot in range(plots):
        arrival = rain + 1000.0 * runon[plot] / area[plot]
        expected = plain_seasons(record, arrival, {name: float(values[plot]) for name, values in drawn.items()}, 1)
        np.testing.assert_allclose(got.et_ratio[plot], [row[0] for row in expected], rtol=1e-9)
        assert got.failure[plot].tolist() == [row[2] for row in expected]
        for season, (_, sown, _, under) in enumerate(expected):
            assert got.standing_water_days[plot, season] == under
            assert np.isnat(got.sown[plot, season]) if sown < 0 else got.sown[plot, season] == days[sown]
    # the draw reaches what it is to test
    assert (got.standing_water_days > 3).any() and (got.et_ratio < 0.9).any()
    assert planting.closes is None or {"no_onset", ""} <= set(got.failure.ravel())
