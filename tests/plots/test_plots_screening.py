"""Screening: each test alone, its margin, its order, and strips that do not depend on the size of cells."""

from dataclasses import fields
from typing import Any

import numpy as np
import pytest

from siting.plots import Ground, Limits, Screening, deepest_part, judge, screen, strip_share_left

SHAPE = (5, 5)
E, SOUTH = 1, 3


def screened(**changed: Any) -> Screening:
    """Screen ground on which every cell passes with room, but for what is changed."""
    return screen(*ground_and_limits(with_room() | changed))


def with_room() -> dict[str, Any]:
    return {
        "valid": np.ones(SHAPE, dtype=np.bool_),
        "inside": None,
        "excluded": None,
        "soil_depth_m": 1.0,
        "slope": np.full(SHAPE, 0.02, dtype=np.float32),
        "position": np.full(SHAPE, 4, dtype=np.uint8),
        "height_above_channel_m": np.full(SHAPE, 2.0, dtype=np.float32),
        "multiple_flow_area_m2": np.full(SHAPE, 5000.0),
        "contributing_area_m2": np.full(SHAPE, 5000.0),
        "channel": np.zeros(SHAPE, dtype=np.bool_),
        "direction": np.full(SHAPE, SOUTH, dtype=np.uint8),
        "pan_deepest": np.zeros(SHAPE, dtype=np.bool_),
        "cell_width_m": np.full(SHAPE[0], 10.0),
        "cell_height_m": np.full(SHAPE[0], 10.0),
        "max_slope_pct": 5.0,
        "max_height_above_channel_m": 5.0,
        "min_soil_depth_m": 0.5,
        "min_catchment_ratio": 1.0,
        "target_area_m2": 10_000.0,
        "max_catchment_m2": 2e6,
        "channel_width_m": 2.0,
        "channel_setback_m": 5.0,
    }


def ground_and_limits(values: dict[str, Any]) -> tuple[Ground, Limits]:
    names = {each.name for each in fields(Ground)}
    ground = Ground(**{name: value for name, value in values.items() if name in names})
    return ground, Limits(**{name: value for name, value in values.items() if name not in names})


def at_centre(value: Any, other: Any, dtype: Any) -> np.ndarray:
    array = np.full(SHAPE, other, dtype=dtype)
    array[2, 2] = value
    return array


def test_ground_with_room_passes_with_the_margin_of_its_slope() -> None:
    found = screened()
    assert found.passed.all()
    assert found.margin == pytest.approx(3.0, abs=1e-5)


@pytest.mark.parametrize(
    ("code", "margin", "changed"),
    [
        (1, np.nan, {"valid": at_centre(False, True, np.bool_)}),
        (1, np.nan, {"slope": at_centre(np.nan, 0.02, np.float32)}),
        (2, np.nan, {"inside": at_centre(False, True, np.bool_)}),
        (3, np.nan, {"excluded": at_centre(True, False, np.bool_)}),
        (5, np.nan, {"pan_deepest": at_centre(True, False, np.bool_)}),
        (6, -1.0, {"slope": at_centre(0.06, 0.02, np.float32)}),
        (7, -1.5, {"position": at_centre(3, 4, np.uint8), "height_above_channel_m": at_centre(6.5, 2, np.float32)}),
        (7, np.nan, {"position": at_centre(0, 4, np.uint8), "height_above_channel_m": at_centre(np.nan, 2, np.float32)}),
        (8, -0.2, {"soil_depth_m": at_centre(0.3, 1.0, np.float64)}),
        (9, -10.0, {"multiple_flow_area_m2": at_centre(900.0, 5000.0, np.float64)}),
        (10, -1e6, {"contributing_area_m2": at_centre(3e6, 5000.0, np.float64)}),
    ],
)
def test_each_test_alone(code: int, margin: float, changed: dict[str, Any]) -> None:
    found = screened(**changed)
    assert found.reason[2, 2] == code
    assert np.delete(found.reason.ravel(), 12).max() == 0
    assert found.margin[2, 2] == pytest.approx(margin, rel=1e-5, nan_ok=True)


def test_the_first_failed_test_is_the_reason() -> None:
    found = screened(
        slope=at_centre(0.2, 0.02, np.float32),
        excluded=at_centre(True, False, np.bool_),
        soil_depth_m=at_centre(0.1, 1.0, np.float64),
    )
    assert found.reason[2, 2] == 3


