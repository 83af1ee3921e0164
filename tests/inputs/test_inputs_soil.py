"""Soil given as one, by polygons or by raster and table: kinds with their sources, depths, and hydrologic groups."""

import warnings
from dataclasses import replace
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pytest
import rasterio
from affine import Affine
from hypothesis import given, settings
from hypothesis import strategies as st
from shapely.geometry import LineString, box

from siting import inputs, tables
from siting.demand import total_evaporable_water_mm
from siting.errors import ConfigError, InputError
from siting.grid import Grid, metric_grid
from siting.inputs import SoilInputs
from siting.inputs.soil_kinds import OwnSoil, SoilFacts, SoilKind, soil_kind
from siting.notes import Notes

WEST, NORTH = 700_000.0, 3_400_000.0
MM_H = 3.6
"""Of one micrometre a second."""


@pytest.fixture
def grid() -> Grid:
    return metric_grid(20, 30, 10.0, west=WEST, north=NORTH)


def polygons(path: Path, **columns: list[Any]) -> Path:
    """Write stripes of 100 m from west to east, one for each row of the columns."""
    count = len(next(iter(columns.values())))
    shapes = [box(WEST + 100 * place, NORTH - 200, WEST + 100 * place + 100, NORTH) for place in range(count)]
    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", "'crs' was not provided")
        gpd.GeoDataFrame(columns, geometry=shapes, crs="EPSG:32636").to_file(path, driver="GPKG")
    return path


def raster(path: Path, values: list[float], dtype: str = "uint8", nodata: float | None = None) -> Path:
    """Write the same stripes as a raster of one row."""
    with rasterio.open(
        path,
        "w",
        driver="GTiff",
        count=1,
        height=1,
        width=len(values),
        dtype=dtype,
        nodata=nodata,
        crs="EPSG:32636",
        transform=Affine(100, 0, WEST, 0, -200, NORTH),
    ) as file:
        file.write(np.array([values], dtype=dtype), 1)
    return path


def stripes(cells: np.ndarray) -> list[Any]:
    """Return the one value of each stripe; every cell of it must have that value."""
    assert cells.shape == (20, 30)
    parts = [np.unique(cells[:, start : start + 10], equal_nan=True) for start in (0, 10, 20)]
    assert all(part.size == 1 for part in parts)
    return [None if np.isnan(part[0]) else part[0].item() for part in parts]


def read(grid: Grid, notes: Notes | None = None, **values: Any) -> inputs.SoilMap:
    return inputs.read_soil(SoilInputs(**values), grid, notes=notes or Notes())


def test_one_texture_is_the_printed_soil_everywhere(grid: Grid) -> None:
    # FAO-56 (1998) Table 19, loam: FC 0.20-0.30, WP 0.07-0.17, REW 8-10 mm; TR-55 appendix A: B; FAO manual: 12.5 mm/h
    notes = Notes()
    got = read(grid, notes, texture="Loam")
    (kind,) = got.kinds
    assert (kind.field_capacity, kind.wilting_point, kind.rew_mm) == pytest.approx((0.25, 0.12, 9.0))
    assert (kind.infiltration_mm_h, kind.soil_group) == (12.5, "B")
    assert stripes(got.soil_group) == [2, 2, 2]
    assert stripes(got.depth_m) == [None, None, None]
    assert got.code.strides == got.soil_group.strides == got.depth_m.strides == (0, 0)
    sources = {noted.id: noted.source for noted in notes.assumptions}
    assert "FAO-56" in sources["soil.water of loam"]
    assert "TR-55" in sources["soil.group of loam"]
    assert "soil.water_table_m" not in sources


def test_nothing_given_is_unknown_and_not_a_soil(grid: Grid) -> None:
    got = read(grid)
    assert np.isnan([got.kinds[0].field_capacity, got.kinds[0].infiltration_mm_h, got.kinds[0].rew_mm]).all()
    assert stripes(got.soil_group) == [0, 0, 0]


