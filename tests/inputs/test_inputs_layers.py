"""Maps and outlines on the DEM: laid right, counted where they do not reach, refused where they cannot be used."""

import warnings
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
from shapely.geometry import LineString, Point, Polygon, box

from siting import inputs
from siting.errors import InputError
from siting.grid import Grid, metric_grid
from siting.notes import Notes

WEST, NORTH = 700_000.0, 3_400_000.0
NASTY = ("=cmd|'/c'!A1", "<script>alert(1)</script>", 'Œuf, "Qesh"; ok')


@pytest.fixture
def grid() -> Grid:
    return metric_grid(20, 30, 10.0, west=WEST, north=NORTH)


def square(left: float, top: float, width: float, height: float) -> Polygon:
    return box(WEST + left, NORTH - top - height, WEST + left + width, NORTH - top)


def save(path: Path, shapes: list[Any], crs: str | None = "EPSG:32636", **columns: list[Any]) -> Path:
    frame = gpd.GeoDataFrame(columns, geometry=shapes, crs="EPSG:32636")
    if crs is None:
        frame = frame.set_crs(None, allow_override=True)
    elif crs != "EPSG:32636":
        frame = frame.to_crs(crs)
    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", "'crs' was not provided")
        frame.to_file(path, driver="GPKG")
    return path


def refused(work: Callable[[], object]) -> str:
    with pytest.raises(InputError) as caught:
        work()
    return str(caught.value)


def test_polygons_give_each_cell_the_value_over_its_centre(grid: Grid, tmp_path: Path) -> None:
    shapes = [square(0, 0, 100, 200), square(100, 0, 200, 200)]
    for crs in ("EPSG:32636", "EPSG:4326"):
        path = save(tmp_path / f"soil{crs[-4:]}.gpkg", shapes, crs, texture=["loam", "sand"])
        got = inputs.read_map(path, grid, column="texture", setting="soil.map", notes=Notes())
        assert got.values == ("loam", "sand")
        expected = np.where(np.arange(30) < 10, 0, 1)
        np.testing.assert_array_equal(got.code, np.tile(expected, (20, 1)))


@pytest.mark.parametrize("dtype", ["float32", "float64", "int16", "int32", "uint8", "uint16"])
@pytest.mark.parametrize("nodata", [None, 9])
def test_cells_beyond_a_raster_are_unknown_whatever_its_numbers(
    grid: Grid, tmp_path: Path, dtype: str, nodata: int | None
) -> None:
    path = tmp_path / "map.tif"
    with rasterio.open(
        path,
        "w",
        driver="GTiff",
        count=1,
        height=2,
        width=2,
        dtype=dtype,
        nodata=nodata,
        crs="EPSG:32636",
        transform=Affine(100, 0, WEST, 0, -100, NORTH),
    ) as file:
        file.write(np.full((2, 2), 80, dtype=dtype), 1)
    got = inputs.read_raster_on_grid(path, grid, setting="cover.curve_number")
    np.testing.assert_array_equal(got, np.tile(np.where(np.arange(30) < 20, 80.0, np.nan), (20, 1)))


def test_a_raster_of_another_cell_size_and_crs_is_read_by_its_nearest_cell(grid: Grid, tmp_path: Path) -> None:
    path = tmp_path / "cover.tif"
    values = np.array([[1, 2, 2], [1, 2, 7]], dtype=np.uint8)
    with rasterio.open(
        path,
        "w",
        driver="GTiff",
        count=1,
        height=2,
        width=3,
        dtype="uint8",
        nodata=7,
        crs="EPSG:32636",
        transform=Affine(100, 0, WEST, 0, -100, NORTH),
    ) as file:
        file.write(values, 1)
    notes = Notes()
    got = inputs.read_map(path, grid, column=None, setting="cover.map", notes=notes)
    assert got.values == ("1", "2")
    assert got.code[0, 0] == 0 and got.code[0, 29] == 1 and got.code[19, 29] == -1
    assert "leaves 16.7 % of the DEM's cells" in notes.warnings[0].text


