"""
Make the demo place: an INVENTED dry valley, its rain, soil, cover, boundary and villages.

Nothing here is measured and no real place is meant. The script is seeded, so that a second
run gives the same values; run it as `python demo_dem/make_demo.py [FOLDER]`.
"""

import sys
from pathlib import Path

import geopandas as gpd
import numpy as np
import numpy.typing as npt
import pandas as pd
import rasterio
from affine import Affine
from shapely.geometry import LineString, Polygon, box

from siting.grid import metric_grid
from siting.terrain import accumulate, condition

Array = npt.NDArray[np.float64]

SEED = 20260
ROWS = COLS = 1000
CELL_M = 10.0
WEST_M, NORTH_M = 690_000.0, 3_420_000.0
CRS = "EPSG:32636"
SIZE_M = ROWS * CELL_M
FIRST_DAY, LAST_DAY = "1989-01-01", "2023-12-31"
PANS = ((2050.0, 7050.0, 190.0, 2.8), (8250.0, 4100.0, 160.0, 2.4))  # x, y, radius, depth in m
GORGE_Y_M = 2300.0
ROAD = ((6350.0, 5200.0), (6350.0, 6900.0))  # a bank along a line, x and y in m
VILLAGES = (  # invented names, people and places (x, y in m from the south-west corner)
    ("Oru Sabba", 420, 4300.0, 8600.0),
    ("Hamat Lour", 1150, 5900.0, 7300.0),
    ("Enneb", 95, 3300.0, 6100.0),
    ("Tamour", 640, 6700.0, 4900.0),
    ("Rasif Qesh", 210, 4700.0, 3500.0),
    ("Nuwar Delle", 330, 5200.0, 900.0),
)


def axis_x(y: Array) -> Array:
    """East position of the valley's axis, m."""
    return 5000.0 + 800.0 * np.sin(2.0 * np.pi * y / 7000.0)


def fractal(rng: np.random.Generator, slope: float) -> Array:
    """Noise of unit standard deviation whose power falls with frequency."""
    rows = np.fft.fftfreq(ROWS)[:, None]
    cols = np.fft.rfftfreq(COLS)[None, :]
    frequency = np.hypot(rows, cols)
    frequency[0, 0] = 1.0
    spectrum = np.fft.rfft2(rng.standard_normal((ROWS, COLS))) * frequency ** (-slope / 2.0)
    spectrum[0, 0] = 0.0
    field: Array = np.fft.irfft2(spectrum, s=(ROWS, COLS))
    return field / field.std()


def metres() -> tuple[Array, Array]:
    """East and north position of every cell centre from the south-west corner, m."""
    along = (np.arange(COLS) + 0.5) * CELL_M
    return np.meshgrid(along, SIZE_M - along)


def floor_half_width(y: Array) -> Array:
    """Half the width of the valley floor, m; the gorge narrows it."""
    return 320.0 - 260.0 * np.exp(-(((y - GORGE_Y_M) / 420.0) ** 2))


def elevation() -> Array:
    """Heights in m, rounded to 0.01 m."""
    rng = np.random.default_rng(SEED)
    x, y = metres()
    rough, gentle = fractal(rng, 3.2), fractal(rng, 4.2)
    away = np.abs(x - axis_x(y))
    beyond = np.maximum(away - floor_half_width(y), 0.0)
    bed = 430.0 + 0.008 * y + 0.004 * away
    terrace = 2.2 * (1.0 - np.exp(-((beyond / 60.0) ** 2))) + 0.016 * np.minimum(beyond, 620.0)
    hill = np.maximum(beyond - 620.0, 0.0)
    rise = 150.0 * (hill / 3400.0) ** 1.35
    # side wadis: a comb of valleys across the hills, bent by the noise
    comb = np.abs(np.sin(np.pi * (y + 260.0 * gentle) / 1150.0))
    side = 48.0 * comb * (1.0 - np.exp(-((hill / 900.0) ** 2)))
    gorge = 70.0 * np.exp(-(((y - GORGE_Y_M) / 420.0) ** 2)) * (1.0 - np.exp(-((beyond / 110.0) ** 2)))
    share = np.clip(hill / 900.0, 0.0, 1.0)
    z = bed + terrace + rise + side + gorge + rough * (1.6 + 2.0 * share) + 3.0 * gentle * share
    z = gullied(z)
    for pan in PANS:
        z = with_pan(z, x, y, *pan)
    return np.round(with_road(z, x, y), 2)


