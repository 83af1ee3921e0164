"""Catchments: a case worked by hand, and all ground against a plain walk from every cell."""

from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from siting.grid import Raster, metric_grid
from siting.plots import (
    Catchments,
    PlotCells,
    catchment_cells,
    overflow_path,
    plot_cells,
    trace_catchments,
)
from siting.terrain import Terrain, analyse
from siting.terrain._kernels.direction import STEP_COL, STEP_ROW

LOSSES = (0.0, 0.3, 2.0)
CLASSES = 3


def terrain(heights: np.ndarray, cell_m: float, channel_area_m2: float) -> Terrain:
    return analyse(
        Raster(metric_grid(heights.shape[0], heights.shape[1], cell_m), heights.astype(np.float32)),
        vertical_error_m=0.15,
        channel_area_m2=channel_area_m2,
        pan_min_area_m2=1e9,
        pan_layer=None,
        threads=1,
    )


def trace(
    ground: Terrain, label: np.ndarray, classes: np.ndarray, inside: np.ndarray | None, pan: np.ndarray
) -> tuple[PlotCells, Catchments]:
    cells = plot_cells(label, int(label.max()))
    found = trace_catchments(
        cells,
        label=label,
        direction=ground.direction,
        contributing_area_m2=ground.contributing_area_m2,
        elevation=ground.filled,
        slope=ground.slope,
        channel=ground.channel,
        doubtful_pan=pan,
        inside=inside,
        class_of_cell=classes,
        classes=CLASSES,
        loss_per_km=LOSSES,
        cell_area_m2=ground.grid.cell_area_m2,
        cell_width_m=ground.grid.cell_width_m,
        cell_height_m=ground.grid.cell_height_m,
    )
    return cells, found


def test_the_valley_worked_by_hand() -> None:
    r, c = np.mgrid[0:17, 0:11]
    z = 100 + 1.0 * np.abs(np.clip(c, 1, 9) - 5) + 0.2 * (15 - np.maximum(r, 1))
    ground = terrain(z - 0.1 * ((r == 0) | (c == 0) | (c == 10)), 20.0, 10_800.0)
    label = np.zeros((17, 11), dtype=np.int32)
    label[13:15, 4:7] = 1
    none = np.zeros(label.shape, dtype=np.bool_)
    cells, found = trace(ground, label, np.zeros(label.shape, np.uint16), None, none)
    assert found.area_m2[0] == 48_000.0
    assert divmod(int(found.intake_cell[0]), 11) == (13, 5)
    assert found.intake_area_m2[0] == 43_200.0
    assert found.effective_area_m2[1, 0].tolist() == pytest.approx([45_750.21, 0.0, 0.0], abs=0.01)
    assert found.bed_length_m[0] == 200.0
    assert found.longest_path_m[0] == 320.0
    assert divmod(int(found.exit_cell[0]), 11) == (14, 5)
    assert (found.next_plot[0], found.plots_upstream[0]) == (-1, 0)
    assert (found.outside_m2[0], found.behind_pan_m2[0], found.unclassed_m2[0]) == (0.0, 0.0, 0.0)
    assert catchment_cells(cells, 0, label=label, direction=ground.direction).size == 120
    path = overflow_path(int(found.exit_cell[0]), direction=ground.direction, stop=none)
    assert [divmod(int(cell), 11) for cell in path] == [(14, 5), (15, 5), (16, 5)]
    # a property that ends south of row 15: the path ends on the first cell outside
    stop = np.zeros(label.shape, dtype=np.bool_)
    stop[15] = True
    path = overflow_path(int(found.exit_cell[0]), direction=ground.direction, stop=stop)
    assert [divmod(int(cell), 11) for cell in path] == [(14, 5), (15, 5)]


def test_a_plot_below_another_takes_its_ground_and_that_above_it() -> None:
    """An even slope to the south, 10 m cells: two plots, one below the other, in one of three columns."""
    z = np.repeat(np.arange(9.0, -1.0, -1.0)[:, None], 3, axis=1)
    z[:, 1] -= 0.01 * np.arange(10)  # steepest straight down each column
    ground = terrain(z, 10.0, 1e9)
    label = np.zeros((10, 3), dtype=np.int32)
    label[3, 1], label[7, 1] = 1, 2
    pan = np.zeros(label.shape, dtype=np.bool_)
    pan[5, 1] = True
    inside = np.ones(label.shape, dtype=np.bool_)
    inside[:2] = False
    classes = np.zeros(label.shape, np.uint16)
    classes[4:] = 9  # without a runoff class
    _, found = trace(ground, label, classes, inside, pan)
    assert found.area_m2.tolist() == [300.0, 700.0]
    assert found.next_plot.tolist() == [1, -1]
    assert found.plots_upstream.tolist() == [0, 1]
    assert found.next_distance_m[0] == 40.0
    assert np.isnan(found.next_distance_m[1])
    assert found.outside_m2.tolist() == [200.0, 200.0]
    assert found.behind_pan_m2.tolist() == [0.0, 600.0]  # rows 0 to 5, the plot above among them
    assert found.unclassed_m2.tolist() == [0.0, 300.0]
    assert found.effective_area_m2[1, :, 0] == pytest.approx(
        [
            100 * sum(np.exp(-0.0003 * far) for far in (10, 20, 30)),
            100 * sum(np.exp(-0.0003 * far) for far in (40, 50, 60, 70)),
        ]
    )


