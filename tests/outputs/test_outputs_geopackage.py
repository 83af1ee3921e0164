import os
import shutil
import sqlite3
import subprocess
from contextlib import closing
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pandas as pd
import pyogrio
import pytest
from shapely.geometry import LineString, MultiPolygon, Point, Polygon, box

from siting.errors import OutputError
from siting.layers.vectors import LAYERS
from siting.outputs.geopackage import write_geopackage

CRS = "EPSG:32636"
EVIL = ["=cmd|'/c'!A1", "<script>alert(1)</script>", "O'Neil; DROP TABLE plots"]

# As promised to users: typed here once more, so that a column that vanishes is noticed.
PROMISED_PLOTS = [
    "plot_id",
    "rank",
    "rank_low",
    "rank_high",
    "area_m2",
    "supported_area_m2",
    "supply_ratio_dry",
    "reliability_pct",
    "rain_only_reliability_pct",
    "catchment_area_m2",
    "open_catchment",
    "cautions",
    "slope_pct",
    "drop_m",
    "wetness_index",
    "height_above_channel_m",
    "position",
    "soil_group",
    "texture",
    "curve_number",
    "available_water_mm",
    "catchment_ratio",
    "needed_ratio",
    "yield_dry_m3",
    "yield_median_m3",
    "yield_wet_m3",
    "yield_dry_other_ratio_m3",
    "supply_ratio_dry_other_ratio",
    "storm_yield_m3",
    "runon_dry_mm",
    "runon_median_mm",
    "crop_demand_mm",
    "crop_demand_m3",
    "supply_ratio_median",
    "mean_yield_pct",
    "standing_water_days",
    "limit",
    "peak_flow_10y_m3s",
    "peak_flow_25y_m3s",
    "spillway_width_m",
    "spillway_velocity_m_s",
    "permissible_velocity_m_s",
    "supply_rank",
    "reliability_low_pct",
    "reliability_high_pct",
    "catchment_outside_pct",
    "behind_pan_pct",
    "top_5_pct",
    "rank_low_weights",
    "rank_high_weights",
    "score",
    "score_water",
    "score_gain",
    "score_soil",
    "score_ease",
    "score_safety",
    "score_certainty",
    "plots_upstream",
    "next_plot_id",
    "set_order",
    "set_yield_median_m3",
    "origin",
    "given_name",
]
PROMISED = {
    "plots": PROMISED_PLOTS,
    "catchments": ["plot_id", "area_m2", "open_catchment", "open_sides", "extend_m"],
    "intakes": ["plot_id", "contributing_area_m2"],
    "overflow_paths": ["plot_id", "length_m"],
    "channels": ["contributing_area_m2"],
    "pans": ["pan_id", "area_m2", "depth_m", "volume_m3", "status"],
    "villages": [
        "name",
        "people",
        "village_id",
        "rank",
        "rank_low",
        "rank_high",
        "plots_in_reach",
        "plots_shared",
        "supported_dry_m2",
        "supported_dry_m2_per_person",
        "best_plot_id",
        "runoff_lost_dry_pct",
        "runoff_lost_median_pct",
        "status",
        "reason",
    ],
    "seasons": [
        "plot_id",
        "season",
        "sown",
        "rain_mm",
        "runon_mm",
        "supply_ratio",
        "et_ratio",
        "relative_yield",
        "rain_only_relative_yield",
        "standing_water_days",
        "failure",
    ],
    "months": ["plot_id", "month", "rain_mm", "runon_mm", "surplus_mm", "shortage_mm"],
    "area_curves": ["plot_id", "area_m2", "reliability_pct"],
    "downstream": ["plot_id", "below", "below_id", "lost_dry_pct", "lost_median_pct"],
    "assumptions": ["id", "value", "unit", "source", "effect"],
    "run_info": ["key", "value"],
}


