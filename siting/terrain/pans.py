"""Closed depressions: which are kept as ends of flow, and which are doubtful."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.errors import GridError
from siting.parallel import run_all
from siting.terrain._kernels.depressions import label_patches, measure_patches, renumber
from siting.terrain.condition import Conditioned, FloatArray, Heights, Mask, row_bands

Integers = npt.NDArray[np.int64]

HECTARE_M2 = 10_000.0
KEPT, DOUBTFUL, GIVEN = "kept", "doubtful", "given"


@dataclass(frozen=True, slots=True, eq=False)
class Pans:
    """
    Kept, given and doubtful depressions, one entry each; `label` holds the pan_id of their cells, else 0.

    `status` is "kept" by its size and depth, "given" by the user, or "doubtful": drained, yet perhaps real. Volume is
    that between the ground and the spill level. `spill_cell` is the flat index of the first cell outside that the pan
    would spill to, -1 where unknown. `bottom_cell` is the lowest cell, at which the flow into a kept pan ends.
    """

    pan_id: Integers
    status: tuple[str, ...]
    area_m2: FloatArray
    depth_m: FloatArray
    volume_m3: FloatArray
    spill_cell: Integers
    bottom_cell: Integers
    label: npt.NDArray[np.int32]

    def mask_of(self, *statuses: str) -> Mask:
        """Mark the cells of all pans of these statuses."""
        wanted = np.array([False, *(status in statuses for status in self.status)])
        return np.asarray(wanted[self.label])

    def kept_mask(self) -> Mask:
        """Mark the cells of pans that end the flow."""
        return self.mask_of(KEPT, GIVEN)

    def doubtful_mask(self) -> Mask:
        """Mark the cells of drained depressions that may be real."""
        return self.mask_of(DOUBTFUL)


def find_pans(
    conditioned: Conditioned,
    elevation: Heights,
    *,
    cell_area_m2: FloatArray,
    vertical_error_m: float,
    pan_min_area_m2: float,
    pan_layer: npt.NDArray[np.int8] | None,
    threads: int = 1,
) -> Pans:
    """
    Choose among the raised patches of a plain fill.

    A patch of at least `pan_min_area_m2` is kept if its greatest depth is at least 2 e, or its mean depth at least
    2 e / sqrt(n), n = its area over a hectare or over one cell if that is larger: pans are wide and shallow. One
    with half that depth is doubtful. `pan_layer` (1 keep, -1 never keep, 0 not said) always wins where it touches a
    patch; where it says both of one patch, keeping wins. Where it keeps ground that holds no depression, each
    8-connected part of that ground is listed with depth and volume 0 and ends the flow at its lowest cell.

    Parameters
    ----------
    conditioned
        The plain fill of `elevation`, no pan kept.
    elevation
        Heights in m, NaN void.
    cell_area_m2
        Area of a cell for each row, m2.
    vertical_error_m
        Standard deviation e of the local error of the heights, m.
    pan_min_area_m2, pan_layer
        As above; the layer is (rows, columns) or None.
    threads
        How to compute; cannot change the result.

    Raises
    ------
    GridError
        A layer of another shape than the heights.
    """
    if pan_layer is not None and pan_layer.shape != elevation.shape:
        msg = f"pan_layer has shape {pan_layer.shape}, the heights {elevation.shape}: give both on one grid"
        raise GridError(msg)
    raised = conditioned.filled > elevation  # never at voids
    label = np.zeros(elevation.shape, dtype=np.int32)
    count = label_patches(raised, label, np.empty(np.count_nonzero(raised) + 1, dtype=np.int64))
    if pan_layer is not None:
        count = _label_kept_ground((pan_layer > 0) & np.isfinite(elevation), label, count)
    area, volume, depth = (np.zeros(count + 1) for _ in range(3))
    bottom, spill = (np.full(count + 1, -1, dtype=np.int64) for _ in range(2))
    measure_patches(
        label, conditioned.filled, elevation, conditioned.direction, cell_area_m2, area, volume, depth, bottom, spill
    )
    status = _statuses(area, volume, depth, float(np.median(cell_area_m2)), vertical_error_m, pan_min_area_m2)
    if pan_layer is not None:
        for patch in np.unique(label[pan_layer < 0]):
            status[patch] = ""
        for patch in np.unique(label[pan_layer > 0]):
            status[patch] = GIVEN
    status[0] = ""
    listed = np.flatnonzero(status != "")
    number = np.zeros(count + 1, dtype=np.int64)
    number[listed] = np.arange(1, listed.size + 1)
    run_all(lambda row0, row1: renumber(label, number, row0, row1), row_bands(elevation.shape[0], 64), threads)
    return Pans(
        np.arange(1, listed.size + 1, dtype=np.int64),
        tuple(str(status[patch]) for patch in listed),
        area[listed],
        depth[listed],
        volume[listed],
        spill[listed],
        bottom[listed],
        label,
    )


def _label_kept_ground(keep: Mask, label: npt.NDArray[np.int32], count: int) -> int:
    """Add to the labels each kept patch of ground that touches no depression; return how many labels there are."""
    ground = np.zeros(label.shape, dtype=np.int32)
    patches = label_patches(keep, ground, np.empty(np.count_nonzero(keep) + 1, dtype=np.int64))
    new = np.ones(patches + 1, dtype=np.bool_)
    new[ground[label > 0]] = False
    new[0] = False
    number = np.where(new, count + np.cumsum(new), 0).astype(np.int32)
    np.maximum(label, number[ground], out=label)
    return count + int(new.sum())


def _statuses(
    area: FloatArray, volume: FloatArray, depth: FloatArray, cell_m2: float, error_m: float, least_m2: float
) -> npt.NDArray[np.str_]:
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = volume / area
        mean_limit = 2.0 * error_m / np.sqrt(area / max(HECTARE_M2, cell_m2))
    large = area >= least_m2
    kept = large & ((depth >= 2.0 * error_m) | (mean >= mean_limit))
    doubtful = large & ((depth >= error_m) | (mean >= 0.5 * mean_limit))
    return np.where(kept, KEPT, np.where(doubtful, DOUBTFUL, "")).astype("<U8")