def plainly(ground: Terrain, label: np.ndarray, classes: np.ndarray, inside: np.ndarray, pan: np.ndarray) -> dict[str, Any]:
    """Walk from every cell and count it, once, for each plot on its path but its own."""
    count, (rows, cols) = int(label.max()), label.shape
    area = float(ground.grid.cell_area_m2[0])
    width, height = float(ground.grid.cell_width_m[0]), float(ground.grid.cell_height_m[0])
    sums: dict[str, Any] = {name: np.zeros(count) for name in ("area", "outside", "behind", "unclassed", "bed", "longest")}
    sums["effective"] = np.zeros((len(LOSSES), count, CLASSES))
    sums["highest"] = np.full(count, -np.inf)
    for start in range(rows * cols):
        row, col = divmod(start, cols)
        seen, far, behind = {int(label[row, col])}, 0.0, False
        first = ground.direction[row, col]
        link = 0.0 if first > 8 else np.hypot(STEP_COL[first] * width, STEP_ROW[first] * height)
        while (code := ground.direction[row, col]) <= 8:
            behind |= bool(pan[row, col])
            far += float(np.hypot(STEP_COL[code] * width, STEP_ROW[code] * height))
            row, col = row + int(STEP_ROW[code]), col + int(STEP_COL[code])
            plot = int(label[row, col]) - 1
            if plot < 0 or plot + 1 in seen:
                continue
            seen.add(plot + 1)
            sums["area"][plot] += area
            sums["outside"][plot] += area * (not inside.flat[start])
            sums["behind"][plot] += area * behind
            sums["bed"][plot] += link * ground.channel.flat[start]
            sums["longest"][plot] = max(sums["longest"][plot], far)
            sums["highest"][plot] = max(sums["highest"][plot], ground.filled.flat[start])
            group = int(classes.flat[start])
            if group >= CLASSES:
                sums["unclassed"][plot] += area
                continue
            for turn, loss in enumerate(LOSSES):
                sums["effective"][turn, plot, group] += area * np.exp(-loss * far / 1000.0)
    return sums


@settings(max_examples=60, deadline=None)
@given(seed=st.integers(0, 2**32 - 1))
def test_catchments_equal_a_walk_from_every_cell(seed: int) -> None:
    random = np.random.default_rng(seed)
    shape = (int(random.integers(3, 25)), int(random.integers(3, 25)))
    heights = random.normal(size=shape).cumsum(0).cumsum(1) / 5 + random.normal(size=shape)
    heights[random.random(shape) < 0.03] = np.nan
    if np.isnan(heights).all():
        return
    ground = terrain(heights, 10.0, 1500.0)
    label = np.zeros(shape, dtype=np.int32)
    wanted = np.flatnonzero((random.random(shape) < 0.15).ravel() & (ground.direction.ravel() != 255))
    if wanted.size == 0:
        return
    # scattered plots of several pieces: water leaves and comes back
    label.flat[wanted] = 1 + np.unique(random.integers(0, 4, wanted.size), return_inverse=True)[1]
    classes = random.integers(0, 5, shape).astype(np.uint16)
    inside, pan = random.random(shape) < 0.7, random.random(shape) < 0.1
    cells, found = trace(ground, label, classes, inside, pan)
    slow = plainly(ground, label, classes, inside, pan)
    for name, fast in {
        "area": found.area_m2,
        "outside": found.outside_m2,
        "behind": found.behind_pan_m2,
        "unclassed": found.unclassed_m2,
        "bed": found.bed_length_m,
        "longest": found.longest_path_m,
        "effective": found.effective_area_m2,
    }.items():
        np.testing.assert_allclose(fast, slow[name], rtol=1e-12, atol=1e-9, err_msg=name)
    np.testing.assert_array_equal(np.isnan(found.highest_m), np.isinf(slow["highest"]))
    np.testing.assert_array_equal(np.nan_to_num(found.highest_m, nan=-np.inf), slow["highest"])
    for plot in range(cells.start.size - 1):
        above = catchment_cells(cells, plot, label=label, direction=ground.direction)
        assert np.unique(above).size == above.size
        assert above.size * 100.0 == found.area_m2[plot]
        # the way down from plot to plot never comes back
        steps, node = 0, plot
        while found.next_plot[node] >= 0:
            node, steps = int(found.next_plot[node]), steps + 1
            assert steps < cells.start.size