def test_classes_drawn_over_each_other_are_said(grid: Grid, tmp_path: Path) -> None:
    # 20 of 30 columns under "a" and, of these, five under "b" too and five under another "a"
    shapes = [square(0, 0, 200, 200), square(50, 0, 50, 200), square(100, 0, 50, 200), square(200, 0, 100, 200)]
    path, notes = save(tmp_path / "c.gpkg", shapes, kind=["a", "b", "a", "b"]), Notes()
    got = inputs.read_map(path, grid, column="kind", setting="cover.map", notes=notes)
    np.testing.assert_array_equal(got.code[0], np.isin(np.arange(30), [*range(5, 10), *range(20, 30)]))
    assert [warned.code for warned in notes.warnings] == ["cover.map_overlap"]
    assert "over each other on 16.7 % of the DEM's cells: the last of them" in notes.warnings[0].text


def test_a_map_of_another_place_or_without_its_column_is_refused(grid: Grid, tmp_path: Path) -> None:
    away = save(tmp_path / "away.gpkg", [square(90_000, 0, 100, 100)], texture=["loam"])
    text = refused(lambda: inputs.read_map(away, grid, column="texture", setting="soil.map", notes=Notes()))
    assert "does not meet the DEM" in text
    text = refused(lambda: inputs.read_map(away, grid, column="soil", setting="soil.map", notes=Notes()))
    assert "needs the name of a column, not 'soil'; it has 'texture'" in text


def test_files_that_are_no_map_are_refused(grid: Grid, tmp_path: Path) -> None:
    words = tmp_path / "words.gpkg"
    words.write_text("no map", encoding="utf-8")
    assert "cannot be read as a vector file" in refused(lambda: inputs.read_boundary(words, grid, notes=Notes()))
    absent = tmp_path / "none.gpkg"
    assert "does not exist" in refused(lambda: inputs.read_boundary(absent, grid, notes=Notes()))
    bare = save(tmp_path / "bare.gpkg", [square(0, 0, 50, 50)], None)
    assert "declares no CRS" in refused(lambda: inputs.read_boundary(bare, grid, notes=Notes()))


def test_the_boundary_marks_its_cells_and_says_what_lies_beyond(grid: Grid, tmp_path: Path) -> None:
    notes = Notes()
    inside = inputs.read_boundary(save(tmp_path / "b.gpkg", [square(200, 100, 200, 200)]), grid, notes=notes)
    assert inside.sum() == 10 * 10
    assert "75.0 % of the boundary lies beyond the DEM" in notes.warnings[0].text


def test_a_boundary_that_crosses_itself_is_mended(grid: Grid, tmp_path: Path) -> None:
    knot = Polygon([(WEST, NORTH), (WEST + 200, NORTH - 200), (WEST + 200, NORTH), (WEST, NORTH - 200)])
    inside = inputs.read_boundary(save(tmp_path / "knot.gpkg", [knot]), grid, notes=Notes())
    assert 180 <= inside.sum() <= 220  # the two triangles hold half of 400 cells


def test_a_set_back_is_in_ground_metres(grid: Grid, tmp_path: Path) -> None:
    # a road along the middle between two rows; 25 m on each side takes the two nearest rows (centres at 5 and 15 m)
    # and the third (25 m) only just
    line = LineString([(WEST - 10, NORTH - 100), (WEST + 310, NORTH - 100)])
    path = save(tmp_path / "road.gpkg", [line])
    rows = inputs.read_exclusions((path,), grid, setback_m=24.0, notes=Notes()).any(axis=1)
    assert np.flatnonzero(rows).tolist() == [8, 9, 10, 11]


