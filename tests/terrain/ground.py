"""Ground that several tests of the terrain stand on."""

from typing import Any

import numpy as np
import numpy.typing as npt

from siting.grid import Raster, metric_grid
from siting.terrain import Terrain, analyse

FloatArray = npt.NDArray[np.float64]


def terrain_of(z: npt.NDArray[np.floating], cell_m: float, **settings: Any) -> Terrain:
    """Analyse heights on square cells, with settings that keep no pan unless told otherwise."""
    values: dict[str, Any] = {
        "vertical_error_m": 0.15,
        "channel_area_m2": 10_800.0,
        "pan_min_area_m2": 1e9,
        "pan_layer": None,
        "threads": 2,
    }
    raster = Raster(metric_grid(z.shape[0], z.shape[1], cell_m), z.astype(np.float32))
    return analyse(raster, **(values | settings))


def worked_valley() -> FloatArray:
    """17 x 11 cells of 20 m, sides of 5 %, a bed that falls 1 % south, a rim that falls away."""
    r, c = np.mgrid[0:17, 0:11]
    z = 100 + 1.0 * np.abs(np.clip(c, 1, 9) - 5) + 0.2 * (15 - np.maximum(r, 1))
    heights: FloatArray = z - 0.1 * ((r == 0) | (c == 0) | (c == 10))
    return heights


def bowl(depth: float) -> FloatArray:
    """Give 60 x 60 cells of gently falling ground with a round hollow of 24 cells across."""
    y, x = np.mgrid[0:60, 0:60]
    z = 100.0 + 0.02 * (60 - y)
    r = np.hypot(x - 30, y - 30)
    heights: FloatArray = np.where(r < 12, 100.0 - depth * (1 - (r / 12) ** 2), z)
    return heights


def box(depth: float, side: int, cells: int = 40) -> FloatArray:
    """Give level ground at 50 m that falls away at its edge, with a square pit of level bottom from (10, 10)."""
    z = np.full((cells, cells), 50.0)
    z[0], z[-1], z[:, 0], z[:, -1] = 49.0, 49.0, 49.0, 49.0
    z[10 : 10 + side, 10 : 10 + side] -= depth
    return z


def random_tree(rows: int, cols: int, seed: int) -> tuple[npt.NDArray[np.uint8], FloatArray]:
    """Give directions without circles: each cell points at one of its lower neighbours, by chance, on rough ground."""
    rng = np.random.default_rng(seed)
    z = rng.random((rows, cols))
    z[rng.random((rows, cols)) < 0.1] = np.nan
    steps = ((0, 1), (1, 1), (1, 0), (1, -1), (0, -1), (-1, -1), (-1, 0), (-1, 1))
    direction = np.full((rows, cols), 255, dtype=np.uint8)
    for row, col in np.argwhere(np.isfinite(z)):
        lower = [
            code
            for code, (down, along) in enumerate(steps, 1)
            if 0 <= row + down < rows and 0 <= col + along < cols and z[row + down, col + along] < z[row, col]
        ]
        direction[row, col] = rng.choice(lower) if lower else rng.choice([9, 10])
    return direction, z
