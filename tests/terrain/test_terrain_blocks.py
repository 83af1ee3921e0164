"""One result, whatever the blocks and threads; equal to a plain statement and to two other libraries."""

import numpy as np
import numpy.typing as npt
import pyflwdir
import pytest
import richdem
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp
from plain_reference import Plain

from siting.errors import GridError
from siting.terrain.area import accumulate, multiple_flow_area
from siting.terrain.condition import Conditioned, condition

Heights = npt.NDArray[np.float32]

SHAPES = hnp.array_shapes(min_dims=2, max_dims=2, min_side=1, max_side=11)
FEW_HEIGHTS = st.sampled_from([0.0, -0.0, 1.0, 2.0, 3.0, np.nan, np.inf, 2.5])
RASTERS = hnp.arrays(np.float32, SHAPES, elements=FEW_HEIGHTS)


def conditioned(
    z: Heights, *, sinks: npt.NDArray[np.bool_] | None = None, block: int = 256, threads: int = 1
) -> Conditioned:
    rows = z.shape[0]
    return condition(
        z,
        cell_width_m=np.full(rows, 10.0),
        cell_height_m=np.full(rows, 12.0),
        sinks=sinks,
        threads=threads,
        block=block,
    )


def fractal(side: int, seed: int, *, whole_metres: bool = False) -> Heights:
    rng = np.random.default_rng(seed)
    frequency = np.hypot(np.fft.fftfreq(side)[:, None], np.fft.rfftfreq(side)[None, :])
    frequency[0, 0] = 1.0
    spectrum = np.fft.rfft2(rng.standard_normal((side, side))) * frequency**-1.7
    spectrum[0, 0] = 0.0
    z = np.fft.irfft2(spectrum, s=(side, side))
    z = 500.0 + 60.0 * z / z.std()
    heights: Heights = (np.round(z) if whole_metres else z).astype(np.float32)
    return heights


@settings(max_examples=150, deadline=None)
@given(z=RASTERS, seed=st.integers(0, 2**16), block=st.sampled_from([1, 2, 3, 5, 16]))
def test_small_rasters_equal_the_plain_statement_bit_for_bit(z: Heights, seed: int, block: int) -> None:
    sinks = np.random.default_rng(seed).random(z.shape) < 0.04
    plain = Plain(z, sinks & np.isfinite(z), 10.0, 12.0)
    got = conditioned(z, sinks=sinks & np.isfinite(z), block=block, threads=1 + seed % 3)
    np.testing.assert_array_equal(got.filled.view(np.uint32), plain.filled.view(np.uint32))
    np.testing.assert_array_equal(got.direction, plain.direction)
    area = accumulate(got.direction, np.full(z.shape[0], 120.0), threads=2, block=block)
    np.testing.assert_array_equal(area, plain.area(120.0))


@pytest.mark.parametrize("whole_metres", [False, True])
def test_blocks_and_threads_change_no_bit(whole_metres: bool) -> None:
    z = fractal(211, 3, whole_metres=whole_metres)
    z[40:60, 100:130] = np.nan
    weight = np.arange(211) / 1024.0 + 100.0
    one = conditioned(z, block=4096)
    area = accumulate(one.direction, weight, threads=1, block=4096)
    for block, threads in ((16, 2), (37, 3), (64, 1), (256, 2)):
        other = conditioned(z, block=block, threads=threads)
        np.testing.assert_array_equal(
            np.ascontiguousarray(other.filled).view(np.uint32),
            np.ascontiguousarray(one.filled).view(np.uint32),
        )
        np.testing.assert_array_equal(other.direction, one.direction)
        np.testing.assert_array_equal(accumulate(other.direction, weight, threads=threads, block=block), area)


