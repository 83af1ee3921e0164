"""Which cells can be cropped; each failed test leaves its code and by how much."""

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from siting.plots._kernels.strip import SAMPLES, mark_strips

FloatArray = npt.NDArray[np.float64]
Floats = npt.NDArray[np.floating]
Mask = npt.NDArray[np.bool_]
Codes = npt.NDArray[np.uint8]

CAN_BE_CROPPED, NO_DATA, OUTSIDE_BOUNDARY, EXCLUDED, CHANNEL_STRIP, PAN = 0, 1, 2, 3, 4, 5
TOO_STEEP, NOT_LOW, SOIL_TOO_SHALLOW, TOO_LITTLE_ABOVE, TOO_MUCH_ABOVE = 6, 7, 8, 9, 10
PATCH_TOO_SMALL, LEFT_OVER = 11, 12
FOOTSLOPE, TOESLOPE = 4, 5

LEAST_SHARE = 0.5
"""A cell with less than this share of its area left beside a channel strip fails."""

DEEPEST_SHARE = 0.5
"""What lies below this share of a pan's greatest depth is its deepest part (our threshold)."""

BAND_ROWS = 256


@dataclass(frozen=True, slots=True, eq=False)
class Screening:
    """
    `reason` of each cell (uint8, 0 where it can be cropped) and `margin` (float32).

    The margin of a failed cell is that of its first failed test, below zero (-0.0 at most): share of the cell for a
    channel strip, percentage points of slope, m of height, m of soil, m of ground above (m2 per m of contour), m2 of
    ground above; NaN where a test has no measure. A cell that can be cropped carries its slope's margin, percentage points.
    """

    reason: Codes
    margin: npt.NDArray[np.float32]

    @property
    def passed(self) -> Mask:
        """Mark the cells that can be cropped."""
        return np.asarray(self.reason == CAN_BE_CROPPED)

    def _fail(self, code: int, failed: Mask, margin: Any = np.nan) -> None:
        """Give a code to cells that have none yet."""
        new = failed & (self.reason == CAN_BE_CROPPED)
        self.reason[new] = code
        self.margin[new] = np.broadcast_to(np.asarray(margin, dtype=np.float32), new.shape)[new]


