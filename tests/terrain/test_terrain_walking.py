"""Walks over the ground: worked by hand, and against another library's least ways."""

from math import exp, hypot, sqrt
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.sparse import coo_array
from scipy.sparse.csgraph import dijkstra

from siting.errors import ConfigError, InputError
from siting.terrain.walking import Walks, walks

FloatArray = npt.NDArray[np.float64]
CELL_M = 50.0


def walk(
    elevation: npt.NDArray[Any],
    starts: list[list[int]],
    goals: list[list[int]] | None = None,
    *,
    reach_m: float = 1e6,
    width_m: float | FloatArray = CELL_M,
    height_m: float | FloatArray = CELL_M,
    **changed: Any,
) -> Walks:
    """Walk between cells (a list for each start and each goal); goals are all cells unless given."""
    rows = elevation.shape[0]
    goals = [[cell] for cell in range(elevation.size)] if goals is None else goals
    given: dict[str, Any] = {
        "start_cell": flat(starts),
        "start": numbers(starts),
        "starts": len(starts),
        "goal_cell": flat(goals),
        "goal": numbers(goals),
        "reach_m": reach_m,
        "cell_width_m": np.broadcast_to(width_m, rows).astype(np.float64),
        "cell_height_m": np.broadcast_to(height_m, rows).astype(np.float64),
    }
    return walks(elevation, **(given | changed))


def flat(cells: list[list[int]]) -> npt.NDArray[np.int64]:
    return np.array([cell for one in cells for cell in one], dtype=np.int64)


def numbers(cells: list[list[int]]) -> npt.NDArray[np.int64]:
    return np.repeat(np.arange(len(cells)), [len(one) for one in cells]).astype(np.int64)


def distances(found: Walks, shape: tuple[int, int]) -> FloatArray:
    """Distance of every cell from the only start, infinite out of reach."""
    far = np.full(shape[0] * shape[1], np.inf)
    far[found.goal] = found.distance_m
    return far.reshape(shape)


def slower(tangent: float) -> float:
    """Time there and back over that on the level, from the printed 6 km/h x exp(-3.5 |s + 0.05|), Tobler (1993)."""
    speeds = [6.0 * exp(-3.5 * abs(slope + 0.05)) for slope in (0.0, tangent, -tangent)]
    return 0.5 * (speeds[0] / speeds[1] + speeds[0] / speeds[2])


def test_level_ground_is_as_long_as_on_the_map() -> None:
    # a row of five, and two rows below it: along, across, diagonal, and the step between
    got = distances(walk(np.zeros((3, 5)), [[0]]), (3, 5))
    expected: list[list[float]] = [
        [0, 50, 100, 150, 200],
        [50, 50 * sqrt(2), 50 * sqrt(5), 50 + 50 * sqrt(5), 100 + 50 * sqrt(5)],
        [100, 50 * sqrt(5), 100 * sqrt(2), 50 * sqrt(2) + 50 * sqrt(5), 100 * sqrt(5)],
    ]
    np.testing.assert_allclose(got, expected)


def test_a_slope_counts_as_long_as_it_takes_there_and_back() -> None:
    # 10 % up: exp(3.5 x 0.10) there and exp(0) back, over the level; 4 %: exp(3.5 x 0.04) and exp(-3.5 x 0.04)
    assert slower(0.10) == pytest.approx(0.5 * (exp(0.35) + 1.0))
    for tangent in (0.04, 0.10, 0.5):
        ramp = np.arange(4) * tangent * CELL_M
        for heights in (ramp, -ramp, ramp[::-1]):
            got = distances(walk(heights[None, :], [[0]]), (1, 4))
            np.testing.assert_allclose(got[0], np.arange(4) * CELL_M * slower(tangent))


def test_steep_ground_is_walked_round_by_hand() -> None:
    # a block of 40 m in the middle of the way: over it two steps of 80 %, round it two diagonals
    ground = np.zeros((3, 3))
    ground[1, 1] = 40.0
    got = distances(walk(ground, [[3]]), (3, 3))
    assert got[1, 2] == pytest.approx(2 * hypot(50, 50))
    assert 2 * 50 * slower(0.8) > got[1, 2]


