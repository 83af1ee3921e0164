"""The pages made from the program are those that it makes now, and a run fills what they tell of."""

import importlib.util
import json
import shutil
from functools import cache
from pathlib import Path
from types import ModuleType

import geopandas as gpd
import pytest
import rasterio
from affine import Affine

from siting.config import load_project
from siting.pipeline import run

ROOT = Path(__file__).parents[2]
DEMO = ROOT / "demo_dem"
TOP, LEFT, SIDE = 100, 350, 300


@cache
def script() -> ModuleType:
    spec = importlib.util.spec_from_file_location("generate", ROOT / "docs" / "generate.py")
    assert spec is not None and spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.mark.parametrize("page", ["layers.md", "settings.md"])
def test_a_page_is_what_the_program_declares(page: str) -> None:
    found = (ROOT / "docs" / page).read_text(encoding="utf-8")
    assert found == script().PAGES[page](), f"docs/{page} is old: run python docs/generate.py"


@pytest.fixture(scope="module")
def results(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Run a corner of the demo place with a plot drawn by hand, so that every kind of column has something to say."""
    folder = tmp_path_factory.mktemp("place")
    shutil.copytree(DEMO, folder, dirs_exist_ok=True, ignore=shutil.ignore_patterns("results", "__pycache__"))
    with rasterio.open(DEMO / "dem.tif") as file:
        heights = file.read(1, window=((TOP, TOP + SIDE), (LEFT, LEFT + SIDE))) * file.scales[0]
        west, north, crs = file.transform.c + 10 * LEFT, file.transform.f - 10 * TOP, file.crs
    with rasterio.open(
        folder / "dem.tif", "w", driver="GTiff", height=SIDE, width=SIDE, count=1, dtype="float32", crs=crs,
        transform=Affine(10, 0, west, 0, -10, north),
    ) as file:  # fmt: skip
        file.write(heights.astype("float32"), 1)
    x, y = west + 1500, north - 1500
    corners = [[x, y], [x + 60, y], [x + 60, y + 60], [x, y + 60], [x, y]]
    own = {"type": "Feature", "properties": {"name": "by hand"}, "geometry": {"type": "Polygon", "coordinates": [corners]}}
    name = {"type": "name", "properties": {"name": f"urn:ogc:def:crs:EPSG::{crs.to_epsg()}"}}
    collection = {"type": "FeatureCollection", "crs": name, "features": [own]}
    (folder / "own.geojson").write_text(json.dumps(collection), encoding="utf-8")
    project = load_project(folder / "project.toml", (f"plots.given={folder / 'own.geojson'}",))
    run(project, out=folder / "results", threads=2)
    return folder / "results"


@pytest.mark.parametrize("name", ["plots", "villages"])
def test_a_run_fills_every_column_that_the_page_tells_of(results: Path, name: str) -> None:
    table = gpd.read_file(results / "siting.gpkg", layer=name).drop(columns="geometry")
    assert not [column for column in table if table[column].isna().all()]


def test_every_file_of_a_run_is_told_of(results: Path) -> None:
    page = (ROOT / "docs" / "layers.md").read_text(encoding="utf-8")
    for path in results.rglob("*.tif"):
        assert f"| `{path.stem}` |" in page
    for path in results.iterdir():
        assert f"`{path.name}{'/' if path.is_dir() else ''}`" in page
