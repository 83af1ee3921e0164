"""The demo place, run once: what its results say of each other, of the inputs, and of a second way of reckoning."""

import json
from functools import cache
from pathlib import Path

import geopandas as gpd
import numpy as np
import pandas as pd
import pyogrio
import pytest
import rasterio
from shapely.geometry import Point

from siting.config import load_project
from siting.layers import LAYERS, RASTERS, WHY_NOT
from siting.outputs import sha256
from siting.pipeline import run
from siting.pipeline.results import Results

DEMO = Path(__file__).parents[2] / "demo_dem"
Demo = tuple[Path, Results]


@cache
def read(folder: Path, layer: str) -> gpd.GeoDataFrame:
    return pyogrio.read_dataframe(folder / "siting.gpkg", layer=layer)


def test_every_layer_and_raster_is_there_and_opens(demo: Demo) -> None:
    folder, _ = demo
    names = [name for name, _ in pyogrio.list_layers(folder / "siting.gpkg")]
    assert names == [*(layer.name for layer in LAYERS), "layer_styles"]
    with rasterio.open(DEMO / "dem.tif") as dem:
        for definition in RASTERS:
            with rasterio.open(folder / "rasters" / f"{definition.name}.tif") as file:
                assert (file.shape, file.transform, file.crs) == (dem.shape, dem.transform, dem.crs)
                assert file.read_masks(1).any(), definition.name


def test_ranks_follow_the_score_and_supply_ranks_the_supply_ratio(demo: Demo) -> None:
    plots = read(demo[0], "plots")
    assert len(plots) == demo[1].summary["n_plots"] > 50
    assert plots["rank"].tolist() == list(range(1, len(plots) + 1))
    assert (np.diff(plots["score"].to_numpy()) <= 1e-12).all()
    capped = np.minimum(plots.sort_values("supply_rank")["supply_ratio_dry"].to_numpy(), 1.0)
    assert (np.diff(capped) <= 0).all()
    assert sorted(plots["supply_rank"]) == sorted(plots["plot_id"]) == list(range(1, len(plots) + 1))


def test_the_interval_of_a_rank_holds_it_and_is_narrow_only_where_plots_differ(demo: Demo) -> None:
    plots = read(demo[0], "plots")
    inside = (plots["rank_low"] <= plots["rank"]) & (plots["rank"] <= plots["rank_high"])
    assert inside.mean() > 0.95
    width = plots["rank_high"] - plots["rank_low"]
    assert width.iloc[:10].median() < width.median()
    assert plots["rank_low"].min() == 1
    assert plots["rank_high"].max() == len(plots)


def test_the_score_is_the_weighted_geometric_mean_of_its_components(demo: Demo) -> None:
    plots = read(demo[0], "plots")
    weights = {"water": 0.40, "gain": 0.15, "soil": 0.10, "ease": 0.10, "safety": 0.15, "certainty": 0.10}
    mean = np.exp(sum(weight * np.log(plots[f"score_{name}"]) for name, weight in weights.items()))
    np.testing.assert_allclose(plots["score"], mean, rtol=1e-12)
    np.testing.assert_allclose(plots["score_water"], plots["reliability_pct"] / 100)
    np.testing.assert_allclose(plots["score_ease"], 1 - plots["slope_pct"] / 10)


def test_plots_lie_inside_the_boundary_and_off_the_road(demo: Demo) -> None:
    plots = read(demo[0], "plots")
    boundary = gpd.read_file(DEMO / "boundary.geojson").to_crs(plots.crs).union_all()
    road = gpd.read_file(DEMO / "road.geojson").to_crs(plots.crs).union_all()
    # a cell is inside where its centre is
    assert plots.within(boundary.buffer(7.1)).all()
    assert (plots.distance(road) >= 20 - 7.1).all()
    assert (plots["slope_pct"] < 6).all()
    assert (plots["area_m2"] >= 1000).all()
    assert (plots["catchment_ratio"] >= 1).all()  # plots.min_catchment_ratio


def test_outlines_have_the_areas_of_the_columns(demo: Demo) -> None:
    """Areas on the ground: the map's, with the scale of the zone here (0.9999 or so) taken off."""
    for layer, column in (("plots", "area_m2"), ("catchments", "area_m2"), ("pans", "area_m2")):
        frame = read(demo[0], layer)
        there = frame[~frame.geometry.isna()]
        np.testing.assert_allclose(there.area, there[column], rtol=1e-3)
    plots, catchments = (read(demo[0], layer).set_index("plot_id") for layer in ("plots", "catchments"))
    np.testing.assert_array_equal(catchments["area_m2"], plots["catchment_area_m2"].reindex(catchments.index))


