"""Multiple-flow area: against a plain statement, the same bits whatever the blocks and threads, and by hand."""

from collections.abc import Callable
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from made_ground import RASTERS, Heights, conditioned, fractal, kinds_of_ground
from plain_reference import Plain

from siting.errors import GridError
from siting.terrain.area import multiple_flow_area

KINDS = kinds_of_ground(211)


def shared(filled: Heights, direction: npt.NDArray[np.uint8], **how: Any) -> npt.NDArray[np.float64]:
    """Share water on cells of 10 m x 12 m."""
    ones = np.ones(direction.shape[0])
    return multiple_flow_area(
        filled, direction, cell_area_m2=ones * 120.0, cell_width_m=ones * 10.0, cell_height_m=ones * 12.0, **how
    )


@settings(max_examples=100, deadline=None)
@given(z=RASTERS, seed=st.integers(0, 2**16), block=st.sampled_from([1, 2, 3, 5, 16]))
def test_small_rasters_agree_with_the_plain_statement(z: Heights, seed: int, block: int) -> None:
    sinks = (np.random.default_rng(seed).random(z.shape) < 0.04) & np.isfinite(z)
    got = conditioned(z, sinks=sinks)
    area = shared(got.filled, got.direction, block=block, threads=1 + seed % 3)
    np.testing.assert_allclose(area, Plain(z, sinks, 10.0, 12.0).multiple_flow(120.0, 10.0, 12.0), rtol=1e-12)
    whole = shared(got.filled, got.direction, block=64)
    np.testing.assert_array_equal(area.view(np.uint64), whole.view(np.uint64))


@pytest.mark.parametrize("kind", KINDS)
def test_blocks_and_threads_change_no_bit(kind: str) -> None:
    got = conditioned(KINDS[kind])
    one = shared(got.filled, got.direction, block=4096)
    for block, threads in ((1, 2), (7, 3), (37, 5), (64, 1), (210, 2), (256, 2)):
        other = shared(got.filled, got.direction, block=block, threads=threads)
        np.testing.assert_array_equal(other.view(np.uint64), one.view(np.uint64))


@pytest.mark.parametrize("kind", KINDS)
def test_all_water_reaches_an_end(kind: str) -> None:
    got = conditioned(KINDS[kind], sinks=KINDS[kind] == np.nanmin(KINDS[kind]))
    area = shared(got.filled, got.direction, threads=2)
    ends = (got.direction == 9) | (got.direction == 10)
    valid = got.direction != 255
    assert area[ends].sum() == pytest.approx(120.0 * np.count_nonzero(valid), rel=1e-12)
    assert np.all(area[valid] >= 120.0)
    assert np.isnan(area[~valid]).all()


def test_falls_of_very_different_size_lose_no_water() -> None:
    # near 0 m the steps of 32-bit heights are uneven: sums of falls need more digits than the falls have
    rng = np.random.default_rng(31)
    z = (rng.choice([-1.0, 1.0], (90, 90)) * 10.0 ** rng.uniform(-12.0, 2.0, (90, 90))).astype(np.float32)
    got = conditioned(z)
    area = shared(got.filled, got.direction, threads=2)
    assert area[got.direction == 9].sum() == pytest.approx(120.0 * z.size, rel=1e-12)


TURNS: list[Callable[[Any], Any]] = [np.rot90, np.flipud, np.fliplr, np.transpose, lambda z: np.rot90(z, 2)]


@pytest.mark.parametrize("turn", TURNS)
def test_turning_the_ground_turns_the_area(turn: Callable[[Any], Any]) -> None:
    # no two cells alike, and all pits are ends: directions, whose ties have an order, play no part
    z = conditioned(fractal(60, 23)).filled
    ramp = np.arange(3600, dtype=np.float32).reshape(60, 60)
    z = np.asarray(np.argsort(np.argsort((z + 1e-6 * ramp).ravel())).reshape(60, 60), dtype=np.float32)
    size = np.full(60, 10.0)
    cells: dict[str, Any] = {"cell_area_m2": size * 10, "cell_width_m": size, "cell_height_m": size}

    def of(heights: Heights) -> npt.NDArray[np.float64]:
        done = conditioned(heights)
        direction = np.where(done.filled > heights, 10, done.direction).astype(np.uint8)  # every pit
        return multiple_flow_area(heights, direction, **cells)

    np.testing.assert_allclose(of(np.ascontiguousarray(turn(z))), turn(of(z)), rtol=1e-12)


def test_multiple_flow_keeps_all_water() -> None:
    z = fractal(120, 19, whole_metres=True)
    got = conditioned(z)
    size = np.full(120, 10.0)
    area = multiple_flow_area(got.filled, got.direction, cell_area_m2=size * 10, cell_width_m=size, cell_height_m=size)
    assert area[got.direction == 9].sum() == pytest.approx(100.0 * z.size, rel=1e-9)
    assert np.all(area >= 100.0)


def test_multiple_flow_on_a_plane_grows_by_a_row_each_row() -> None:
    # a plane that falls south: every cell of a row carries the rows above it (away from the sides)
    z = np.repeat(np.arange(30, 0, -1.0)[:, None], 61, axis=1).astype(np.float32)
    got = conditioned(z)
    size = np.full(30, 10.0)
    area = multiple_flow_area(got.filled, got.direction, cell_area_m2=size * 10, cell_width_m=size, cell_height_m=size)
    np.testing.assert_allclose(area[:, 30], 100.0 * np.arange(1, 31))


def test_directions_against_the_fall_lose_no_water_in_multiple_flow() -> None:
    # a user's own direction to an equal neighbour although a lower one is there
    z = np.array([[3, 3, 3, 3, 3], [3, 2, 2, 2, 3], [3, 2, 2, 1.5, 3], [3, 3, 3, 0, 3]], dtype=np.float32)
    got = conditioned(z)
    direction = got.direction.copy()
    direction[1, 2] = 3
    size = np.full(4, 10.0)
    area = multiple_flow_area(got.filled, direction, cell_area_m2=size * 10, cell_width_m=size, cell_height_m=size)
    assert area[direction == 9].sum() == pytest.approx(100.0 * z.size)


def test_a_circle_of_flow_is_refused_not_summed() -> None:
    circle = np.array([[1, 1, 5, 9]], dtype=np.uint8)
    level = np.ones((1, 4), dtype=np.float32)
    one = np.ones(1)
    with pytest.raises(GridError, match="circle"):
        multiple_flow_area(level, circle, cell_area_m2=one, cell_width_m=one, cell_height_m=one)