def plots(**columns: Any) -> gpd.GeoDataFrame:
    squares = [box(0, 0, 10, 10), MultiPolygon([box(20, 0, 30, 10), box(40, 0, 50, 10)])]
    return gpd.GeoDataFrame({"plot_id": [1, 2**53 + 1], **columns}, geometry=squares, crs=CRS)


def tables() -> dict[str, pd.DataFrame | None]:
    points = [Point(1, 1), Point(2, 2), Point(3, 3)]
    return {
        "plots": plots(
            rank=[1, None],
            supply_ratio_dry=[0.0, np.nan],
            open_catchment=[False, None],
            texture=["sandy loam", None],
            cautions=["flood;no_exclusions", None],
            plots_upstream=pd.array([0, pd.NA], dtype="Int64"),
            given_name=[EVIL[0], None],
        ),
        "channels": gpd.GeoDataFrame({"contributing_area_m2": [5e4]}, geometry=[LineString([(0, 0), (1, 1)])], crs=CRS),
        "villages": gpd.GeoDataFrame(
            {"name": EVIL, "people": [10, 20, 30], "status": ["ranked", "unknown", None]}, geometry=points, crs=CRS
        ),
        "seasons": pd.DataFrame(
            {"plot_id": [1, 1], "season": [2001, 2002], "sown": pd.to_datetime(pd.Series(["2001-11-02", None]))}
        ),
        "assumptions": pd.DataFrame({"id": ["crop.name"], "value": [EVIL[1]]}),
    }


@pytest.fixture(scope="module")
def path(tmp_path_factory: pytest.TempPathFactory) -> Path:
    file = tmp_path_factory.mktemp("results") / "siting.gpkg"
    write_geopackage(file, tables(), CRS)
    return file


def rows(path: Path, query: str, *values: object) -> list[tuple[Any, ...]]:
    with closing(sqlite3.connect(path)) as database:
        return database.execute(query, values).fetchall()


def tool(name: str) -> str:
    """Find a program of the system; where it must be there (CI), its absence fails the test."""
    found = shutil.which(name)
    if found is None:
        if os.environ.get("CI") == "true":
            pytest.fail(f"{name} is not installed")
        pytest.skip(f"{name} is not installed")
    return found


def test_layers_stand_in_the_promised_order(path: Path) -> None:
    names = [name for name, _ in pyogrio.list_layers(path)]
    assert names == [*PROMISED, "layer_styles"]


@pytest.mark.parametrize("name", PROMISED)
def test_every_promised_column_is_there_in_order(path: Path, name: str) -> None:
    assert list(pyogrio.read_info(path, layer=name)["fields"]) == PROMISED[name]


def test_columns_have_the_declared_types(path: Path) -> None:
    types = {"int64": "INTEGER", "float64": "REAL", "text": "TEXT", "bool": "BOOLEAN", "date": "DATE"}
    for item in LAYERS:
        stored = {name: kind for _, name, kind, *_ in rows(path, f"PRAGMA table_info({item.name})")}
        assert {column.name: types[column.kind] for column in item.columns}.items() <= stored.items()


def test_every_column_carries_title_and_description_with_its_unit(path: Path) -> None:
    query = "SELECT table_name, column_name, name, title, description FROM gpkg_data_columns"
    said = {(table, column): texts for table, column, *texts in rows(path, query)}
    for item in LAYERS:
        for column in item.columns:
            own, title, text = said[(item.name, column.name)]
            assert own is None
            assert column.title in title
            if column.unit not in ("", "1"):
                assert f"({column.unit})" in title
                assert text.endswith(f"Unit: {column.unit}.")


