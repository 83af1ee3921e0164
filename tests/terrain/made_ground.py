"""Rasters made by chance or by rule, for tests that compare ways to compute."""

import numpy as np
import numpy.typing as npt
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from siting.terrain.condition import Conditioned, condition

Heights = npt.NDArray[np.float32]

SHAPES = hnp.array_shapes(min_dims=2, max_dims=2, min_side=1, max_side=11)
FEW_HEIGHTS = st.sampled_from([0.0, -0.0, 1.0, 2.0, 3.0, np.nan, np.inf, 2.5])
RASTERS = hnp.arrays(np.float32, SHAPES, elements=FEW_HEIGHTS)


def conditioned(
    z: Heights, *, sinks: npt.NDArray[np.bool_] | None = None, block: int = 256, threads: int = 1
) -> Conditioned:
    rows = z.shape[0]
    return condition(
        z,
        cell_width_m=np.full(rows, 10.0),
        cell_height_m=np.full(rows, 12.0),
        sinks=sinks,
        threads=threads,
        block=block,
    )


def fractal(side: int, seed: int, *, whole_metres: bool = False) -> Heights:
    rng = np.random.default_rng(seed)
    frequency = np.hypot(np.fft.fftfreq(side)[:, None], np.fft.rfftfreq(side)[None, :])
    frequency[0, 0] = 1.0
    spectrum = np.fft.rfft2(rng.standard_normal((side, side))) * frequency**-1.7
    spectrum[0, 0] = 0.0
    z = np.fft.irfft2(spectrum, s=(side, side))
    z = 500.0 + 60.0 * z / z.std()
    heights: Heights = (np.round(z) if whole_metres else z).astype(np.float32)
    return heights


def kinds_of_ground(side: int) -> dict[str, Heights]:
    """Make natural, terraced, void-ridden and pan-ridden ground; the last two from the first."""
    natural = fractal(side, 3)
    rng = np.random.default_rng(4)
    voids, pans = natural.copy(), natural.copy()
    voids[rng.random(voids.shape) < 0.02] = np.nan
    voids[side // 5 : side // 3, side // 2 : side // 2 + side // 7] = np.nan
    for row, col in rng.integers(0, side - 9, (side // 4, 2)):
        pans[row : row + 9, col : col + 9] -= 30.0
    return {"natural": natural, "terraced": fractal(side, 5, whole_metres=True), "voids": voids, "pans": pans}
