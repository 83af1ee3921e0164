"""Closed depressions: the tests that keep or doubt them, the user's word, and what ends there."""

import sys
from typing import Any

import numpy as np
import pytest
from ground import bowl, box, terrain_of
from hypothesis import given, settings
from hypothesis import strategies as st
from made_ground import kinds_of_ground

from siting.errors import ConfigError, GridError
from siting.terrain import accumulate
from siting.terrain.condition import condition, end_in_pans
from siting.terrain.pans import DOUBTFUL, GIVEN, KEPT, find_pans

KINDS = kinds_of_ground(211)
KINDS["below zero"] = -np.abs(KINDS["pans"] - 520.0)
KINDS["about zero"] = np.round(KINDS["terraced"] - 500.0) * np.float32(-1.0)  # -0.0 among them


def test_a_pan_has_the_area_depth_and_volume_of_its_box() -> None:
    # 8 x 8 cells of 20 m, 3 m deep: 25 600 m2 and 76 800 m3
    got = terrain_of(box(3.0, 8), 20.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0)
    pans = got.pans
    assert pans.status == (KEPT,)
    assert pans.pan_id.tolist() == [1]
    assert pans.area_m2[0] == 64 * 400.0
    assert pans.depth_m[0] == 3.0
    assert pans.volume_m3[0] == 64 * 400.0 * 3.0
    assert int((pans.label == 1).sum()) == 64
    assert pans.bottom_cell[0] == 10 * 40 + 10  # the first of the lowest
    assert got.direction[10, 10] == 10
    np.testing.assert_array_equal(pans.kept_mask(), pans.label == 1)
    assert not pans.doubtful_mask().any()


def test_a_pan_spills_beside_itself_at_its_lowest_rim() -> None:
    z = box(3.0, 8)
    z[18, 13] = 49.5  # a notch in the southern rim, and a gully that leads on from it
    z[19:, 13] = np.linspace(49.4, 48.0, 21)
    got = terrain_of(z, 20.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0)
    assert got.pans.depth_m[0] == 2.5
    assert got.pans.spill_cell[0] == 18 * 40 + 13


# e = 1 m, 16 cells a side of 25 m: 160 000 m2, n = 16, so the mean limit is 2 / sqrt(16) = 0.5 m; doubt from 0.25 m
@pytest.mark.parametrize(
    ("depth", "status"),
    [(2.0, (KEPT,)), (0.51, (KEPT,)), (0.49, (DOUBTFUL,)), (0.26, (DOUBTFUL,)), (0.24, ())],
)
def test_wide_pans_are_kept_by_their_mean_depth(depth: float, status: tuple[str, ...]) -> None:
    got = terrain_of(box(depth, 16), 25.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0)
    assert got.pans.status == status
    assert int((got.direction == 10).sum()) == (1 if status == (KEPT,) else 0)


# one hectare exactly: n = 1, so mean and greatest depth have the same limit 2 e; less area is never listed
@pytest.mark.parametrize(("least_m2", "status"), [(10_000.0, (KEPT,)), (10_000.5, ())])
def test_a_pan_must_reach_the_least_area(least_m2: float, status: tuple[str, ...]) -> None:
    got = terrain_of(box(2.0, 4), 25.0, vertical_error_m=1.0, pan_min_area_m2=least_m2)
    assert got.pans.status == status


def test_a_narrow_deep_spot_keeps_a_shallow_pan() -> None:
    # mean depth far below the limit of 2 m for one hectare, greatest depth above it
    z = box(0.1, 4)
    z[11, 11] -= 2.0
    got = terrain_of(z, 25.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0)
    assert got.pans.status == (KEPT,)
    assert got.direction[11, 11] == 10


def test_patches_that_touch_by_a_corner_are_one_pan() -> None:
    z = box(3.0, 5)
    z[15:20, 15:20] -= 3.0
    got = terrain_of(z, 20.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0)
    assert got.pans.status == (KEPT,)
    assert got.pans.area_m2[0] == 50 * 400.0


def test_a_deep_pan_ends_the_flow_and_a_shallow_one_is_drained() -> None:
    kept = terrain_of(bowl(3.0), 20.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0)
    assert kept.pans.status == (KEPT,)
    assert kept.pans.depth_m[0] == pytest.approx(3.0, abs=0.7)
    assert np.count_nonzero(kept.direction == 10) == 1
    drained = terrain_of(bowl(0.2), 20.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0)
    assert not np.any(drained.direction == 10)


def test_a_doubtful_pan_is_listed_and_drained() -> None:
    got = terrain_of(bowl(1.3), 20.0, vertical_error_m=3.0, pan_min_area_m2=10_000.0)
    assert got.pans.status == (DOUBTFUL,)
    assert got.pans.doubtful_mask().sum() * 400.0 == got.pans.area_m2[0]
    assert not got.pans.kept_mask().any()
    assert not np.any(got.direction == 10)


def test_the_users_word_on_a_depression_wins_both_ways() -> None:
    layer = np.zeros((60, 60), dtype=np.int8)
    layer[30, 30] = -1
    never = terrain_of(bowl(3.0), 20.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0, pan_layer=layer)
    assert never.pans.status == ()
    assert not np.any(never.direction == 10)
    always = terrain_of(bowl(0.2), 20.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0, pan_layer=-layer)
    assert always.pans.status == (GIVEN,)
    assert always.direction[30, 30] == 10


