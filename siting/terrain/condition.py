"""The conditioned surface: filled without epsilon, every cell with a direction, whatever the blocks."""

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
import numpy.typing as npt

from siting.parallel import run_all
from siting.terrain._kernels.depressions import PLACE_MASK, drain_pans
from siting.terrain._kernels.direction import steepest
from siting.terrain._kernels.flats import cross_flats, direct_flats, start_flats
from siting.terrain._kernels.watersheds import fill_block, flood_levels, raise_block, seam_passes

FloatArray = npt.NDArray[np.float64]
Heights = npt.NDArray[np.float32]
Directions = npt.NDArray[np.uint8]
Mask = npt.NDArray[np.bool_]
Steps = npt.NDArray[np.int32]
Block = tuple[int, int, int, int]

LARGEST_BLOCK = 16_000
"""A block's border parts are numbered in 16 bits."""


@dataclass(frozen=True, slots=True, eq=False)
class Conditioned:
    """
    Filled heights (m, NaN void) and directions of every cell.

    Directions: 1 to 8 for E SE S SW W NW N NE, 9 where flow leaves the data, 10 at the end of a pan, 255 void.
    `flat_cells` counts the cells whose direction had to be invented.
    """

    filled: Heights
    direction: Directions
    flat_cells: int


def condition(
    elevation: npt.NDArray[np.floating],
    *,
    cell_width_m: FloatArray,
    cell_height_m: FloatArray,
    sinks: Mask | None,
    threads: int,
    block: int = 256,
) -> Conditioned:
    """
    Fill depressions and direct every cell.

    Parameters
    ----------
    elevation
        Heights in m (rows, columns); NaN and infinite cells are voids, over which water may leave.
    cell_width_m, cell_height_m
        Ground size of a cell for each row, m.
    sinks
        Cells at which flow ends (the bottoms of kept pans), or None.
    threads, block
        How to compute; they cannot change the result.

    References
    ----------
    Filled surface: Barnes, Lehman & Mulla (2014). Steepest descent: O'Callaghan & Mark (1984). Flats after
    Garbrecht & Martz (1997): twice the steps to the way out, less the steps from higher ground.
    """
    heights = np.ascontiguousarray(elevation, dtype=np.float32)
    ends = np.zeros(heights.shape, dtype=np.bool_) if sinks is None else np.ascontiguousarray(sinks)
    side = min(max(1, block), LARGEST_BLOCK)
    padded = fill(heights, ends, threads=threads, block=side)
    return _directed(padded, ends, inverse_distances(cell_width_m, cell_height_m), side, threads)


def end_in_pans(
    plain: Conditioned,
    elevation: Heights,
    *,
    label: npt.NDArray[np.int32],
    pan_id: npt.NDArray[np.int64],
    bottom_cell: npt.NDArray[np.int64],
    cell_width_m: FloatArray,
    cell_height_m: FloatArray,
    threads: int,
    block: int = 256,
) -> Conditioned:
    """
    Condition again with the bottoms of some depressions as ends of flow: what `condition` gives for them as sinks.

    Any way out of a depression passes a cell at least as high as its level, so the filled surface changes inside these
    depressions only, and only there it is worked out anew.

    Parameters
    ----------
    plain
        What `condition` gives for `elevation` without sinks.
    label
        Number of the depression that each raised cell belongs to.
    pan_id, bottom_cell
        Numbers and lowest cells (flat indices) of the depressions in which flow is to end. A bottom may also be a cell
        that was not raised.
    """
    ends = np.zeros(elevation.shape, dtype=np.bool_)
    ends.ravel()[bottom_cell] = True
    if elevation.size <= PLACE_MASK:
        padded = with_ring(plain.filled).copy()
        most = np.count_nonzero(label) + 1  # far too many for one pan, but memory never touched costs nothing
        flat, cols = (elevation.ravel(), padded.ravel(), label.ravel()), elevation.shape[1]

        def drain(first: int, last: int) -> None:
            heap = np.empty(most, dtype=np.int64)
            drain_pans(*flat, pan_id[first:last], bottom_cell[first:last], cols, heap)

        run_all(drain, row_bands(pan_id.size, 64), threads)
    else:
        padded = fill(elevation, ends, threads=threads, block=block)
    return _directed(padded, ends, inverse_distances(cell_width_m, cell_height_m), block, threads)


def _directed(padded: Heights, ends: Mask, inverse: npt.NDArray[np.float32], side: int, threads: int) -> Conditioned:
    """Direct every cell of a filled surface."""
    direction = np.empty(ends.shape, dtype=np.uint8)
    bands = row_bands(ends.shape[0], 64)
    run_all(lambda r0, r1: steepest(padded, ends, inverse, direction, r0, r1), bands, threads)
    flat_cells = _across_flats(padded, direction, side, threads)
    return Conditioned(padded[1:-1, 1:-1], direction, flat_cells)


def with_ring(filled: Heights) -> Heights:
    """Return a surface padded by a ring of NaN: the array it is the inside of, as `condition` makes it, else a copy."""
    rows, cols = filled.shape
    ring = filled.base
    if isinstance(ring, np.ndarray) and ring.shape == (rows + 2, cols + 2) and ring.flags.c_contiguous:
        inside = ring[1:-1, 1:-1]
        same = inside.ctypes.data == filled.ctypes.data and inside.strides == filled.strides
        if same and all(np.isnan(edge).all() for edge in (ring[0], ring[-1], ring[:, 0], ring[:, -1])):
            return ring
    return np.pad(filled, 1, constant_values=np.nan)


def row_bands(rows: int, height: int) -> list[tuple[int, int]]:
    """Divide rows into bands for threads."""
    return [(first, min(rows, first + height)) for first in range(0, rows, height)]


