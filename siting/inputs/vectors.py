"""Outlines on the DEM: boundary, exclusions, plots of the user's own, pans, villages."""

import io
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import numpy.typing as npt
import pandas as pd
import pyogrio
import pyogrio.errors
import shapely
from affine import Affine
from pyproj import CRS
from rasterio.features import rasterize

from siting.errors import InputError
from siting.grid import Grid
from siting.inputs.daily_csv import separator_of
from siting.notes import Notes

Mask = npt.NDArray[np.bool_]

TABLE_ENDINGS = (".csv", ".xlsx")

AREAS = ("Polygon", "MultiPolygon")

LEAST_BEYOND = 0.001
"""A share of an area beyond the DEM below this comes of rounding (assumption)."""

NO_VALUE = -1
"""Code of a cell that a map says nothing of."""


def read_vector(path: Path, grid: Grid, *, setting: str, areas: bool = False) -> gpd.GeoDataFrame:
    """
    Read a vector file into the grid's CRS, its geometry repaired; refuse one without features or CRS.

    With `areas`, shapes that are no polygons are refused too.
    """
    if not path.exists():
        msg = f"{setting} {path.name} does not exist; correct the path"
        raise InputError(msg)
    try:
        frame = gpd.read_file(path)
    except Exception as error:  # pyogrio and the drivers below it raise many kinds
        msg = f"{setting} {path.name} cannot be read as a vector file; convert it to GeoPackage"
        raise InputError(msg) from error
    if not isinstance(frame, gpd.GeoDataFrame) or frame.empty:
        msg = f"{setting} {path.name} holds no feature with a shape; give another file"
        raise InputError(msg)
    if frame.crs is None:
        msg = f"{setting} {path.name} declares no CRS; save it with one"
        raise InputError(msg)
    if areas:
        kinds = frame.geometry.geom_type.dropna()
        others = kinds[~kinds.isin(AREAS)]
        if len(others):
            msg = f"{setting} {path.name} holds {others.iloc[0]} shapes, and needs areas; draw them as polygons"
            raise InputError(msg)
    frame = frame.to_crs(grid.crs)
    frame.geometry = shapely.make_valid(frame.geometry.to_numpy())
    return frame


def burn(shapes: list[tuple[Any, int]], grid: Grid, *, fill: int = NO_VALUE) -> npt.NDArray[np.int32]:
    """Give each cell the value of the last shape that covers its centre."""
    if not shapes:
        return np.full(grid.shape, fill, dtype=np.int32)
    a, _, c, _, e, f = grid.affine
    burnt: npt.NDArray[np.int32] = rasterize(
        shapes, out_shape=grid.shape, transform=Affine(a, 0, c, 0, e, f), fill=fill, dtype="int32"
    )
    return burnt


def overlap_share(shapes: list[tuple[Any, int]], grid: Grid) -> float:
    """Return the share (0 to 1) of cells whose centre lies under shapes of more than one value."""
    if len({value for _, value in shapes}) < 2:
        return 0.0
    rising = sorted(shapes, key=lambda one: one[1])
    return float(np.mean(burn(rising, grid) != burn(rising[::-1], grid)))  # the greatest value against the least


def _burnt(shapes: list[object], grid: Grid) -> Mask:
    return np.asarray(burn([(shape, 1) for shape in shapes], grid, fill=0) == 1)


def read_boundary(path: Path, grid: Grid, *, notes: Notes) -> Mask:
    """Mark the cells whose centre lies inside the boundary; refuse one that meets no cell of the DEM."""
    frame = read_vector(path, grid, setting="place.boundary")
    areas = frame[frame.geometry.geom_type.isin([*AREAS, "GeometryCollection"])]
    if areas.empty:
        msg = f"place.boundary {path.name} holds no polygon; draw the outline as one"
        raise InputError(msg)
    inside = _burnt(list(areas.geometry), grid)
    beyond = _share_beyond(shapely.union_all(areas.geometry.to_numpy()), grid)
    if not inside.any():
        msg = f"place.boundary {path.name} does not meet the DEM; check the CRS of both"
        if beyond < 1.0:
            msg = f"place.boundary {path.name} is smaller than a cell and holds no cell's centre; draw it larger"
        raise InputError(msg)
    if beyond > LEAST_BEYOND:
        notes.warn("boundary_beyond_dem", f"{100 * beyond:.1f} % of the boundary lies beyond the DEM and is not searched.")
    return inside


