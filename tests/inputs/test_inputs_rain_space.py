"""Rain of several stations and rain maps: read onto one calendar, laid on the ground, or refused in one sentence."""

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import rasterio
from affine import Affine
from hypothesis import given, settings
from hypothesis import strategies as st
from pyproj import Geod, Transformer

from siting import inputs
from siting.errors import InputError
from siting.grid import Grid, metric_grid
from siting.notes import Notes
from siting.runoff import RainField, RainGenerator, StationRain, mean_annual_mm

WEST, NORTH = 700_000.0, 3_400_000.0
LONG = (
    "date,station,rain_mm\n2001-01-01,Qesh,5\n2001-01-01,Rehm,2\n2001-01-02,Qesh,0\n2001-01-03,Rehm,1\n2001-01-04,Rehm,4\n"
)
WIDE = "date,Rehm_mm,Qesh_mm\n2001-01-01,2,5\n2001-01-02,,0\n2001-01-03,1,\n2001-01-04,4,\n"


@pytest.fixture
def grid() -> Grid:
    return metric_grid(20, 30, 10.0, west=WEST, north=NORTH)


def saved(folder: Path, text: str, name: str = "rain.csv") -> Path:
    path = folder / name
    path.write_text(text, encoding="utf-8")
    return path


def annual(path: Path, values: Any, *, west: float = WEST, north: float = NORTH, cell: float = 100.0, **more: Any) -> Path:
    table = np.array(values, dtype=np.float32)
    with rasterio.open(
        path,
        "w",
        driver="GTiff",
        count=1,
        height=table.shape[0],
        width=table.shape[1],
        dtype="float32",
        crs="EPSG:32636",
        transform=Affine(cell, 0, west, 0, -cell, north),
        **more,
    ) as file:
        file.write(table, 1)
    return path


def stations_at(grid: Grid, *places: tuple[float, float]) -> inputs.Stations:
    """Stations A, B, ... at metres from the grid's upper left corner."""
    to_degrees = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True)
    x, y = np.array(places, dtype=np.float64).T
    lon, lat = to_degrees.transform(WEST + x, NORTH - y)
    return inputs.Stations(tuple("ABCDEFGH"[: len(places)]), np.asarray(lon), np.asarray(lat))


def years(*means_mm: float) -> StationRain:
    """Stations with the same rain every day of four years, with these yearly sums."""
    days = np.arange(np.datetime64("2001-01-01"), np.datetime64("2005-01-01"))
    return StationRain(days, np.outer(np.array(means_mm) / 365.25, np.ones(days.size)), tuple("ABCDEFGH"[: len(means_mm)]))


def rain_on(field: RainField) -> np.ndarray:
    """The first day's rain on every cell, NaN where unknown."""
    by_zone = field.record.rain_mm[field.zones.station, 0] * field.zones.factor
    return np.append(by_zone, np.nan)[field.zone_of_cell]


@pytest.mark.parametrize("text", [LONG, WIDE, WIDE.replace(",", ";")])
def test_stations_are_laid_on_one_calendar(tmp_path: Path, text: str) -> None:
    notes = Notes()
    got = inputs.read_rain_stations(saved(tmp_path, text), ("Qesh", "Rehm"), notes=notes)
    assert got.station == ("Qesh", "Rehm")
    assert got.days.tolist() == [np.datetime64(f"2001-01-0{day}").item() for day in (1, 2, 3, 4)]
    np.testing.assert_array_equal(got.rain_mm, [[5, 0, np.nan, np.nan], [2, np.nan, 1, 4]])
    said = [warned.text for warned in notes.warnings]
    assert said == [
        "The rain record of 'Qesh' lacks 2 days, the first 2001-01-03.",
        "The rain record of 'Rehm' lacks 1 day, the first 2001-01-02; "
        "1 reading right after a gap may be a sum of several days.",
    ]


