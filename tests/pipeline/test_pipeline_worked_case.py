"""The V-valley worked by hand, from files to the GeoPackage: a 20-day crop, three storms, one plot that was drawn."""

from collections.abc import Callable
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pandas as pd
import pyogrio
import pytest
from shapely.geometry import box

from siting.config import load_project
from siting.pipeline import run

WEST, NORTH, CELL = 690_000.0, 3_420_000.0, 20.0
FIRST, LAST = 1990, 2020
STORMS = {-4: 18.0, 9: 30.0, 14: 12.0}
"""Millimetres by day of the season; there is no day 0."""


@pytest.fixture(scope="module")
def project(tmp_path_factory: pytest.TempPathFactory, write_dem: Callable[..., Path]) -> Path:
    """Write the files: each year, sown on 15 November, has the same three storms in an otherwise dry record."""
    folder = tmp_path_factory.mktemp("worked")
    r, c = np.mgrid[0:17, 0:11]
    z = 100 + 1.0 * np.abs(np.clip(c, 1, 9) - 5) + 0.2 * (15 - np.maximum(r, 1))
    write_dem(folder / "dem.tif", z - 0.1 * ((r == 0) | (c == 0) | (c == 10)), CELL)
    days = pd.date_range(f"{FIRST}-01-01", f"{LAST}-12-31")
    rain = np.zeros(days.size)
    for year in range(FIRST, LAST + 1):
        for day, depth_mm in STORMS.items():
            rain[int(days.searchsorted(pd.Timestamp(year, 11, 15))) + (day - 1 if day > 0 else day)] = depth_mm
    pd.DataFrame({"date": days.strftime("%Y-%m-%d"), "rain_mm": rain}).to_csv(folder / "rain.csv", index=False)
    plot = box(WEST + 4 * CELL, NORTH - 15 * CELL, WEST + 7 * CELL, NORTH - 13 * CELL)
    frame = gpd.GeoDataFrame({"name": ["<script>the corner</script>"]}, geometry=[plot], crs="EPSG:32636")
    frame.to_file(folder / "given.geojson")
    (folder / "project.toml").write_text(
        """
        [place]
        dem = "dem.tif"
        [terrain]
        channel_area_m2 = 10795  # 27 cells, which are a little under 400 m2 each in this zone
        [soil]
        depth_m = 0.6
        field_capacity = 0.25
        wilting_point = 0.12
        infiltration_mm_h = 12.5
        [cover]
        curve_number = 85
        [rain]
        daily = "rain.csv"
        year_starts = 6
        [climate]
        reference_et = [6, 6, 6, 6, 6, 6, 6, 6, 6, 6, 6, 6]
        [crop]
        stage_days = [4, 4, 8, 4]
        kc = [0.3, 1.1, 0.5]
        root_depth_m = 0.6
        depletion_fraction = 0.55
        ky = 1.0
        planting = "11-15"
        [plots]
        given = "given.geojson"
        search = false
        """
    )
    return folder / "project.toml"


def plot_of(project: Path, out: Path, *overrides: str) -> Any:
    """Run the project and return its only plot."""
    run(load_project(project, overrides), out=out)
    plots = pyogrio.read_dataframe(out / "siting.gpkg", layer="plots")
    assert len(plots) == 1
    return plots.iloc[0]


def test_the_printed_figures(project: Path, tmp_path: Path) -> None:
    plot = plot_of(project, tmp_path / "out")
    expected = {
        "area_m2": 2400.0,
        "catchment_area_m2": 48_000.0,
        "catchment_ratio": 20.0,
        "available_water_mm": 78.0,
        "crop_demand_mm": 96.0,
        "crop_demand_m3": 230.4,
        "yield_dry_m3": 356.7263,
        "yield_median_m3": 356.7263,
        "yield_wet_m3": 356.7263,
        "supply_ratio_dry": 1.1331,
        "supply_ratio_median": 1.1331,
        "needed_ratio": 13.4094,
        "runon_dry_mm": 78.0 + 24.7275,
        "curve_number": 85.0,
        "height_above_channel_m": 4.0 / 6.0,
    }
    for name, value in expected.items():
        assert plot[name] == pytest.approx(value, rel=1e-3), name
    assert (plot["rank"], plot["supply_rank"], plot["origin"]) == (1, 1, "given")
    assert plot["given_name"] == "<script>the corner</script>"
    assert not plot["open_catchment"]
    assert pd.isna(plot["next_plot_id"])
    assert plot["reliability_pct"] > plot["rain_only_reliability_pct"]  # the storm before sowing carries the crop
    seasons = pyogrio.read_dataframe(tmp_path / "out" / "siting.gpkg", layer="seasons")
    assert len(seasons) == LAST - FIRST  # the first has no harvest before it
    assert seasons["rain_mm"].to_numpy() == pytest.approx(42.0)
    assert seasons["runon_mm"].to_numpy() == pytest.approx(24.7275 + 123.9085, rel=1e-3)
    assert seasons["supply_ratio"].to_numpy() == pytest.approx(1.1331, rel=1e-3)
    intake = pyogrio.read_dataframe(tmp_path / "out" / "siting.gpkg", layer="intakes").iloc[0]
    assert (intake.geometry.x, intake.geometry.y) == (WEST + 5.5 * CELL, NORTH - 13.5 * CELL)
    assert intake["contributing_area_m2"] == pytest.approx(43_200.0, rel=1e-3)


def test_without_losses_the_gross_volumes_arrive(project: Path, tmp_path: Path) -> None:
    plot = plot_of(project, tmp_path / "out", "runoff.conveyance_loss_per_km=0", "runoff.channel_wetting_mm=0")
    assert plot["yield_dry_m3"] == pytest.approx(404.4923, rel=1e-3)


def test_the_other_abstraction_ratio_gives_more_and_is_shown_beside(project: Path, tmp_path: Path) -> None:
    plot = plot_of(project, tmp_path / "one")
    other = plot_of(project, tmp_path / "two", "runoff.abstraction_ratio=0.05")
    assert plot["yield_dry_other_ratio_m3"] > plot["yield_dry_m3"]
    assert plot["yield_dry_other_ratio_m3"] == pytest.approx(other["yield_dry_m3"], rel=1e-12)
    assert plot["supply_ratio_dry_other_ratio"] == pytest.approx(other["supply_ratio_dry"], rel=1e-12)
