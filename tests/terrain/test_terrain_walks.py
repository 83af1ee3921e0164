"""What lies above and below a cell: against walks made one cell at a time, and on ground worked by hand."""

from collections.abc import Callable

import numpy as np
import numpy.typing as npt
import pytest
from ground import random_tree, terrain_of, worked_valley
from hypothesis import given, settings
from hypothesis import strategies as st

from siting.errors import ConfigError, GridError, InputError
from siting.terrain import (
    Terrain,
    accumulate,
    any_above,
    channel_cells,
    enclosed_voids,
    first_below,
    flow_path,
    follow,
    height_above_channel_m,
    highest_above,
    open_sides,
    sides_feeding,
)

Directions = npt.NDArray[np.uint8]

SEEDS = st.integers(0, 2**32 - 1)
SIDES = st.integers(1, 9)


def sets_above(direction: Directions) -> list[set[int]]:
    """For each cell the cells whose path meets it, itself included, walked one by one."""
    above: list[set[int]] = [set() for _ in range(direction.size)]
    for start in np.flatnonzero(direction.ravel() != 255):
        for cell in flow_path(direction, int(start)):
            above[cell].add(int(start))
    return above


@pytest.fixture(scope="module")
def valley() -> Terrain:
    return terrain_of(worked_valley(), 20.0)