def test_a_plot_is_no_part_of_its_catchment_and_its_intake_lies_in_it(demo: Demo) -> None:
    plots, catchments, intakes = (read(demo[0], name).set_index("plot_id") for name in ("plots", "catchments", "intakes"))
    for number in plots.index[:40]:
        assert plots.geometry[number].intersection(catchments.geometry[number]).area == pytest.approx(0.0, abs=1e-6)
        assert plots.geometry[number].contains(intakes.geometry[number])


def test_water_by_another_way(demo: Demo) -> None:
    """
    Reckon the run-on of three plots from the written rasters alone: walk each cell down, class by class, day by day.

    Runoff as in NEH-630 chapter 10, losses as in the project's assumptions.
    """
    folder, _ = demo
    rasters = {}
    for name in ("flow_direction_deg", "curve_number", "contributing_area_m2"):
        with rasterio.open(folder / "rasters" / f"{name}.tif") as file:
            rasters[name], transform = file.read(1), file.transform
    record = pd.read_csv(DEMO / "rain.csv")
    days = pd.DatetimeIndex(record["date"])
    rain = pd.Series(record["rain_mm"].to_numpy(), index=days)
    steps = {0: (-1, 0), 45: (-1, 1), 90: (0, 1), 135: (1, 1), 180: (1, 0), 225: (1, -1), 270: (0, -1), 315: (-1, -1)}
    direction = rasters["flow_direction_deg"]
    plots, catchments = (read(folder, name).set_index("plot_id") for name in ("plots", "catchments"))
    cell_m = np.sqrt(100.0 * plots["area_m2"].sum() / plots.area.sum())
    for number in plots.index[[0, 17, 60]]:
        shape = catchments.geometry[number]
        own = rasterio.features.rasterize([plots.geometry[number]], direction.shape, transform=transform).astype(bool)
        above = rasterio.features.rasterize([shape], direction.shape, transform=transform).astype(bool)
        total, bed_m = pd.Series(0.0, index=rain.index), 0.0
        effective: dict[float, float] = {}
        for row, col in np.argwhere(above):
            length, r, c = 0.0, row, col
            while not own[r, c]:
                down, right = steps[int(direction[r, c])]
                length += cell_m * np.hypot(down, right)
                r, c = r + down, c + right
            number_here = round(float(rasters["curve_number"][row, col]), 1)
            effective[number_here] = effective.get(number_here, 0.0) + cell_m**2 * np.exp(-0.3 * length / 1000)
            if rasters["contributing_area_m2"][row, col] >= 50_000:
                down, right = steps[int(direction[row, col])]
                bed_m += cell_m * np.hypot(down, right)
        for curve_number, area in effective.items():
            retention = 25_400 / curve_number - 254
            excess = (rain - 0.2 * retention).clip(lower=0)
            total += area * excess**2 / (excess + retention) / 1000
        arriving = (total - 0.025 * 2.0 * bed_m).clip(lower=0)
        year_of = (days - pd.DateOffset(months=5)).year  # years begin in June
        years = arriving.groupby(year_of).sum().loc[1989:2022]
        ranked = years.sort_values(ascending=False).to_numpy()
        position = (np.arange(1, ranked.size + 1) - 0.375) / (ranked.size + 0.25)
        for share, column in ((0.8, "yield_dry_m3"), (0.5, "yield_median_m3"), (0.2, "yield_wet_m3")):
            expected = np.interp(share, position, ranked)
            assert plots[column][number] == pytest.approx(expected, rel=2e-3, abs=0.01)


def test_the_forest_of_plots_agrees_with_itself(demo: Demo) -> None:
    plots = read(demo[0], "plots").set_index("plot_id")
    upstream = pd.Series(0, index=plots.index)
    for number in plots.index:
        node, seen = number, set()
        while pd.notna(plots["next_plot_id"][node]):
            assert node not in seen
            seen.add(node)
            node = int(plots["next_plot_id"][node])
            upstream[node] += 1
    assert (upstream == plots["plots_upstream"]).all()
    assert upstream.max() > 0


def test_reasons_of_the_raster_are_those_of_the_summary_and_of_the_plots(demo: Demo) -> None:
    folder, results = demo
    with rasterio.open(folder / "rasters" / "why_not.tif") as file:
        reasons = file.read(1)
    counts = {item.label: int((reasons == int(item.value)).sum()) for item in WHY_NOT.items}
    assert counts == results.summary["cells"]
    assert counts["can be cropped"] * 100 == pytest.approx(read(folder, "plots").area.sum())


def test_pans_of_the_demo_are_kept_and_flow_ends_in_them(demo: Demo) -> None:
    pans = read(demo[0], "pans")
    kept = pans[pans["status"] == "kept"]
    for x, y in ((692_050.0, 3_417_050.0), (698_250.0, 3_414_100.0)):
        assert kept.contains(Point(x, y)).any()


