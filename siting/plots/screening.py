"""Which cells can be cropped; each failed test leaves its code and by how much."""

from collections.abc import Iterator
from dataclasses import dataclass, fields
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


@dataclass(frozen=True, slots=True, eq=False)
class Ground:
    """
    What the tests look at, all rasters (rows, columns).

    Parameters
    ----------
    valid
        Where heights are known. A valid cell without slope or areas counts as no data.
    inside, excluded
        The boundary given, and what must stay clear, set-backs included; None where there is none.
    soil_depth_m
        Depth of soil; NaN (unknown) passes.
    slope
        Tangent.
    position, height_above_channel_m
        A cell is low if it is footslope (4) or toeslope (5) or not higher than the limit above its channel; one whose
        height is unknown (NaN) and that is no slope foot fails, with margin NaN.
    multiple_flow_area_m2, contributing_area_m2
        Ground above each cell by multiple flow, and along the steepest descent.
    channel, direction
        Marks of channel cells, and where each cell drains to, for the strips along the channels' lines.
    pan_deepest
        The deepest parts of pans, which fail.
    cell_width_m, cell_height_m
        Ground metres of a cell, for each row.
    """

    valid: Mask
    inside: Mask | None
    excluded: Mask | None
    soil_depth_m: Floats | float
    slope: Floats
    position: Codes
    height_above_channel_m: Floats
    multiple_flow_area_m2: Floats
    contributing_area_m2: Floats
    channel: Mask
    direction: Codes
    pan_deepest: Mask
    cell_width_m: FloatArray
    cell_height_m: FloatArray

    def rows(self, first: int, after: int) -> "Ground":
        """Return some rows of it, without a copy."""
        shape = self.valid.shape
        found: dict[str, Any] = {}
        for each in fields(self):
            values = getattr(self, each.name)
            if each.name == "soil_depth_m":
                values = np.broadcast_to(np.asarray(values), shape)
            found[each.name] = None if values is None else values[first:after]
        return Ground(**found)


@dataclass(frozen=True, slots=True)
class Limits:
    """
    What a cell that can be cropped keeps to.

    Multiple-flow area per metre of contour (mean of the cell's width and height) must reach `min_catchment_ratio` times
    the root of `target_area_m2`; contributing area may be `max_catchment_m2` at most. The strip of channel_width_m / 2 +
    channel_setback_m on both sides of the channels' lines is taken off; see `strip_share_left`.

    References
    ----------
    Slope: Critchley & Siegert (1991), FAO AGL/MISC/17/91. The other limits are common practice or assumptions.
    """

    max_slope_pct: float
    max_height_above_channel_m: float
    min_soil_depth_m: float
    min_catchment_ratio: float
    target_area_m2: float
    max_catchment_m2: float
    channel_width_m: float
    channel_setback_m: float

    @property
    def strip_half_width_m(self) -> float:
        """Ground taken off on each side of a channel's line."""
        return 0.5 * self.channel_width_m + self.channel_setback_m

    @property
    def least_fed_m(self) -> float:
        """Least ground above for each metre of contour, m2/m."""
        return float(self.min_catchment_ratio * np.sqrt(self.target_area_m2))


def screen(ground: Ground, limits: Limits) -> Screening:
    """Test every cell, in the order of the reason codes; the first failed test is the reason."""
    shape = ground.valid.shape
    left = _strip_left(ground, limits)
    found = Screening(np.zeros(shape, dtype=np.uint8), np.full(shape, np.nan, dtype=np.float32))
    for row in range(0, shape[0], BAND_ROWS):  # the margins of a band are small beside the rasters
        band = slice(row, row + BAND_ROWS)
        part = Screening(found.reason[band], found.margin[band])
        some = ground.rows(row, row + BAND_ROWS)
        with np.errstate(invalid="ignore"):
            for code, failed, margin in _tests(some, limits, left[band]):
                part._fail(code, failed, margin)
            part.margin[part.passed] = _slope_margin(some, limits)[part.passed]
    return found


def judge(ground: Ground, limits: Limits, *, row: int, col: int) -> dict[int, tuple[bool, float]]:
    """Return for one cell and every test, by its code, whether it fails, and its margin (NaN where it has no measure)."""
    left = _strip_left(ground, limits)
    found = {}
    with np.errstate(invalid="ignore"):
        for code, failed, margin in _tests(ground.rows(row, row + 1), limits, left[row : row + 1]):
            value = np.broadcast_to(np.asarray(margin, dtype=np.float64), failed.shape)[0, col]
            found[code] = (bool(failed[0, col]), float(value))
    return found


def _strip_left(ground: Ground, limits: Limits) -> npt.NDArray[np.float32]:
    return strip_share_left(
        ground.channel,
        ground.direction,
        limits.strip_half_width_m,
        cell_width_m=ground.cell_width_m,
        cell_height_m=ground.cell_height_m,
    )


def _slope_margin(ground: Ground, limits: Limits) -> Floats:
    return np.asarray(np.float32(limits.max_slope_pct) - np.float32(100.0) * ground.slope)


def _tests(ground: Ground, limits: Limits, left: Floats) -> Iterator[tuple[int, Mask, Any]]:
    """Give code, failed cells and margin of every test, in the order of the codes."""
    none = np.zeros(ground.valid.shape, dtype=np.bool_)
    area, shared = ground.contributing_area_m2, ground.multiple_flow_area_m2
    yield NO_DATA, ~ground.valid | np.isnan(ground.slope) | np.isnan(area) | np.isnan(shared), np.nan
    yield OUTSIDE_BOUNDARY, none if ground.inside is None else ~ground.inside, np.nan
    yield EXCLUDED, none if ground.excluded is None else ground.excluded, np.nan
    yield CHANNEL_STRIP, left < LEAST_SHARE, left - LEAST_SHARE
    yield PAN, ground.pan_deepest, np.nan
    margin = _slope_margin(ground, limits)
    yield TOO_STEEP, margin < 0, margin
    margin = limits.max_height_above_channel_m - ground.height_above_channel_m
    foot = (ground.position == FOOTSLOPE) | (ground.position == TOESLOPE)
    yield NOT_LOW, ~foot & ~(margin >= 0), margin
    depth_margin = ground.soil_depth_m - limits.min_soil_depth_m
    yield SOIL_TOO_SHALLOW, np.asarray(depth_margin < 0), depth_margin
    contour_m = 0.5 * (ground.cell_width_m + ground.cell_height_m)
    fed_margin = shared / contour_m[:, None] - limits.least_fed_m
    yield TOO_LITTLE_ABOVE, fed_margin < 0, fed_margin
    yield TOO_MUCH_ABOVE, area > limits.max_catchment_m2, limits.max_catchment_m2 - area


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