def blocks_of(shape: tuple[int, int], side: int, shift: int = 0) -> list[Block]:
    """
    Divide a raster into blocks, row by row: (first row, row after, first column, column after).

    Borders lie `shift` cells, less than a side, before those of blocks that start at the first cell.
    """
    rows, cols = ([0, *range(side - shift, cells, side), cells] for cells in shape)
    return [(row, row_after, col, col_after) for row, row_after in pairwise(rows) for col, col_after in pairwise(cols)]


def inverse_distances(cell_width_m: FloatArray, cell_height_m: FloatArray) -> npt.NDArray[np.float32]:
    """Return one over the distance to a neighbour along the row, diagonal and across rows, for each row."""
    slant = np.hypot(cell_width_m, cell_height_m)
    return (1.0 / np.column_stack([cell_width_m, slant, cell_height_m])).astype(np.float32)


def fill(heights: Heights, ends: Mask, *, threads: int, block: int) -> Heights:
    """Return the filled surface, padded by a ring of NaN; `ends` are cells at which flow ends."""
    rows, cols = heights.shape
    padded = np.full((rows + 2, cols + 2), np.nan, dtype=np.float32)
    name = np.empty((rows, cols), dtype=np.uint16)
    blocks = blocks_of((rows, cols), block)
    parts = run_all(lambda *where: fill_block(heights, ends, *where, padded, name), blocks, threads)
    counts = np.array([part[0] for part in parts], dtype=np.int64)
    base = np.concatenate([np.zeros(1, dtype=np.int64), np.cumsum(counts)])
    level = _levels(padded, name, parts, base, block)
    run_all(
        lambda number, where: raise_block(padded, name, base[number], level, *where),
        list(enumerate(blocks)),
        threads,
    )
    return padded


def _levels(
    padded: Heights,
    name: npt.NDArray[np.uint16],
    parts: list[tuple[int, npt.NDArray[np.int64], npt.NDArray[np.int64], Heights]],
    base: npt.NDArray[np.int64],
    block: int,
) -> Heights:
    """Solve the graph of all blocks: the level to which each named part is raised."""
    rows, cols = name.shape
    most = 3 * (rows * (cols // block + 1) + cols * (rows // block + 1)) + 1
    first, second = np.empty((2, most), dtype=np.int32)
    height = np.empty(most, dtype=np.float32)
    count = 0
    for step in ((0, 1), (1, 0), (1, 1), (1, -1)):
        count += seam_passes(padded, name, base, block, *step, first[count:], second[count:], height[count:])
    all_first, all_second, all_height = [first[:count]], [second[:count]], [height[:count]]
    for number, (_, one, two, passes) in enumerate(parts):
        all_first.append(np.where(one > 0, one + base[number], 0).astype(np.int32))
        all_second.append(np.where(two > 0, two + base[number], 0).astype(np.int32))
        all_height.append(passes)
    nodes = int(base[-1]) + 1
    marked = np.zeros(nodes, dtype=np.bool_)
    marked[0] = True
    nothing = np.empty(1, dtype=np.int64)
    level, _ = flood_levels(
        np.concatenate(all_first),
        np.concatenate(all_second),
        np.concatenate(all_height),
        marked,
        np.zeros(nodes, dtype=np.int64),
        nothing,
        nothing.copy(),
        np.empty(1, dtype=np.float32),
    )
    solved: Heights = level
    return solved


def _across_flats(padded: Heights, direction: Directions, side: int, threads: int) -> int:
    """Direct the cells that have no lower neighbour; return how many there are."""
    flat_cells = int(np.count_nonzero(direction == 0))
    if flat_cells == 0:
        return 0
    cols = direction.shape[1]
    blocks = blocks_of((direction.shape[0], cols), side)
    toward, away = (np.empty(direction.shape, dtype=np.int32) for _ in range(2))

    def start(*limits: int) -> None:
        within = (limits[1] - limits[0] + 2, limits[3] - limits[2] + 2)
        local_toward, local_away = np.zeros((2, *within), dtype=np.int32)
        queue = np.empty(within[0] * within[1] + 1, dtype=np.int32)
        start_flats(padded, direction, toward, away, limits, local_toward, local_away, queue)

    run_all(start, blocks, threads)
    _meet(toward.ravel(), away.ravel(), cols, blocks, side, threads)
    heights, out, high, codes = padded.ravel(), toward.ravel(), away.ravel(), direction.ravel()
    bands = row_bands(direction.shape[0], 64)
    run_all(lambda row0, row1: direct_flats(heights, out, high, cols, codes, row0, row1), bands, threads)
    return flat_cells


def _meet(toward: Steps, away: Steps, cols: int, blocks: list[Block], side: int, threads: int) -> None:
    """Carry steps across the borders of blocks, round by round, until no block can lower another's."""
    across = -(-cols // side)

    def cross(steps: Steps, block: int) -> int:
        limits = blocks[block]
        rows, columns = limits[1] - limits[0], limits[3] - limits[2]
        seeds, queue = np.empty(2 * (rows + columns), dtype=np.int64), np.empty(rows * columns, dtype=np.int64)
        return int(cross_flats(steps, cols, limits, seeds, queue))

    work = [(steps, block) for steps in (toward, away) for block in range(len(blocks))]
    while work:
        again = {}
        for (steps, block), gains in zip(work, run_all(cross, work, threads), strict=True):
            for bit in range(9):
                if gains >> bit & 1:
                    other = block + (bit // 3 - 1) * across + bit % 3 - 1
                    again[id(steps), other] = (steps, other)
        work = list(again.values())