def _share_beyond(area: Any, grid: Grid) -> float:
    """Return the share (0 to 1) of an area that lies beyond the DEM."""
    inside = float(area.intersection(shapely.box(*_extent(grid))).area)
    return 1.0 - inside / area.area if inside else 1.0


def _extent(grid: Grid) -> tuple[float, float, float, float]:
    a, _, west, _, e, north = grid.affine
    return (west, north + e * grid.rows, west + a * grid.cols, north)


def read_exclusions(paths: tuple[Path, ...], grid: Grid, *, setback_m: float, notes: Notes) -> Mask:
    """
    Mark the cells in or within `setback_m` (ground metres) of any exclusion.

    Points and lines without a set-back exclude the cells that they touch.
    """
    excluded = np.zeros(grid.shape, dtype=np.bool_)
    for path in paths:
        frame = read_vector(path, grid, setting="place.exclude")
        shapes = _set_back(frame, grid, setback_m)
        marked = _burnt(list(shapes), grid)
        if not marked.any():
            notes.warn("exclusion_elsewhere", f"The exclusion {path.name} touches no cell of the DEM.")
        excluded |= marked
    return excluded


def _set_back(frame: gpd.GeoDataFrame, grid: Grid, setback_m: float) -> gpd.GeoSeries:
    """Buffer in ground metres: in a local equal-distance projection around the DEM's middle."""
    reach = max(setback_m, 0.5 * float(max(grid.cell_width_m.max(), grid.cell_height_m.max())))
    x, y = grid.xy((grid.rows - 1) / 2, (grid.cols - 1) / 2)
    middle = gpd.GeoSeries.from_xy([x], [y], crs=grid.crs).to_crs("EPSG:4326")
    local = CRS.from_proj4(f"+proj=aeqd +lat_0={middle.y[0]} +lon_0={middle.x[0]} +datum=WGS84 +units=m")
    there = frame.geometry.to_crs(local)
    solid = there.geom_type.isin(AREAS).to_numpy()
    distance = np.where(solid, setback_m, reach)
    return gpd.GeoSeries(shapely.buffer(there.to_numpy(), distance), crs=local).to_crs(grid.crs)


def read_given_plots(path: Path, grid: Grid, *, notes: Notes | None = None) -> tuple[npt.NDArray[np.int32], list[str]]:
    """
    Read plots of the user's own: a label for each cell (1, 2, … in file order, else 0) and their names.

    A cell belongs to the plot that covers its centre. Refused: plots that overlap, and plots that cover no cell's centre.
    `notes` are told of plots that the edge of the DEM cuts.
    """
    frame = read_vector(path, grid, setting="plots.given", areas=True)
    names = _names(frame)
    label = burn([(shape, place + 1) for place, shape in enumerate(frame.geometry)], grid, fill=0)
    for place, shape in enumerate(frame.geometry):
        cells = burn([(shape, 1)], grid, fill=0) == 1
        beyond = _share_beyond(shape, grid)
        if beyond == 1.0:
            msg = f"the given plot {names[place]!r} lies beyond the DEM; check the CRS of {path.name}, or give a larger DEM"
            raise InputError(msg)
        if not cells.any():
            msg = f"the given plot {names[place]!r} covers no cell's centre of the DEM; draw it larger or give a finer DEM"
            raise InputError(msg)
        other = label[cells & (label != place + 1)]
        if other.size:
            msg = f"the given plots {names[place]!r} and {names[int(other[0]) - 1]!r} overlap; draw them apart or as one"
            raise InputError(msg)
        if notes is not None and beyond > LEAST_BEYOND:
            text = f"{100 * beyond:.1f} % of the given plot {names[place]!r} lies beyond the DEM and is cut off"
            notes.warn("given_plot_cut", f"{text}; give a larger DEM to judge it whole.")
    return label, names


