"""Patches and their division, with figures counted by hand and laws on random ground."""

from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from siting.errors import InputError
from siting.plots import PlotLabels, fit_planes, make_plots, plot_cells, plot_means, plot_size, without_plots
from siting.plots.surface import commonest, slope_margin

SOUTH = 3


def plots_of(passed: np.ndarray, *, cell_m: float = 10.0, weight: np.ndarray | None = None, **changed: object) -> PlotLabels:
    """Divide cells that all drain south."""
    shape = passed.shape
    direction = np.full(shape, SOUTH, dtype=np.uint8)
    direction[-1] = 9
    values: dict[str, Any] = {
        "passed": passed,
        "given": None,
        "catchment_weight": np.ones(shape) if weight is None else weight,
        "direction": direction,
        "cell_width_m": np.full(shape[0], cell_m),
        "cell_height_m": np.full(shape[0], cell_m),
        "min_area_m2": 1000.0,
        "target_area_m2": 10_000.0,
        "reason": np.where(passed, 0, 6).astype(np.uint8),
    }
    return make_plots(**(values | changed))


def test_a_patch_of_two_targets_becomes_two_equal_plots_around_the_strongest_inflows() -> None:
    passed = np.zeros((14, 24), dtype=np.bool_)
    passed[2:12, 2:22] = True  # 200 cells of 100 m2: 20 000 m2
    weight = np.ones(passed.shape)
    weight[1, 4], weight[1, 20] = 900.0, 800.0
    found = plots_of(passed, weight=weight)
    assert found.count == 2
    assert found.area_m2.tolist() == [10_000.0, 10_000.0]
    assert found.label[2, 4] == 1
    assert found.label[2, 20] == 2
    assert found.slivers == 0
    assert set(np.unique(found.reason)) == {0, 6}
    assert found.origin == ("found", "found")


def test_small_patches_are_no_plots_and_say_why() -> None:
    passed = np.zeros((20, 20), dtype=np.bool_)
    passed[1:4, 1:4] = True  # 900 m2
    passed[10:14, 10:14] = True  # 1 600 m2
    found = plots_of(passed)
    assert found.count == 1
    assert found.area_m2.tolist() == [1600.0]
    assert (found.reason[1:4, 1:4] == 11).all()
    assert (found.reason[10:14, 10:14] == 0).all()


def test_pieces_left_over_in_division_are_counted() -> None:
    """A bar of one target with arms that its plot does not reach."""
    passed = np.zeros((7, 64), dtype=np.bool_)
    passed[3, :] = True
    passed[1:6, 30:34] = True
    weight = np.ones(passed.shape)
    weight[0, 31] = 500.0
    found = plots_of(passed, weight=weight, target_area_m2=4000.0, min_area_m2=3000.0)
    assert found.slivers == 2
    assert (found.reason[found.label > 0] == 0).all()
    assert (found.reason[passed & (found.label == 0)] == 12).all()


def test_coarse_cells_raise_both_sizes() -> None:
    cells = np.full(5, 900.0)
    size = plot_size(cells, min_area_m2=1000.0, target_area_m2=10_000.0)
    assert (size.min_area_m2, size.target_area_m2, size.coarse_cells) == (3600.0, 10_000.0, True)
    size = plot_size(np.full(5, 2500.0), min_area_m2=1000.0, target_area_m2=10_000.0)
    assert (size.min_area_m2, size.target_area_m2) == (10_000.0, 22_500.0)
    assert not plot_size(np.full(5, 100.0), min_area_m2=1000.0, target_area_m2=10_000.0).coarse_cells


def test_given_plots_take_their_cells_first_and_stay_as_drawn() -> None:
    passed = np.zeros((20, 30), dtype=np.bool_)
    passed[5:15, 5:25] = True
    given_label = np.zeros(passed.shape, dtype=np.int32)
    given_label[0:8, 10:14] = 7  # partly on ground that failed
    found = plots_of(passed, given=given_label, given_names=["?"] * 6 + ["corner"])
    assert found.origin[0] == "given"
    assert found.given_label[0] == 7
    np.testing.assert_array_equal(found.label == 1, given_label == 7)
    assert set(found.origin[1:]) == {"found"}
    assert (found.reason[0:5, 10:14] == 6).all()


def test_a_given_plot_without_heights_is_refused_by_name() -> None:
    passed = np.ones((6, 6), dtype=np.bool_)
    given_label = np.zeros((6, 6), dtype=np.int32)
    given_label[0, 0] = 1
    direction = np.full((6, 6), SOUTH, dtype=np.uint8)
    direction[-1], direction[0, 0] = 9, 255
    with pytest.raises(InputError, match="'the corner' has no cell with a known height"):
        plots_of(passed, given=given_label, given_names=["the corner"], direction=direction)