def test_a_well_without_a_set_back_excludes_the_cell_it_stands_in(grid: Grid, tmp_path: Path) -> None:
    path = save(tmp_path / "well.gpkg", [Point(WEST + 15, NORTH - 25)])
    got = inputs.read_exclusions((path,), grid, setback_m=0.0, notes=Notes())
    assert np.argwhere(got).tolist() == [[2, 1]]


def test_given_plots_keep_their_names_and_may_not_overlap(grid: Grid, tmp_path: Path) -> None:
    path = save(tmp_path / "g.gpkg", [square(0, 0, 30, 30), square(100, 100, 20, 20)], name=[NASTY[0], NASTY[1]])
    label, names = inputs.read_given_plots(path, grid)
    assert names == [NASTY[0], NASTY[1]]
    assert np.bincount(label.ravel()).tolist() == [600 - 13, 9, 4]
    path = save(tmp_path / "o.gpkg", [square(0, 0, 30, 30), square(20, 20, 30, 30)], name=["low", "high"])
    assert "'low' and 'high' overlap" in refused(lambda: inputs.read_given_plots(path, grid))
    path = save(tmp_path / "s.gpkg", [square(1, 1, 2, 2)], name=["speck"])
    assert "'speck' covers no cell's centre" in refused(lambda: inputs.read_given_plots(path, grid))


def test_a_given_plot_that_the_edge_cuts_is_said(grid: Grid, tmp_path: Path) -> None:
    path = save(tmp_path / "g.gpkg", [square(-60, 0, 80, 30), square(100, 100, 20, 20)], name=["west", "inner"])
    notes = Notes()
    label, _ = inputs.read_given_plots(path, grid, notes=notes)
    assert np.count_nonzero(label == 1) == 2 * 3
    assert [warned.code for warned in notes.warnings] == ["given_plot_cut"]
    assert "75.0 % of the given plot 'west' lies beyond the DEM" in notes.warnings[0].text


def test_a_given_plot_beyond_the_dem_is_refused(grid: Grid, tmp_path: Path) -> None:
    path = save(tmp_path / "g.gpkg", [square(900, 0, 80, 30)], name=["east"])
    assert "'east' lies beyond the DEM" in refused(lambda: inputs.read_given_plots(path, grid))


def test_given_plots_are_areas(grid: Grid, tmp_path: Path) -> None:
    path = save(tmp_path / "points.gpkg", [Point(WEST + 15, NORTH - 25)])
    assert "holds Point shapes, and needs areas" in refused(lambda: inputs.read_given_plots(path, grid))


def test_a_boundary_between_the_cells_centres_is_smaller_than_a_cell(grid: Grid, tmp_path: Path) -> None:
    path = save(tmp_path / "b.gpkg", [square(101, 101, 3, 3)])
    text = refused(lambda: inputs.read_boundary(path, grid, notes=Notes()))
    assert "is smaller than a cell and holds no cell's centre" in text
    path = save(tmp_path / "away.gpkg", [square(9_000, 0, 30, 30)])
    assert "does not meet the DEM" in refused(lambda: inputs.read_boundary(path, grid, notes=Notes()))


def test_known_pans_say_keep_or_not(grid: Grid, tmp_path: Path) -> None:
    path = save(tmp_path / "p.gpkg", [square(0, 0, 20, 20), square(100, 0, 20, 20)], keep=[True, False])
    got = inputs.read_pan_layer(path, grid)
    assert (got[0, 0], got[0, 10], got[10, 10]) == (1, -1, 0)
    path = save(tmp_path / "q.gpkg", [square(0, 0, 20, 20)], keep=["maybe"])
    assert "keep = 'maybe'; write true or false" in refused(lambda: inputs.read_pan_layer(path, grid))