def test_inches_of_stations_become_millimetres(tmp_path: Path) -> None:
    got = inputs.read_rain_stations(saved(tmp_path, WIDE.replace("_mm", "_in")), ("Rehm", "Qesh"), notes=Notes())
    np.testing.assert_allclose(got.rain_mm[:, 0], [50.8, 127.0])


def test_stations_without_a_place_are_said(tmp_path: Path) -> None:
    for text, name in ((LONG, "Qesh"), (WIDE, "Qesh_mm")):
        notes = Notes()
        inputs.read_rain_stations(saved(tmp_path, text), ("Rehm",), notes=notes)
        assert f"stations that rain.stations does not place: '{name}'" in notes.warnings[0].text


def test_one_gauge_needs_no_station_column(tmp_path: Path) -> None:
    path = saved(tmp_path, "date,rain_mm\n2001-01-01,1\n2001-01-02,2\n")
    for names, name in ((None, "rain"), (("Qesh",), "Qesh")):
        got = inputs.read_rain_stations(path, names, notes=Notes())
        assert got.station == (name,)
        np.testing.assert_array_equal(got.rain_mm, [[1, 2]])


@pytest.mark.parametrize(
    ("text", "names", "message"),
    [
        (LONG, ("Qesh", "Tell"), "has no rain of the station 'Tell'; it has 'Qesh', 'Rehm'"),
        (WIDE, ("Tell", "Rehm"), "has no rain of the station 'Tell'; it has 'date', 'Rehm_mm', 'Qesh_mm'"),
        (LONG, None, r"holds several stations; say where they lie in rain\.stations"),
        (LONG + "2001-01-01,Rehm,3\n", ("Qesh", "Rehm"), "at 'Rehm' has 2001-01-01 more than once"),
        (LONG + "2001-01-05,Rehm,-3\n", ("Qesh", "Rehm"), "at 'Rehm' has a depth of -3 mm"),
        (WIDE.replace("2,5", "2,2000"), ("Qesh", "Rehm"), "at 'Qesh' has 2000 mm on 2001-01-01, beyond the most"),
        (
            "date,Rehm,Qesh\n" + "\n".join(f"2001-{month:02d}-01,30,40" for month in range(1, 13)),
            ("Qesh", "Rehm"),
            "at 'Qesh' has one row in 31 days: totals",
        ),
    ],
)
def test_rain_of_stations_that_cannot_be_right_is_refused(
    tmp_path: Path, text: str, names: tuple[str, ...] | None, message: str
) -> None:
    with pytest.raises(InputError, match=message):
        inputs.read_rain_stations(saved(tmp_path, text), names, notes=Notes())


def test_monthly_totals_become_days_where_that_is_asked_for(tmp_path: Path) -> None:
    # dates at the start, the end or without a day all mean that month
    for day in ("-01", "-28", ""):
        text = "date,rain_mm\n" + "\n".join(f"2001-{month:02d}{day},{10 * month}" for month in (1, 2, 3, 5))
        notes = Notes()
        got = inputs.read_rain(saved(tmp_path, text), generator=RainGenerator(8.0, 1), notes=notes)
        month = got.days.astype("datetime64[M]").astype(int) % 12 + 1
        sums = [got.rain_mm[month == one].sum() for one in range(1, 6)]
        np.testing.assert_allclose(sums, [10, 20, 30, np.nan, 50])
        assert "rain_generated" in {warned.code for warned in notes.warnings}


