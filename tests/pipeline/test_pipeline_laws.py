"""What must hold on any ground: units, missing inputs, drawn plots, a run cut short."""

from collections.abc import Callable
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pandas as pd
import pyogrio
import pytest
from shapely.geometry import box

from siting.errors import CapacityError, OutputError
from siting.pipeline import write
from siting.pipeline.results import Results

Write = Callable[..., Path]
Run = Callable[..., Results]
FOOT_M = 0.3048


def plots_of(folder: Path) -> Any:
    return pyogrio.read_dataframe(folder / "siting.gpkg", layer="plots")


def test_a_dem_in_feet_ranks_as_the_same_dem_in_metres(
    tmp_path: Path, write_dem: Write, run_flags: Run, valley: np.ndarray
) -> None:
    run_flags(write_dem(tmp_path / "m.tif", valley, 10.0), tmp_path / "m")
    run_flags(write_dem(tmp_path / "ft.tif", valley / FOOT_M, 10.0, unit="ft"), tmp_path / "ft")
    metres, feet = plots_of(tmp_path / "m"), plots_of(tmp_path / "ft")
    assert len(metres) > 3
    assert metres["plot_id"].tolist() == feet["plot_id"].tolist()
    for column in ("area_m2", "catchment_area_m2", "yield_dry_m3", "supply_ratio_dry"):
        np.testing.assert_allclose(metres[column], feet[column], rtol=1e-9)


def test_ground_in_us_feet_gives_areas_in_square_metres(
    tmp_path: Path, write_dem: Write, run_flags: Run, valley: np.ndarray
) -> None:
    """EPSG:2229 (California zone 5) counts in US survey feet: a cell of 32.8 of them is 10.0 m."""
    foot = 1200 / 3937
    dem = write_dem(tmp_path / "feet.tif", valley, 10.0 / foot, west=6_000_000.0, north=2_000_000.0, crs="EPSG:2229")
    run_flags(dem, tmp_path / "out", place__elevation_unit="metre")
    plots = plots_of(tmp_path / "out")
    np.testing.assert_allclose(plots["area_m2"], plots.area * foot**2, rtol=2e-3)


def test_raising_all_ground_changes_nothing(tmp_path: Path, write_dem: Write, run_flags: Run, valley: np.ndarray) -> None:
    ground = np.round(valley * 64) / 64  # so that heights stay exact when a whole number is added
    run_flags(write_dem(tmp_path / "low.tif", ground, 10.0), tmp_path / "low")
    run_flags(write_dem(tmp_path / "high.tif", ground + 16.0, 10.0), tmp_path / "high")
    low, high = plots_of(tmp_path / "low"), plots_of(tmp_path / "high")
    pd.testing.assert_frame_equal(
        low.drop(columns=["geometry", "slope_pct", "drop_m", "wetness_index"]),
        high.drop(columns=["geometry", "slope_pct", "drop_m", "wetness_index"]),
        rtol=1e-6,
    )


def test_a_higher_curve_number_never_lowers_a_yield(
    tmp_path: Path, write_dem: Write, run_flags: Run, valley: np.ndarray
) -> None:
    dem = write_dem(tmp_path / "dem.tif", valley, 10.0)
    bare = {"cover__cover": None, "cover__condition": None}
    run_flags(dem, tmp_path / "75", cover__curve_number=75.0, **bare)
    run_flags(dem, tmp_path / "85", cover__curve_number=85.0, **bare)
    low, high = (plots_of(tmp_path / name).sort_values("plot_id", ignore_index=True) for name in ("75", "85"))
    for column in ("yield_dry_m3", "yield_median_m3", "yield_wet_m3", "supply_ratio_dry"):
        assert (high[column] >= low[column]).all()
    assert (high["yield_wet_m3"] > low["yield_wet_m3"]).any()


def test_without_rain_what_needs_years_is_null(tmp_path: Path, write_dem: Write, run_flags: Run, valley: np.ndarray) -> None:
    results = run_flags(write_dem(tmp_path / "dem.tif", valley, 10.0), tmp_path / "out", rain__daily=None)
    plots = plots_of(tmp_path / "out")
    assert len(plots) > 3
    assert plots[["supply_rank", "yield_dry_m3", "supply_ratio_dry", "crop_demand_mm"]].isna().all(axis=None)
    assert plots["catchment_area_m2"].notna().all()
    assert "no_rain" in {one.code for one in results.warnings}
    assert len(pyogrio.read_dataframe(tmp_path / "out" / "siting.gpkg", layer="seasons")) == 0


def test_without_cover_run_on_is_unknown_not_none(
    tmp_path: Path, write_dem: Write, run_flags: Run, valley: np.ndarray
) -> None:
    dem = write_dem(tmp_path / "dem.tif", valley, 10.0)
    results = run_flags(dem, tmp_path / "out", cover__cover=None, cover__condition=None)
    plots = plots_of(tmp_path / "out")
    assert plots[["yield_dry_m3", "supply_ratio_dry", "curve_number", "rank"]].isna().all(axis=None)
    assert "no_curve_number" in {one.code for one in results.warnings}