# Saxton & Rawls (2006) Table 3, 2.5 % organic matter: wilting point, field capacity in %v, Ksat in mm/h
@pytest.mark.parametrize(
    ("sand", "clay", "texture", "wilting", "capacity", "ksat"),
    [
        (88, 5, "sand", 5, 10, 108.1),
        (65, 10, "sandy loam", 8, 18, 50.3),
        (20, 15, "silt loam", 11, 31, 16.1),
        (60, 25, "sandy clay loam", 17, 27, 11.3),
        (10, 45, "silty clay", 27, 41, 3.7),
        (25, 50, "clay", 30, 42, 1.1),
    ],
)
def test_particle_sizes_give_texture_and_water(
    grid: Grid, sand: float, clay: float, texture: str, wilting: float, capacity: float, ksat: float
) -> None:
    (kind,) = read(grid, sand_pct=sand, clay_pct=clay, organic_matter_pct=2.5).kinds
    assert kind.texture == texture
    assert 100 * kind.wilting_point == pytest.approx(wilting, abs=1)
    assert 100 * kind.field_capacity == pytest.approx(capacity, abs=1)
    if not tables.soil(texture).infiltration_source.startswith("FAO"):
        assert kind.infiltration_mm_h == pytest.approx(ksat, rel=0.01, abs=0.05)  # printed to 0.1


def test_organic_matter_that_nobody_gave_is_said(grid: Grid) -> None:
    notes = Notes()
    bare = read(grid, notes, sand_pct=40.0, clay_pct=20.0).kinds[0]
    assert {noted.id: noted.value for noted in notes.assumptions}["soil.organic_matter_pct"] == "0.5"
    rich = read(grid, sand_pct=40.0, clay_pct=20.0, organic_matter_pct=2.5).kinds[0]
    assert rich.field_capacity > bare.field_capacity


def test_sizes_beyond_the_fit_take_the_printed_values_of_their_class() -> None:
    heavy = soil_kind(SoilFacts(sand_pct=10, clay_pct=80), OwnSoil())
    assert (heavy.texture, heavy.field_capacity) == ("clay", tables.soil("clay").field_capacity)
    assert heavy.water_source == tables.soil("clay").water_source


def test_polygons_carry_textures_depths_and_groups(grid: Grid, tmp_path: Path) -> None:
    path = polygons(
        tmp_path / "soil.gpkg", kind=["loam", "sand", "loam"], depth=[1.2, 0.3, None], soil_group=["", "", "C/D"]
    )
    notes = Notes()
    got = read(grid, notes, map=path, column="kind", depth_column="depth")
    assert [kind.texture for kind in got.kinds] == ["loam", "sand", "loam"]
    assert stripes(got.code) == [0, 1, 2]
    assert stripes(got.depth_m) == pytest.approx([1.2, 0.3, None])
    # TR-55 (1986) appendix A; a dual group counts as its second letter
    assert stripes(got.soil_group) == [2, 1, 4]
    assert {one.id: one.value for one in notes.assumptions}["soil.dual_groups"] == "C/D as D"
    (warned,) = notes.warnings
    assert warned.text.startswith("On 33.3 % of the cells the soil is less than 0.5 m deep, which soil groups do not")
    np.testing.assert_allclose(got.values("field_capacity"), [0.25, 0.12, 0.25, np.nan])


def test_polygons_carry_particle_sizes_in_any_case(grid: Grid, tmp_path: Path) -> None:
    path = polygons(
        tmp_path / "soil.gpkg",
        SAND_PCT=[65.0, 20.0, 65.0],
        Clay_pct=[10.0, 15.0, 10.0],
        silt_pct=[25.2, 65.0, 24.8],
        organic_matter_pct=[2.5, 2.5, 2.5],
        depth_m=[1.0, 2.0, 1.0],
    )
    got = read(grid, map=path)
    # the first and the last are the same soil
    assert stripes(got.code) == [0, 1, 0]
    assert [kind.name for kind in got.kinds] == [
        "sandy loam (sand 65 %, clay 10 %)",
        "silt loam (sand 20 %, clay 15 %)",
    ]
    assert 100 * got.kinds[1].field_capacity == pytest.approx(31, abs=1)  # Saxton & Rawls (2006) Table 3
    assert stripes(got.depth_m) == [1, 2, 1]


def test_a_raster_takes_its_soils_from_a_table(grid: Grid, tmp_path: Path) -> None:
    table = tmp_path / "soil.csv"
    table.write_text("map_value,texture,sand_pct,clay_pct,ksat_mm_h\n1,loam,,,\n2,,65,10,\n3,,,,\n", encoding="utf-8")
    notes = Notes()
    got = read(grid, notes, map=raster(tmp_path / "soil.tif", [1, 2, 3]), table=table)
    assert stripes(got.code) == [0, 1, -1]
    assert [kind.texture for kind in got.kinds] == ["loam", "sandy loam"]
    assert stripes(got.soil_group) == [2, 1, 0]
    assert "leaves 33.3 % of the DEM's cells without a value" in notes.warnings[0].text