def test_class_lists_are_enum_constraints_that_bind_the_values(path: Path) -> None:
    bound = rows(
        path, "SELECT constraint_name FROM gpkg_data_columns WHERE table_name = 'plots' AND column_name = 'texture'"
    )
    assert bound == [("texture",)]
    enums = "SELECT value FROM gpkg_data_column_constraints WHERE constraint_type = 'enum' AND constraint_name = 'texture'"
    values = rows(path, enums)
    assert len(values) == 12
    used = set(rows(path, "SELECT DISTINCT constraint_name FROM gpkg_data_columns WHERE constraint_name IS NOT NULL"))
    assert used == set(rows(path, "SELECT DISTINCT constraint_name FROM gpkg_data_column_constraints"))


def test_unknown_is_null_and_zero_stays_zero(path: Path) -> None:
    columns = "rank, supply_ratio_dry, open_catchment, texture, plots_upstream, area_m2, position"
    assert rows(path, f"SELECT {columns} FROM plots ORDER BY fid") == [
        (1, 0.0, 0, "sandy loam", 0, None, None),
        (None, None, None, None, None, None, None),
    ]
    assert rows(path, "SELECT sown FROM seasons ORDER BY fid") == [("2001-11-02",), (None,)]


def test_ids_beyond_the_whole_numbers_of_a_float_survive(path: Path) -> None:
    assert rows(path, "SELECT plot_id FROM plots ORDER BY fid") == [(1,), (2**53 + 1,)]


def test_cell_text_goes_in_unharmed(path: Path) -> None:
    assert [text for (text,) in rows(path, "SELECT name FROM villages ORDER BY fid")] == EVIL
    assert pyogrio.read_dataframe(path, layer="villages")["name"].tolist() == EVIL


def test_polygons_become_multipolygons_of_one_declared_type(path: Path) -> None:
    assert rows(path, "SELECT geometry_type_name, z, m FROM gpkg_geometry_columns WHERE table_name = 'plots'") == [
        ("MULTIPOLYGON", 0, 0)
    ]
    assert set(pyogrio.read_dataframe(path, layer="plots").geom_type) == {"MultiPolygon"}


def test_the_same_tables_give_the_same_bytes(path: Path, tmp_path: Path) -> None:
    write_geopackage(tmp_path / "again.gpkg", tables(), CRS)
    assert (tmp_path / "again.gpkg").read_bytes() == path.read_bytes()


def test_the_file_is_a_geopackage_1_3_without_journal(path: Path) -> None:
    assert rows(path, "PRAGMA application_id") == [(0x47504B47,)]  # "GPKG", OGC 12-128r17, requirement 2
    assert rows(path, "PRAGMA user_version") == [(10300,)]
    assert rows(path, "PRAGMA journal_mode") == [("delete",)]
    assert rows(path, "PRAGMA integrity_check") == [("ok",)]
    assert rows(path, "PRAGMA foreign_key_check") == []
    assert [item.name for item in path.parent.iterdir()] == [path.name]


def test_an_empty_run_still_writes_every_layer_with_its_schema(tmp_path: Path) -> None:
    write_geopackage(tmp_path / "empty.gpkg", {}, CRS)
    names = [name for name, _ in pyogrio.list_layers(tmp_path / "empty.gpkg")]
    assert names == [name for name in [*PROMISED, "layer_styles"] if name != "villages"]
    for name in names[:-1]:
        info = pyogrio.read_info(tmp_path / "empty.gpkg", layer=name)
        assert info["features"] == 0
        assert list(info["fields"]) == PROMISED[name]


def test_given_columns_get_safe_names_and_keep_their_own_as_title(tmp_path: Path) -> None:
    given = {"Nom du Village": ["a"], "Été": [1.5], "fid": [7], "<b>": ["x"], "Nom du  village": ["b"]}
    table = gpd.GeoDataFrame(given, geometry=[box(0, 0, 1, 1)], crs=CRS)
    write_geopackage(tmp_path / "v.gpkg", {"villages": table}, CRS)
    fields = list(pyogrio.read_info(tmp_path / "v.gpkg", layer="villages")["fields"])
    assert fields[:5] == ["nom_du_village", "ete", "given_fid", "b", "given_nom_du_village"]
    titles = rows(tmp_path / "v.gpkg", "SELECT title FROM gpkg_data_columns WHERE table_name = 'villages'")
    assert [title for (title,) in titles][:5] == list(given)