def screen(
    *,
    valid: Mask,
    inside: Mask | None,
    excluded: Mask | None,
    soil_depth_m: Floats | float,
    slope: Floats,
    position: Codes,
    height_above_channel_m: Floats,
    multiple_flow_area_m2: Floats,
    contributing_area_m2: Floats,
    channel: Mask,
    direction: Codes,
    pan_deepest: Mask,
    cell_width_m: FloatArray,
    cell_height_m: FloatArray,
    max_slope_pct: float,
    max_height_above_channel_m: float,
    min_soil_depth_m: float,
    min_catchment_ratio: float,
    target_area_m2: float,
    max_catchment_m2: float,
    channel_width_m: float,
    channel_setback_m: float,
) -> Screening:
    """
    Test every cell, in the order of the reason codes; the first failed test is the reason.

    Parameters
    ----------
    valid
        Where heights are known; all arrays are (rows, columns). A valid cell without slope or areas counts as no data.
    inside, excluded
        The boundary given, and what must stay clear, set-backs included; None where there is none.
    soil_depth_m
        Depth of soil; NaN (unknown) passes.
    slope
        Tangent.
    position, height_above_channel_m
        A cell is low if it is footslope (4) or toeslope (5) or not higher than `max_height_above_channel_m` above its
        channel; one whose height is unknown (NaN) and that is no slope foot fails, with margin NaN.
    multiple_flow_area_m2
        Per metre of contour (mean of the cell's width and height) at least `min_catchment_ratio` times the root of
        `target_area_m2`.
    contributing_area_m2
        At most `max_catchment_m2`.
    channel, channel_width_m, channel_setback_m
        The strip of channel_width_m / 2 + channel_setback_m on both sides of the channels' lines is taken off; see
        `strip_share_left`.
    pan_deepest
        The deepest parts of pans, which fail.
    cell_width_m, cell_height_m
        Ground metres of a cell, for each row.

    References
    ----------
    Slope: Critchley & Siegert (1991), FAO AGL/MISC/17/91. The other limits are common practice or assumptions.
    """
    left = strip_share_left(
        channel,
        direction,
        0.5 * channel_width_m + channel_setback_m,
        cell_width_m=cell_width_m,
        cell_height_m=cell_height_m,
    )
    found = Screening(np.zeros(valid.shape, dtype=np.uint8), np.full(valid.shape, np.nan, dtype=np.float32))
    contour_m = 0.5 * (cell_width_m + cell_height_m)
    soil_margin = np.broadcast_to(np.asarray(soil_depth_m - min_soil_depth_m), valid.shape)
    for row0 in range(0, valid.shape[0], BAND_ROWS):  # the margins of a band are small beside the rasters
        band = slice(row0, row0 + BAND_ROWS)
        part = Screening(found.reason[band], found.margin[band])
        with np.errstate(invalid="ignore"):
            slope_margin = np.float32(max_slope_pct) - np.float32(100.0) * slope[band]
            unknown = np.isnan(slope[band]) | np.isnan(contributing_area_m2[band]) | np.isnan(multiple_flow_area_m2[band])
            part._fail(NO_DATA, ~valid[band] | unknown)
            if inside is not None:
                part._fail(OUTSIDE_BOUNDARY, ~inside[band])
            if excluded is not None:
                part._fail(EXCLUDED, excluded[band])
            part._fail(CHANNEL_STRIP, left[band] < LEAST_SHARE, left[band] - LEAST_SHARE)
            part._fail(PAN, pan_deepest[band])
            part._fail(TOO_STEEP, slope_margin < 0, slope_margin)
            height_margin = max_height_above_channel_m - height_above_channel_m[band]
            foot = (position[band] == FOOTSLOPE) | (position[band] == TOESLOPE)
            part._fail(NOT_LOW, ~foot & ~(height_margin >= 0), height_margin)
            part._fail(SOIL_TOO_SHALLOW, soil_margin[band] < 0, soil_margin[band])
            fed_m = multiple_flow_area_m2[band] / contour_m[band, None]
            fed_margin = fed_m - min_catchment_ratio * np.sqrt(target_area_m2)
            part._fail(TOO_LITTLE_ABOVE, fed_margin < 0, fed_margin)
            flood_margin = max_catchment_m2 - contributing_area_m2[band]
            part._fail(TOO_MUCH_ABOVE, flood_margin < 0, flood_margin)
        part.margin[part.passed] = slope_margin[part.passed]
    return found


def strip_share_left(
    channel: Mask, direction: Codes, half_width_m: float, *, cell_width_m: FloatArray, cell_height_m: FloatArray
) -> npt.NDArray[np.float32]:
    """
    Return the share of each cell's area left beside the strips along channels, 0 to 1.

    A strip reaches `half_width_m` to both sides of the lines from the centre of each channel cell to that of its
    receiver; shares are counted on 8 x 8 points a cell, so that cells of any size lose the same ground.
    """
    left = np.ones(channel.shape, dtype=np.float32)
    if not half_width_m > 0 or not channel.any():
        return left
    centre_m = np.cumsum(cell_height_m) - 0.5 * cell_height_m
    for row0 in range(0, channel.shape[0], BAND_ROWS):
        band = left[row0 : row0 + BAND_ROWS]
        covered = np.zeros(band.shape, dtype=np.uint64)
        mark_strips(channel, direction, cell_width_m, cell_height_m, centre_m, half_width_m, row0, covered)
        band -= np.bitwise_count(covered).astype(np.float32) / np.float32(SAMPLES * SAMPLES)
    return left


def deepest_part(*, elevation: Floats, pan_label: npt.NDArray[np.int32], pan_depth_m: FloatArray) -> Mask:
    """
    Mark the cells of pans that lie in the lower half of their pan's depth.

    `pan_label` numbers the pans from 1 (0 elsewhere), `pan_depth_m` holds their greatest depths in that order.
    """
    lowest = np.full(pan_depth_m.size + 1, np.inf)
    in_pan = np.flatnonzero(pan_label)
    number, height = pan_label.ravel()[in_pan], elevation.ravel()[in_pan].astype(np.float64)
    np.minimum.at(lowest, number, height)
    deep = np.zeros(pan_label.size, dtype=np.bool_)
    deep[in_pan] = height - lowest[number] < DEEPEST_SHARE * pan_depth_m[number - 1]
    return deep.reshape(pan_label.shape)
