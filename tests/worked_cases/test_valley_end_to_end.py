"""
A V-valley, three storms, one plot, from heights to supply: each figure was worked by hand.

17 x 11 cells of 20 m; the plot is rows 13 and 14, columns 4 to 6 (2 400 m2).
"""

import numpy as np
import pytest

from siting.demand import season_days, seasonal_supply
from siting.grid import Raster, metric_grid
from siting.runoff import RunoffClasses, class_runoff_mm, delivered_m3
from siting.terrain import Terrain, analyse, first_below

CELL_M = 20.0
LOSS_PER_KM = 0.3


@pytest.fixture(scope="module")
def ground() -> Terrain:
    r, c = np.mgrid[0:17, 0:11]
    z = 100 + 1.0 * np.abs(np.clip(c, 1, 9) - 5) + 0.2 * (15 - np.maximum(r, 1))
    z = z - 0.1 * ((r == 0) | (c == 0) | (c == 10))
    return analyse(
        Raster(metric_grid(17, 11, CELL_M), z.astype(np.float32)),
        vertical_error_m=0.15,
        channel_area_m2=10_800.0,
        pan_min_area_m2=10_000.0,
        pan_layer=None,
        threads=1,
    )


def catchment(ground: Terrain) -> tuple[np.ndarray, np.ndarray]:
    """Return the cells above the plot, and each cell's distance to it, m."""
    plot = np.zeros((17, 11), dtype=np.bool_)
    plot[13:15, 4:7] = True
    target, distance = first_below(
        ground.direction,
        plot,
        cell_width_m=ground.grid.cell_width_m,
        cell_height_m=ground.grid.cell_height_m,
        include_self=True,
    )
    return (target >= 0) & ~plot, distance


def test_catchment_distance_and_bed_of_the_plot(ground: Terrain) -> None:
    above, distance = catchment(ground)
    assert above.sum() == 120  # 48 000 m2, twenty times the plot
    assert distance[above].max() == 320.0
    effective = (400.0 * np.exp(-LOSS_PER_KM * distance[above] / 1000.0)).sum()
    assert effective == pytest.approx(45_750.21, abs=0.01)
    # channel cells (3, 5) to (12, 5): ten links of 20 m, 2 m wide
    assert np.argwhere(ground.channel & above).tolist() == [[row, 5] for row in range(3, 13)]
    assert not ground.open_catchment[13:15, 4:7].any()


def test_from_heights_to_supply(ground: Terrain) -> None:
    above, distance = catchment(ground)
    effective = (400.0 * np.exp(-LOSS_PER_KM * distance[above] / 1000.0)).sum()
    bed_m2 = np.count_nonzero(ground.channel & above) * CELL_M * 2.0
    days = np.arange(np.datetime64("2001-01-01"), np.datetime64("2003-01-01"))
    sowing = int((np.datetime64("2002-06-01") - days[0]).astype(int))
    rain = np.zeros(days.size)
    rain[[sowing - 4, sowing + 8, sowing + 13]] = [18.0, 30.0, 12.0]
    classes = RunoffClasses(np.zeros((1, 1), np.uint16), np.array([85.0]), np.array([np.nan]))
    runon = delivered_m3(
        np.array([[effective]]),
        np.array([bed_m2]),
        class_runoff_mm(rain, classes, abstraction_ratio=0.2),
        channel_wetting_mm=25.0,
    )
    assert runon.sum() == pytest.approx(356.7263, rel=1e-5)
    got = seasonal_supply(
        runon_m3=runon,
        rain_mm=rain,
        et0_mm=np.full(days.size, 6.0),
        seasons=season_days(days, planting=(6, 1), season_length_days=20),
        stage_days=(4, 4, 8, 4),
        kc=(0.3, 1.1, 0.5),
        plot_area_m2=np.array([2400.0]),
        catchment_area_m2=np.array([48_000.0]),
        available_water_mm=np.array([78.0]),
        intake_capacity_mm=np.array([200.0 + 12.5 * 6.0]),
        efficiency=0.65,
    )
    assert got.supply_mm[0, 0] == pytest.approx(108.7728, rel=1e-5)
    assert got.supply_ratio[0, 0] == pytest.approx(1.1331, rel=1e-4)
    assert got.needed_ratio[0, 0] == pytest.approx(13.4094, rel=1e-4)


def test_the_smaller_abstraction_ratio_gives_more_from_every_storm() -> None:
    classes = RunoffClasses(np.zeros((1, 1), np.uint16), np.array([85.0]), np.array([np.nan]))
    storms = np.array([18.0, 30.0, 12.0])
    more = class_runoff_mm(storms, classes, abstraction_ratio=0.05)
    assert np.all(more > class_runoff_mm(storms, classes, abstraction_ratio=0.2))