def _names(frame: gpd.GeoDataFrame) -> list[str]:
    lower = {str(column).lower(): column for column in frame.columns}
    column = next((lower[name] for name in ("given_name", "name", "plot", "id") if name in lower), None)
    texts = [""] * len(frame) if column is None else ["" if pd.isna(value) else str(value) for value in frame[column]]
    return [text or f"given {place + 1}" for place, text in enumerate(texts)]


def read_pan_layer(path: Path, grid: Grid) -> npt.NDArray[np.int8]:
    """Read known pans: 1 where a polygon says keep, -1 where it says it is none, 0 elsewhere."""
    frame = read_vector(path, grid, setting="terrain.pans")
    if "keep" not in frame.columns:
        msg = f"terrain.pans {path.name} lacks the column 'keep' (true or false); add it"
        raise InputError(msg)
    words = {"true": 1, "1": 1, "1.0": 1, "yes": 1, "false": -1, "0": -1, "0.0": -1, "no": -1}
    said = [words.get(str(value).strip().lower()) for value in frame["keep"]]
    if None in said:
        msg = f"terrain.pans {path.name} has keep = {frame['keep'].iloc[said.index(None)]!r}; write true or false"
        raise InputError(msg)
    shapes = [(shape, int(value or 0)) for shape, value in zip(frame.geometry, said, strict=True)]
    return burn(shapes, grid, fill=0).astype(np.int8)


def cells_of_shapes(shapes: list[Any], grid: Grid) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.int64]]:
    """
    Return the flat cells in or under each shape, and the number of the shape (from 0) that each belongs to.

    An area has the cells whose centre it covers; one too small for any, a point or a line has the cell in its middle.
    Shapes off the grid, empty or missing have none.
    """
    cells: list[npt.NDArray[np.int64]] = [np.zeros(0, dtype=np.int64)]
    numbers: list[npt.NDArray[np.int64]] = [np.zeros(0, dtype=np.int64)]
    for number, shape in enumerate(shapes):
        found = np.zeros(0, dtype=np.int64)
        if shape is None or shape.is_empty:
            continue
        if shape.area > 0:
            found = _covered(shape, grid)
        if found.size == 0:
            middle = shape.representative_point()
            row, col = grid.cell(middle.x, middle.y)
            if 0 <= row < grid.rows and 0 <= col < grid.cols:
                found = np.array([row * grid.cols + col], dtype=np.int64)
        cells.append(found)
        numbers.append(np.full(found.size, number, dtype=np.int64))
    return np.concatenate(cells), np.concatenate(numbers)


def _covered(shape: Any, grid: Grid) -> npt.NDArray[np.int64]:
    """Return the flat cells whose centre an area covers, looking no farther than its own extent."""
    a, _, c, _, e, f = grid.affine
    west, south, east, north = shape.bounds
    (top, left), (low, right) = grid.cell(west, north), grid.cell(east, south)
    top, left, low, right = max(top, 0), max(left, 0), min(low, grid.rows - 1), min(right, grid.cols - 1)
    if top > low or left > right:
        return np.zeros(0, dtype=np.int64)
    window = (low - top + 1, right - left + 1)
    inside = rasterize(
        [(shape, 1)], out_shape=window, transform=Affine(a, 0, c + left * a, 0, e, f + top * e), dtype="uint8"
    )
    row, col = np.nonzero(inside)
    return ((row + top) * grid.cols + col + left).astype(np.int64)