def test_villages_of_a_table_keep_their_text_untouched(grid: Grid, tmp_path: Path) -> None:
    path = tmp_path / "villages.csv"
    pd.DataFrame({"name": NASTY, "people": [10, None, 30], "lon": [35.1, 35.2, 35.3], "lat": [30.7, 30.7, 30.7]}).to_csv(
        path, index=False
    )
    got = inputs.read_villages(path, grid, name="name", people="people")
    assert tuple(got["name"]) == NASTY
    assert np.isnan(got["people"][1])  # unknown stays unknown
    text = refused(lambda: inputs.read_villages(path, grid, name="village", people=None))
    assert "has no column 'village'; it has 'name', 'people'" in text


def village_table(path: Path, text: str) -> Path:
    path.write_text(text, encoding="utf-8")
    return path


def villages_said(grid: Grid, path: Path) -> list[tuple[str, str]]:
    notes = Notes()
    inputs.read_villages(path, grid, name="name", people="people", notes=notes)
    return [(warned.code, warned.text) for warned in notes.warnings]


def test_villages_outside_the_dem_are_said(grid: Grid, tmp_path: Path) -> None:
    middle = gpd.GeoSeries.from_xy([WEST + 150], [NORTH - 100], crs="EPSG:32636").to_crs("EPSG:4326")
    lon, lat = middle.x[0], middle.y[0]
    header = "name,people,lon,lat\n"
    assert villages_said(grid, village_table(tmp_path / "in.csv", f"{header}a,5,{lon},{lat}\n")) == []
    ((code, text),) = villages_said(grid, village_table(tmp_path / "x.csv", f"{header}a,5,{lat},{lon}\nb,5,{lon},{lat}\n"))
    assert code == "villages_elsewhere"
    assert text.startswith("1 of 2 villages lies outside the DEM: with lon and lat exchanged they would lie inside")
    ((_, text),) = villages_said(grid, village_table(tmp_path / "o.csv", f"{header}a,5,40,31\nb,5,41,31\n"))
    assert text.startswith("2 of 2 villages lie outside the DEM: check their places")


def test_people_that_are_no_number_are_said(grid: Grid, tmp_path: Path) -> None:
    middle = gpd.GeoSeries.from_xy([WEST + 150], [NORTH - 100], crs="EPSG:32636").to_crs("EPSG:4326")
    place = f"{middle.x[0]};{middle.y[0]}"
    rows = "".join(f"v;{people};{place}\n" for people in ("~50", "-5", "", "0", "7"))
    ((code, text),) = villages_said(grid, village_table(tmp_path / "v.csv", f"name;people;lon;lat\n{rows}"))
    assert code == "villages_people"
    assert "is none or below 0 in 2 of 5 villages, like '~50'" in text


def test_villages_in_metres_are_refused_in_plain_numbers(grid: Grid, tmp_path: Path) -> None:
    path = village_table(tmp_path / "v.csv", "name,people,lon,lat\na,5,694315,3416000\n")
    text = refused(lambda: inputs.read_villages(path, grid, name="name", people="people"))
    assert "row 2 has lon 694315, lat 3416000, which are no degrees; write decimal degrees" in text


def test_meanings_of_map_values(tmp_path: Path) -> None:
    path = tmp_path / "table.csv"
    path.write_text("map_value,cover\n1,desert shrub\n2,fallow\n", encoding="utf-8")
    got = inputs.read_meanings(path, needed=("cover",), setting="cover.table")
    assert got["2"]["cover"] == "fallow"
    path.write_text("map_value,cover\n1,a\n1,b\n", encoding="utf-8")
    text = refused(lambda: inputs.read_meanings(path, needed=("cover",), setting="cover.table"))
    assert "says twice what '1' means" in text
    text = refused(lambda: inputs.read_meanings(path, needed=("texture",), setting="soil.table"))
    assert "lacks the column 'texture'" in text