def test_no_cell_is_left_undrained_and_no_water_is_lost() -> None:
    z = fractal(300, 5, whole_metres=True)
    got = conditioned(z, block=64, threads=2)
    assert not np.any(got.direction == 0)
    area = accumulate(got.direction, np.full(300, 120.0), threads=2, block=64)
    assert area[got.direction == 9].sum() == 120.0 * z.size  # exact, not nearly


def test_fill_equals_two_independent_libraries_cell_for_cell() -> None:
    # pyflwdir.dem.fill_depressions shares the outlet rule; richdem's plain fill agrees where no void is enclosed
    z = fractal(300, 7)
    got = conditioned(z, block=64, threads=2).filled
    other, _ = pyflwdir.dem.fill_depressions(z, nodata=-9999.0, max_depth=-1, connectivity=8)
    np.testing.assert_array_equal(got, other)
    raster = richdem.rdarray(z.copy(), no_data=-9999.0)
    raster.geotransform = (0.0, 1.0, 0.0, 0.0, 0.0, -1.0)
    np.testing.assert_array_equal(got, np.asarray(richdem.FillDepressions(raster, epsilon=False)))


def test_directions_on_long_rows_equal_plain_array_arithmetic() -> None:
    # rows longer than 64 cells: a compiler was seen to spoil stores in vectorised loops
    z = fractal(150, 11)
    got = conditioned(z)
    w = np.pad(np.asarray(got.filled), 1, constant_values=np.nan)
    steps = ((0, 1), (1, 1), (1, 0), (1, -1), (0, -1), (-1, -1), (-1, 0), (-1, 1))
    falls = []
    for row, col in steps:
        inverse = np.float32(1.0 / np.hypot(10.0 * col, 12.0 * row))
        there = w[1 + row : 151 + row, 1 + col : 151 + col]
        falls.append(np.nan_to_num((w[1:-1, 1:-1] - there) * inverse, nan=-1.0))
    stack = np.stack(falls)
    expected = np.argmax(stack, axis=0) + 1
    sloping = stack.max(axis=0) > 0
    np.testing.assert_array_equal(got.direction[sloping], expected[sloping])


def test_turning_the_ground_turns_the_filled_surface() -> None:
    z = fractal(90, 13, whole_metres=True)
    for turned in (np.rot90, np.flipud, np.fliplr, np.transpose):
        np.testing.assert_array_equal(
            np.asarray(conditioned(turned(z).copy()).filled), turned(np.asarray(conditioned(z).filled))
        )


def test_raising_all_ground_changes_no_direction() -> None:
    z = fractal(90, 17, whole_metres=True)  # whole metres: adding one is exact
    np.testing.assert_array_equal(conditioned(z).direction, conditioned(z + 1).direction)


def test_a_cell_at_the_edge_with_lower_ground_inside_drains_inward() -> None:
    z = np.array([[9, 9, 9], [9, 1, 9], [9, 0, 9]], dtype=np.float32)
    got = conditioned(z)
    assert got.direction[1, 0] == 1  # to the east (8/10 beats 9/15.6 to the south-east), not over the edge
    assert got.direction[2, 1] == 9


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


@pytest.mark.parametrize("codes", [[1, 0, 9], [1, 1, 1], [1, 11, 9], [1, 255, 9], [7, 1, 9]])
def test_directions_that_lead_nowhere_are_refused(codes: list[int]) -> None:
    with pytest.raises(GridError, match="no code or lead off"):
        accumulate(np.array([codes], dtype=np.uint8), np.ones(1), threads=1)


def test_a_circle_of_flow_is_refused_not_summed() -> None:
    circle = np.array([[1, 1, 5, 9]], dtype=np.uint8)
    with pytest.raises(GridError, match="through or above 2 cells"):
        accumulate(circle, np.ones(1), threads=1)
    level = np.ones((1, 4), dtype=np.float32)
    one = np.ones(1)
    with pytest.raises(GridError, match="circle"):
        multiple_flow_area(level, circle, cell_area_m2=one, cell_width_m=one, cell_height_m=one)
