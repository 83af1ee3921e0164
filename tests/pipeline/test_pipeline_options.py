"""What settings of rain, soil, runoff and sowing do to a run: each moves what it says it moves, and nothing else."""

from collections.abc import Callable
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pandas as pd
import pyogrio
import pytest
import rasterio
from affine import Affine
from shapely.geometry import box

from siting.errors import ConfigError, InputError
from siting.pipeline.results import Results

DEMO = Path(__file__).parents[2] / "demo_dem"
WEST, NORTH = 690_000.0, 3_420_000.0

Runs = Callable[..., Any]


@pytest.fixture(scope="module")
def plots_with(
    tmp_path_factory: pytest.TempPathFactory,
    write_dem: Callable[..., Path],
    run_flags: Callable[..., Results],
    valley: np.ndarray,
) -> Runs:
    """Run the valley without rasters and draws, with some settings changed; return a layer of the results."""
    folder = tmp_path_factory.mktemp("options")
    dem = write_dem(folder / "dem.tif", valley, 10.0)
    done: dict[str, tuple[Path, Results]] = {}

    def call(layer: str = "plots", *, warnings: bool = False, **settings: Any) -> Any:
        key = repr(sorted(settings.items()))
        if key not in done:
            out = folder / str(len(done))
            quick = {"output__rasters": False, "ranking__draws": 0}
            done[key] = (out, run_flags(dem, out, **(quick | settings)))
        out, results = done[key]
        if warnings:
            return {one.code for one in results.warnings}
        found = pyogrio.read_dataframe(out / "siting.gpkg", layer=layer)
        return found.sort_values("plot_id", ignore_index=True) if layer == "plots" else found

    return call


def test_two_stations_with_the_same_rain_are_one(tmp_path: Path, plots_with: Runs) -> None:
    rain = pd.read_csv(DEMO / "rain.csv")
    both = pd.concat([rain.assign(station=name) for name in ("west", "east")])
    both.to_csv(tmp_path / "both.csv", index=False)
    pd.DataFrame({"station": ["west", "east"], "x": [WEST, WEST + 1000], "y": [NORTH - 500, NORTH - 500]}).to_csv(
        tmp_path / "stations.csv", index=False
    )
    settings = {"rain__daily": str(tmp_path / "both.csv"), "rain__stations": str(tmp_path / "stations.csv")}
    one, two = plots_with(), plots_with(**settings)
    for column in ("plot_id", "area_m2", "yield_dry_m3", "supply_ratio_dry", "reliability_pct", "peak_flow_10y_m3s"):
        np.testing.assert_allclose(one[column], two[column], rtol=1e-9, err_msg=column)
    assert "no_rank_interval" not in plots_with(warnings=True, **settings)  # no draws were asked for


def test_a_wetter_station_gives_its_own_side_more(tmp_path: Path, plots_with: Runs) -> None:
    rain = pd.read_csv(DEMO / "rain.csv")
    both = pd.concat([rain.assign(station="west"), rain.assign(station="east", rain_mm=1.5 * rain["rain_mm"])])
    both.to_csv(tmp_path / "both.csv", index=False)
    pd.DataFrame({"station": ["west", "east"], "x": [WEST, WEST + 1000], "y": [NORTH - 500, NORTH - 500]}).to_csv(
        tmp_path / "stations.csv", index=False
    )
    one = plots_with()
    two = plots_with(rain__daily=str(tmp_path / "both.csv"), rain__stations=str(tmp_path / "stations.csv"))
    assert (two["yield_median_m3"] >= one["yield_median_m3"] - 1e-9).all()
    catchments = plots_with("catchments").sort_values("plot_id", ignore_index=True)
    west = catchments.bounds["maxx"] < WEST + 501
    assert west.any() and (~west).any()
    np.testing.assert_allclose(two["yield_median_m3"][west], one["yield_median_m3"][west], rtol=1e-9)
    assert (two["yield_median_m3"][~west] > one["yield_median_m3"][~west]).all()