@settings(max_examples=60, deadline=None)
@given(rows=SIDES, cols=SIDES, seed=SEEDS, include_self=st.booleans())
def test_the_first_mark_below_is_the_first_on_the_path(rows: int, cols: int, seed: int, include_self: bool) -> None:
    direction, _ = random_tree(rows, cols, seed)
    mark = np.random.default_rng(seed + 1).random((rows, cols)) < 0.2
    width, height = np.linspace(10.0, 14.0, rows), np.linspace(30.0, 20.0, rows)
    target, distance = first_below(direction, mark, cell_width_m=width, cell_height_m=height, include_self=include_self)
    for start in range(direction.size):
        path = flow_path(direction, start) if direction.flat[start] != 255 else np.array([], dtype=np.int64)
        hits = [place for place, cell in enumerate(path) if mark.flat[cell] and (include_self or place > 0)]
        if not hits:
            assert target.flat[start] == -1
            assert np.isnan(distance.flat[start])
            continue
        walked = path[: hits[0] + 1]
        down, along = np.diff(walked // cols) != 0, np.diff(walked % cols) != 0
        row = walked[:-1] // cols
        length = np.hypot(along * width[row], down * height[row]).sum()
        assert target.flat[start] == walked[-1]
        assert float(distance.flat[start]) == pytest.approx(float(length), rel=1e-6)


@settings(max_examples=60, deadline=None)
@given(rows=SIDES, cols=SIDES, seed=SEEDS)
def test_what_comes_from_above_is_that_of_all_cells_above(rows: int, cols: int, seed: int) -> None:
    direction, z = random_tree(rows, cols, seed)
    mark = np.random.default_rng(seed + 1).random((rows, cols)) < 0.2
    marked, highest = any_above(direction, mark), highest_above(direction, z)
    area = accumulate(direction, np.ones(rows), threads=1)
    for cell, above in enumerate(sets_above(direction)):
        assert marked.flat[cell] == any(mark.flat[one] for one in above)
        if above:
            assert highest.flat[cell] == np.float32(max(z.flat[one] for one in above))
            assert area.flat[cell] == len(above)
        else:
            assert np.isnan(highest.flat[cell])


@settings(max_examples=60, deadline=None)
@given(rows=SIDES, cols=SIDES, seed=SEEDS)
def test_height_above_a_channel_is_that_over_the_first_channel_cell_below(rows: int, cols: int, seed: int) -> None:
    # Nobre et al. (2011): elevation less that of the drainage cell that the cell's own path reaches
    direction, z = random_tree(rows, cols, seed)
    heights = z.astype(np.float32)
    channel = np.random.default_rng(seed + 1).random((rows, cols)) < 0.2
    got = height_above_channel_m(heights, direction, channel)
    size = np.ones(rows)
    target, _ = first_below(direction, channel, cell_width_m=size, cell_height_m=size, include_self=True)
    for cell in range(direction.size):
        if target.flat[cell] < 0:
            assert np.isnan(got.flat[cell])
        else:
            assert got.flat[cell] == heights.flat[cell] - heights.flat[target.flat[cell]]
            assert got.flat[cell] >= 0


def test_a_v_valley_stands_a_metre_above_its_channel_five_cells_away() -> None:
    # sides of 2 %, cells of 10 m, five cells from the channel: 5 x 10 x 0.02 = 1.0 m (algebra)
    r, c = np.mgrid[0:60, 0:41]
    z = 200.0 + 0.02 * 10 * np.abs(c - 20) + 0.005 * 10 * (60 - r)
    got = terrain_of(z, 10.0, channel_area_m2=41 * 100.0 * 5)
    assert float(got.slope[40, 10]) == pytest.approx(np.hypot(0.02, 0.005), rel=1e-3)
    np.testing.assert_array_equal(np.flatnonzero(got.channel[40]), [20])
    assert float(got.height_above_channel_m[40, 15]) == pytest.approx(1.0, abs=1e-4)
    assert float(got.height_above_channel_m[40, 25]) == pytest.approx(1.0, abs=1e-4)
    assert float(got.height_above_channel_m[40, 20]) == 0.0


def test_paths_and_distances_in_the_valley(valley: Terrain) -> None:
    path = flow_path(valley.direction, 10 * 11 + 2)
    assert path[:4].tolist() == [112, 113, 114, 115]  # along row 10 to column 5
    assert path[-1] // 11 == 16
    size = {"cell_width_m": valley.grid.cell_width_m, "cell_height_m": valley.grid.cell_height_m}
    target, distance = first_below(valley.direction, valley.channel, include_self=True, **size)
    assert (target[10, 2], distance[10, 2], distance[10, 5]) == (115, 60.0, 0.0)
    beyond, further = first_below(valley.direction, valley.channel, include_self=False, **size)
    assert (beyond[10, 5], further[10, 5]) == (126, 20.0)


def test_a_mark_is_seen_by_all_below_and_none_above(valley: Terrain) -> None:
    mark = np.zeros(valley.grid.shape, dtype=np.bool_)
    mark[10, 2] = True
    below = any_above(valley.direction, mark)
    assert below[10, 2] and below[10, 4] and below[14, 5]
    assert not below[9, 5] and not below[10, 7]


def test_an_area_that_just_reaches_the_limit_is_channel() -> None:
    area = np.array([[399.0, 400.0, np.nan]])
    np.testing.assert_array_equal(channel_cells(area, channel_area_m2=400.0), [[False, True, False]])


def test_the_valley_is_closed_inside_its_rim(valley: Terrain) -> None:
    assert not valley.open_catchment[1:15, 1:10].any()
    assert sides_feeding(valley.open_sides, [13 * 11 + 5, 12 * 11 + 5]) == ()


TURNS: list[tuple[Callable[..., npt.NDArray[np.float64]], str]] = [
    (lambda z: z, "N"),
    (np.flipud, "S"),
    (np.transpose, "W"),
    (lambda z: np.fliplr(z.T), "E"),
]


@pytest.mark.parametrize(("turn", "side"), TURNS, ids=[side for _, side in TURNS])
def test_ground_that_falls_away_from_the_edge_is_open_on_that_side(
    turn: Callable[..., npt.NDArray[np.float64]], side: str
) -> None:
    # a ditch: nothing comes in over its banks, all of it may come over the high end
    r, c = np.mgrid[0:20, 0:21]
    z = np.where((c == 0) | (c == 20), 0.0, 20.0 - 0.5 * r + np.abs(c - 10.0))
    got = terrain_of(np.ascontiguousarray(turn(z)), 10.0)
    middle = got.grid.cols * (got.grid.rows // 2) + got.grid.cols // 2
    assert sides_feeding(got.open_sides, [middle]) == (side,)
    assert got.open_catchment.flat[middle]


def test_a_hole_in_the_data_opens_what_lies_below_it_and_is_counted() -> None:
    r, c = np.mgrid[0:20, 0:21]
    z = 100.0 - r + 3.0 * np.abs(c - 10)
    z[0] = 0.0  # no water comes in from the north
    z[:, [0, -1]] = 0.0
    z[8, 10] = np.nan
    z[4, 3] = np.nan
    got = terrain_of(z, 10.0)
    assert got.enclosed_voids == 2
    assert sides_feeding(got.open_sides, [12 * 21 + 10]) == ("void",)
    assert sides_feeding(got.open_sides, [2 * 21 + 10]) == ()


def test_a_collar_without_data_counts_by_its_side_and_is_no_hole() -> None:
    z = np.repeat(np.arange(30.0, 0, -1)[:, None], 30, axis=1)
    z[:5] = np.nan  # a collar without data north of the ground
    got = terrain_of(z, 10.0)
    assert got.enclosed_voids == 0
    assert sides_feeding(got.open_sides, [20 * 30 + 15]) == ("N",)


@settings(max_examples=60, deadline=None)
@given(rows=SIDES, cols=SIDES, seed=SEEDS)
def test_open_sides_are_those_of_cells_above_that_lie_beside_them(rows: int, cols: int, seed: int) -> None:
    direction, _ = random_tree(rows, cols, seed)
    enclosed, count = enclosed_voids(direction != 255)
    assert count <= int(enclosed.sum())
    sides = open_sides(direction, enclosed)
    where = {(-1, 0): "N", (0, 1): "E", (1, 0): "S", (0, -1): "W"}
    for cell, above in enumerate(sets_above(direction)):
        found = set()
        for one in above:
            if direction.flat[one] > 8:
                continue
            row, col = divmod(one, cols)
            own, corners = set(), set()
            for down in (-1, 0, 1):
                for along in (-1, 0, 1):
                    r, c = row + down, col + along
                    inside = 0 <= r < rows and 0 <= c < cols
                    if inside and direction[r, c] != 255:
                        continue
                    if inside and enclosed[r, c]:
                        own.add("void")
                    elif down == 0 or along == 0:
                        own.add(where[down, along])
                    else:
                        corners |= {where[down, 0], where[0, along]}
            found |= own or corners
        assert set(sides_feeding(sides, [cell])) == found


def test_own_directions_are_followed_and_give_the_surface_that_agrees_with_them(valley: Terrain) -> None:
    own = valley.direction.copy()
    own[own == 9] = 255  # many programs leave the outermost cells without one
    got = terrain_of(worked_valley(), 20.0, flow_direction=own)
    np.testing.assert_array_equal(got.direction, valley.direction)
    np.testing.assert_array_equal(got.filled, valley.filled)
    np.testing.assert_array_equal(got.contributing_area_m2, valley.contributing_area_m2)
    np.testing.assert_array_equal(got.position, valley.position)


@settings(max_examples=60, deadline=None)
@given(rows=SIDES, cols=SIDES, seed=SEEDS)
def test_the_surface_of_own_directions_is_the_highest_ground_on_the_way_down(rows: int, cols: int, seed: int) -> None:
    direction, z = random_tree(rows, cols, seed)
    heights = np.where(np.isnan(z), np.nan, np.random.default_rng(seed + 2).random(z.shape)).astype(np.float32)
    got = follow(heights, direction)
    for cell in np.flatnonzero(direction.ravel() != 255):
        assert got.filled.flat[cell] == heights.ravel()[flow_path(direction, int(cell))].max()


def test_a_step_over_the_edge_or_into_a_void_ends_there() -> None:
    heights = np.array([[3.0, 2.0, 1.0, np.nan]], dtype=np.float32)
    got = follow(heights, np.array([[7, 1, 1, 0]], dtype=np.uint8))  # at a void any code will do
    assert got.direction.tolist() == [[9, 1, 9, 255]]


def test_own_directions_that_cannot_be_followed_are_refused_with_the_place() -> None:
    heights = np.ones((4, 5), dtype=np.float32)
    south = np.full((4, 5), 3, dtype=np.uint8)
    circle, strange, lost = south.copy(), south.copy(), south.copy()
    circle[1, 2], circle[1, 3] = 1, 5
    strange[2, 1] = 64
    lost[1, 1] = 255
    with pytest.raises(InputError, match=r"2 cells run in a circle, the first in row 1, column 2"):
        follow(heights, circle)
    with pytest.raises(InputError, match=r"1 cells hold a code .* row 2, column 1"):
        follow(heights, strange)
    with pytest.raises(InputError, match=r"1 cells have heights but no direction.* row 1, column 1"):
        follow(heights, lost)
    with pytest.raises(GridError, match=r"shape \(3, 5\)"):
        follow(heights, south[1:])
    with pytest.raises(ConfigError, match="give one of them"):
        terrain_of(heights, 10.0, flow_direction=south, pan_layer=np.zeros((4, 5), np.int8))
