"""Analytic surfaces, a valley worked by hand, positions in the landscape, and laws of the whole terrain."""

from collections.abc import Callable
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from ground import FloatArray, bowl, terrain_of, worked_valley
from hypothesis import given, settings
from hypothesis import strategies as st

from siting.grid import Grid, Raster
from siting.terrain import Terrain, analyse, landscape_position, profile_curvature, slope, wetness_index


def tangent(z: FloatArray, cell_m: float) -> npt.NDArray[np.float32]:
    size = np.full(z.shape[0], cell_m)
    return slope(z, cell_width_m=size, cell_height_m=size)


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
    return terrain_of(worked_valley(), 20.0)


def test_the_valley_worked_by_hand(valley: Terrain) -> None:
    assert valley.contributing_area_m2[12, 5] == 108 * 400.0
    assert float(valley.slope[6, 2]) == pytest.approx(np.sqrt(0.05**2 + 0.01**2), rel=1e-4)
    assert float(valley.slope[6, 5]) == pytest.approx(0.01, rel=1e-3)
    assert float(valley.height_above_channel_m[10, 2]) == pytest.approx(3.0, abs=1e-4)
    np.testing.assert_array_equal(np.flatnonzero(valley.channel[:, 5]), np.arange(3, 17))
    np.testing.assert_array_equal(valley.filled, valley.elevation)  # nothing is raised


def test_slope_of_a_plane_of_five_percent() -> None:
    # dz/dx 0.05, dz/dy 0: 5.0 % everywhere, whatever the size of the cells (algebra)
    for cell_m in (1.0, 10.0, 30.0):
        z = np.repeat(0.05 * cell_m * np.arange(80.0)[None, :], 70, axis=0)
        np.testing.assert_allclose(tangent(z, cell_m), 0.05, rtol=1e-5)


@settings(max_examples=40, deadline=None)
@given(a=st.floats(-0.5, 0.5), b=st.floats(-0.5, 0.5), width=st.floats(1.0, 40.0), height=st.floats(1.0, 40.0))
def test_any_plane_has_its_gradient_on_cells_of_any_shape(a: float, b: float, width: float, height: float) -> None:
    y, x = np.mgrid[0:7, 0:9]
    got = slope(a * x * width + b * y * height, cell_width_m=np.full(7, width), cell_height_m=np.full(7, height))
    np.testing.assert_allclose(got, np.hypot(a, b), rtol=1e-4, atol=1e-6)


def test_a_paraboloid_bends_by_its_second_derivative() -> None:
    # z = a r2 rises outward ever more steeply: along the slope z'' = 2a, concave downslope, so -2a; a dome +2a
    y, x = np.mgrid[-20:21, -20:21] * 10.0
    size = {"cell_width_m": np.full(41, 10.0), "cell_height_m": np.full(41, 10.0)}
    bowl_bend = profile_curvature(5e-4 * (x**2 + y**2), **size)
    dome_bend = profile_curvature(100 - 5e-4 * (x**2 + y**2), **size)
    assert float(bowl_bend[20, 30]) == pytest.approx(-1e-3, rel=1e-6)
    assert float(dome_bend[27, 12]) == pytest.approx(1e-3, rel=1e-6)
    assert float(bowl_bend[20, 20]) == 0.0  # level: no direction to bend along


def test_a_plane_high_up_is_straight_in_spite_of_its_32_bits() -> None:
    y, x = np.mgrid[0:200, 0:200]
    z = (8000.0 + 0.0371 * x - 0.0113 * y).astype(np.float32)
    size = {"cell_width_m": np.full(200, 1.0), "cell_height_m": np.full(200, 1.0)}
    assert not profile_curvature(z, **size).any()


# h above the channel, u below the top, slope, bend (> 0 convex), e = 1 m -> position
POSITIONS = [
    ("toeslope by height and slope", 1.0, 9.0, 0.05, 0.1, 5),
    ("a steep foot is a footslope", 1.0, 9.0, 0.06, -0.1, 4),
    ("a steep convex foot is neither", 1.0, 9.0, 0.06, 0.1, 3),
    ("footslope up to r = 0.35", 3.5, 6.5, 0.2, 0.0, 4),
    ("backslope above it", 3.6, 6.4, 0.2, -0.1, 3),
    ("shoulder from r = 0.65", 6.5, 3.5, 0.2, 0.0, 2),
    ("a concave one is a backslope", 6.5, 3.5, 0.2, -0.1, 3),
    ("summit from r = 0.9, gentle", 9.0, 1.0, 0.05, -0.1, 1),
    ("a steep top is a shoulder", 9.0, 1.0, 0.06, 0.1, 2),
    ("relief within the error is unknown", 0.9, 1.0, 0.01, 0.0, 0),
    ("relief of just twice the error is known", 0.125, 1.875, 0.01, 0.0, 5),
    ("no channel below is unknown", np.nan, 5.0, 0.01, 0.0, 0),
    ("a void has no position", np.nan, np.nan, np.nan, np.nan, 255),
]