def test_villages_are_ranked_by_area_for_each_person_and_say_where_the_data_end(demo: Demo) -> None:
    villages, plots = read(demo[0], "villages"), read(demo[0], "plots")
    given = pd.read_csv(DEMO / "villages.csv")
    assert villages["name"].tolist() == given["name"].tolist()
    assert villages["people"].tolist() == given["people"].tolist()
    np.testing.assert_allclose(villages["supported_dry_m2_per_person"] * villages["people"], villages["supported_dry_m2"])
    by_rank = villages.sort_values("rank")
    assert (np.diff(by_rank["supported_dry_m2_per_person"]) <= 0).all()
    assert (villages["rank_low"] <= villages["rank"]).all()
    assert (villages["rank"] <= villages["rank_high"]).all()
    assert villages["supported_dry_m2"].sum() <= plots["area_m2"].sum()
    cut = villages["status"] == "reach_cut"
    assert cut.any() and (~cut).any()
    assert villages.loc[cut, "reason"].notna().all()
    # each village in a circle of 2 km: nobody walks to a plot beyond
    for village in villages.itertuples():
        assert village.plots_in_reach <= (plots.distance(village.geometry) <= 2050).sum()


def test_the_ledger_tells_what_each_place_below_loses(demo: Demo) -> None:
    downstream, plots = read(demo[0], "downstream"), read(demo[0], "plots").set_index("plot_id")
    assert downstream["lost_dry_pct"].dropna().between(0, 100).all()
    assert downstream["lost_median_pct"].dropna().between(0, 100).all()
    alone = downstream[(downstream["below"] == "plot") & downstream["plot_id"].notna()]
    assert sorted(alone["plot_id"]) == sorted(plots.index[plots["next_plot_id"].notna()])
    assert (plots["next_plot_id"][alone["plot_id"]].to_numpy() == alone["below_id"].to_numpy()).all()
    by_set = downstream[(downstream["below"] == "village") & downstream["plot_id"].isna()].set_index("below_id")
    villages = read(demo[0], "villages").set_index("village_id")
    np.testing.assert_allclose(villages["runoff_lost_dry_pct"].reindex(by_set.index), by_set["lost_dry_pct"])
    of_set = downstream[(downstream["below"] == "plot") & downstream["plot_id"].isna()]
    left = plots["set_yield_median_m3"] / plots["yield_median_m3"]
    np.testing.assert_allclose(100 * (1 - left[of_set["below_id"]].to_numpy()), of_set["lost_median_pct"], atol=1e-9)


def test_no_village_loses_more_than_the_community_has_said(demo: Demo, tmp_path: Path) -> None:
    """The demo's people have agreed on 25 %; without a limit some villages would lose more."""
    columns = ["runoff_lost_dry_pct", "runoff_lost_median_pct"]
    limited = read(demo[0], "villages")[columns]
    assert (limited.fillna(0) <= 25 + 1e-9).all(axis=None)
    free = ("villages.most_lost_pct=", "output.rasters=false", "ranking.draws=0")
    run(load_project(DEMO / "project.toml", free), out=tmp_path / "out", threads=2)
    assert (read(tmp_path / "out", "villages")[columns] > 25).any(axis=None)
    sets = [read(folder, "plots")["set_order"].notna().sum() for folder in (demo[0], tmp_path / "out")]
    assert 50 < sets[0] < sets[1]


def test_the_run_record_names_inputs_assumptions_and_outputs(demo: Demo) -> None:
    folder, results = demo
    text = (folder / "run.json").read_text(encoding="utf-8")
    record = json.loads(text)
    assert record["inputs"]["place.dem"] == {"file": "dem.tif", "sha256": sha256(DEMO / "dem.tif")}
    for name, digest in record["outputs"].items():
        assert sha256(folder / name) == digest
    assert {path.relative_to(folder).as_posix() for path in folder.rglob("*") if path.is_file()} == {
        *record["outputs"],
        "run.json",
    }
    assert {"runoff.starts", "place.vertical_error_m", "crop.kc"} <= {one["id"] for one in record["assumptions"]}
    assert set(record["stages"]) >= {"inputs", "terrain", "plots", "water", "layers", "rasters"}
    assert all(stage["peak_memory_mb"] > 10 for stage in record["stages"].values())
    assert str(DEMO) not in text and str(folder) not in text
    assert len(read(folder, "assumptions")) == len(results.summary["assumptions"])


def test_two_runs_give_the_same_bytes_whatever_the_threads(demo: Demo, tmp_path: Path) -> None:
    folder, _ = demo
    run(load_project(DEMO / "project.toml"), out=tmp_path / "again", threads=1)
    first, second = (json.loads((path / "run.json").read_text())["outputs"] for path in (folder, tmp_path / "again"))
    assert first == second