def test_a_map_of_groups_alone_tells_groups_alone(grid: Grid, tmp_path: Path) -> None:
    got = read(grid, map=polygons(tmp_path / "soil.gpkg", soil_group=["A", "b", "D"]))
    assert stripes(got.soil_group) == [1, 2, 4]
    assert np.isnan(got.values("field_capacity")).all()


def test_rock_and_water_below_are_read_by_soil(grid: Grid, tmp_path: Path) -> None:
    # NEH-630 Table 7-1: a layer less than 50 cm deep makes group D; 41 um/s over a layer at 80 cm and water at 50 cm: A/D
    path = polygons(
        tmp_path / "soil.gpkg",
        texture=["sand"] * 3,
        depth_m=[0.4] * 3,
        restrictive_depth_m=[0.4, 3.0, 0.8],
        water_table_m=[None, None, 0.5],
        ksat_mm_h=[None, None, 41 * MM_H],
    )
    notes = Notes()
    got = read(grid, notes, map=path, column="texture")
    assert [kind.soil_group for kind in got.kinds] == ["D", "A", "A/D"]
    assert stripes(got.soil_group) == [4, 1, 4]
    assert not notes.warnings


def test_a_depth_map_wins_over_columns(grid: Grid, tmp_path: Path) -> None:
    path = polygons(tmp_path / "soil.gpkg", texture=["sand"] * 3, depth_m=[9.0] * 3)
    depth = raster(tmp_path / "depth.tif", [0.4, 0.8, -1], "float32", nodata=-1)
    notes = Notes()
    got = read(grid, notes, map=path, column="texture", depth_map=depth)
    assert stripes(got.depth_m) == pytest.approx([0.4, 0.8, None])
    assert [warned.code for warned in notes.warnings] == ["soil.depth_map_partial", "shallow_soil_group"]


# NEH-630 ch. 7 Table 7-1 (January 2009): Ksat in um/s, depth to a layer and to water in m
@pytest.mark.parametrize(
    ("ksat_um_s", "layer_m", "water_m", "group"),
    [
        (41, 0.8, 0.7, "A"),
        (39, 0.8, 0.7, "B"),
        (9, 0.8, 0.7, "C"),
        (0.9, 0.8, 0.7, "D"),
        (11, 2.0, 2.0, "A"),
        (9, 2.0, 2.0, "B"),
        (3.9, 2.0, 2.0, "C"),
        (0.3, 2.0, 2.0, "D"),
        (41, 2.0, 0.8, "A"),
        (41, 0.4, 2.0, "D"),
        (41, 0.8, 0.5, "A/D"),
        (5, 2.0, 0.5, "B/D"),
    ],
)
def test_measured_conductivity_and_depths_give_the_group(
    grid: Grid, ksat_um_s: float, layer_m: float, water_m: float, group: str
) -> None:
    notes = Notes()
    got = read(
        grid,
        notes,
        texture="clay",
        ksat_mm_h=ksat_um_s * MM_H,
        restrictive_depth_m=layer_m,
        water_table_m=water_m,
    )
    assert stripes(got.soil_group)[0] == " ABCD".index(group[-1])
    assert got.kinds[0].soil_group == group
    assert got.kinds[0].infiltration_mm_h == pytest.approx(ksat_um_s * MM_H)
    assert ("soil.dual_groups" in {noted.id for noted in notes.assumptions}) == ("/" in group)


def test_depths_that_nobody_gave_are_said_where_conductivity_decides(grid: Grid) -> None:
    notes = Notes()
    assert stripes(read(grid, notes, texture="clay", ksat_mm_h=50.0).soil_group) == [1, 1, 1]
    noted = {one.id: one.value for one in notes.assumptions}
    assert (noted["soil.water_table_m"], noted["soil.restrictive_depth_m"]) == ("deeper than 1", "deeper than 1")


def test_a_given_group_wins_over_all_depths(grid: Grid) -> None:
    got = read(grid, texture="clay", soil_group="A", depth_m=0.2, ksat_mm_h=0.1)
    assert stripes(got.soil_group) == [1, 1, 1]