@settings(max_examples=40, deadline=None)
@given(seed=st.integers(0, 2**32 - 1), share=st.floats(0.3, 1.0))
def test_laws_of_division(seed: int, share: float) -> None:
    random = np.random.default_rng(seed)
    shape = (int(random.integers(4, 40)), int(random.integers(4, 40)))
    passed = random.random(shape) < share
    found = plots_of(passed, weight=random.integers(1, 1000, shape).astype(float), target_area_m2=3000.0)
    # every cell that passed is in a plot, or says why not; no other cell is
    assert not (found.label[~passed] > 0).any()
    np.testing.assert_array_equal(found.label > 0, found.reason == 0)
    assert set(np.unique(found.reason[passed & (found.label == 0)])) <= {11, 12}
    assert (found.area_m2 >= 1000.0).all()
    assert (found.area_m2 <= 1.5 * 3000.0 + 100.0).all()
    # numbers follow the first cells, and each plot hangs together
    first = [int(np.flatnonzero(found.label == plot)[0]) for plot in range(1, found.count + 1)]
    assert first == sorted(first)
    for plot in range(1, found.count + 1):
        reached = np.zeros(shape, dtype=np.bool_)
        reached.flat[first[plot - 1]] = True
        while True:
            wider = np.zeros(shape, dtype=np.bool_)
            padded = np.pad(reached, 1)
            for down, right in ((0, 1), (1, 0), (1, 1), (1, 2), (2, 1)):  # across edges, never across corners
                wider |= padded[down : down + shape[0], right : right + shape[1]]
            wider &= found.label == plot
            if (wider == reached).all():
                break
            reached = wider
        assert reached.sum() == found.cells[plot - 1]


def test_plane_means_and_commonest_class() -> None:
    row, col = np.mgrid[0:12, 0:12]
    z = (50 + 0.03 * 10 * col - 0.04 * 10 * row).astype(np.float32)  # a slope of 5 % on cells of 10 m
    label = np.zeros((12, 12), dtype=np.int32)
    label[2:6, 2:5] = 1
    label[8, 1:5] = 2  # in one line: level across it
    label[10, 10] = 3
    cells = plot_cells(label, 3)
    size = np.full(12, 10.0)
    plane = fit_planes(cells, z, cell_width_m=size, cell_height_m=size)
    assert plane.slope[:2] == pytest.approx([0.05, 0.03], abs=1e-6)
    assert plane.drop_m[:2] == pytest.approx([0.03 * 30 + 0.04 * 40, 0.03 * 40], abs=1e-5)
    assert np.isnan(plane.slope[2])
    area = np.full(12, 100.0)
    values = col.astype(float)
    values[2:6, 4] = np.nan
    assert plot_means(cells, values, area).tolist() == [2.5, 2.5, 10.0]
    codes = np.zeros((12, 12), dtype=np.int8)
    codes[2:6, 2] = 2
    known = np.array([False, True, True])
    assert commonest(cells, codes, known).tolist() == [2, -1, -1]


def test_the_doubt_of_a_slope_is_that_of_the_differences_in_its_formula() -> None:
    """Horn (1981): each component weighs six heights, sd e sqrt(12) / (8 cell) = 0.433 e / cell."""
    assert slope_margin(1.0, 10.0) == pytest.approx(np.sqrt(12) / 8 / 10, rel=0.01)


def test_no_plots_at_all() -> None:
    cells = plot_cells(np.zeros((4, 4), dtype=np.int32), 0)
    size = np.full(4, 10.0)
    assert fit_planes(cells, np.zeros((4, 4), np.float32), cell_width_m=size, cell_height_m=size).slope.size == 0
    assert plots_of(np.zeros((4, 4), dtype=np.bool_)).count == 0


def test_plots_taken_out_again_leave_the_others_in_order_and_say_why() -> None:
    passed = np.zeros((12, 60), dtype=np.bool_)
    for left in (1, 21, 41):
        passed[3:8, left : left + 5] = True
    plots = plots_of(passed)
    assert plots.count == 3
    found = without_plots(plots, np.array([False, True, False]), reason=9)
    assert found.count == 2
    assert found.area_m2.tolist() == [2500.0, 2500.0]
    assert (found.label[3:8, 1:6] == 1).all()
    assert (found.label[3:8, 41:46] == 2).all()
    assert (found.label[3:8, 21:26] == 0).all()
    assert (found.reason[3:8, 21:26] == 9).all()
