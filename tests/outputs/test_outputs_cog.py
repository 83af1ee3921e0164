import os
import shutil
import subprocess
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
import rasterio

from siting.errors import OutputError
from siting.grid import Grid, metric_grid
from siting.layers.rasters import RASTERS, raster
from siting.outputs.cog import azimuth_deg, write_cog

GRID = metric_grid(1301, 1103, 10.0, west=400_000.0, north=2_000_000.0)


def values_for(name: str, grid: Grid = GRID) -> npt.NDArray[Any]:
    random = np.random.default_rng(7)
    definition = raster(name)
    if not definition.is_measure:
        return random.choice([int(code) for code in definition.style.values], size=grid.shape).astype(definition.dtype)
    values = random.random(grid.shape) * 100
    values[:600, :300] = np.nan
    values[0, -1] = 0.0
    return values


@pytest.mark.parametrize("name", [item.name for item in RASTERS])
def test_each_raster_is_a_tiled_cog_that_says_what_it_is(tmp_path: Path, name: str) -> None:
    definition = raster(name)
    write_cog(tmp_path / "x.tif", values_for(name), GRID, definition, 2)
    with rasterio.open(tmp_path / "x.tif") as file:
        assert file.tags(ns="IMAGE_STRUCTURE")["LAYOUT"] == "COG"
        assert file.tags(ns="IMAGE_STRUCTURE")["COMPRESSION"] == "DEFLATE"
        assert file.tags(ns="IMAGE_STRUCTURE").get("PREDICTOR") == ("3" if definition.is_measure else None)
        assert file.block_shapes == [(512, 512)]
        assert file.overviews(1) == [2, 4]
        assert file.dtypes == (definition.dtype,)
        assert file.nodata == definition.nodata
        assert (file.units[0] or "") == definition.unit
        assert file.descriptions == (definition.title,)
        assert file.crs.to_epsg() == 32636
        assert tuple(file.transform)[:6] == GRID.affine


def test_values_come_back_as_they_went_in_and_zero_is_not_missing(tmp_path: Path) -> None:
    values = values_for("slope_pct")
    write_cog(tmp_path / "x.tif", values, GRID, raster("slope_pct"), 1)
    with rasterio.open(tmp_path / "x.tif") as file:
        back = file.read(1, masked=True)
        tags = file.tags(1)
    np.testing.assert_array_equal(back.mask, np.isnan(values))
    np.testing.assert_array_equal(back.compressed(), values[~np.isnan(values)].astype(np.float32))
    assert back[0, -1] == 0.0
    assert float(tags["STATISTICS_MAXIMUM"]) == back.max()
    assert float(tags["STATISTICS_MEAN"]) == pytest.approx(np.nanmean(values), rel=1e-6)


def read_overview(path: Path, level: int) -> npt.NDArray[Any]:
    with rasterio.open(path, overview_level=level) as file:
        return np.asarray(file.read(1))