def test_days_are_never_made_up_unasked_nor_over_real_ones(tmp_path: Path) -> None:
    monthly = saved(tmp_path, "date,rain_mm\n" + "\n".join(f"2001-{month:02d}-01,30" for month in range(1, 13)))
    with pytest.raises(InputError, match=r"give daily rain, or let days be drawn from the totals with rain\.generator"):
        inputs.read_rain(monthly, notes=Notes())
    generator = RainGenerator(8.0, 1)
    daily = saved(tmp_path, "date,rain_mm\n2001-01-01,1\n2001-01-02,2\n", "daily.csv")
    with pytest.raises(InputError, match=r"daily\.csv holds no monthly totals; take rain\.generator out"):
        inputs.read_rain(daily, generator=generator, notes=Notes())
    weekly = saved(tmp_path, "date,rain_mm\n2001-01-01,1\n2001-01-08,2\n2001-01-15,2\n", "weekly.csv")
    with pytest.raises(InputError, match=r"one row in 7 days: totals; .* so give daily rain$"):
        inputs.read_rain(weekly, notes=Notes())
    yearly = saved(tmp_path, "date,rain_mm\n2001-01-01,300\n2002-01-01,200\n2003-01-01,250\n", "yearly.csv")
    with pytest.raises(InputError, match=r"yearly\.csv holds no monthly totals"):
        inputs.read_rain(yearly, generator=generator, notes=Notes())
    inches = saved(tmp_path, "date,rain\n" + "\n".join(f"200{y}-{m:02d},0.9" for y in (1, 2) for m in range(1, 13)))
    with pytest.raises(InputError, match=r"sums to 10\.8 mm in a mean year; if it is in inches"):
        inputs.read_rain(inches, generator=generator, notes=Notes())
    with pytest.raises(InputError, match="draws the days of one gauge"):
        inputs.read_rain_stations(saved(tmp_path, WIDE), ("Qesh", "Rehm"), generator=generator, notes=Notes())


def test_stations_are_placed_by_degrees_or_by_map_units(grid: Grid, tmp_path: Path) -> None:
    by_map = inputs.read_stations(saved(tmp_path, f"y;x;station\n{NORTH};{WEST};Qesh\n"), grid)
    # EPSG:32636 (UTM 36 N), inverse by pyproj
    lon, lat = Transformer.from_crs("EPSG:32636", "EPSG:4326", always_xy=True).transform(WEST, NORTH)
    by_degrees = inputs.read_stations(saved(tmp_path, f"Station,Lon,Lat\nQesh,{lon:.9f},{lat:.9f}\n"), grid)
    assert by_map.name == by_degrees.name == ("Qesh",)
    np.testing.assert_allclose([by_map.lon[0], by_map.lat[0]], [by_degrees.lon[0], by_degrees.lat[0]], atol=1e-8)


def test_a_longitude_that_elsewhere_means_missing_is_a_place(grid: Grid, tmp_path: Path) -> None:
    got = inputs.read_stations(saved(tmp_path, "station;lon;lat\nQesh;-99;19,5\nRehm;-99.9;20\n"), grid)
    assert (got.lon.tolist(), got.lat.tolist()) == ([-99.0, -99.9], [19.5, 20.0])


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("station,lon\nQesh,35\n", "needs the columns station, lon, lat"),
        ("station,lon,lat\nQesh,35,31\nQesh,36,31\n", "has the station 'Qesh' twice"),
        ("station,lon,lat\n,35,31\n", "has the station '' without a name"),
        ("station,lon,lat\nQesh,35,131\n", "places 'Qesh' at lon '35', lat '131', which is no place"),
        ("station,lon,lat\nQesh,35,\n", "places 'Qesh' at lon '35', lat '', which is no place"),
    ],
)
def test_stations_without_a_place_are_refused(grid: Grid, tmp_path: Path, text: str, message: str) -> None:
    with pytest.raises(InputError, match=message):
        inputs.read_stations(saved(tmp_path, text), grid)


def geographic_grid(rows: int, cols: int) -> Grid:
    """Cells of 0.01 degree at 60 degrees north: half as wide as high."""
    return Grid(
        rows,
        cols,
        (0.01, 0.0, 30.0, 0.0, -0.01, 60.0 + 0.005 * rows),
        "EPSG:4326",
        np.full(rows, 557.0),
        np.full(rows, 1114.0),
    )


