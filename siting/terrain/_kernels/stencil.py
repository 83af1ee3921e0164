"""Slope and wetness, row by row: selects instead of branches, so that the loops vectorise."""

import numpy as np

from siting.terrain._kernels.jit import kernel


@kernel
def horn(window, width_m, height_m, tangent):
    """
    Horn's slope of the inner cells of `window` (padded by one, void NaN), as a tangent.

    Heights are taken relative to the centre, so small numbers keep their digits. A missing neighbour is its
    opposite mirrored; with both gone a side is level and a corner lies on the plane of its sides.
    """
    for row in range(tangent.shape[0]):
        north, middle, south = window[row], window[row + 1], window[row + 2]
        by_x, by_y = 1.0 / (8.0 * width_m[row]), 1.0 / (8.0 * height_m[row])
        for col in range(tangent.shape[1]):
            here = middle[col + 1]
            n0, s0 = north[col + 1] - here, south[col + 1] - here
            w0, e0 = middle[col] - here, middle[col + 2] - here
            nw0, ne0 = north[col] - here, north[col + 2] - here
            sw0, se0 = south[col] - here, south[col + 2] - here
            n, s = n0 if n0 == n0 else -s0, s0 if s0 == s0 else -n0
            w, e = w0 if w0 == w0 else -e0, e0 if e0 == e0 else -w0
            n, s = n if n == n else np.float32(0.0), s if s == s else np.float32(0.0)
            w, e = w if w == w else np.float32(0.0), e if e == e else np.float32(0.0)
            nw, se = nw0 if nw0 == nw0 else -se0, se0 if se0 == se0 else -nw0
            ne, sw = ne0 if ne0 == ne0 else -sw0, sw0 if sw0 == sw0 else -ne0
            nw, se = nw if nw == nw else n + w, se if se == se else s + e
            ne, sw = ne if ne == ne else n + e, sw if sw == sw else s + w
            dz_dx = (ne + 2 * e + se - nw - 2 * w - sw) * by_x
            dz_dy = (nw + 2 * n + ne - sw - 2 * s - se) * by_y
            steep = np.sqrt(dz_dx * dz_dx + dz_dy * dz_dy)
            tangent[row, col] = steep if here == here else np.nan


@kernel
def wetness(area_m2, slope, contour_m, least, index):
    """Write ln(a / tan b) with a = area over the contour's length and tan b at least `least`."""
    for row in range(slope.shape[0]):
        per_metre = 1.0 / contour_m[row]
        for col in range(slope.shape[1]):
            steep = slope[row, col]
            # a NaN slope stays NaN: the comparison is false for it
            steep = np.float32(least) if steep < least else steep
            index[row, col] = np.log(area_m2[row, col] * per_metre / steep)


@kernel
def bend(z, width_m, height_m, straight_m, curvature):
    """
    Write the curvature along the steepest line of the quadratic surface through each cell and its neighbours.

    0 where a neighbour is void or missing, on level ground, and where the ground bends by less than `straight_m` over a
    cell; NaN at voids.
    """
    rows, cols = z.shape
    for row in range(rows):
        if row == 0 or row == rows - 1 or cols < 3:
            for col in range(cols):
                curvature[row, col] = np.nan if np.isnan(z[row, col]) else 0.0
            continue
        above, beside, below, out = z[row - 1], z[row], z[row + 1], curvature[row]
        width, height = width_m[row], height_m[row]
        for col in range(1, cols - 1):
            centre = beside[col]
            north, south, west, east = above[col], below[col], beside[col - 1], beside[col + 1]
            p, q = (east - west) / (2 * width), (north - south) / (2 * height)
            r = (east - 2 * centre + west) / (width * width)
            t = (north - 2 * centre + south) / (height * height)
            corners = above[col + 1] - above[col - 1] - below[col + 1] + below[col - 1]
            s = corners / (4 * width * height)
            steep = p * p + q * q
            along = -(r * p * p + 2 * s * p * q + t * q * q) / steep
            along = along if np.abs(along) < np.inf else 0.0  # level ground or a void beside it
            along = along if np.abs(along) * width * height >= straight_m else 0.0
            out[col] = np.nan if np.isnan(centre) else along
        for col in (0, cols - 1):
            out[col] = np.nan if np.isnan(beside[col]) else 0.0


@kernel
def place(height, drop, slope, curvature, gentle_slope, least_relief, shares, codes, position):
    """
    Write the position of each cell by its share of the relief about it, its slope and how it bends.

    `shares` are the limits of summit, shoulder, footslope and toeslope; `codes` are theirs in this order, then those of
    backslope, unknown and void. All measures are float32.
    """
    at_summit, at_shoulder, at_foot, at_toe = shares
    summit, shoulder, foot, toe, back, unknown, void = codes
    for row in range(position.shape[0]):
        above, below, steep, bends, out = height[row], drop[row], slope[row], curvature[row], position[row]
        for col in range(position.shape[1]):
            relief = above[col] + below[col]
            share = above[col] / relief
            gentle = steep[col] <= gentle_slope
            code = shoulder if (share >= at_shoulder) & (bends[col] >= 0) else back
            code = summit if (share >= at_summit) & gentle else code
            code = foot if (share <= at_foot) & (bends[col] <= 0) else code
            code = toe if (share <= at_toe) & gentle else code
            code = code if relief >= least_relief else unknown
            out[col] = void if np.isnan(steep[col]) else code
