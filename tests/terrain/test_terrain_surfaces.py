"""Analytic surfaces, a valley worked by hand, pans, and what lies above and below."""

import numpy as np
import numpy.typing as npt
import pytest

from siting.grid import Raster, metric_grid
from siting.terrain import Terrain, analyse, any_above, first_below, flow_path, slope, wetness_index
from siting.terrain.pans import DOUBTFUL, GIVEN, KEPT

FloatArray = npt.NDArray[np.float64]


def tangent(z: FloatArray, cell_m: float) -> npt.NDArray[np.float32]:
    size = np.full(z.shape[0], cell_m)
    return slope(z, cell_width_m=size, cell_height_m=size)


def terrain_of(z: FloatArray, cell_m: float, **settings: object) -> Terrain:
    values: dict[str, object] = {
        "vertical_error_m": 0.15,
        "channel_area_m2": 10_800.0,
        "pan_min_area_m2": 1e9,
        "pan_layer": None,
        "threads": 2,
    }
    raster = Raster(metric_grid(z.shape[0], z.shape[1], cell_m), z.astype(np.float32))
    return analyse(raster, **(values | settings))  # type: ignore[arg-type]


def test_slope_of_the_printed_window() -> None:
    # Horn (1981) worked by algebra on 612 609 607 / 610 607 603 / 609 604 601 at 20 m: 20.6345 %
    window = np.array([[612, 609, 607], [610, 607, 603], [609, 604, 601.0]])
    assert float(tangent(window, 20.0)[1, 1]) == pytest.approx(0.206345, abs=5e-7)


def test_a_plane_has_its_slope_everywhere_even_at_the_edge() -> None:
    # dz/dx 0.05, dz/dy 0.02, near 1000 m: small numbers must keep their digits
    y, x = np.mgrid[0:40, 0:90]
    got = tangent(1000.0 + 0.05 * 10 * x - 0.02 * 10 * y, 10.0)
    # heights are kept in 32 bits: 6e-5 m near 1000 m, so 3e-6 of slope
    np.testing.assert_allclose(got, np.hypot(0.05, 0.02), rtol=1e-4)