def test_a_rain_map_scales_the_record(tmp_path: Path, plots_with: Runs) -> None:
    with rasterio.open(
        tmp_path / "map.tif", "w", driver="GTiff", height=10, width=10, count=1, dtype="float32", crs="EPSG:32636",
        transform=Affine(200, 0, WEST - 400, 0, -200, NORTH + 400), nodata=-1,
    ) as file:  # fmt: skip
        file.write(np.full((10, 10), 420.0, dtype=np.float32), 1)  # twice the record's own mean
    wet = plots_with(rain__map=str(tmp_path / "map.tif"))
    assert (wet["yield_median_m3"] > 2 * plots_with()["yield_median_m3"]).all()
    assert "rain_factor" in plots_with(warnings=True, rain__map=str(tmp_path / "map.tif"))


def test_monthly_totals_are_refused_unless_days_may_be_drawn(tmp_path: Path, plots_with: Runs) -> None:
    rain = pd.read_csv(DEMO / "rain.csv", parse_dates=["date"]).set_index("date")["rain_mm"]
    monthly = rain.resample("MS").sum()
    first_days = pd.DatetimeIndex(monthly.index).strftime("%Y-%m-%d")
    frame = pd.DataFrame({"date": first_days, "rain_mm": monthly.to_numpy()})
    frame.to_csv(tmp_path / "monthly.csv", index=False)
    with pytest.raises(InputError, match="month"):
        plots_with(rain__daily=str(tmp_path / "monthly.csv"))
    drawn = {"rain__daily": str(tmp_path / "monthly.csv"), "rain__generator": True}
    assert plots_with(**drawn)["yield_median_m3"].gt(0).any()
    assert "rain_generated" in plots_with(warnings=True, **drawn)


def test_the_antecedent_rule_changes_runoff_and_says_that_it_is_withdrawn(plots_with: Runs) -> None:
    ruled = plots_with(runoff__antecedent="rule")
    assert not np.allclose(ruled["yield_median_m3"], plots_with()["yield_median_m3"])
    assert "antecedent_rule" in plots_with(warnings=True, runoff__antecedent="rule")


def test_steep_ground_sheds_more_where_curve_numbers_follow_the_slope(plots_with: Runs) -> None:
    adjusted = plots_with(runoff__slope_adjusted=True)
    assert (adjusted["curve_number"] != plots_with()["curve_number"]).any()


def test_soil_maps_by_particle_sizes_and_depth(tmp_path: Path, plots_with: Runs) -> None:
    """West: a sandy loam of 1.5 m; east: the same, but only 0.3 m of it, too shallow for plots."""
    frame = gpd.GeoDataFrame(
        {"sand_pct": [65.0, 65.0], "clay_pct": [10.0, 10.0], "silt_pct": [25.0, 25.0], "depth_m": [1.5, 0.3]},
        geometry=[
            box(WEST - 100, NORTH - 1300, WEST + 500, NORTH + 100),
            box(WEST + 500, NORTH - 1300, WEST + 1100, NORTH + 100),
        ],
        crs="EPSG:32636",
    )
    frame.to_file(tmp_path / "soil.gpkg")
    plots = plots_with(soil__texture=None, soil__map=str(tmp_path / "soil.gpkg"))
    assert len(plots) > 0
    assert (plots.bounds["maxx"] <= WEST + 500).all()
    assert (plots["texture"] == "sandy loam").all()
    # Saxton & Rawls (2006): about 0.18 less 0.08 at 65 % sand and 10 % clay, over roots of 1.5 m
    assert plots["available_water_mm"].between(100, 200).all()


def test_two_sowings_a_year_are_two_seasons(plots_with: Runs) -> None:
    short = {"crop__stage_days": [15, 20, 30, 15], "crop__kc": [0.3, 1.1, 0.4]}
    once = plots_with("seasons", **short)
    twice = plots_with("seasons", **short, crop__second_planting="03-10")
    plot = twice["plot_id"] == 1
    days = pd.DatetimeIndex(twice.loc[plot, "sown"])
    assert set(days.strftime("%m-%d")) == {"11-15", "03-10"}
    assert (np.diff(days.to_numpy()) > np.timedelta64(80, "D")).all()
    assert plot.sum() in (2 * (once["plot_id"] == 1).sum() + extra for extra in (-1, 0, 1))
    with pytest.raises(ConfigError, match="does not fit between the two sowings"):
        plots_with("seasons", **short, crop__second_planting="12-10")


