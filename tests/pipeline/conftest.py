"""One run of the demo place for all tests that look at it, and small projects to run."""

from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import rasterio
from affine import Affine

from siting.config import load_project
from siting.pipeline import run
from siting.pipeline.results import Results

DEMO = Path(__file__).parents[2] / "demo_dem"


@pytest.fixture(scope="session")
def demo(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, Results]:
    """Run the demo place once: its results folder and summary."""
    folder = tmp_path_factory.mktemp("demo") / "results"
    return folder, run(load_project(DEMO / "project.toml"), out=folder, threads=2)


@pytest.fixture(scope="session")
def write_dem() -> Callable[..., Path]:
    """Write heights as a GeoTIFF."""

    def write(path: Path, heights: np.ndarray, cell: float, *, west: float = 690_000.0, north: float = 3_420_000.0,
              crs: str | None = "EPSG:32636", unit: str = "") -> Path:  # fmt: skip
        with rasterio.open(
            path, "w", driver="GTiff", height=heights.shape[0], width=heights.shape[1], count=1, dtype="float32",
            crs=crs, transform=Affine(cell, 0, west, 0, -cell, north),
        ) as file:  # fmt: skip
            file.write(heights.astype(np.float32), 1)
            if unit:
                file.units = (unit,)
        return path

    return write


@pytest.fixture(scope="session")
def valley() -> np.ndarray:
    """Give rough ground 120 x 100 cells wide that drains through a valley to the south."""
    random = np.random.default_rng(7)
    row, col = np.mgrid[0:120, 0:100]
    rough = random.normal(size=(120, 100)).cumsum(0).cumsum(1)
    rough = (rough - rough.mean()) / rough.std()
    return np.asarray(500.0 + 0.12 * (119 - row) + 0.012 * (col - 50.0) ** 2 + 0.3 * rough + 0.1 * random.random((120, 100)))


@pytest.fixture(scope="session")
def run_flags() -> Callable[..., Results]:
    """Run a DEM with the demo's weather and uniform ground, and whatever settings are given."""

    def call(dem: Path, out: Path, *, threads: int = 2, overwrite: bool = False, **settings: Any) -> Results:
        flags: Mapping[str, Any] = {
            "place.dem": str(dem),
            "rain.daily": str(DEMO / "rain.csv"),
            "climate.daily": str(DEMO / "climate.csv"),
            "crop.name": "barley",
            "crop.planting": "11-15",
            "cover.cover": "desert shrub",
            "cover.condition": "poor",
            "soil.texture": "clay loam",
        } | {key.replace("__", "."): value for key, value in settings.items()}
        return run(load_project(None, flags=flags), out=out, threads=threads, overwrite=overwrite)

    return call