@pytest.mark.parametrize(
    ("columns", "said"),
    [
        ({"area_m2": [1.0, np.inf]}, "infinite"),
        ({"rank": [1.5, 2.0]}, "whole numbers"),
        ({"texture": ["mud", None]}, "'mud'"),
        ({"cautions": ["flood;fire", None]}, "'fire'"),
        ({"given_name": ["a\0b", None]}, "given_name"),
        ({"given_name": [3, None]}, "given_name"),
        ({"colour": [1, 2]}, "'colour'"),
    ],
)
def test_a_value_that_does_not_fit_its_column_is_refused_by_name(
    tmp_path: Path, columns: dict[str, list[Any]], said: str
) -> None:
    with pytest.raises(OutputError, match=said):
        write_geopackage(tmp_path / "x.gpkg", {"plots": plots(**columns)}, CRS)


def test_another_crs_another_geometry_and_an_invalid_one_are_refused(tmp_path: Path) -> None:
    bowtie = Polygon([(0, 0), (1, 1), (1, 0), (0, 1)])
    wrong = {
        "one CRS": plots().set_crs("EPSG:32637", allow_override=True),
        "MultiPolygon alone": gpd.GeoDataFrame({"plot_id": [1]}, geometry=[Point(0, 0)], crs=CRS),
        "not valid": gpd.GeoDataFrame({"plot_id": [1]}, geometry=[bowtie], crs=CRS),
        "without geometries": pd.DataFrame({"plot_id": [1]}),
    }
    for said, table in wrong.items():
        with pytest.raises(OutputError, match=said):
            write_geopackage(tmp_path / f"{len(said)}.gpkg", {"plots": table}, CRS)


def test_an_unknown_layer_and_an_existing_file_are_refused(tmp_path: Path) -> None:
    with pytest.raises(OutputError, match="ponds"):
        write_geopackage(tmp_path / "x.gpkg", {"ponds": None}, CRS)
    (tmp_path / "x.gpkg").write_text("mine")
    with pytest.raises(OutputError, match="exists already"):
        write_geopackage(tmp_path / "x.gpkg", {}, CRS)
    assert (tmp_path / "x.gpkg").read_text() == "mine"


def test_a_missing_geometry_stays_missing(tmp_path: Path) -> None:
    table = gpd.GeoDataFrame({"plot_id": [1]}, geometry=[None], crs=CRS)
    write_geopackage(tmp_path / "x.gpkg", {"overflow_paths": table}, CRS)
    assert rows(tmp_path / "x.gpkg", "SELECT plot_id, geom FROM overflow_paths") == [(1, None)]


def test_a_wkt_crs_without_a_code_is_kept(tmp_path: Path) -> None:
    wkt = gpd.GeoSeries([Point(0, 0)], crs="+proj=laea +lat_0=10 +lon_0=20 +datum=WGS84").crs.to_wkt()
    table = gpd.GeoDataFrame({"plot_id": [1]}, geometry=[Point(3, 4)], crs=wkt)
    write_geopackage(tmp_path / "x.gpkg", {"intakes": table}, wkt)
    assert "Lambert_Azimuthal_Equal_Area" in pyogrio.read_info(tmp_path / "x.gpkg", layer="intakes")["crs"]


def test_a_program_of_the_system_reads_layers_and_class_lists(path: Path) -> None:
    done = subprocess.run([tool("ogrinfo"), "-ro", "-so", path, "plots"], capture_output=True, text=True, check=True)
    assert "Feature Count: 2" in done.stdout
    assert "plot_id: Integer64" in done.stdout
    assert "domain name=texture" in done.stdout
    assert "Warning" not in done.stderr + done.stdout