def test_within_a_window_the_crop_waits_for_rain(plots_with: Runs) -> None:
    seasons = plots_with("seasons", crop__planting_until="12-31", crop__onset_mm=15.0)
    sown = pd.DatetimeIndex(seasons["sown"].dropna())
    assert sown.strftime("%m-%d").nunique() > 5
    assert ((sown.month == 11) & (sown.day >= 15) | (sown.month == 12)).all()
    failed = seasons["failure"].isin(["no_onset", "stand_lost"])
    assert (seasons.loc[failed, "relative_yield"] == 0).all()
    assert seasons.loc[seasons["failure"] == "no_onset", "sown"].isna().all()


def test_months_add_up_to_the_rain_of_a_mean_year(plots_with: Runs) -> None:
    months = plots_with("months")
    first = months[months["plot_id"] == 1]
    assert first["month"].tolist() == list(range(1, 13))
    rain = pd.read_csv(DEMO / "rain.csv")["rain_mm"].sum() / 35
    assert first["rain_mm"].sum() == pytest.approx(rain, rel=0.03)
    assert (months[["surplus_mm", "shortage_mm", "runon_mm"]] >= 0).all(axis=None)


def test_one_storm_ranks_plots_where_there_is_no_record(plots_with: Runs) -> None:
    plots = plots_with(rain__daily=None, rain__design_storm_mm=40.0)
    depth = 1000 * plots["storm_yield_m3"] / plots["area_m2"]
    by_rank = depth[plots["rank"].sort_values().index]
    capped = np.minimum(by_rank, 200 + 6 * 8)  # ponding and six hours of a clay loam, some 8 mm/h (FAO manual)
    assert (np.diff(capped) <= 1e-6).all()
    assert plots["supply_rank"].isna().all()
    smaller = plots_with(rain__daily=None, rain__design_storm_mm=25.0)
    assert (smaller["storm_yield_m3"] <= plots["storm_yield_m3"]).all()


def test_directions_of_ones_own_that_are_those_of_a_run_change_nothing(
    tmp_path: Path, write_dem: Callable[..., Path], run_flags: Callable[..., Results], valley: np.ndarray
) -> None:
    dem = write_dem(tmp_path / "dem.tif", valley, 10.0)
    run_flags(dem, tmp_path / "first", ranking__draws=0)
    own = {"terrain__flow_direction": str(tmp_path / "first" / "rasters" / "flow_direction_deg.tif")}
    run_flags(dem, tmp_path / "second", ranking__draws=0, **own)
    first, second = (pyogrio.read_dataframe(tmp_path / name / "siting.gpkg", layer="plots") for name in ("first", "second"))
    assert first["plot_id"].tolist() == second["plot_id"].tolist()
    np.testing.assert_allclose(first["catchment_area_m2"], second["catchment_area_m2"])
    np.testing.assert_allclose(first["supply_ratio_dry"], second["supply_ratio_dry"])
    write_dem(tmp_path / "smaller.tif", valley[1:], 10.0)
    with pytest.raises(InputError, match="give directions on the DEM's own cells"):
        run_flags(tmp_path / "smaller.tif", tmp_path / "third", **own)


def test_the_set_ends_with_the_plot_that_feeds_the_people_asked_for(plots_with: Runs) -> None:
    every = plots_with()
    few = plots_with(ranking__set_people=2)
    members = few[few["set_order"].notna()].sort_values("set_order")
    supported = members["area_m2"] * members["supply_ratio_dry"].clip(upper=1)
    assert 0 < len(members) < every["set_order"].notna().sum()
    # what the set leaves a plot may be less than all of its water: never fewer plots than without losses
    assert supported.iloc[:-1].sum() < 2 * 1500 * 2
    assert supported.sum() >= 2 * 1500
    assert "set_too_small" in plots_with(warnings=True, ranking__set_people=100_000)
