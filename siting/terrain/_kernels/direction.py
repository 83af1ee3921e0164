"""Flow directions: steepest descent, and integer steps across flats."""

import numpy as np

from siting.terrain._kernels.jit import kernel

STEP_ROW = np.array([0, 0, 1, 1, 1, 0, -1, -1, -1], np.int64)
"""Row step of direction 1 to 8: E SE S SW W NW N NE."""

STEP_COL = np.array([0, 1, 1, 0, -1, -1, -1, 0, 1], np.int64)
"""Column step of direction 1 to 8."""

FLAT_ORDER = np.array([1, 3, 5, 7, 2, 4, 6, 8], np.int64)
"""Order in which equals are decided on flats: E S W N SE SW NW NE."""

FLAT, OUTLET, SINK, VOID = 0, 9, 10, 255


@kernel
def steepest(filled, sinks, inverse_distance, direction, row0, row1):
    """
    Direct rows `row0` to `row1` down the steepest descent on `filled` (padded by one, void NaN).

    Selects instead of branches, one store: a compiler was seen to spoil branched stores in loops like this.
    `inverse_distance` is float32 (rows, 3): along the row, diagonal, across rows.
    """
    cols = filled.shape[1] - 2
    for row in range(row0, row1):
        along, slant, across = (
            inverse_distance[row, 0],
            inverse_distance[row, 1],
            inverse_distance[row, 2],
        )
        north, middle, south = filled[row], filled[row + 1], filled[row + 2]
        for col in range(cols):
            here = middle[col + 1]
            e = (here - middle[col + 2]) * along
            se = (here - south[col + 2]) * slant
            s = (here - south[col + 1]) * across
            sw = (here - south[col]) * slant
            w = (here - middle[col]) * along
            nw = (here - north[col]) * slant
            n = (here - north[col + 1]) * across
            ne = (here - north[col + 2]) * slant
            best, code = np.float32(0.0), 0
            code, best = (1, e) if e > best else (code, best)
            code, best = (2, se) if se > best else (code, best)
            code, best = (3, s) if s > best else (code, best)
            code, best = (4, sw) if sw > best else (code, best)
            code, best = (5, w) if w > best else (code, best)
            code, best = (6, nw) if nw > best else (code, best)
            code, best = (7, n) if n > best else (code, best)
            code, best = (8, ne) if ne > best else (code, best)
            beside_void = np.isnan(e + se + s + sw + w + nw + n + ne)
            code = OUTLET if code == 0 and beside_void else code
            code = SINK if sinks[row, col] else code
            code = VOID if np.isnan(here) else code
            direction[row, col] = code


@kernel
def flat_seeds(filled, direction, toward, away, queue):
    """Mark flat cells with -1 and, of those, seeds of the steps `toward` a way out and `away` from higher ground."""
    rows, cols = direction.shape
    outs = highs = 0
    size = queue.shape[1]
    for row in range(rows):
        for col in range(cols):
            if direction[row, col] != FLAT:
                continue
            here = filled[row + 1, col + 1]
            way_out = higher = False
            for code in range(1, 9):
                to_row, to_col = row + STEP_ROW[code], col + STEP_COL[code]
                there = filled[to_row + 1, to_col + 1]
                if there == here and direction[to_row, to_col] != FLAT:
                    way_out = True
                if there > here:
                    higher = True
            toward[row, col] = 1 if way_out else -1
            away[row, col] = 1 if higher else -1
            if way_out:
                queue[0, outs] = row * cols + col
                outs += 1
            if higher:
                queue[1, highs] = row * cols + col
                highs += 1
    return min(outs, size), min(highs, size)


@kernel
def spread_steps(steps, queue, waiting):
    """Count steps breadth first from the `waiting` seeds in `queue` through cells marked -1."""
    rows, cols = steps.shape
    place = 0
    while place < waiting:
        row, col = queue[place] // cols, queue[place] % cols
        place += 1
        for code in range(1, 9):
            to_row, to_col = row + STEP_ROW[code], col + STEP_COL[code]
            inside = 0 <= to_row < rows and 0 <= to_col < cols
            if inside and steps[to_row, to_col] == -1:
                steps[to_row, to_col] = steps[row, col] + 1
                queue[waiting] = to_row * cols + to_col
                waiting += 1


@kernel
def direct_flats(filled, toward, away, direction, row0, row1):
    """Direct flat cells to the neighbour of equal height with the least 2 toward - away; ways out come first."""
    cols = direction.shape[1]
    for row in range(row0, row1):
        for col in range(cols):
            if toward[row, col] == 0:
                continue
            here = filled[row + 1, col + 1]
            best = np.int64(2**62)
            code = 0
            for turn in FLAT_ORDER:
                to_row, to_col = row + STEP_ROW[turn], col + STEP_COL[turn]
                if filled[to_row + 1, to_col + 1] != here:
                    continue
                steps = np.int64(toward[to_row, to_col])
                value = 2 * steps - max(np.int64(away[to_row, to_col]), 0) if steps > 0 else -(2**62)
                if value < best:
                    best, code = value, turn
            direction[row, col] = code
