"""Flow directions by steepest descent, and the codes of directions."""

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