@settings(max_examples=25, deadline=None)
@given(
    places=st.lists(st.tuples(st.floats(29.0, 33.0), st.floats(59.0, 61.0)), min_size=2, max_size=6, unique=True),
    rows=st.integers(1, 150),
    cols=st.integers(1, 150),
)
def test_every_cell_takes_the_station_nearest_along_the_ground(
    places: list[tuple[float, float]], rows: int, cols: int
) -> None:
    grid = geographic_grid(rows, cols)
    lon, lat = np.array(places).T
    got = inputs.nearest_station(grid, inputs.Stations(tuple("ABCDEF"[: lon.size]), lon, lat))
    assert got.shape == grid.shape
    sample = np.random.default_rng(1).integers([0, 0], grid.shape, (60, 2))
    for row, col in sample:
        x, y = grid.xy(row, col)
        away = np.array([Geod(ellps="WGS84").inv(x, y, east, north)[2] for east, north in places])
        # geodesic lengths by another library; of stations equally far either may be named
        assert away[got[row, col]] <= away.min() * (1 + 1e-6) + 0.01


def test_a_place_under_many_blocks_is_divided_cell_by_cell() -> None:
    grid = metric_grid(200, 300, 10.0, west=WEST, north=NORTH)
    got = inputs.nearest_station(grid, stations_at(grid, (501.0, 1000.0), (1501.0, 1000.0)))
    # in a projected CRS of one scale the border is the line midway, at 1001 m
    np.testing.assert_array_equal(got, np.tile((np.arange(300) * 10 + 5 > 1001).astype(np.int16), (200, 1)))


def test_cells_take_the_rain_of_their_station_and_unused_ones_are_left_out(grid: Grid) -> None:
    notes = Notes()
    where = stations_at(grid, (50.0, 100.0), (9000.0, 100.0), (250.0, 100.0))
    field = inputs.read_rain_zones(years(100, 900, 200), grid, stations=where, rain_map=None, notes=notes)
    assert field.record.station == ("A", "C")
    expected = np.where(np.arange(30) < 15, 100, 200) / 365.25
    np.testing.assert_allclose(rain_on(field), np.tile(expected, (20, 1)))
    assert notes.assumptions[0].value == "A 50.0 %, C 50.0 %"


def test_a_station_far_away_is_said(grid: Grid) -> None:
    notes = Notes()
    inputs.read_rain_zones(years(300), grid, stations=stations_at(grid, (150_000.0, 0.0)), rain_map=None, notes=notes)
    assert "'A' lies 150 km from the middle of the DEM" in notes.warnings[0].text


def test_one_gauge_without_a_map_is_one_zone(grid: Grid) -> None:
    field = inputs.read_rain_zones(years(300), grid, stations=None, rain_map=None, notes=Notes())
    assert (field.zones.count, field.zones.factor[0]) == (1, 1.0)
    assert not field.zone_of_cell.any()


def test_a_map_scales_the_record_by_its_mean_year_in_steps(grid: Grid, tmp_path: Path) -> None:
    notes = Notes()
    path = annual(tmp_path / "annual.tif", [[300, 330, 390], [300, 300, -1]], nodata=-1)
    field = inputs.read_rain_zones(years(300), grid, stations=None, rain_map=path, notes=notes)
    # 1.1 and 1.3 are nearest to 1.05^2 and 1.05^5
    expected = np.repeat(np.repeat([[1, 1.1025, 1.27628], [1, 1, np.nan]], 10, axis=0), 10, axis=1)
    np.testing.assert_allclose(rain_on(field) * 365.25 / 300, expected, rtol=1e-5)
    assert field.zones.count == 3
    noted = {one.id: one for one in notes.assumptions}["rain.map_reference of A"]
    assert (noted.value, noted.source) == ("300", "mean year of the record: the station's place is not given")
    assert [warned.code for warned in notes.warnings] == ["rain.map_partial"]