def gullied(z: Array) -> Array:
    """Cut the ground where water gathers, a little more each time, so that rills join into gullies."""
    grid = metric_grid(ROWS, COLS, CELL_M)
    size = {"cell_width_m": grid.cell_width_m, "cell_height_m": grid.cell_height_m}
    for _ in range(4):
        z = np.round(z, 2)
        flow = condition(z.astype(np.float32), sinks=None, threads=2, **size)
        area = accumulate(flow.direction, grid.cell_area_m2, threads=2)
        cut = 0.02 * np.log1p(area / 3000.0) + 0.12 * np.log1p(area / 40_000.0)
        beside = np.stack([np.roll(cut, (down, right), (0, 1)) for down in (-1, 0, 1) for right in (-1, 0, 1)])
        z = z - 0.4 * cut - 0.6 * beside.mean(axis=0)
    return z


def with_pan(z: Array, x: Array, y: Array, east: float, north: float, radius: float, depth: float) -> Array:
    """Sink a closed bowl into flattened ground."""
    distance = np.hypot(x - east, y - north)
    rim = float(z[np.abs(distance - 1.5 * radius) < 1.5 * CELL_M].min())
    bowl = rim - depth * np.clip(1.0 - (distance / radius) ** 2, 0.0, None)
    blend = np.clip((distance - radius) / (0.5 * radius), 0.0, 1.0)
    return np.where(distance < 1.5 * radius, bowl * (1.0 - blend) + np.maximum(z, rim) * blend, z)


def with_road(z: Array, x: Array, y: Array) -> Array:
    """Lay a level road bank, three cells wide, over the low places along its line."""
    (east, south), (_, north) = ROAD
    on_line = (np.abs(x - east) < 1.6 * CELL_M) & (y > south) & (y < north)
    crest = float(np.quantile(z[on_line], 0.22)) + 2.0
    return np.where(on_line, np.maximum(z, np.minimum(crest, z + 4.5)), z)


def cover_codes() -> npt.NDArray[np.uint8]:
    """Cover at 30 m: 1 valley floor, 2 terraces, 3 stony hills, 4 an old field."""
    x, y = metres()
    x, y = x[1::3, 1::3], y[1::3, 1::3]
    beyond = np.abs(x - axis_x(y)) - floor_half_width(y)
    codes = np.where(beyond <= 0.0, 1, np.where(beyond < 620.0, 2, 3)).astype(np.uint8)
    codes[(np.hypot(x - 5500.0, y - 8000.0) < 350.0) & (codes == 2)] = 4
    return codes


def weather() -> pd.DataFrame:
    """Daily rain (mm) and temperature (deg C) of winter-rain country; all invented."""
    rng = np.random.default_rng(SEED + 1)
    days = pd.date_range(FIRST_DAY, LAST_DAY, freq="D")
    month = days.month.to_numpy()
    start = np.array([0, 0.15, 0.14, 0.12, 0.05, 0.015, 0, 0, 0, 0.004, 0.04, 0.10, 0.14])[month]
    mean = np.array([0, 9.5, 9.0, 8.0, 6.0, 4.0, 1, 1, 1, 4.0, 8.5, 10.0, 10.0])[month]
    season = (days.year + (month >= 9)).to_numpy()
    wetness = dict(zip(np.unique(season), rng.lognormal(-0.52, 0.34, np.unique(season).size), strict=True))
    draws, amounts = rng.random(days.size), rng.gamma(0.75, 1.0, days.size) / 0.75
    rain = np.zeros(days.size)
    wet = False
    for day in range(days.size):
        chance = 0.42 if wet and start[day] > 0.01 else start[day]
        wet = bool(draws[day] < chance)
        if wet:
            rain[day] = max(0.2, amounts[day] * mean[day] * wetness[season[day]])
    year = 2.0 * np.pi * (days.dayofyear.to_numpy() - 205) / 365.25
    tmax = 26.0 + 9.0 * np.cos(year) + rng.normal(0.0, 2.2, days.size) - 3.0 * (rain > 0)
    tmin = tmax - 12.0 + rng.normal(0.0, 1.5, days.size) + 4.0 * (rain > 0)
    return pd.DataFrame(
        {
            "date": days.strftime("%Y-%m-%d"),
            "rain_mm": np.round(rain, 1),
            "tmin_c": np.round(np.minimum(tmin, tmax - 2.0), 1),
            "tmax_c": np.round(tmax, 1),
        }
    )