def test_contributing_area_keeps_its_largest_value_in_every_overview(tmp_path: Path) -> None:
    values = values_for("contributing_area_m2")
    write_cog(tmp_path / "x.tif", values, GRID, raster("contributing_area_m2"), 2)
    for level, step in enumerate((2, 4)):
        coarse = read_overview(tmp_path / "x.tif", level)
        padded = np.full((-(-GRID.rows // step) * step, -(-GRID.cols // step) * step), -9999.0, dtype=np.float32)
        padded[: GRID.rows, : GRID.cols] = np.where(np.isnan(values), -9999.0, values)
        blocks = padded.reshape(padded.shape[0] // step, step, padded.shape[1] // step, step)
        np.testing.assert_array_equal(coarse, blocks.max(axis=(1, 3)))


def test_a_single_cell_channel_is_still_there_when_seen_from_afar(tmp_path: Path) -> None:
    values = np.full(GRID.shape, 100.0)
    values[:, 551] = 1e7
    write_cog(tmp_path / "x.tif", values, GRID, raster("contributing_area_m2"), 1)
    assert np.all(read_overview(tmp_path / "x.tif", 1).max(axis=1) == np.float32(1e7))


def test_measures_are_averaged_and_codes_take_the_commonest(tmp_path: Path) -> None:
    grid = metric_grid(1024, 1024, 10.0)
    slope = np.tile([[1.0, 3.0], [5.0, np.nan]], (512, 512))
    write_cog(tmp_path / "slope.tif", slope, grid, raster("slope_pct"), 1)
    np.testing.assert_allclose(read_overview(tmp_path / "slope.tif", 0), 3.0)  # (1 + 3 + 5) / 3
    codes = np.tile(np.array([[6, 6], [7, 6]], dtype=np.uint8), (512, 512))
    write_cog(tmp_path / "codes.tif", codes, grid, raster("why_not"), 1)
    assert np.all(read_overview(tmp_path / "codes.tif", 0) == 6)


@pytest.mark.parametrize("name", ["slope_pct", "contributing_area_m2", "why_not"])
def test_bytes_depend_neither_on_the_run_nor_on_threads(tmp_path: Path, name: str) -> None:
    for number, threads in enumerate((1, 2, 2)):
        write_cog(tmp_path / f"{number}.tif", values_for(name), GRID, raster(name), threads)
    first, *others = [(tmp_path / f"{number}.tif").read_bytes() for number in range(3)]
    assert all(other == first for other in others)
    assert sorted(item.name for item in tmp_path.iterdir()) == ["0.tif", "1.tif", "2.tif"]


def test_codes_carry_labels_and_the_colours_of_their_classes(tmp_path: Path) -> None:
    write_cog(tmp_path / "x.tif", values_for("position"), GRID, raster("position"), 1)
    with rasterio.open(tmp_path / "x.tif") as file:
        assert file.tags(1)["CLASS_5"] == "toeslope"
        assert file.colormap(1)[5] == (0x03, 0x40, 0x6D, 255)


def test_zstd_is_an_option(tmp_path: Path) -> None:
    write_cog(tmp_path / "x.tif", values_for("slope_pct"), GRID, raster("slope_pct"), 1, compression="zstd")
    with rasterio.open(tmp_path / "x.tif") as file:
        assert file.tags(ns="IMAGE_STRUCTURE")["COMPRESSION"] == "ZSTD"


def test_a_raster_without_any_value_and_one_smaller_than_a_tile_are_written(tmp_path: Path) -> None:
    grid = metric_grid(3, 4, 10.0)
    write_cog(tmp_path / "x.tif", np.full(grid.shape, np.nan), grid, raster("contributing_area_m2"), 1)
    with rasterio.open(tmp_path / "x.tif") as file:
        assert file.read(1, masked=True).mask.all()
        assert file.overviews(1) == []


@pytest.mark.parametrize(
    ("name", "value", "said"),
    [
        ("slope_pct", np.inf, "finite"),
        ("slope_pct", -9999.0, "-9999"),
        ("why_not", 13, "code 13"),
        ("position", 0, "code 0"),
    ],
)
def test_a_value_that_would_be_misread_is_refused(tmp_path: Path, name: str, value: float, said: str) -> None:
    values = values_for(name)
    values[5, 6] = value
    with pytest.raises(OutputError, match=said):
        write_cog(tmp_path / "x.tif", values, GRID, raster(name), 1)
    assert not list(tmp_path.iterdir())


def test_azimuths_turn_clockwise_from_north() -> None:
    # inner codes 1 to 8 are E SE S SW W NW N NE; then outlet, sink, void
    codes = np.array([[1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 255]], dtype=np.uint8)
    assert azimuth_deg(codes).tolist() == [[90, 135, 180, 225, 270, 315, 0, 45, 999, 999, 65535]]
    with pytest.raises(OutputError, match="code 11"):
        azimuth_deg(np.array([[11]], dtype=np.uint8))


def test_a_program_of_the_system_reads_it_without_complaint(tmp_path: Path) -> None:
    program = shutil.which("gdalinfo")
    if program is None:
        if os.environ.get("CI") == "true":
            pytest.fail("gdalinfo is not installed")
        pytest.skip("gdalinfo is not installed")
    write_cog(tmp_path / "x.tif", values_for("contributing_area_m2"), GRID, raster("contributing_area_m2"), 1)
    done = subprocess.run([program, tmp_path / "x.tif"], capture_output=True, text=True, check=True)
    assert "LAYOUT=COG" in done.stdout
    assert "Unit Type: m2" in done.stdout
    assert "Overviews: 552x651, 276x326" in done.stdout
    assert done.stderr == ""