def test_a_map_is_compared_with_itself_at_the_station(grid: Grid, tmp_path: Path) -> None:
    # the record is 20 % above the map at its station: the pattern is the map's, the level the record's
    path = annual(tmp_path / "annual.tif", [[250, 250, 500]] * 2)
    notes = Notes()
    where = stations_at(grid, (50.0, 100.0))
    field = inputs.read_rain_zones(years(300), grid, stations=where, rain_map=path, notes=notes)
    np.testing.assert_allclose(np.unique(rain_on(field)) * 365.25, [300, 300 * 1.05**14])
    assert {one.id: one.value for one in notes.assumptions}["rain.map_reference of A"] == "250"
    assert "scales the record by 1.00 to 2.00; on 33.3 % of the cells beyond 0.7 to 1.4" in notes.warnings[0].text


def test_a_station_off_the_map_is_compared_with_its_own_record(grid: Grid, tmp_path: Path) -> None:
    path = annual(tmp_path / "annual.tif", [[300, 300, 300]] * 2)
    notes = Notes()
    where = stations_at(grid, (5000.0, 100.0))
    field = inputs.read_rain_zones(years(300), grid, stations=where, rain_map=path, notes=notes)
    assert field.zones.factor.tolist() == [1.0]
    assert {one.id: one.source for one in notes.assumptions}["rain.map_reference of A"].endswith("none at the station")


def test_ground_without_rain_has_none(grid: Grid, tmp_path: Path) -> None:
    path = annual(tmp_path / "annual.tif", [[300, 300, 0]] * 2)
    field = inputs.read_rain_zones(years(300), grid, stations=None, rain_map=path, notes=Notes())
    assert rain_on(field)[0, 29] == 0.0


@settings(max_examples=20, deadline=None)
@given(mean_mm=st.floats(20.0, 3000.0), factor=st.floats(0.2, 9.0))
def test_scaled_rain_is_within_a_step_of_the_map(
    tmp_path_factory: pytest.TempPathFactory, mean_mm: float, factor: float
) -> None:
    path = annual(tmp_path_factory.mktemp("map") / "annual.tif", [[mean_mm * factor] * 3] * 2)
    grid = metric_grid(20, 30, 10.0, west=WEST, north=NORTH)
    field = inputs.read_rain_zones(years(mean_mm), grid, stations=None, rain_map=path, notes=Notes())
    np.testing.assert_allclose(rain_on(field) * 365.25, mean_mm * factor, rtol=0.025)


@pytest.mark.parametrize(
    ("values", "more", "message"),
    [
        ([[300, -9999, 300]] * 2, {}, r"mean annual rain of -9999 mm; .* `gdal_edit\.py -a_nodata -9999 annual\.tif`"),
        ([[300, 7620, 300]] * 2, {}, r"has 7620, 25\.4 times the rain at its station; give mean annual rain in mm"),
        ([[300] * 3] * 2, {"west": 0.0}, "does not meet the DEM"),
    ],
)
def test_a_map_that_cannot_be_right_is_refused(
    grid: Grid, tmp_path: Path, values: Any, more: dict[str, Any], message: str
) -> None:
    path = annual(tmp_path / "annual.tif", values, **more)
    with pytest.raises(InputError, match=message):
        inputs.read_rain_zones(years(300), grid, stations=None, rain_map=path, notes=Notes())


def test_several_stations_need_their_places(grid: Grid) -> None:
    with pytest.raises(InputError, match="rain of the stations A, B needs a place for each"):
        inputs.read_rain_zones(years(300, 400), grid, stations=None, rain_map=None, notes=Notes())


def test_the_mean_year_of_a_real_record_is_that_of_its_totals(package_file: Callable[[str, str], Path]) -> None:
    # Seattle 2012-2015 (NOAA): 1226.0, 828.0, 1232.8, 1139.2 mm, so 1106.5 mm a year
    path = package_file("vega_datasets", "_data/seattle-weather.csv")
    record = inputs.read_rain_stations(path, None, notes=Notes())
    assert mean_annual_mm(record.of(0)) == pytest.approx(1106.5, abs=0.1)
