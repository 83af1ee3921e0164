"""Channel lines: a network drawn by hand, and the definition written slowly on random ground."""

from collections import Counter

import numpy as np
import numpy.typing as npt
import pytest
from ground import random_tree, terrain_of, worked_valley
from hypothesis import given, settings
from hypothesis import strategies as st

from siting.errors import GridError
from siting.terrain import ChannelLines, accumulate, channel_lines, flow_path

Directions = npt.NDArray[np.uint8]
Mask = npt.NDArray[np.bool_]

E, SE, S, SW, OUT, VOID = 1, 2, 3, 4, 9, 255


def drawn(lines: ChannelLines) -> list[list[int]]:
    return [part.tolist() for part in np.split(lines.cells, lines.start[1:-1])] if lines.start.size > 1 else []


def lines_by_definition(channel: Mask, direction: Directions) -> list[list[int]]:
    """Ask of every channel cell which channel cells drain into it, and walk the whole path of those that begin a line."""
    marked = [int(cell) for cell in np.flatnonzero(channel & (direction != 255))]
    path = {cell: flow_path(direction, cell).tolist() for cell in marked}
    inflows = Counter(path[cell][1] for cell in marked if len(path[cell]) > 1)
    lines = []
    for head in marked:
        if inflows[head] == 1:
            continue
        line = [head]
        for cell in path[head][1:]:
            if cell not in path:
                break
            line.append(cell)
            if inflows[cell] >= 2:
                break
        lines.append(line)
    return lines


def random_network(rows: int, cols: int, seed: int) -> tuple[Mask, Directions, npt.NDArray[np.float64]]:
    """Channels by contributing area, with gaps knocked into them."""
    direction, _ = random_tree(rows, cols, seed)
    area = accumulate(direction, np.ones(rows), threads=1)
    rng = np.random.default_rng(seed + 1)
    with np.errstate(invalid="ignore"):
        channel = (area >= rng.integers(1, 4)) & (rng.random((rows, cols)) < rng.choice([0.7, 1.0]))
    return channel, direction, area


def test_two_arms_meet_and_run_on() -> None:
    # a Y: arms from cells 0 and 4 meet at 12, and the stem runs to 22, where flow leaves the data
    direction = np.array(
        [
            [SE, S, S, S, SW],
            [S, SE, S, SW, S],
            [E, E, S, 5, 5],
            [E, E, S, 5, 5],
            [E, E, OUT, 5, 5],
        ],
        dtype=np.uint8,
    )
    channel = np.zeros((5, 5), dtype=bool)
    channel.flat[[0, 6, 12, 17, 22, 4, 8]] = True
    area = np.arange(25, dtype=np.float64).reshape(5, 5) * 100.0
    lines = channel_lines(channel, direction, area)
    assert drawn(lines) == [[0, 6, 12], [4, 8, 12], [12, 17, 22]]
    assert lines.start.tolist() == [0, 3, 6, 9]
    # arms carry what comes down them alone, not what the confluence gathers; the stem ends at its own last cell
    assert lines.contributing_area_m2.tolist() == [600.0, 800.0, 2200.0]
    assert lines.isolated_cells == 0
    assert lines.cells.dtype == lines.start.dtype == np.int64


def test_a_line_stops_where_the_channel_stops() -> None:
    direction = np.array([[E, E, E, E, OUT]], dtype=np.uint8)
    channel = np.array([[True, True, True, False, False]])
    lines = channel_lines(channel, direction, np.arange(1.0, 6.0)[None, :])
    assert drawn(lines) == [[0, 1, 2]]
    assert lines.contributing_area_m2.tolist() == [3.0]


def test_a_confluence_that_ends_the_flow_starts_no_line_of_its_own() -> None:
    direction = np.array([[E, OUT, 5]], dtype=np.uint8)
    lines = channel_lines(np.ones((1, 3), dtype=bool), direction, np.array([[1.0, 3.0, 2.0]]))
    assert drawn(lines) == [[0, 1], [2, 1]]
    assert lines.contributing_area_m2.tolist() == [1.0, 2.0]
    assert lines.isolated_cells == 0


def test_a_channel_cell_alone_is_counted_and_not_drawn() -> None:
    direction = np.array([[E, E, E, OUT, VOID]], dtype=np.uint8)
    channel = np.array([[True, False, False, True, True]])
    lines = channel_lines(channel, direction, np.ones((1, 5)))
    assert drawn(lines) == []
    assert lines.start.tolist() == [0]
    assert lines.isolated_cells == 2


@pytest.mark.parametrize("channel", [np.zeros((3, 4), dtype=bool), np.ones((3, 4), dtype=bool)])
def test_no_channel_and_no_ground_give_no_line(channel: Mask) -> None:
    direction = np.full((3, 4), VOID, dtype=np.uint8)
    lines = channel_lines(channel, direction, np.full((3, 4), np.nan))
    assert (lines.cells.size, lines.start.tolist(), lines.contributing_area_m2.size) == (0, [0], 0)


def test_layers_of_several_shapes_are_refused() -> None:
    with pytest.raises(GridError, match=r"channels of shape \(2, 3\).*take all three from one terrain"):
        channel_lines(np.ones((2, 3), dtype=bool), np.full((3, 2), OUT, dtype=np.uint8), np.ones((3, 2)))


@settings(max_examples=150, deadline=None)
@given(rows=st.integers(1, 12), cols=st.integers(1, 12), seed=st.integers(0, 2**32 - 1))
def test_lines_are_those_of_the_definition(rows: int, cols: int, seed: int) -> None:
    channel, direction, area = random_network(rows, cols, seed)
    lines = channel_lines(channel, direction, area)
    expected = lines_by_definition(channel, direction)
    got = drawn(lines)
    assert got == [line for line in expected if len(line) > 1]
    on_lines = {cell for line in got for cell in line}
    alone = set(np.flatnonzero(channel).tolist()) - on_lines
    assert lines.isolated_cells == len(alone)
    assert on_lines | alone == set(np.flatnonzero(channel).tolist())
    # every cell lies on one line only, the shared lower ends apart
    upper = Counter(cell for line in got for cell in line[:-1])
    assert set(upper.values()) <= {1}
    for line, size in zip(got, lines.contributing_area_m2, strict=True):
        shared = sum(other[-1] == line[-1] for other in got) > 1
        assert size == area.flat[line[-2] if shared else line[-1]]


def test_the_valley_has_one_line_down_its_bed() -> None:
    ground = terrain_of(worked_valley(), 20.0)
    lines = channel_lines(ground.channel, ground.direction, ground.contributing_area_m2)
    bed = np.flatnonzero(ground.channel)
    assert drawn(lines) == [bed.tolist()]
    assert (bed % 11 == 5).all()
    assert lines.contributing_area_m2.tolist() == [ground.contributing_area_m2.flat[bed[-1]]]
