"""
The filled surface by graphs of watersheds: no queue, no order.

A block is reduced to the lowest passes between the watersheds that touch its border. Levels follow from minima
and maxima of heights alone, so neither blocks nor threads can change a bit of them.
"""

import numpy as np

from siting.terrain._kernels.jit import at, kernel
from siting.terrain._kernels.sorting import ascending

OCEAN = 0
"""The label of voids, of ends of flow and of all that descends to them."""

SEEN = 4096
"""Size of the table of pairs seen last, a power of two."""


@kernel
def _root(parent, node):
    while parent[node] != node:
        parent[node] = parent[parent[node]]
        node = parent[node]
    return node


@kernel
def flood_levels(first, second, height, has_name, name_of, forest_first, forest_second, forest_height):
    """
    Find for each node the height at which it first meets a named one, and which.

    `first`, `second`, `height` are the passes. `has_name` marks named nodes; `name_of` holds their names and
    receives those of the others. Passes between two named parts are written to the forest.
    Returns the level of each node (-inf for named ones) and the number of forest passes.
    """
    nodes = has_name.size
    parent = np.arange(nodes)
    named = has_name.copy()  # of a part, at its root
    carried = name_of.copy()
    following = np.full(nodes, -1, np.int64)  # the nodes of a part without a name, as a list
    last = np.arange(nodes)
    level = np.full(nodes, -np.inf, np.float32)
    kept = 0
    for place in ascending(height):
        one = _root(parent, first[place])
        two = _root(parent, second[place])
        if one == two:
            continue
        if named[one] and named[two]:
            forest_first[kept] = carried[one]
            forest_second[kept] = carried[two]
            forest_height[kept] = height[place]
            kept += 1
            parent[two] = one
        elif named[one] or named[two]:
            if named[two]:
                one, two = two, one
            node = two
            while node >= 0:
                level[node] = height[place]
                name_of[node] = carried[one]
                node = following[node]
            parent[two] = one
        else:
            following[last[one]] = two
            last[one] = last[two]
            parent[two] = one
    return level, kept


@kernel
def _copy_block(z, sinks, row0, row1, col0, col1, heights, ends):
    """Copy a block with its ring: voids -inf, cells of other blocks +inf; -0.0 becomes 0.0."""
    rows, cols = z.shape
    for row in range(row0 - 1, row1 + 1):
        for col in range(col0 - 1, col1 + 1):
            here = (row - row0 + 1, col - col0 + 1)
            ends[here] = False
            if row < 0 or col < 0 or row >= rows or col >= cols or not np.isfinite(z[row, col]):
                heights[here] = -np.inf
            elif row < row0 or col < col0 or row >= row1 or col >= col1:
                heights[here] = np.inf
            else:
                heights[here] = z[row, col] + np.float32(0.0)
                ends[here] = sinks[row, col]


@kernel
def _lowest_neighbours(heights, ends, pointer):
    """
    Point each cell at its lowest neighbour, at an equal one only if that comes earlier, else at itself.

    Ends and cells beside a void point at the corner of the ring, which stands for the ocean. Selects in the order of
    rows, so that the loop vectorises.
    """
    rows, cols = heights.shape
    for row in range(1, rows - 1):
        north, middle, south = heights[row - 1], heights[row], heights[row + 1]
        end, out = ends[row], pointer[row]
        for col in range(1, cols - 1):
            best, step = north[col - 1], -cols - 1
            best, step = (north[col], -cols) if north[col] < best else (best, step)
            best, step = (north[col + 1], -cols + 1) if north[col + 1] < best else (best, step)
            best, step = (middle[col - 1], -1) if middle[col - 1] < best else (best, step)
            best, step = (middle[col], 0) if middle[col] < best else (best, step)
            best, step = (middle[col + 1], 1) if middle[col + 1] < best else (best, step)
            best, step = (south[col - 1], cols - 1) if south[col - 1] < best else (best, step)
            best, step = (south[col], cols) if south[col] < best else (best, step)
            best, step = (south[col + 1], cols + 1) if south[col + 1] < best else (best, step)
            ocean = end[col] | (best == -np.inf)
            out[col] = 0 if ocean else row * cols + col + step


@kernel
def _label(heights, pointer, label):
    """
    Label watersheds from 1, the ocean (voids, ends, what descends to them) 0, cells out of it -1; return the count.

    All three are flat. A walk goes down to a cell whose label is known; then all cells on the way get it.
    """
    label[:] = -1
    count = 1
    for first in range(label.size):
        if not np.isfinite(heights[first]) or label[first] >= 0:
            continue
        place = first
        below = np.int64(at(pointer, place))
        while at(label, place) < 0 and below != 0 and below != place:
            place = below
            below = np.int64(at(pointer, place))
        found = np.int64(at(label, place))
        if found < 0 and below == 0:
            found = OCEAN
        elif found < 0:
            found = count
            count += 1
        last, place = place, first
        while place != last:
            label[np.uint64(place)] = found
            place = np.int64(at(pointer, place))
        label[np.uint64(last)] = found
    return count


@kernel
def _mark_differing(label, row, differs):
    """Mark the columns of a row whose neighbour E, SW, S or SE bears another label."""
    middle, south = label[row], label[row + 1]
    for col in range(1, label.shape[1] - 1):
        one = middle[col]
        other = (middle[col + 1] != one) | (south[col - 1] != one) | (south[col] != one) | (south[col + 1] != one)
        differs[col] = other & (one >= 0)


