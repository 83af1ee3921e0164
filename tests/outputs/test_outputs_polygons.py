import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra import numpy as arrays
from shapely import get_coordinates
from shapely.geometry import LineString, Point

from siting.errors import OutputError
from siting.grid import metric_grid
from siting.outputs.polygons import line_from_cells, point_from_cell, polygon_from_mask, polygons_from_labels

LABELS = arrays.arrays(np.int64, arrays.array_shapes(min_dims=2, max_dims=2, max_side=9), elements=st.integers(0, 3))


@given(label=LABELS)
@settings(max_examples=150, deadline=None)
def test_outlines_are_valid_and_hold_exactly_the_cells(label: npt.NDArray[np.int64]) -> None:
    grid = metric_grid(label.shape[0], label.shape[1], 10.0, west=500_000.0, north=4_000_000.0)
    shapes = polygons_from_labels(label, grid)
    assert list(shapes) == [value for value in np.unique(label) if value > 0]
    for value, shape in shapes.items():
        assert shape.is_valid
        assert shape.geom_type == "MultiPolygon"
        assert shape.area == pytest.approx(100.0 * np.sum(label == value))
        for row, col in np.argwhere(label == value):
            assert shape.contains(Point(grid.xy(row, col)))


@given(label=LABELS, row0=st.integers(0, 4), col0=st.integers(0, 4))
@settings(max_examples=60, deadline=None)
def test_a_window_gives_the_outline_of_the_whole_grid_bit_for_bit(
    label: npt.NDArray[np.int64], row0: int, col0: int
) -> None:
    rows, cols = label.shape
    grid = metric_grid(rows + 5, cols + 5, 0.3, west=0.1, north=0.7)
    whole = np.zeros(grid.shape, dtype=np.int64)
    whole[row0 : row0 + rows, col0 : col0 + cols] = label == 1
    window = polygon_from_mask(row0, col0, label == 1, grid)
    if not np.any(label == 1):
        assert window.is_empty
        return
    assert window.equals(polygons_from_labels(whole, grid)[1])
    assert {tuple(xy) for xy in get_coordinates(window)} == {
        tuple(xy) for xy in get_coordinates(polygons_from_labels(whole, grid)[1])
    }


def test_a_ring_has_a_hole_and_cells_that_touch_at_a_corner_are_two_parts() -> None:
    grid = metric_grid(3, 3, 1.0)
    ring = np.ones((3, 3), dtype=np.int32)
    ring[1, 1] = 0
    assert len(polygons_from_labels(ring, grid)[1].geoms[0].interiors) == 1
    assert len(polygons_from_labels(np.eye(3, dtype=np.int32), grid)[1].geoms) == 3


def test_neighbours_share_their_edge_without_gap_or_overlap() -> None:
    label = np.array([[1, 1, 2], [1, 2, 2]])
    shapes = polygons_from_labels(label, metric_grid(2, 3, 0.1, west=0.3, north=0.7))
    assert shapes[1].intersection(shapes[2]).area == 0.0
    assert shapes[1].union(shapes[2]).area == pytest.approx(0.06)  # 6 cells of 0.1 x 0.1
    assert shapes[1].touches(shapes[2])


def test_points_and_lines_lie_on_cell_centres() -> None:
    # 2 rows x 3 columns of 10 m from (100, 200): cell 4 is row 1, column 1, centre (115, 185)
    grid = metric_grid(2, 3, 10.0, west=100.0, north=200.0)
    assert point_from_cell(4, grid).equals(Point(115, 185))
    line = line_from_cells(np.array([0, 4, 5]), grid)
    assert line is not None
    assert line.equals(LineString([(105, 195), (115, 185), (125, 185)]))
    assert line_from_cells(np.array([3]), grid) is None
    assert line_from_cells(np.array([], dtype=np.int64), grid) is None


def test_cells_windows_and_labels_that_cannot_be_are_refused() -> None:
    grid = metric_grid(2, 3, 10.0)
    with pytest.raises(OutputError, match="cell 6"):
        point_from_cell(6, grid)
    with pytest.raises(OutputError, match="-1"):
        line_from_cells(np.array([-1, 2]), grid)
    with pytest.raises(OutputError, match="leaves the grid"):
        polygon_from_mask(1, 0, np.ones((2, 2), dtype=np.bool_), grid)
    for bad in (np.full((2, 3), -1), np.full((2, 3), 2**31), np.zeros((2, 2), dtype=np.int64), np.zeros((2, 3))):
        with pytest.raises(OutputError):
            polygons_from_labels(bad, grid)