@pytest.mark.parametrize("separator", [";", "\t"])
def test_meanings_may_be_separated_by_semicolons_or_tabs(tmp_path: Path, separator: str) -> None:
    path = tmp_path / "table.csv"
    path.write_text("map_value,cover\n1,desert shrub\n2,\n".replace(",", separator), encoding="utf-8")
    got = inputs.read_meanings(path, needed=("cover",), setting="cover.table")
    assert [got[value]["cover"] for value in ("1", "2")] == ["desert shrub", ""]


DAYS = np.arange(np.datetime64("2001-01-01"), np.datetime64("2001-01-11"))


def weather(path: Path, header: str, row: str) -> Path:
    lines = [f"{day},{row}" for day in DAYS]
    path.write_text("\n".join([header, *lines]), encoding="utf-8")
    return path


def test_weather_is_read_by_the_names_of_its_columns(tmp_path: Path) -> None:
    path = weather(tmp_path / "c.csv", "date,TMin_C , tmax_c,comment", "5,20,x")
    path.write_text(path.read_text(encoding="utf-8") + "\n2001-01-11,5,-,x", encoding="utf-8")
    got = inputs.read_climate(path)
    np.testing.assert_array_equal(got.days[:10], DAYS)
    assert got.series("tmin_c").tolist() == [5.0] * 11
    assert got.series("tmax_c")[:10].tolist() == [20.0] * 10
    assert np.isnan(got.series("tmax_c")[10])  # a mark for missing is unknown
    assert got.et0_mm is None and np.isnan(got.series("et0_mm")).all()


def test_weather_in_any_order_and_with_holes_is_sorted(tmp_path: Path) -> None:
    path = tmp_path / "c.csv"
    path.write_text("date,et0_mm\n2001-02-01,4.5\n2001-01-03,3.5\n", encoding="utf-8")
    got = inputs.read_climate(path)
    assert got.days.astype(str).tolist() == ["2001-01-03", "2001-02-01"]
    assert got.series("et0_mm").tolist() == [3.5, 4.5]


def test_weather_that_cannot_be_right_is_refused(tmp_path: Path) -> None:
    cases = {
        "tmax_c is 95 deg C on 2001-01-01, outside -90 to 60": ("date,tmax_c", "95"),
        "on 2001-01-01 tmin_c 20 exceeds tmax_c 5": ("date,tmin_c,tmax_c", "20,5"),
        "has none of the columns et0_mm, tmin_c": ("date,temperature", "20"),
    }
    for message, (header, row) in cases.items():
        path = weather(tmp_path / "c.csv", header, row)
        with pytest.raises(InputError, match=message):
            inputs.read_climate(path)
    twice = tmp_path / "twice.csv"
    twice.write_text("date,tmin_c\n2001-01-03,5\n2001-01-02,4\n2001-01-03,6\n", encoding="utf-8")
    assert "2001-01-03 twice or out of order" in refused(lambda: inputs.read_climate(twice))
    same = weather(tmp_path / "same.csv", "date,tmin_c,TMIN_C", "5,6")
    assert "the column tmin_c twice" in refused(lambda: inputs.read_climate(same))


def test_villages_of_a_spreadsheet_are_those_of_the_same_csv(tmp_path: Path) -> None:
    table = pd.DataFrame({"name": ["=1+1", "Ünder"], "people": [12, 40], "lon": [35.01, 35.02], "lat": [30.81, 30.82]})
    table.to_csv(tmp_path / "v.csv", index=False)
    pyogrio.write_dataframe(table, tmp_path / "v.xlsx", driver="XLSX")
    grid = metric_grid(100, 100, 100.0, west=690_000.0, north=3_415_000.0)
    csv, xlsx = (inputs.read_villages(tmp_path / name, grid, name="name", people="people") for name in ("v.csv", "v.xlsx"))
    one, other = (pd.DataFrame(frame.drop(columns="geometry")) for frame in (csv, xlsx))
    pd.testing.assert_frame_equal(one, other, check_dtype=False)
    assert csv.geometry.geom_equals_exact(xlsx.geometry, 1e-6).all()