@kernel
def _passes(heights, label, first, second, height):
    """List the passes between watersheds; a table of the last pairs seen drops most repeats."""
    rows, cols = heights.shape
    seen = np.full(SEEN, -1, np.int32)
    differs = np.zeros(cols, np.bool_)
    count = 0
    for row in range(1, rows - 1):
        _mark_differing(label, row, differs)
        for col in range(1, cols - 1):
            if not differs[col]:
                continue
            one = label[row, col]
            for turn in range(4):  # E, SW, S, SE: each pair once
                to_row, to_col = row + (turn > 0), col + (1 if turn == 0 else turn - 2)
                two = label[to_row, to_col]
                if two < 0 or two == one:
                    continue
                low, high = min(one, two), max(one, two)
                top = max(heights[row, col], heights[to_row, to_col])
                slot = (low * 7919 + high) & (SEEN - 1)
                old = seen[slot]
                if old >= 0 and first[old] == low and second[old] == high:
                    height[old] = min(height[old], top)
                    continue
                seen[slot] = count
                first[count], second[count], height[count] = low, high, top
                count += 1
    return count


@kernel
def _name_border(label, count):
    """Name the watersheds on the block's border from 1 on, the ocean 0. Returns marks, names, and how many."""
    rows, cols = label.shape
    marked = np.zeros(count, np.bool_)
    names = np.zeros(count, np.int64)
    marked[OCEAN] = True
    found = 0
    for row in range(1, rows - 1):
        step = 1 if row == 1 or row == rows - 2 else max(1, cols - 3)
        for col in range(1, cols - 1, step):
            one = label[row, col]
            if one > 0 and not marked[one]:
                marked[one] = True
                found += 1
                names[one] = found
    return marked, names, found


@kernel
def fill_block(z, sinks, row0, row1, col0, col1, filled, name):
    """
    Fill one block as far as it can be filled alone.

    Writes the height of each cell within the block to `filled` (padded by one) and the name of the part it belongs
    to `name`. Returns the number of names and the passes between them (three arrays).
    """
    rows, cols = row1 - row0 + 2, col1 - col0 + 2
    heights = np.empty((rows, cols), np.float32)
    ends = np.empty((rows, cols), np.bool_)
    pointer = np.empty((rows, cols), np.int32)
    label = np.empty((rows, cols), np.int32)
    _copy_block(z, sinks, row0, row1, col0, col1, heights, ends)
    _lowest_neighbours(heights, ends, pointer)
    count = _label(heights.reshape(rows * cols), pointer.reshape(rows * cols), label.reshape(rows * cols))
    first = np.empty(4 * rows * cols, np.int32)
    second = np.empty(4 * rows * cols, np.int32)
    height = np.empty(4 * rows * cols, np.float32)
    passes = _passes(heights, label, first, second, height)
    marked, names, found = _name_border(label, count)
    forest_first = np.empty(found + 1, np.int64)
    forest_second = np.empty(found + 1, np.int64)
    forest_height = np.empty(found + 1, np.float32)
    level, kept = flood_levels(
        first[:passes], second[:passes], height[:passes], marked, names,
        forest_first, forest_second, forest_height,
    )  # fmt: skip
    for row in range(1, rows - 1):
        for col in range(1, cols - 1):
            one = label[row, col]
            void = one < 0
            filled[row0 + row, col0 + col] = np.nan if void else max(heights[row, col], level[one])
            name[row0 + row - 1, col0 + col - 1] = 0 if void else names[one]
    return found, forest_first[:kept], forest_second[:kept], forest_height[:kept]


@kernel
def seam_passes(filled, name, base, block, row_step, col_step, first, second, height):
    """
    List the passes between cells of different blocks, `row_step` and `col_step` apart.

    `base` holds for each block what to add to its names; `filled` is padded by one. Returns the count.
    """
    rows, cols = name.shape
    across = (cols + block - 1) // block
    count = 0
    for row in range(rows - row_step):
        seam = row_step == 1 and (row + 1) % block == 0
        if seam:
            start, step = max(0, -col_step), 1
        elif col_step == 0:
            continue
        else:
            start, step = block - max(0, col_step), block
        for col in range(start, cols - max(0, col_step), step):
            here, there = filled[row + 1, col + 1], filled[row + 1 + row_step, col + 1 + col_step]
            if np.isnan(here) or np.isnan(there):
                continue
            one, two = name[row, col], name[row + row_step, col + col_step]
            one_name = base[(row // block) * across + col // block] + one if one > 0 else 0
            to_row, to_col = row + row_step, col + col_step
            two_name = base[(to_row // block) * across + to_col // block] + two if two > 0 else 0
            if one_name == two_name:
                continue
            top = max(here, there)
            if count > 0 and first[count - 1] == one_name and second[count - 1] == two_name:
                height[count - 1] = min(height[count - 1], top)
                continue
            first[count], second[count], height[count] = one_name, two_name, top
            count += 1
    return count


@kernel
def raise_block(filled, name, base, level, row0, row1, col0, col1):
    """Raise each cell of a block to the level of its name."""
    for row in range(row0, row1):
        for col in range(col0, col1):
            one = name[row, col]
            if one > 0:
                filled[row + 1, col + 1] = max(filled[row + 1, col + 1], level[base + one])