def test_a_high_water_table_makes_any_texture_group_d(grid: Grid) -> None:
    assert stripes(read(grid, texture="sand", water_table_m=0.5).soil_group) == [4, 4, 4]


def test_a_texture_without_a_printed_group_takes_that_of_its_conductivity(grid: Grid) -> None:
    # silt is not in TR-55 appendix A; Saxton & Rawls with 10 % sand, 5 % clay: 7.9 mm/h = 2.2 um/s, group C when deep
    got = read(grid, texture="silt")
    assert tables.soil("silt").soil_group is None
    assert stripes(got.soil_group) == [3, 3, 3]
    assert "no group by this texture in print" in got.kinds[0].group_source


def test_own_values_win_for_every_kind(grid: Grid, tmp_path: Path) -> None:
    path = polygons(tmp_path / "soil.gpkg", texture=["sand", "loam", "clay"])
    notes = Notes()
    got = read(
        grid, notes, map=path, column="texture", field_capacity=0.3, wilting_point=0.1, infiltration_mm_h=9.0, depth_m=0.7
    )
    np.testing.assert_array_equal(got.values("field_capacity")[:3], 0.3)
    np.testing.assert_array_equal(got.values("infiltration_mm_h")[:3], 9.0)
    assert stripes(got.depth_m) == pytest.approx([0.7] * 3)
    assert not [noted for noted in notes.assumptions if noted.id.startswith(("soil.water of", "soil.infiltration"))]


def test_rew_without_a_printed_value_is_that_of_the_nearest_texture() -> None:
    # sandy clay loam is not in FAO-56 Table 19
    kind = soil_kind(SoilFacts(texture="sandy clay loam"), OwnSoil())
    assert kind.rew_source.startswith("assumption: as the texture of FAO-56 Table 19 that is nearest in TEW")
    printed = {row.rew_mm for row in tables.soils() if row.rew_mm is not None}
    assert kind.rew_mm in printed


FACTS = st.one_of(
    st.builds(SoilFacts, texture=st.sampled_from(tables.TEXTURES)),
    st.tuples(st.floats(0, 100), st.floats(0, 100))
    .filter(lambda pair: sum(pair) <= 100)
    .map(lambda pair: SoilFacts(sand_pct=pair[0], clay_pct=pair[1])),
)


@settings(deadline=None)
@given(facts=FACTS)
def test_every_kind_of_soil_can_be(facts: SoilFacts) -> None:
    kind: SoilKind = soil_kind(facts, OwnSoil())
    assert 0 < kind.wilting_point < kind.field_capacity < 1
    assert 0 < kind.rew_mm <= kind.tew_mm
    assert kind.infiltration_mm_h > 0
    # FAO-56 eq. 73
    tew = float(total_evaporable_water_mm(field_capacity=kind.field_capacity, wilting_point=kind.wilting_point))
    assert kind.tew_mm == tew
    assert kind.soil_group in ("A", "B", "C", "D")
    assert soil_kind(replace(facts, restrictive_depth_m=0.3), OwnSoil()).soil_group == "D"
    assert soil_kind(replace(facts, restrictive_depth_m=3.0), OwnSoil()).soil_group == kind.soil_group


def test_many_kinds_are_listed_in_one_line(grid: Grid, tmp_path: Path) -> None:
    sand = [10.0 + place for place in range(20)]
    shapes = polygons(tmp_path / "soil.gpkg", sand_pct=sand, clay_pct=[20.0] * 20)
    notes = Notes()
    wide = metric_grid(20, 200, 10.0, west=WEST, north=NORTH)
    inputs.read_soil(SoilInputs(map=shapes), wide, notes=notes)
    noted = {one.id: one.value for one in notes.assumptions}
    assert noted["soil.water"] == "20 kinds of soil"
    assert not [name for name in noted if name.startswith("soil.water of")]