def test_yields_and_reliability_follow_from_the_seasons(demo: Demo) -> None:
    plots, seasons = read(demo[0], "plots").set_index("plot_id"), read(demo[0], "seasons")
    assert len(seasons) == 34 * len(plots)
    good = (seasons["relative_yield"] >= 0.7).groupby(seasons["plot_id"]).mean() * 100
    np.testing.assert_allclose(plots["reliability_pct"].sort_index(), good)
    alone = (seasons["rain_only_relative_yield"] >= 0.7).groupby(seasons["plot_id"]).mean() * 100
    np.testing.assert_allclose(plots["rain_only_reliability_pct"].sort_index(), alone)
    mean = seasons.groupby("plot_id")["relative_yield"].mean() * 100
    np.testing.assert_allclose(plots["mean_yield_pct"].sort_index(), mean)
    assert (plots["reliability_low_pct"] <= plots["reliability_pct"]).all()
    assert (plots["reliability_pct"] <= plots["reliability_high_pct"]).all()
    # run-on lowers a yield only through standing water, or in the season after a stand was lost
    lower = seasons[seasons["relative_yield"] < seasons["rain_only_relative_yield"] - 1e-9]
    assert len(lower) < 0.01 * len(seasons)
    assert plots["reliability_pct"].iloc[:20].min() > 1.5 * plots["rain_only_reliability_pct"].iloc[:20].max()


def test_the_curve_of_areas_ends_with_the_whole_plot(demo: Demo) -> None:
    plots, curves = read(demo[0], "plots").set_index("plot_id"), read(demo[0], "area_curves")
    assert len(curves) == 24 * len(plots)
    whole = curves.groupby("plot_id").last()
    np.testing.assert_allclose(whole["area_m2"], plots["area_m2"].sort_index())
    np.testing.assert_allclose(whole["reliability_pct"], plots["reliability_pct"].sort_index())


def test_shares_among_the_best_and_other_weights_agree_with_the_ranks(demo: Demo) -> None:
    plots = read(demo[0], "plots")
    assert plots["top_5_pct"].sum() == pytest.approx(500, abs=1e-6)
    assert (plots.loc[plots["rank_low"] > 5, "top_5_pct"] <= 5.0 + 1e-9).all()
    assert (plots["rank_low_weights"] <= plots["rank"]).mean() > 0.95
    assert (plots["rank"] <= plots["rank_high_weights"]).mean() > 0.95


def test_supported_areas_lie_within_the_plots_and_hold_the_target(demo: Demo) -> None:
    plots = read(demo[0], "plots")
    assert (plots["supported_area_m2"] <= plots["area_m2"] + 1e-6).all()
    full = plots["limit"] == "land"
    assert (plots.loc[full, "reliability_pct"] >= 67).all()
    assert (plots.loc[~full, "reliability_pct"] < 67).all()


def test_the_set_begins_with_the_best_plot_and_counts_water_once(demo: Demo) -> None:
    """What the plots of the set above took is missing below."""
    plots = read(demo[0], "plots")
    members = plots[plots["set_order"].notna()].sort_values("set_order")
    assert members["set_order"].tolist() == list(range(1, len(members) + 1))
    assert members["rank"].iloc[0] == 1
    assert (plots["set_yield_median_m3"] <= plots["yield_median_m3"] + 1e-9).all()
    heads = plots[plots["plots_upstream"] == 0]
    np.testing.assert_allclose(heads["set_yield_median_m3"], heads["yield_median_m3"], rtol=1e-12)
    below = plots[plots["plots_upstream"] > 0]
    assert (below["set_yield_median_m3"] < below["yield_median_m3"]).mean() > 0.5


def test_flood_peaks_by_the_published_form(demo: Demo) -> None:
    """The 25-year peak is larger; the spillway passes it by b = Q / (C h^1.5), C 1.5 and h 0.3 m as assumed."""
    plots = read(demo[0], "plots")
    assert (plots["peak_flow_25y_m3s"] > plots["peak_flow_10y_m3s"]).all()
    np.testing.assert_allclose(plots["spillway_width_m"], plots["peak_flow_25y_m3s"] / (1.5 * 0.3**1.5))
    # critical flow over a sill 0.3 m below the water: sqrt(2/3 g h)
    np.testing.assert_allclose(plots["spillway_velocity_m_s"], np.sqrt(2 / 3 * 9.81 * 0.3))
    assert set(plots["permissible_velocity_m_s"]) <= {0.457, 0.533, 0.61, 0.762, 1.143}  # Fortier & Scobey (1926)
    assert (plots["peak_flow_10y_m3s"] / plots["catchment_area_m2"] * 1e6).between(0.5, 30).all()  # m3/s for each km2