def test_no_step_leaps_over_a_ridge() -> None:
    # a ridge of 60 m, one cell wide and without a gap: every way climbs it, at best on the slope that rises fastest in
    # time, up and down, s = 1 / 3.5
    ground = np.zeros((6, 5))
    ground[:, 2] = 60.0
    got = distances(walk(ground, [[6]]), (6, 5))
    least = 2 * 60 * slower(1 / 3.5) * 3.5
    assert least < got[:, 3:].min() <= 2 * 50 * slower(60 / 50)


def test_a_void_is_walked_round() -> None:
    ground = np.zeros((4, 3))
    ground[:3, 1] = np.nan
    got = distances(walk(ground, [[0]]), (4, 3))
    assert np.isinf(got[:3, 1]).all()
    # down two rows, diagonally under the void and up again
    assert got[0, 2] == pytest.approx(100 + 50 * sqrt(2) + 50 * sqrt(2) + 100)
    ground[3, 1] = np.nan
    assert np.isinf(distances(walk(ground, [[0]]), (4, 3))[:, 2]).all()


def library_distances(ground: FloatArray, start: int, width: FloatArray, height: FloatArray) -> FloatArray:
    """Least ways of another library, over a graph made cell by cell."""
    rows, cols = ground.shape
    middle = np.cumsum(height) - 0.5 * height
    edges = []
    for row, col in np.ndindex(rows, cols):
        for down, right in np.ndindex(5, 5):
            to = row + down - 2, col + right - 2
            squares = (down - 2) ** 2 + (right - 2) ** 2
            if squares not in (1, 2, 5) or not (0 <= to[0] < rows and 0 <= to[1] < cols):
                continue
            length = hypot((right - 2) * 0.5 * (width[row] + width[to[0]]), middle[to[0]] - middle[row])
            heights = [ground[row, col], ground[to]]
            if squares == 5:
                if abs(right - 2) == 2:
                    crossed = (row, col + (right - 2) // 2), (to[0], col + (right - 2) // 2)
                else:
                    crossed = (row + (down - 2) // 2, col), (row + (down - 2) // 2, to[1])
                heights.insert(1, 0.5 * (ground[crossed[0]] + ground[crossed[1]]))
            part = length / (len(heights) - 1)
            way = sum(part * slower(rise / part) for rise in np.diff(heights))
            if np.isfinite(way):
                edges.append((row * cols + col, to[0] * cols + to[1], way))
    from_cell, to_cell, ways = zip(*edges, strict=True)
    graph = coo_array((ways, (from_cell, to_cell)), shape=(ground.size, ground.size)).tocsr()
    return np.asarray(dijkstra(graph, indices=start))


@settings(max_examples=25, deadline=None)
@given(rows=st.integers(2, 9), cols=st.integers(2, 9), seed=st.integers(0, 2**32 - 1))
def test_ways_agree_with_another_library(rows: int, cols: int, seed: int) -> None:
    draw = np.random.default_rng(seed)
    ground = draw.uniform(0, 40, (rows, cols))
    ground[draw.random((rows, cols)) < 0.15] = np.nan
    start = int(draw.integers(rows * cols))
    ground.flat[start] = 20.0
    width, height = np.linspace(50.0, 62.0, rows), np.linspace(75.0, 51.0, rows)
    theirs = library_distances(ground, start, width, height)
    got = distances(walk(ground, [[start]], width_m=width, height_m=height), (rows, cols)).ravel()
    known = np.isfinite(ground.ravel())
    np.testing.assert_allclose(got[known], theirs[known], rtol=1e-12)
    # within a limit: the same ones, no others
    limit = 1.0 + float(np.median(theirs[np.isfinite(theirs)]))
    near = distances(walk(ground, [[start]], width_m=width, height_m=height, reach_m=limit), (rows, cols)).ravel()
    np.testing.assert_array_equal(np.isfinite(near), (theirs <= limit) & known)


def test_the_nearest_cell_of_an_area_counts_and_threads_change_nothing() -> None:
    ground = np.random.default_rng(3).uniform(0, 5, (12, 20))
    starts, goals = [[0, 1, 2], [239], []], [[5, 25], [230], [7]]
    got = walk(ground, starts, goals)
    assert got.start.tolist() == [0, 0, 0, 1, 1, 1]
    assert got.goal.tolist() == [0, 1, 2, 0, 1, 2]
    singles = [distances(walk(ground, [[cell]]), (12, 20)).ravel() for cell in (0, 1, 2)]
    assert got.distance_m[0] == pytest.approx(min(far[cell] for far in singles for cell in (5, 25)))
    assert got.reach_cut.tolist() == [True, True, True]
    again = walk(ground, starts, goals, threads=2)
    np.testing.assert_array_equal(again.distance_m, got.distance_m)
    back = walk(ground, goals, starts)
    np.testing.assert_allclose(np.sort(back.distance_m), np.sort(got.distance_m))


def test_errors_of_small_cells_do_not_lengthen_the_way() -> None:
    # cells of 10 m with an error of 1 m: step by step a fifth of all slopes would be over 20 %
    noise = np.random.default_rng(8).normal(0.0, 1.0, (300, 300))
    start, goal = 150 * 300 + 20, 150 * 300 + 220
    got = walk(noise, [[start]], [[goal]], width_m=10.0, height_m=10.0)
    assert got.distance_m[0] == pytest.approx(2000.0, rel=0.005)


def test_no_level_way_is_over_3_percent_too_long() -> None:
    far = distances(walk(np.zeros((41, 41)), [[20 * 41 + 20]]), (41, 41))
    row, col = np.indices((41, 41)) - 20
    straight = np.maximum(50 * np.hypot(row, col), 1.0)
    stretch = far / straight
    assert stretch.max() == pytest.approx(1.0275, abs=0.001)
    np.testing.assert_array_less(1 - 1e-12, stretch[straight > 1])


def test_a_reach_that_meets_the_edge_or_a_void_is_cut() -> None:
    ground = np.zeros((21, 21))
    middle = [[10 * 21 + 10]]
    # nine steps along a row stay one cell away from the edge, ten do not
    assert not walk(ground, middle, reach_m=499.0).reach_cut[0]
    assert walk(ground, middle, reach_m=500.0).reach_cut[0]
    ground[10, 13] = np.nan
    assert not walk(ground, middle, reach_m=99.0).reach_cut[0]
    assert walk(ground, middle, reach_m=100.0).reach_cut[0]


def test_a_few_cells_without_height_do_not_cut_a_reach_of_small_cells() -> None:
    ground = np.zeros((210, 210))
    start = [[105 * 210 + 105]]
    ground[110:112, 110:112] = np.nan
    assert not walk(ground, start, [[0]], reach_m=300.0, width_m=10.0, height_m=10.0).reach_cut[0]
    ground[110:115, 110:115] = np.nan
    assert walk(ground, start, [[0]], reach_m=300.0, width_m=10.0, height_m=10.0).reach_cut[0]


@pytest.mark.parametrize(
    ("changed", "error", "said"),
    [
        ({"reach_m": 0.0}, ConfigError, "reach of a walk is 0 m"),
        ({"start_cell": np.array([99])}, InputError, "cell 99 of a start lies outside the grid of 9 cells"),
        ({"goal_cell": np.array([-1]), "goal": np.array([0])}, InputError, "cell -1 of a goal lies outside"),
        ({"start": np.array([1])}, InputError, "start 1 is not one of the 1 starts"),
        ({"goal": np.array([0])}, InputError, "9 cells of 1 goals"),
        ({"start_cell": np.array([4])}, InputError, "starts on cell 4, which has no height"),
    ],
)
def test_what_makes_no_sense_is_refused(changed: dict[str, Any], error: type[Exception], said: str) -> None:
    ground = np.zeros((3, 3))
    ground[1, 1] = np.nan
    with pytest.raises(error, match=said):
        walk(ground, [[0]], **changed)
