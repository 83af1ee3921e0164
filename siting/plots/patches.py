"""Patches of cells that passed, and the sizes that a plot can have on these cells."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.grid import AREA_UNIT_M2
from siting.plots._kernels.patches import label_edge_patches

FloatArray = npt.NDArray[np.float64]
Mask = npt.NDArray[np.bool_]
Labels = npt.NDArray[np.int32]

LEAST_CELLS = 4
"""No plot has fewer cells: fewer carry no slope of their own."""

TARGET_CELLS = 9
"""No target is smaller than this many cells."""


@dataclass(frozen=True, slots=True)
class PlotSize:
    """
    Least and target size of a plot on cells of a given size.

    `coarse_cells` tells that cells raise either figure: what is found then are zones to search in.
    """

    min_area_m2: float
    target_area_m2: float
    coarse_cells: bool


def plot_size(cell_area_m2: FloatArray, *, min_area_m2: float, target_area_m2: float) -> PlotSize:
    """Raise the sizes asked for to what the largest cells of the grid allow."""
    cell = float(cell_area_m2.max())
    least, target = max(min_area_m2, LEAST_CELLS * cell), max(target_area_m2, TARGET_CELLS * cell)
    return PlotSize(least, max(target, least), least > min_area_m2 or target > target_area_m2)


def cell_areas_m2(cell_width_m: FloatArray, cell_height_m: FloatArray) -> FloatArray:
    """Return the area of a cell for each row, rounded as the areas of a Grid are, so that sums are exact."""
    return np.maximum(np.round(cell_width_m * cell_height_m / AREA_UNIT_M2), 1.0) * AREA_UNIT_M2


def label_parts(mask: Mask) -> tuple[Labels, int]:
    """Label the patches of cells that share edges from 1, in the order of their first cells; return how many, too."""
    label = np.zeros(mask.shape, dtype=np.int32)
    count = label_edge_patches(mask, label, np.empty(int(np.count_nonzero(mask)) + 8, dtype=np.int64))
    return label, int(count)


def areas_and_cells(label: Labels, count: int, cell_area_m2: FloatArray) -> tuple[FloatArray, npt.NDArray[np.int64]]:
    """Return the area (m2) and the number of cells of labels 1 to `count`; other labels are ignored."""
    place = np.flatnonzero(label > 0)
    number = label.ravel()[place]
    weight = cell_area_m2[place // label.shape[1]]
    area = np.bincount(number, weights=weight, minlength=count + 1)[1:].astype(np.float64)
    return area, np.bincount(number, minlength=count + 1)[1:].astype(np.int64)