def band(half_width_extra_m: float) -> Polygon:
    """Ground within the valley floor and so many metres beyond it, in map coordinates."""
    y = np.arange(-200.0, SIZE_M + 201.0, 50.0)
    half = floor_half_width(y) + half_width_extra_m
    left = np.column_stack([WEST_M + axis_x(y) - half, NORTH_M - SIZE_M + y])
    right = np.column_stack([WEST_M + axis_x(y) + half, NORTH_M - SIZE_M + y])
    return Polygon(np.vstack([left, right[::-1]])).buffer(0)


def soils() -> gpd.GeoDataFrame:
    """Soil polygons with a texture class each."""
    whole = box(WEST_M - 100, NORTH_M - SIZE_M - 100, WEST_M + SIZE_M + 100, NORTH_M + 100)
    floor, low = band(0.0).intersection(whole), band(620.0).intersection(whole)
    return gpd.GeoDataFrame(
        {
            "unit": ["valley floor", "terraces", "hills"],
            "texture": ["loam", "silt loam", "sandy clay loam"],
            "depth_m": [1.8, 1.3, 0.3],
        },
        geometry=[floor, low.difference(floor), whole.difference(low)],
        crs=CRS,
    )


def place(x: float, y: float) -> tuple[float, float]:
    """Map coordinates from metres east and north of the south-west corner."""
    return (WEST_M + x, NORTH_M - SIZE_M + y)


def boundary() -> gpd.GeoDataFrame:
    """Outline the property."""
    corners = [(3300, 4300), (7600, 4500), (7700, 8300), (6100, 8900), (3500, 8500)]
    outline = Polygon([place(float(x), float(y)) for x, y in corners])
    return gpd.GeoDataFrame({"name": ["invented property"]}, geometry=[outline], crs=CRS)


def road() -> gpd.GeoDataFrame:
    """Draw the road that plots keep clear of."""
    line = LineString([place(*ROAD[0]), place(*ROAD[1])])
    return gpd.GeoDataFrame({"name": ["invented road"]}, geometry=[line], crs=CRS)


def villages() -> pd.DataFrame:
    """Six invented villages with invented people, in degrees."""
    points = gpd.GeoSeries.from_xy(
        [place(x, y)[0] for _, _, x, y in VILLAGES],
        [place(x, y)[1] for _, _, x, y in VILLAGES],
        crs=CRS,
    ).to_crs("EPSG:4326")
    return pd.DataFrame(
        {
            "name": [name for name, *_ in VILLAGES],
            "people": [people for _, people, *_ in VILLAGES],
            "lon": np.round(points.x, 6),
            "lat": np.round(points.y, 6),
        }
    )


def write_raster(path: Path, values: npt.NDArray[np.generic], cell_m: float, **profile: object) -> None:
    """Write one band as a compressed GeoTIFF."""
    with rasterio.open(
        path,
        "w",
        driver="GTiff",
        height=values.shape[0],
        width=values.shape[1],
        count=1,
        crs=CRS,
        transform=Affine(cell_m, 0, WEST_M, 0, -cell_m, NORTH_M),
        tiled=True,
        compress="deflate",
        zlevel=9,
        **profile,
    ) as file:
        file.write(values, 1)
        file.set_band_description(1, path.stem)


def main(folder: Path) -> None:
    """Write every file of the demo place but the project file and the read-me."""
    heights = np.round(elevation() * 100.0).astype(np.int32)
    write_raster(folder / "dem.tif", heights, CELL_M, dtype="int32", predictor=2, nodata=-99999)
    with rasterio.open(folder / "dem.tif", "r+") as file:
        file.scales, file.offsets, file.units = (0.01,), (0.0,), ("metre",)
    codes = cover_codes()
    write_raster(folder / "cover.tif", codes, 3 * CELL_M, dtype="uint8", nodata=0)
    daily = weather()
    daily[["date", "rain_mm"]].to_csv(folder / "rain.csv", index=False)
    daily[["date", "tmin_c", "tmax_c"]].to_csv(folder / "climate.csv", index=False)
    villages().to_csv(folder / "villages.csv", index=False)
    for name, frame in (("soil", soils()), ("boundary", boundary()), ("road", road())):
        frame.to_file(folder / f"{name}.geojson", driver="GeoJSON")


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent)