def test_a_paraboloid_has_its_exact_slope() -> None:
    # z = 1e-4 r2: slope 0.01, 0.02, 0.04 at r 50, 100, 200 m (Horn is exact on a quadratic)
    y, x = np.mgrid[-30:31, -30:31] * 10.0
    got = tangent(1e-4 * (x**2 + y**2), 10.0)
    for r in (50, 100, 200):
        assert float(got[30, 30 + r // 10]) == pytest.approx(2e-4 * r, rel=1e-6)


def test_slope_knows_the_true_size_of_cells_by_row() -> None:
    z = np.repeat(np.arange(50.0)[None, :], 9, axis=0)
    width = np.linspace(10.0, 20.0, 9)
    got = slope(z, cell_width_m=width, cell_height_m=np.full(9, 15.0))
    np.testing.assert_allclose(got[:, 25], 1.0 / width, rtol=1e-6)


def test_a_missing_neighbour_does_not_break_a_plane() -> None:
    z = np.repeat(0.5 * np.arange(30.0)[None, :], 20, axis=0)
    z[10, 15] = np.nan
    got = tangent(z, 10.0)
    assert np.isnan(got[10, 15])
    np.testing.assert_allclose(got[~np.isnan(got)], 0.05, rtol=1e-6)


def test_wetness_of_a_cone_by_hand() -> None:
    # outward cone: a = r/2 = 10, 50, 250 m at slope 0.1 -> 4.6052, 6.2146, 7.8240 (algebra)
    cell = np.full(1, 10.0)
    area = np.array([[10.0, 50.0, 250.0]]) * 10.0
    got = wetness_index(area, np.full((1, 3), 0.1, np.float32), cell_width_m=cell, cell_height_m=cell)
    np.testing.assert_allclose(got[0], [4.6052, 6.2146, 7.8240], atol=1e-4)


def test_multiple_flow_on_a_cone_comes_near_its_exact_area() -> None:
    # a = r/2; sharing among eight neighbours overshoots on a cone, by 13 % here; single flow scatters far more
    y, x = np.mgrid[-50:51, -50:51] * 10.0
    r = np.hypot(x, y)
    ground = terrain_of(200.0 - 0.1 * r, 10.0)
    ring = (r > 150) & (r < 400)
    shared = ground.multiple_flow_area_m2[ring] / 10.0 / (r[ring] / 2.0)
    single = ground.contributing_area_m2[ring] / 10.0 / (r[ring] / 2.0)
    assert float(shared.mean()) == pytest.approx(1.0, abs=0.15)
    assert float(shared.std()) < 0.2 * float(single.std())


def test_level_ground_gets_a_number_for_wetness() -> None:
    got = wetness_index(
        np.full((1, 1), 1000.0),
        np.zeros((1, 1), np.float32),
        cell_width_m=np.full(1, 10.0),
        cell_height_m=np.full(1, 10.0),
    )
    assert float(got[0, 0]) == pytest.approx(np.log(100 / 0.001), rel=1e-6)


@pytest.fixture(scope="module")
def valley() -> Terrain:
    """Worked by hand: 17 x 11 cells of 20 m, sides of 5 %, a bed that falls 1 % south, a rim that falls away."""
    r, c = np.mgrid[0:17, 0:11]
    z = 100 + 1.0 * np.abs(np.clip(c, 1, 9) - 5) + 0.2 * (15 - np.maximum(r, 1))
    z = z - 0.1 * ((r == 0) | (c == 0) | (c == 10))
    return terrain_of(z, 20.0)


def test_the_valley_worked_by_hand(valley: Terrain) -> None:
    assert valley.contributing_area_m2[12, 5] == 108 * 400.0
    assert float(valley.slope[6, 2]) == pytest.approx(np.sqrt(0.05**2 + 0.01**2), rel=1e-4)
    assert float(valley.slope[6, 5]) == pytest.approx(0.01, rel=1e-3)
    assert float(valley.height_above_channel_m[10, 2]) == pytest.approx(3.0, abs=1e-4)
    np.testing.assert_array_equal(np.flatnonzero(valley.channel[:, 5]), np.arange(3, 17))
    np.testing.assert_array_equal(valley.filled, valley.elevation)  # nothing is raised


def test_the_valley_is_closed_inside_its_rim(valley: Terrain) -> None:
    assert not valley.open_catchment[13, 5]
    assert not valley.open_catchment[12, 5]


def test_paths_and_distances_in_the_valley(valley: Terrain) -> None:
    path = flow_path(valley.direction, 10 * 11 + 2)
    assert path[:4].tolist() == [112, 113, 114, 115]  # along row 10 to column 5
    assert path[-1] // 11 == 16
    target, distance = first_below(
        valley.direction,
        valley.channel,
        cell_width_m=valley.grid.cell_width_m,
        cell_height_m=valley.grid.cell_height_m,
        include_self=True,
    )
    assert target[10, 2] == 115
    assert distance[10, 2] == 60.0
    assert distance[10, 5] == 0.0
    beyond, further = first_below(
        valley.direction,
        valley.channel,
        cell_width_m=valley.grid.cell_width_m,
        cell_height_m=valley.grid.cell_height_m,
        include_self=False,
    )
    assert beyond[10, 5] == 126
    assert further[10, 5] == 20.0


def test_ground_cut_by_the_edge_of_the_data_is_open() -> None:
    # a plane that falls south, higher at its northern edge: what comes in over that edge is unseen
    z = np.repeat(np.arange(20, 0, -1.0)[:, None], 30, axis=1)
    got = terrain_of(z, 10.0)
    assert got.open_catchment[10, 15]


def test_a_mark_is_seen_by_all_below_and_none_above(valley: Terrain) -> None:
    mark = np.zeros(valley.grid.shape, dtype=np.bool_)
    mark[10, 2] = True
    below = any_above(valley.direction, mark, threads=1)
    assert below[10, 2] and below[10, 4] and below[14, 5]
    assert not below[9, 5] and not below[10, 7]


def bowl(depth: float) -> FloatArray:
    y, x = np.mgrid[0:60, 0:60]
    z = 100.0 + 0.02 * (60 - y)
    r = np.hypot(x - 30, y - 30)
    heights: FloatArray = np.where(r < 12, 100.0 - depth * (1 - (r / 12) ** 2), z)
    return heights


def test_a_deep_pan_ends_the_flow_and_a_shallow_one_is_drained() -> None:
    kept = terrain_of(bowl(3.0), 20.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0)
    assert kept.pans.status == (KEPT,)
    assert kept.pans.depth_m[0] == pytest.approx(3.0, abs=0.7)
    assert 0.3 * kept.pans.area_m2[0] < kept.pans.volume_m3[0] / kept.pans.depth_m[0] < 0.9 * kept.pans.area_m2[0]
    assert np.count_nonzero(kept.direction == 10) == 1
    drained = terrain_of(bowl(0.2), 20.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0)
    assert not np.any(drained.direction == 10)


def test_water_is_kept_where_pans_end_it() -> None:
    got = terrain_of(bowl(3.0), 20.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0)
    ends = (got.direction == 9) | (got.direction == 10)
    assert got.contributing_area_m2[ends].sum() == 400.0 * 3600


def test_the_users_layer_of_pans_wins() -> None:
    layer = np.zeros((60, 60), dtype=np.int8)
    layer[30, 30] = -1
    never = terrain_of(bowl(3.0), 20.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0, pan_layer=layer)
    assert never.pans.status == ()
    always = terrain_of(bowl(0.2), 20.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0, pan_layer=-layer)
    assert always.pans.status == (GIVEN,)
    assert always.direction[30, 30] == 10


def test_a_pan_of_half_the_depth_is_doubtful() -> None:
    got = terrain_of(bowl(1.3), 20.0, vertical_error_m=3.0, pan_min_area_m2=10_000.0)
    assert got.pans.status == (DOUBTFUL,)
    assert got.pans.doubtful_mask().sum() * 400.0 == got.pans.area_m2[0]
    assert not np.any(got.direction == 10)


def test_raising_all_ground_changes_nothing() -> None:
    low, high = (
        terrain_of(bowl(3.0).round() + lift, 20.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0) for lift in (0.0, 1.0)
    )
    np.testing.assert_array_equal(low.direction, high.direction)
    np.testing.assert_array_equal(low.contributing_area_m2, high.contributing_area_m2)
    np.testing.assert_array_equal(low.position, high.position)
    np.testing.assert_allclose(low.slope, high.slope, atol=1e-7)