@pytest.mark.parametrize(
    ("columns", "values", "message"),
    [
        ({"name": ["x"] * 3}, {}, "tells no soil: it needs a column of textures .* it has 'name'"),
        ({"texture": ["mud"] * 3}, {}, "soil.map soil.gpkg: texture 'mud' is unknown"),
        ({"texture": ["loam"] * 3}, {"column": "kind"}, "soil.column is 'kind', which soil.map soil.gpkg does not have"),
        ({"texture": ["loam"] * 3}, {"depth_column": "z"}, "soil.depth_column is 'z', which"),
        ({"sand_pct": ["70"] * 3, "clay_pct": ["x"] * 3}, {}, "has clay_pct = 'x'; write a number"),
        ({"sand_pct": [70] * 3, "clay_pct": [40] * 3}, {}, "sand of 70 % and clay of 40 %, which together exceed"),
        ({"sand_pct": [70] * 3, "clay_pct": [20] * 3, "silt_pct": [20] * 3}, {}, "of 70, 20 and 20 %; they must sum to 100"),
        ({"sand_pct": [70, None, 70], "clay_pct": [20] * 3}, {}, "sand_pct without clay_pct"),
        ({"texture": ["loam"] * 3, "depth_m": [120] * 3}, {}, "a soil depth of 120 m; it must be 0 to 20"),
        ({"texture": ["loam"] * 3, "soil_group": ["E"] * 3}, {}, "the soil group 'E'; the groups are A, B, C, D, A/D"),
    ],
)
def test_a_soil_map_that_cannot_be_right_is_refused(
    grid: Grid, tmp_path: Path, columns: dict[str, list[Any]], values: dict[str, Any], message: str
) -> None:
    path = polygons(tmp_path / "soil.gpkg", **columns)
    with pytest.raises(InputError, match=message):
        read(grid, map=path, **values)


def test_tables_and_maps_that_do_not_go_together_are_refused(grid: Grid, tmp_path: Path) -> None:
    table = tmp_path / "soil.csv"
    table.write_text("map_value,texture\n1,loam\n", encoding="utf-8")
    with pytest.raises(
        ConfigError, match=r"soil\.map soil\.tif has the value 2, which soil\.table soil\.csv does not explain"
    ):
        read(grid, map=raster(tmp_path / "soil.tif", [1, 2, 1]), table=table)
    with pytest.raises(ConfigError, match=r"soil\.tif holds map values; say what they mean in soil\.table"):
        read(grid, map=tmp_path / "soil.tif")
    with pytest.raises(ConfigError, match=r"soil\.table goes with a raster, and soil\.map soil\.gpkg holds polygons"):
        read(grid, map=polygons(tmp_path / "soil.gpkg", texture=["loam"]), table=table)


def test_a_depth_map_in_centimetres_is_refused(grid: Grid, tmp_path: Path) -> None:
    path = raster(tmp_path / "depth.tif", [30, 80, 120])
    with pytest.raises(InputError, match=r"depth\.tif has a depth of 30; it must be 0 to 20 m, so convert it"):
        read(grid, texture="loam", depth_map=path)


def test_soils_drawn_over_each_other_are_said(grid: Grid, tmp_path: Path) -> None:
    # three stripes of 100 m, and over the first 50 m of each pair a polygon of another, or of the same, soil
    path = tmp_path / "over.gpkg"
    stripes = [box(WEST + 100 * place, NORTH - 200, WEST + 100 * place + 100, NORTH) for place in range(3)]
    over = [box(WEST, NORTH - 200, WEST + 50, NORTH), box(WEST + 100, NORTH - 200, WEST + 150, NORTH)]
    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", "'crs' was not provided")
        frame = {"texture": ["loam", "loam", "sand", "sand", "loam"], "id": [1, 2, 3, 4, 5]}
        gpd.GeoDataFrame(frame, geometry=stripes + over, crs="EPSG:32636").to_file(path, driver="GPKG")
    notes = Notes()
    got = inputs.read_soil(SoilInputs(map=path, column="texture"), grid, notes=notes)
    said = [warned.text for warned in notes.warnings if warned.code == "soil.map_overlap"]
    assert len(said) == 1 and "over each other on 16.7 % of the DEM's cells: the last of them" in said[0]
    textures = [got.kinds[code].name for code in got.code[0, [0, 7, 12, 17, 27]]]
    assert textures == ["sand", "loam", "loam", "loam", "sand"]


def test_a_soil_map_of_lines_is_refused(grid: Grid, tmp_path: Path) -> None:
    path = tmp_path / "lines.gpkg"
    lines = [LineString([(WEST, NORTH), (WEST + 300, NORTH - 200)])]
    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", "'crs' was not provided")
        gpd.GeoDataFrame({"texture": ["loam"]}, geometry=lines, crs="EPSG:32636").to_file(path, driver="GPKG")
    with pytest.raises(InputError, match=r"lines\.gpkg holds LineString shapes, and needs areas; draw them as polygons"):
        read(grid, map=path, column="texture")
