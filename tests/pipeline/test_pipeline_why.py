"""The judgement of one place says what a run says of it."""

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pyogrio
import pytest
import rasterio
from pyproj import Transformer
from shapely.geometry import Point

from siting.config import load_project
from siting.errors import InputError
from siting.layers import WHY_NOT
from siting.pipeline import why
from siting.pipeline.results import Results


def test_the_reason_at_a_place_is_that_of_the_raster_and_its_plot_that_of_the_layer(
    tmp_path: Path, write_dem: Callable[..., Path], run_flags: Callable[..., Results], valley: np.ndarray
) -> None:
    dem = write_dem(tmp_path / "dem.tif", valley, 10.0)
    run_flags(dem, tmp_path / "out")
    settings = {"place.dem": str(dem), "cover.curve_number": 80.0, "soil.texture": "clay loam"}
    project = load_project(None, flags=settings)
    with rasterio.open(tmp_path / "out" / "rasters" / "why_not.tif") as file:
        reasons, transform, crs = file.read(1), file.transform, file.crs
    plots = pyogrio.read_dataframe(tmp_path / "out" / "siting.gpkg", layer="plots")
    labels = {int(item.value): item.label for item in WHY_NOT.items}
    for code in np.unique(reasons):
        row, col = np.argwhere(reasons == code)[-1]
        x, y = transform.c + (col + 0.5) * transform.a, transform.f + (row + 0.5) * transform.e
        found = why(project, x, y)
        assert found["reason"] == labels[int(code)]
        failed = [one["test"] for one in found["tests"] if one["result"] == "fails"]
        assert bool(failed) == (code != 0)
        assert all(one["what_would_change_it"] for one in found["tests"] if one["result"] == "fails")
        here = plots[plots.contains(Point(x, y))]
        assert found["plot_id"] == (int(here["plot_id"].iloc[0]) if len(here) else None)
        lon, lat = Transformer.from_crs(crs, "EPSG:4326", always_xy=True).transform(x, y)
        assert why(project, lon, lat, lonlat=True)["place"] == found["place"]


def test_a_point_beyond_the_data_is_refused_with_the_way_out(
    tmp_path: Path, write_dem: Callable[..., Path], valley: np.ndarray
) -> None:
    project = load_project(None, flags={"place.dem": str(write_dem(tmp_path / "dem.tif", valley, 10.0))})
    with pytest.raises(InputError, match=r"lies outside the elevation model.*--lonlat"):
        why(project, 35.0, 30.9)