@pytest.mark.parametrize(("h", "u", "steep", "bend", "code"), [p[1:] for p in POSITIONS], ids=[p[0] for p in POSITIONS])
def test_positions_follow_their_thresholds(h: float, u: float, steep: float, bend: float, code: int) -> None:
    def cell(value: float) -> npt.NDArray[np.float32]:
        return np.array([[value]], dtype=np.float32)

    got = landscape_position(
        height_above_channel_m=cell(h),
        drop_from_above_m=cell(u),
        slope=cell(steep),
        profile_curvature=cell(bend),
        vertical_error_m=1.0,
    )
    assert got.tolist() == [[code]]


def test_a_hillside_runs_from_summit_to_toeslope() -> None:
    # a ridge and a valley, cosine between them: convex above, concave below
    r, c = np.mgrid[0:60, 0:81]
    z = 120.0 + 20.0 * np.cos(np.pi * (c - 40) / 40.0) * -1.0 + 0.2 * (60 - r)
    got = terrain_of(z, 10.0, channel_area_m2=81 * 100.0 * 5, vertical_error_m=0.5)
    along = got.position[40, 2:40]
    assert along[along > 0].tolist() == sorted(along[along > 0].tolist())  # summit 1 ... toeslope 5, in order
    assert set(along.tolist()) >= {2, 3, 4, 5}


SYMMETRIES: list[Callable[[Any], Any]] = [
    lambda z: z,
    lambda z: np.rot90(z, 1),
    lambda z: np.rot90(z, 2),
    lambda z: np.rot90(z, 3),
    lambda z: np.flipud(z),
    lambda z: np.fliplr(z),
    lambda z: z.T,
    lambda z: np.rot90(z, 2).T,
]


@pytest.mark.parametrize("turn", SYMMETRIES)
def test_turning_or_mirroring_the_ground_turns_or_mirrors_every_layer(turn: Callable[[Any], Any]) -> None:
    # hills and valleys without two equal steepest ways, and one pan that is kept
    y, x = np.mgrid[0:70, 0:83] * 10.0
    z = 300 - 0.031 * x - 0.017 * y + 4 * np.sin(x / 97 + y / 211) + 3 * np.cos(y / 83 - x / 301)
    z -= 15 * np.exp(-((x - 402.3) ** 2 + (y - 351.7) ** 2) / 120**2)
    rule = {"channel_area_m2": 20_000.0, "pan_min_area_m2": 10_000.0, "vertical_error_m": 0.5}
    one, other = terrain_of(z, 10.0, **rule), terrain_of(np.ascontiguousarray(turn(z)), 10.0, **rule)
    assert one.pans.status == other.pans.status == ("kept",)
    assert one.pans.volume_m3[0] == pytest.approx(other.pans.volume_m3[0], rel=1e-6)
    for name in ("filled", "contributing_area_m2", "channel", "height_above_channel_m", "position", "open_catchment"):
        np.testing.assert_array_equal(turn(getattr(one, name)), getattr(other, name), err_msg=name)
    for name in ("multiple_flow_area_m2", "slope", "wetness_index"):
        np.testing.assert_allclose(turn(getattr(one, name)), getattr(other, name), rtol=1e-4, err_msg=name)


@settings(max_examples=25, deadline=None)
@given(seed=st.integers(0, 2**32 - 1), lift=st.sampled_from([1.0, -64.0, 512.0]))
def test_raising_all_ground_changes_nothing(seed: int, lift: float) -> None:
    # heights in 1/64 m: adding whole metres is exact
    rng = np.random.default_rng(seed)
    z = np.cumsum(np.cumsum(np.round(rng.standard_normal((25, 30)) * 16) / 64, axis=0), axis=1)
    rule = {"channel_area_m2": 3_000.0, "pan_min_area_m2": 800.0, "vertical_error_m": 0.5}
    low, high = terrain_of(z, 20.0, **rule), terrain_of(z + lift, 20.0, **rule)
    assert low.pans.status == high.pans.status
    for name in ("direction", "contributing_area_m2", "channel", "position", "height_above_channel_m", "open_sides"):
        np.testing.assert_array_equal(getattr(low, name), getattr(high, name), err_msg=name)
    np.testing.assert_allclose(low.slope, high.slope, rtol=1e-6)
    np.testing.assert_allclose(low.wetness_index, high.wetness_index, rtol=1e-5)
    np.testing.assert_array_equal(low.filled + np.float32(lift), high.filled)


