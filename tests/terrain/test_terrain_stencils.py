"""Kernels that vectorise, on long rows with voids and flats, against the same formulas on whole arrays."""

from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from made_ground import Heights, kinds_of_ground

from siting.terrain import landscape_position, profile_curvature
from siting.terrain._kernels.sorting import ascending

KINDS = kinds_of_ground(150)


def around(z: Heights) -> list[npt.NDArray[np.float64]]:
    """Return the nine cells of each cell's window as arrays, row by row; NaN beyond the edge."""
    rows, cols = z.shape
    padded = np.pad(z.astype(np.float64), 1, constant_values=np.nan)
    return [padded[row : row + rows, col : col + cols] for row in range(3) for col in range(3)]


@pytest.mark.parametrize("kind", KINDS)
def test_curvature_equals_the_formula_on_arrays(kind: str) -> None:
    # Zevenbergen & Thorne (1987): second derivative of the surface along its gradient
    z = KINDS[kind]
    width, height = np.linspace(9.0, 11.0, 150)[:, None], np.linspace(12.0, 10.0, 150)[:, None]
    nw, n, ne, w, centre, e, sw, s, se = around(z)
    p, q = (e - w) / (2 * width), (n - s) / (2 * height)
    xx, yy = (e - 2 * centre + w) / width**2, (n - 2 * centre + s) / height**2
    xy = (ne - nw - se + sw) / (4 * width * height)
    with np.errstate(invalid="ignore", divide="ignore"):
        along = -(xx * p**2 + 2 * xy * p * q + yy * q**2) / (p**2 + q**2)
        bends = np.isfinite(along + nw + n + ne + w + e + sw + s + se) & (np.abs(along) * width * height >= 0.002)
    expected = np.where(np.isnan(centre), np.nan, np.where(bends, along, 0.0))
    got = profile_curvature(z, cell_width_m=width[:, 0], cell_height_m=height[:, 0])
    np.testing.assert_allclose(got, expected, rtol=1e-6, atol=1e-12)


def test_positions_equal_the_rules_on_arrays() -> None:
    rng = np.random.default_rng(8)

    def some(*values: float) -> Heights:
        return rng.choice(np.array(values, dtype=np.float32), (97, 203))

    measured: dict[str, Any] = {
        "height_above_channel_m": some(0.0, 0.5, 1.0, 3.0, 6.0, 9.0, np.nan),
        "drop_from_above_m": some(0.0, 0.25, 1.0, 4.0, 7.0, 9.0),
        "slope": some(0.0, 0.03, 0.05, 0.2, np.nan),
        "profile_curvature": some(-0.01, 0.0, 0.01),
    }
    h, u, steep, bend = measured.values()
    with np.errstate(invalid="ignore", divide="ignore"):
        share = h / (h + u)
        rules = [
            (np.isnan(steep), 255),
            (~(h + u >= 2.0), 0),
            ((share <= np.float32(0.1)) & (steep <= np.float32(0.05)), 5),
            ((share <= np.float32(0.35)) & (bend <= 0), 4),
            ((share >= np.float32(0.9)) & (steep <= np.float32(0.05)), 1),
            ((share >= np.float32(0.65)) & (bend >= 0), 2),
        ]
    expected = np.select([rule for rule, _ in rules], [code for _, code in rules], default=3)
    assert set(np.unique(expected)) == {0, 1, 2, 3, 4, 5, 255}
    np.testing.assert_array_equal(landscape_position(**measured, vertical_error_m=1.0), expected)


@pytest.mark.parametrize("size", [0, 1, 5, 3000])
def test_sorted_heights_ascend_and_equals_stay_in_order(size: int) -> None:
    rng = np.random.default_rng(size)
    heights = rng.choice(np.array([-1e30, -7.5, -1e-30, 0.0, 1e-40, 3.0, 8848.0, np.inf], dtype=np.float32), size)
    heights[: size // 2] = rng.normal(0.0, 500.0, size // 2)
    np.testing.assert_array_equal(ascending(heights), np.argsort(heights, kind="stable"))