def test_a_pan_given_where_the_heights_show_none_ends_the_flow_at_its_lowest_cell() -> None:
    r, c = np.mgrid[0:30, 0:30]
    z = 100.0 - 0.5 * r + 0.01 * c
    layer = np.zeros((30, 30), dtype=np.int8)
    layer[10:14, 5:9] = 1
    layer[10:14, 20:22] = 1
    got = terrain_of(z, 20.0, vertical_error_m=1.0, pan_layer=layer)
    assert got.pans.status == (GIVEN, GIVEN)
    assert got.pans.area_m2.tolist() == [16 * 400.0, 8 * 400.0]
    assert got.pans.volume_m3.tolist() == [0.0, 0.0]
    assert got.pans.bottom_cell.tolist() == [13 * 30 + 5, 13 * 30 + 20]
    assert got.direction[13, 5] == 10 and got.direction[13, 20] == 10
    assert got.contributing_area_m2[13, 5] > 400.0


def test_own_directions_say_which_depressions_end_the_flow() -> None:
    first = terrain_of(bowl(3.0), 20.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0)
    ended = terrain_of(bowl(3.0), 20.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0, flow_direction=first.direction)
    assert ended.pans.status == (GIVEN,)
    np.testing.assert_array_equal(ended.contributing_area_m2, first.contributing_area_m2)
    through = terrain_of(bowl(3.0), 20.0).direction
    drained = terrain_of(bowl(3.0), 20.0, vertical_error_m=1.0, pan_min_area_m2=10_000.0, flow_direction=through)
    assert drained.pans.status == (DOUBTFUL,)
    np.testing.assert_array_equal(drained.direction, through)


@settings(max_examples=25, deadline=None)
@given(seed=st.integers(0, 2**32 - 1), error_m=st.sampled_from([0.2, 1.0, 3.0]))
def test_pans_neither_make_nor_lose_water(seed: int, error_m: float) -> None:
    rng = np.random.default_rng(seed)
    z = np.round(rng.random((24, 31)) * 9)
    z[rng.random(z.shape) < 0.03] = np.nan
    layer = rng.choice([-1, 0, 1], size=z.shape, p=[0.02, 0.96, 0.02]).astype(np.int8)
    got = terrain_of(z, 20.0, vertical_error_m=error_m, pan_min_area_m2=800.0, pan_layer=layer)
    ends = (got.direction == 9) | (got.direction == 10)
    assert got.contributing_area_m2[ends].sum() == 400.0 * np.isfinite(z).sum()
    assert float(got.multiple_flow_area_m2[ends].sum()) == pytest.approx(400.0 * np.isfinite(z).sum(), rel=1e-9)
    assert not np.any(got.direction == 0)
    # every listed pan that ends the flow does so, once, at its lowest cell; no other cell does
    kept = [cell for cell, status in zip(got.pans.bottom_cell, got.pans.status, strict=True) if status != DOUBTFUL]
    assert sorted(kept) == np.flatnonzero(got.direction.ravel() == 10).tolist()
    for pan, bottom in zip(got.pans.pan_id, got.pans.bottom_cell, strict=True):
        assert got.elevation.flat[bottom] == got.elevation[got.pans.label == pan].min()
    count = accumulate(got.direction, np.ones(24), threads=1)
    assert np.nansum(count[ends]) == np.isfinite(z).sum()
    assert np.all(got.filled[np.isfinite(z)] >= got.elevation[np.isfinite(z)])
    assert not np.any(got.height_above_channel_m < 0)


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("most_cells", [2**32, 10], ids=["inside pans", "all anew"])
def test_what_is_worked_out_inside_pans_equals_working_it_all_out(
    kind: str, most_cells: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    # a raster of more cells than a heap can number is filled anew as a whole
    z = KINDS[kind]
    z[30:33, 100:104] = z[30:33, 100:104].mean()  # ground that is kept, though no depression
    given_ground = np.zeros(z.shape, dtype=np.int8)
    given_ground[30:33, 100:104] = 1
    size: dict[str, Any] = {"cell_width_m": np.full(len(z), 10.0), "cell_height_m": np.full(len(z), 12.0), "threads": 2}
    plain = condition(z, sinks=None, **size)
    rule: dict[str, Any] = {"cell_area_m2": np.full(len(z), 120.0), "vertical_error_m": 0.5, "pan_min_area_m2": 500.0}
    pans = find_pans(plain, z, pan_layer=given_ground, **rule)
    ends = np.array(pans.status) != DOUBTFUL
    assert ends.sum() > 10
    sinks = np.zeros(z.shape, dtype=np.bool_)
    sinks.flat[pans.bottom_cell[ends]] = True
    whole = condition(z, sinks=sinks, **size)
    monkeypatch.setattr(sys.modules[condition.__module__], "PLACE_MASK", most_cells)
    for block in (37, 256):
        got = end_in_pans(
            plain,
            z,
            label=pans.label,
            pan_id=pans.pan_id[ends],
            bottom_cell=pans.bottom_cell[ends],
            block=block,
            **size,
        )
        np.testing.assert_array_equal(got.filled.copy().view(np.uint32), whole.filled.copy().view(np.uint32))
        np.testing.assert_array_equal(got.direction, whole.direction)
        assert got.flat_cells == whole.flat_cells


def test_settings_out_of_range_are_refused_by_name() -> None:
    for name, value in (
        ("vertical_error_m", 0.0),
        ("channel_area_m2", np.nan),
        ("pan_min_area_m2", -1.0),
        ("vertical_error_m", np.inf),
    ):
        with pytest.raises(ConfigError, match=name):
            terrain_of(bowl(1.0), 20.0, **{name: value})
    with pytest.raises(GridError, match="pan_layer has shape"):
        terrain_of(bowl(1.0), 20.0, pan_layer=np.zeros((3, 3), np.int8))