def test_cells_whose_width_varies_by_row_keep_their_own_area_slope_and_contour() -> None:
    # a plane that falls south on cells 8 m wide in the north and 12 m in the south, 10 m high
    width = np.linspace(8.0, 12.0, 30)
    height = np.full(30, 10.0)
    z = np.repeat(np.arange(30, 0, -1.0)[:, None], 41, axis=1).astype(np.float32)
    grid = Grid(30, 41, (1.0, 0.0, 0.0, 0.0, -1.0, 0.0), "EPSG:4326", width, height)
    got = analyse(
        Raster(grid, z),
        vertical_error_m=0.1,
        channel_area_m2=500.0,
        pan_min_area_m2=1e4,
        pan_layer=None,
        threads=1,
    )
    column = np.cumsum(grid.cell_area_m2)
    np.testing.assert_array_equal(got.contributing_area_m2[:, 20], column)
    np.testing.assert_allclose(got.slope[1:-1], 0.1, rtol=1e-5)
    expected = np.log(got.multiple_flow_area_m2[:, 20] / ((width + height) / 2) / 0.1)
    np.testing.assert_allclose(got.wetness_index[1:-1, 20], expected[1:-1], rtol=1e-5)
    np.testing.assert_array_equal(np.flatnonzero(got.channel[:, 20]), np.flatnonzero(column >= 500.0))


@pytest.mark.parametrize("shape", [(1, 1), (1, 7), (7, 1), (2, 2)])
def test_the_smallest_rasters_have_a_terrain(shape: tuple[int, int]) -> None:
    z = np.arange(float(shape[0] * shape[1])).reshape(shape)
    got = terrain_of(z, 10.0)
    assert got.contributing_area_m2[got.direction == 9].sum() == 100.0 * z.size
    assert np.isfinite(got.slope).all()
    assert np.isfinite(got.wetness_index).all()


def test_ground_without_any_height_has_no_number_anywhere() -> None:
    got = terrain_of(np.full((6, 7), np.nan), 10.0)
    for name in (
        "filled",
        "contributing_area_m2",
        "multiple_flow_area_m2",
        "slope",
        "wetness_index",
        "height_above_channel_m",
    ):
        assert np.isnan(getattr(got, name)).all(), name
    assert np.all(got.direction == 255) and np.all(got.position == 255)
    assert not got.channel.any() and not got.open_catchment.any()
    assert got.flat_share == 0.0 and got.enclosed_voids == 0


def test_infinite_heights_are_voids() -> None:
    z = bowl(0.2)
    with_void, with_infinite = z.copy(), z.copy()
    with_void[5, 5], with_infinite[5, 5] = np.nan, np.inf
    one, other = terrain_of(with_void, 20.0), terrain_of(with_infinite, 20.0)
    assert one.enclosed_voids == other.enclosed_voids == 1
    np.testing.assert_array_equal(one.elevation, other.elevation)
    np.testing.assert_array_equal(one.contributing_area_m2, other.contributing_area_m2)


def test_a_listener_hears_every_stage_once_in_order() -> None:
    heard: list[tuple[str, int, int]] = []
    terrain_of(bowl(1.0), 20.0, progress=lambda *news: heard.append(news))
    assert [done for _, done, _ in heard] == list(range(1, len(heard) + 1))
    assert {total for _, _, total in heard} == {len(heard)}
    assert heard[0][0] == "drainage"


@pytest.mark.parametrize("kind", [np.float32, np.float64])
def test_the_heights_that_are_handed_in_are_never_written_to(kind: type[np.floating[Any]]) -> None:
    z = bowl(3.0).astype(kind)
    z[3, 4], z[50, 7] = np.inf, np.nan
    before = z.copy()
    raster = Raster(Grid(60, 60, (20.0, 0, 0, 0, -20.0, 0), "EPSG:32636", np.full(60, 20.0), np.full(60, 20.0)), z)
    rule: dict[str, Any] = {"vertical_error_m": 1.0, "channel_area_m2": 4000.0, "pan_min_area_m2": 1000.0}
    got = analyse(raster, pan_layer=None, threads=2, **rule)
    np.testing.assert_array_equal(z, before)
    assert np.isnan(got.elevation[3, 4])
