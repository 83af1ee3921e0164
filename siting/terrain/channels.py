"""Drainage lines, the height above them, and positions in the landscape."""

import numpy as np
import numpy.typing as npt

from siting.parallel import run_all
from siting.terrain._kernels.stencil import place
from siting.terrain._kernels.walk import height_of_target
from siting.terrain.condition import Directions, FloatArray, Heights, Mask, blocks_of, row_bands

SUMMIT, SHOULDER, BACKSLOPE, FOOTSLOPE, TOESLOPE = 1, 2, 3, 4, 5
UNKNOWN_POSITION, NO_POSITION = 0, 255
CODES = tuple(np.uint8(code) for code in (SUMMIT, SHOULDER, FOOTSLOPE, TOESLOPE, BACKSLOPE, UNKNOWN_POSITION, NO_POSITION))
SHARES = tuple(np.float32(share) for share in (0.9, 0.65, 0.35, 0.1))
"""Limits of r for summit, shoulder, footslope and toeslope."""

GENTLE_SLOPE = 0.05


def channel_cells(contributing_area_m2: FloatArray, *, channel_area_m2: float) -> Mask:
    """Mark the cells whose contributing area in m2 reaches `channel_area_m2`; False at voids."""
    with np.errstate(invalid="ignore"):
        return np.asarray(contributing_area_m2 >= channel_area_m2)


def height_above_channel_m(filled: Heights, direction: Directions, channel: Mask, *, threads: int = 1) -> Heights:
    """
    Height of each cell over the first channel cell on its flow path, m; NaN where it meets none.

    Measured on the filled surface, so it is never negative; 0 at channel cells.

    References
    ----------
    Nobre et al. (2011), Journal of Hydrology 404.
    """
    height = np.full(direction.shape, np.inf, dtype=np.float32)
    flat = [one.ravel() for one in (direction, channel, filled, height)]
    cols = direction.shape[1]
    blocks = blocks_of((direction.shape[0], cols), 256)
    run_all(lambda *limits: height_of_target(*flat, cols, limits), blocks, threads)
    bands = row_bands(direction.shape[0], 64)
    run_all(lambda a, b: np.subtract(filled[a:b], height[a:b], out=height[a:b]), bands, threads)
    return height


def landscape_position(
    *,
    height_above_channel_m: Heights,
    drop_from_above_m: Heights,
    slope: Heights,
    profile_curvature: Heights,
    vertical_error_m: float,
) -> npt.NDArray[np.uint8]:
    """
    Place each cell on the slope: 1 summit, 2 shoulder, 3 backslope, 4 footslope, 5 toeslope.

    With h the height above the channel, u the drop from the highest cell upstream, r = h / (h + u): toeslope
    r <= 0.1 and slope <= 5 %; footslope r <= 0.35 and not convex; summit r >= 0.9 and slope <= 5 %; shoulder
    r >= 0.65 and not concave; else backslope (our thresholds). 0 (unknown) where h is unknown or
    h + u < 2 vertical_error_m; 255 void.

    Parameters
    ----------
    profile_curvature
        Above zero where the ground is convex downslope, 1/m.

    References
    ----------
    Terms: Schoeneberger et al., Field book for describing and sampling soils.
    """
    position = np.empty(slope.shape, dtype=np.uint8)
    place(
        height_above_channel_m,
        drop_from_above_m,
        slope,
        profile_curvature,
        np.float32(GENTLE_SLOPE),
        np.float32(2.0 * vertical_error_m),
        SHARES,
        CODES,
        position,
    )
    return position
