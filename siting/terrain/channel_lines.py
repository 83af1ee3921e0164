"""Channels as lines: from heads and confluences down to the next confluence."""

from dataclasses import dataclass

import numpy as np

from siting.errors import GridError
from siting.terrain._kernels.lines import count_marked_inflows, trace_lines
from siting.terrain.condition import Directions, FloatArray, Mask
from siting.terrain.downstream import Indices


@dataclass(frozen=True, slots=True, eq=False)
class ChannelLines:
    """
    The channel network in pieces, in order of their first cells.

    Attributes
    ----------
    cells
        int64 flat indices of the cells of all lines, one line after another, each from its upper end down.
    start
        int64, one more than there are lines: line i is `cells[start[i]:start[i + 1]]`, two cells at least.
    contributing_area_m2
        float64, one a line: the area that drains through its lower end, before other lines join there.
    isolated_cells
        Number of channel cells that neither receive from a channel cell nor drain to one, so lie on no line.
    """

    cells: Indices
    start: Indices
    contributing_area_m2: FloatArray
    isolated_cells: int


def channel_lines(channel: Mask, direction: Directions, contributing_area_m2: FloatArray) -> ChannelLines:
    """
    Cut the channels into lines at every confluence.

    A line begins at a channel head (no channel cell drains into it) or a confluence (two or more do). It follows the
    flow to the next confluence, whose cell it shares with the lines that meet there, or to the last channel cell.

    Parameters
    ----------
    channel
        True at channel cells; void cells never count.
    direction
        1 to 8 for E SE S SW W NW N NE, 9 and 10 ends of flow, 255 void; as `analyse` gives them, without circles.
    contributing_area_m2
        Area that drains through each cell, m2; NaN stays NaN.

    Raises
    ------
    GridError
        Where the three are not of one shape.
    """
    if not channel.shape == direction.shape == contributing_area_m2.shape:
        msg = (
            f"channels of shape {channel.shape}, directions of {direction.shape} and areas of "
            f"{contributing_area_m2.shape} do not fit; take all three from one terrain"
        )
        raise GridError(msg)
    mark = channel & (direction != 255)
    inflows = np.empty(direction.shape, dtype=np.uint8)
    count_marked_inflows(direction, mark, inflows)
    # a line's own cells are no other line's, and each line ends in at most one more
    begins = np.count_nonzero(mark & (inflows != 1))
    cells = np.empty(np.count_nonzero(mark) + begins, dtype=np.int64)
    start = np.empty(begins + 1, dtype=np.int64)
    last = np.empty(begins, dtype=np.int64)
    count, isolated = trace_lines(direction, mark, inflows, cells, start, last)
    area = np.asarray(contributing_area_m2, dtype=np.float64).ravel()[last[:count]]
    return ChannelLines(cells[: start[count]].copy(), start[: count + 1].copy(), area, int(isolated))