def test_a_slope_foot_passes_however_high_above_its_channel_and_low_ground_in_any_position() -> None:
    high = {"height_above_channel_m": np.full(SHAPE, 40.0, dtype=np.float32)}
    assert screened(position=np.full(SHAPE, 5, dtype=np.uint8), **high).passed.all()
    assert (screened(position=np.full(SHAPE, 2, dtype=np.uint8), **high).reason == 7).all()
    assert screened(position=np.full(SHAPE, 2, dtype=np.uint8)).passed.all()


def test_soil_of_unknown_depth_passes() -> None:
    assert screened(soil_depth_m=np.nan).passed.all()


def channel_row(rows: int, cols: int, row: int) -> tuple[np.ndarray, np.ndarray]:
    channel = np.zeros((rows, cols), dtype=np.bool_)
    channel[row] = True
    direction = np.full((rows, cols), E, dtype=np.uint8)
    direction[:, -1] = 9
    return channel, direction


@pytest.mark.parametrize("cell_m", [1.0, 2.0, 10.0, 30.0])
def test_a_strip_takes_the_same_ground_on_cells_of_any_size(cell_m: float) -> None:
    """12 m about a straight channel, to the spacing of the 8 x 8 points on which shares are counted."""
    rows, cols = int(90 / cell_m) | 1, int(300 / cell_m)
    channel, direction = channel_row(rows, cols, rows // 2)
    size = np.full(rows, cell_m)
    left = strip_share_left(channel, direction, 6.0, cell_width_m=size, cell_height_m=size)
    middle = slice(cols // 4, cols // 4 + cols // 2)
    taken = (1.0 - left[:, middle]).sum() * cell_m**2 / ((cols // 2) * cell_m)
    assert taken == pytest.approx(12.0, abs=0.01 + cell_m / 8)


def test_the_channel_strip_fails_cells_with_less_than_half_their_area_left() -> None:
    channel, direction = channel_row(5, 5, 2)
    found = screened(channel=channel, direction=direction)  # 12 m about the middle of row 2, cells of 10 m
    assert (found.reason[2, :4] == 4).all()
    assert (found.reason[[0, 1, 3, 4]] == 0).all()
    coarse = {"cell_width_m": np.full(5, 30.0), "cell_height_m": np.full(5, 30.0)}
    assert screened(channel=channel, direction=direction, multiple_flow_area_m2=np.full(SHAPE, 9e4), **coarse).passed.all()


def test_no_channel_takes_nothing() -> None:
    none = np.zeros(SHAPE, dtype=np.bool_)
    size = np.full(5, 10.0)
    left = strip_share_left(none, np.full(SHAPE, SOUTH, np.uint8), 6.0, cell_width_m=size, cell_height_m=size)
    assert (left == 1.0).all()


def test_the_deepest_part_of_a_pan_is_the_lower_half_of_its_depth() -> None:
    z = np.array([[9.0, 8.0, 6.0, 7.0, 9.0]])
    label = np.array([[0, 1, 1, 1, 0]], dtype=np.int32)
    deep = deepest_part(elevation=z, pan_label=label, pan_depth_m=np.array([3.0]))
    assert deep.tolist() == [[False, False, True, True, False]]


@pytest.mark.parametrize("seed", range(20))
def test_the_judgement_of_one_cell_agrees_with_the_screening(seed: int) -> None:
    random = np.random.default_rng(seed)
    values = with_room() | {
        "slope": random.uniform(0, 0.08, SHAPE).astype(np.float32),
        "height_above_channel_m": random.uniform(0, 8, SHAPE).astype(np.float32),
        "position": random.integers(1, 6, SHAPE).astype(np.uint8),
        "multiple_flow_area_m2": random.uniform(500, 3000, SHAPE),
        "contributing_area_m2": random.uniform(0, 3e6, SHAPE),
        "excluded": random.random(SHAPE) < 0.1,
        "channel": random.random(SHAPE) < 0.1,
        "soil_depth_m": random.uniform(0.3, 1.0, SHAPE),
    }
    values["direction"][-1] = 9
    ground, limits = ground_and_limits(values)
    found = screen(ground, limits)
    for row, col in np.ndindex(SHAPE):
        judged = judge(ground, limits, row=row, col=col)
        assert list(judged) == list(range(1, 11))
        failed = [code for code, (fails, _) in judged.items() if fails]
        assert found.reason[row, col] == (failed[0] if failed else 0)
        if failed:
            assert found.margin[row, col] == pytest.approx(judged[failed[0]][1], nan_ok=True)