def read_villages(path: Path, grid: Grid, *, name: str, people: str | None, notes: Notes | None = None) -> gpd.GeoDataFrame:
    """
    Read villages: any vector file, or a CSV or XLSX table with the columns lon and lat in degrees.

    All their columns are kept as they are. The columns `name` and `people` must exist where they are named. `notes` are
    told of villages outside the DEM, and of numbers of people that are none.
    """
    if path.suffix.lower() in TABLE_ENDINGS:
        frame = _villages_of_table(path, grid)
    else:
        frame = read_vector(path, grid, setting="villages.file")
    for column in (name, people):
        if column is not None and column not in frame.columns:
            known = ", ".join(repr(str(one)) for one in frame.columns if one != frame.geometry.name)
            msg = f"villages.file {path.name} has no column {column!r}; it has {known}"
            raise InputError(msg)
    if notes is not None:
        _note_villages_elsewhere(frame, grid, notes)
        if people is not None:
            _note_wrong_people(frame[people], notes)
    return frame


def _note_villages_elsewhere(frame: gpd.GeoDataFrame, grid: Grid, notes: Notes) -> None:
    west, south, east, north = _extent(grid)
    middles = frame.geometry.representative_point()
    degrees = middles.to_crs("EPSG:4326")
    exchanged = gpd.GeoSeries.from_xy(degrees.y, degrees.x, crs="EPSG:4326").to_crs(grid.crs)
    inside, would = ((one.x.between(west, east) & one.y.between(south, north)).to_numpy() for one in (middles, exchanged))
    outside = int(np.count_nonzero(~inside))
    if outside:
        hint = "check their places, and that lon and lat are not exchanged"
        if (would & ~inside).any():
            hint = "with lon and lat exchanged they would lie inside, so look at their order"
        text = f"{outside} of {len(frame)} villages {'lies' if outside == 1 else 'lie'} outside the DEM"
        notes.warn("villages_elsewhere", f"{text}: {hint}.")


def _note_wrong_people(people: "pd.Series[Any]", notes: Notes) -> None:
    given = people.notna() & (people.astype(str).str.strip() != "")
    wrong = given & ~(pd.to_numeric(people, errors="coerce") >= 0)
    if wrong.any():
        notes.warn(
            "villages_people",
            f"The number of people is none or below 0 in {int(wrong.sum())} of {len(people)} villages, like "
            f"{str(people[wrong].iloc[0])!r}, and counts as unknown: write plain numbers.",
        )


def _villages_of_table(path: Path, grid: Grid) -> gpd.GeoDataFrame:
    try:
        if path.suffix.lower() == ".csv":
            text = path.read_text(encoding="utf-8-sig")
            table = pd.read_csv(io.StringIO(text), sep=separator_of(text), skipinitialspace=True)
        else:
            table = pyogrio.read_dataframe(path, read_geometry=False)
    except (OSError, UnicodeDecodeError, ValueError, pyogrio.errors.DataSourceError) as error:
        msg = f"villages.file {path.name} cannot be read as a table; save it as CSV (UTF-8) with lon and lat"
        raise InputError(msg) from error
    if not {"lon", "lat"} <= set(table.columns):
        msg = f"villages.file {path.name} lacks lon and lat (degrees); it has {', '.join(map(repr, table.columns))}"
        raise InputError(msg)
    lon, lat = (pd.to_numeric(table[axis], errors="coerce") for axis in ("lon", "lat"))
    wrong = ~((lon.abs() <= 180) & (lat.abs() <= 90))
    if wrong.any():
        row = int(np.flatnonzero(wrong.to_numpy())[0])
        msg = f"villages.file {path.name} row {row + 2} has lon {table['lon'][row]}, lat {table['lat'][row]}, which are no "
        msg += "degrees; write decimal degrees (WGS 84) with a point, or give a vector file with its CRS"
        raise InputError(msg)
    points = gpd.points_from_xy(lon, lat)
    return gpd.GeoDataFrame(table, geometry=points, crs="EPSG:4326").to_crs(grid.crs)