def test_ground_that_cannot_be_cropped_gives_an_empty_result_with_every_layer(
    tmp_path: Path, write_dem: Write, run_flags: Run
) -> None:
    row, col = np.mgrid[0:40, 0:40]
    results = run_flags(write_dem(tmp_path / "steep.tif", 100.0 + 5.0 * col + 0.1 * row, 10.0), tmp_path / "out")
    assert results.summary["n_plots"] == 0
    assert results.summary["plots"] == []
    assert results.summary["cells"]["too steep"] > 1000
    assert len(plots_of(tmp_path / "out")) == 0


def test_a_plot_of_the_users_own_is_judged_by_the_same_rules(
    tmp_path: Path, write_dem: Write, run_flags: Run, valley: np.ndarray
) -> None:
    """A corner on the steep side is kept and ranked, and the run says why most of it fails."""
    shape = box(690_020, 3_419_400, 690_120, 3_419_500)
    name = "=cmd|'/c'!A1"
    mine_file = tmp_path / "mine.gpkg"
    gpd.GeoDataFrame({"name": [name]}, geometry=[shape], crs="EPSG:32636").to_file(mine_file)
    results = run_flags(write_dem(tmp_path / "dem.tif", valley, 10.0), tmp_path / "out", plots__given=str(mine_file))
    plots = plots_of(tmp_path / "out")
    mine = plots[plots["origin"] == "given"]
    assert mine["given_name"].tolist() == [name]
    assert mine["area_m2"].iloc[0] == pytest.approx(10_000, rel=1e-3)
    assert mine["rank"].notna().all()
    told = [one.text for one in results.warnings if one.code == "given_plot"]
    assert len(told) == 1
    assert "too steep" in told[0]
    assert len(plots) > 1


def test_a_two_year_record_is_short_and_gives_no_dry_year(
    tmp_path: Path, write_dem: Write, run_flags: Run, valley: np.ndarray
) -> None:
    days = pd.date_range("2019-06-01", "2021-05-31")
    rain = pd.DataFrame({"date": days.strftime("%Y-%m-%d"), "rain_mm": np.where(days.dayofyear % 15 == 0, 25.0, 0.0)})
    rain.to_csv(tmp_path / "rain.csv", index=False)
    dem = write_dem(tmp_path / "dem.tif", valley, 10.0)
    run_flags(dem, tmp_path / "out", rain__daily=str(tmp_path / "rain.csv"), rain__year_starts=6)
    plots = plots_of(tmp_path / "out")
    assert plots["cautions"].str.contains("short_record").all()
    # with two years the ranks stand at 28 and 72 %: 80 % lies outside
    assert plots["yield_dry_m3"].isna().all()
    assert plots["yield_median_m3"].notna().all()


def test_an_open_catchment_is_marked_with_its_sides(
    tmp_path: Path, write_dem: Write, run_flags: Run, valley: np.ndarray
) -> None:
    run_flags(write_dem(tmp_path / "cut.tif", valley[40:], 10.0), tmp_path / "out")
    catchments = pyogrio.read_dataframe(tmp_path / "out" / "siting.gpkg", layer="catchments")
    open_ones = catchments[catchments["open_catchment"]]
    assert len(open_ones) > 0
    assert open_ones["open_sides"].notna().all()
    assert (open_ones["extend_m"] >= 100).all()
    assert catchments.loc[~catchments["open_catchment"], "extend_m"].isna().all()
    assert catchments.loc[~catchments["open_catchment"], "open_sides"].isna().all()


def test_a_run_cut_short_leaves_the_old_results_whole(
    tmp_path: Path, write_dem: Write, run_flags: Run, valley: np.ndarray, monkeypatch: pytest.MonkeyPatch
) -> None:
    dem, out = write_dem(tmp_path / "dem.tif", valley, 10.0), tmp_path / "out"
    run_flags(dem, out)
    before = {path: path.read_bytes() for path in out.rglob("*") if path.is_file()}

    def cut(*_: object, **__: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(write, "write_rasters", cut)
    with pytest.raises(KeyboardInterrupt):
        run_flags(dem, out, overwrite=True)
    assert {path: path.read_bytes() for path in out.rglob("*") if path.is_file()} == before
    assert sorted(path.name for path in tmp_path.iterdir()) == ["dem.tif", "out"]


def test_results_are_not_overwritten_unasked(tmp_path: Path, write_dem: Write, run_flags: Run, valley: np.ndarray) -> None:
    dem = write_dem(tmp_path / "dem.tif", valley, 10.0)
    run_flags(dem, tmp_path / "out")
    with pytest.raises(OutputError, match="--overwrite"):
        run_flags(dem, tmp_path / "out")


def test_a_run_that_would_not_fit_is_refused_before_it_starts(
    tmp_path: Path, write_dem: Write, run_flags: Run, valley: np.ndarray, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("siting.pipeline.forecast._free_memory_bytes", lambda: 1e6)
    with pytest.raises(CapacityError, match=r"12000 cells need 701 MB of memory and 1 MB are free"):
        run_flags(write_dem(tmp_path / "dem.tif", valley, 10.0), tmp_path / "out")
    assert not (tmp_path / "out").exists()
