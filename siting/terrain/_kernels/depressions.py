"""Patches of raised cells: the depressions of the ground."""

import numpy as np

from siting.terrain._kernels.direction import STEP_COL, STEP_ROW
from siting.terrain._kernels.jit import at, kernel, part

PLACE_MASK = 2**32 - 1
"""Bits of a key that hold the place of a cell."""


@kernel
def renumber(label, number, row0, row1):
    """Put for each label of rows `row0` to `row1` its number."""
    for row in range(row0, row1):
        for col in range(label.shape[1]):
            label[row, col] = number[label[row, col]]


@part
def _first_of(parent, run):
    """Return the first run of the patch that a run belongs to, and shorten the way to it."""
    while at(parent, run) != run:
        parent[np.uint64(run)] = at(parent, at(parent, run))
        run = at(parent, run)
    return run


@part
def _join(parent, one, two):
    """Make one patch of those of two runs, known by the earlier of their first runs; return that."""
    one, two = _first_of(parent, one), _first_of(parent, two)
    first, second = min(one, two), max(one, two)
    parent[np.uint64(second)] = first
    return first


@kernel
def label_patches(mask, label, parent):
    """
    Label the 8-connected patches of a mask from 1 in row order of their first cells; return how many.

    `label` comes as 0. Runs of marked cells along the rows are numbered and joined to those above; `parent` takes one
    entry a run, and one more.
    """
    rows, cols = mask.shape
    runs = 0
    for row in range(rows):
        above = label[row - 1] if row > 0 else label[row]
        marked, out = mask[row], label[row]
        joined = 0  # the run above that this run was joined to last
        for col in range(cols):
            if not marked[col]:
                continue
            if col == 0 or not marked[col - 1]:
                runs += 1
                parent[runs], joined = runs, 0
            out[col] = runs
            if row == 0:
                continue
            for other in range(max(0, col - 1), min(cols, col + 2)):
                run = np.int64(above[other])
                if run != 0 and run != joined:
                    _join(parent, runs, run)
                    joined = run
    count = 0
    for run in range(1, runs + 1):  # a run's parent is an earlier one: it has its number already
        if parent[run] == run:
            count += 1
            parent[run] = count
        else:
            parent[run] = parent[parent[run]]
    parent[0] = 0
    renumber(label, parent, np.int64(0), rows)
    return count


@kernel
def measure_patches(label, filled, elevation, direction, area_by_row, area, volume, depth, bottom, spill):
    """Sum area and volume of each patch, its greatest depth, its first lowest cell, and where it would spill."""
    rows, cols = label.shape
    for row in range(rows):
        for col in range(cols):
            patch = label[row, col]
            if patch == 0:
                continue
            below = filled[row, col] - elevation[row, col]
            area[patch] += area_by_row[row]
            volume[patch] += below * area_by_row[row]
            depth[patch] = max(depth[patch], below)
            lowest = bottom[patch]
            if lowest < 0 or elevation[row, col] < elevation[lowest // cols, lowest % cols]:
                bottom[patch] = row * cols + col
            code = direction[row, col]
            if code <= 8:
                to_row, to_col = row + STEP_ROW[code], col + STEP_COL[code]
                if label[to_row, to_col] != patch and spill[patch] < 0:
                    spill[patch] = to_row * cols + to_col


@part
def _sink_in(heap, size, key):
    """Put a key into a heap of `size` keys, the least on top."""
    place = size
    while place > 0 and at(heap, (place - 1) >> 1) > key:
        heap[np.uint64(place)] = at(heap, (place - 1) >> 1)
        place = (place - 1) >> 1
    heap[np.uint64(place)] = key


@part
def _take_top(heap, size):
    """Take the least key out of a heap of `size` keys, which must be above 0; return it."""
    top, key = at(heap, 0), at(heap, size - 1)
    place, child = 0, 1
    while child < size - 1:
        child += np.int64(child + 1 < size - 1 and at(heap, child + 1) < at(heap, child))
        if at(heap, child) >= key:
            break
        heap[np.uint64(place)] = at(heap, child)
        place, child = child, 2 * child + 1
    heap[np.uint64(place)] = key
    return top


@part
def _key(height, place):
    """Join a height and a place below 2^32 in one number that ascends with the height."""
    bits = np.int64(np.float32(height).view(np.int32))
    rank = bits if bits >= 0 else -(bits & 0x7FFFFFFF)
    return rank * (PLACE_MASK + 1) + place


@kernel
def drain_pans(elevation, filled, label, pan_id, bottom, cols, heap):
    """
    Lower the filled surface in each pan to the level at which its cells drain to its `bottom`, no longer out of it.

    Arrays are flat, `cols` cells to a row, and of fewer than 2^32 cells; `filled` is padded by one. `heap` takes the
    cells of the largest pan. Only raised cells are lowered, and of these the neighbours are always there.
    """
    for pan in range(pan_id.size):
        place, size = bottom[pan], 0
        node = place + cols + 3 + 2 * (place // cols)  # of the same cell in the padded array
        if elevation[place] < filled[node]:
            filled[node] = elevation[place] + np.float32(0.0)
            heap[0], size = _key(filled[node], place), 1
        while size > 0:
            place = _take_top(heap, size) & PLACE_MASK
            size -= 1
            node = place + cols + 3 + 2 * (place // cols)
            level = at(filled, node)
            for code in range(1, 9):
                other = place + STEP_ROW[code] * cols + STEP_COL[code]
                other_node = node + STEP_ROW[code] * (cols + 2) + STEP_COL[code]
                reached = max(at(elevation, other) + np.float32(0.0), level)
                if reached < at(filled, other_node) and at(label, other) == pan_id[pan]:
                    filled[np.uint64(other_node)] = reached
                    _sink_in(heap, size, _key(reached, other))
                    size += 1
