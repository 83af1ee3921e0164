"""One result, whatever the blocks and threads; equal to a plain statement and to two other libraries."""

import numpy as np
import pyflwdir
import pytest
import richdem
from hypothesis import given, settings
from hypothesis import strategies as st
from made_ground import RASTERS, Heights, conditioned, fractal, kinds_of_ground
from plain_reference import STEPS, Plain

from siting.errors import GridError
from siting.terrain.area import accumulate
from siting.terrain.condition import with_ring


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


def spiral(side: int) -> Heights:
    """Make a level corridor that winds inward between walls: one flat, whose steps go through every block many times."""
    z = np.full((side, side), 9.0, dtype=np.float32)
    row, col, turn = 0, 0, 0
    z[row, col] = 1.0
    while True:
        for _ in range(2):
            down, along = ((0, 1), (1, 0), (0, -1), (-1, 0))[turn % 4]
            beyond = (row + 2 * down, col + 2 * along)
            if all(0 <= at < side for at in beyond) and z[beyond] == 9.0:
                break
            turn += 1
        else:
            return z
        ahead = (row + down, col + along)
        z[ahead], row, col = 1.0, *ahead


KINDS = kinds_of_ground(211) | {"spiral": spiral(150), "level": np.ones((130, 70), dtype=np.float32)}


@pytest.mark.parametrize("kind", KINDS)
def test_blocks_and_threads_change_no_bit(kind: str) -> None:
    z = KINDS[kind]
    sinks = z == np.nanmin(z) if kind == "pans" else None
    weight = np.arange(z.shape[0]) / 1024.0 + 100.0
    one = conditioned(z, sinks=sinks, block=4096)
    area = accumulate(one.direction, weight, threads=1, block=4096)
    for block, threads in ((7, 2), (16, 2), (37, 3), (64, 1), (210, 5), (256, 2)):
        other = conditioned(z, sinks=sinks, block=block, threads=threads)
        np.testing.assert_array_equal(
            np.ascontiguousarray(other.filled).view(np.uint32),
            np.ascontiguousarray(one.filled).view(np.uint32),
        )
        np.testing.assert_array_equal(other.direction, one.direction)
        np.testing.assert_array_equal(accumulate(other.direction, weight, threads=threads, block=block), area)


def test_flats_that_wind_through_many_blocks_equal_the_plain_statement() -> None:
    z = spiral(41)
    plain = Plain(z, np.zeros(z.shape, dtype=np.bool_), 10.0, 12.0)
    for block in (5, 16, 64):
        np.testing.assert_array_equal(conditioned(z, block=block, threads=2).direction, plain.direction)


def test_the_ring_of_a_surface_is_taken_over_only_where_it_is_one() -> None:
    filled = conditioned(fractal(40, 43)).filled
    ring = with_ring(filled)
    assert ring is filled.base
    other = with_ring(filled.copy())
    np.testing.assert_array_equal(other, ring)
    larger = np.zeros((42, 42), dtype=np.float32)
    assert np.isnan(with_ring(larger[1:-1, 1:-1])[0]).all()  # the inside of something else


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


@pytest.mark.parametrize("codes", [[1, 0, 9], [1, 1, 1], [1, 11, 9], [1, 255, 9], [7, 1, 9]])
def test_directions_that_lead_nowhere_are_refused(codes: list[int]) -> None:
    with pytest.raises(GridError, match="no code or lead off"):
        accumulate(np.array([codes], dtype=np.uint8), np.ones(1), threads=1)


def test_every_direction_that_leads_nowhere_is_counted() -> None:
    rng = np.random.default_rng(41)
    codes = rng.choice([0, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 200, 255], (9, 150)).astype(np.uint8)
    around = np.pad(codes, 1, constant_values=255)
    astray = 0
    for row, col in np.ndindex(codes.shape):
        code = int(codes[row, col])
        step = STEPS[code - 1] if 1 <= code <= 8 else (0, 0)
        lost = 1 <= code <= 8 and around[row + 1 + step[0], col + 1 + step[1]] == 255
        astray += lost or code not in {*range(1, 11), 255}
    with pytest.raises(GridError, match=f"^{astray} cells"):
        accumulate(codes, np.ones(9), threads=2)


def test_a_circle_of_flow_is_refused_not_summed() -> None:
    circle = np.array([[1, 1, 5, 9]], dtype=np.uint8)
    with pytest.raises(GridError, match="through or above 2 cells"):
        accumulate(circle, np.ones(1), threads=1)
