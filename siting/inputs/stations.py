"""Where rain stations lie, and which of them is nearest to each cell along the ground."""

from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path

import numpy as np
import numpy.typing as npt
from pyproj import CRS, Transformer

from siting.errors import InputError
from siting.grid import Grid
from siting.inputs.daily_csv import read_table

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]

SETTING = "rain.stations"
WGS84_A_M, WGS84_E2 = 6_378_137.0, 0.0066943799901413165
"""Semi-major axis and squared eccentricity of the WGS 84 ellipsoid."""

BLOCK = 64
"""Cells on a side of the blocks that are asked at their corners first."""


@dataclass(frozen=True, slots=True, eq=False)
class Stations:
    """Rain stations by name, with longitude and latitude in degrees (WGS 84)."""

    name: tuple[str, ...]
    lon: FloatArray
    lat: FloatArray


def read_stations(path: Path, grid: Grid) -> Stations:
    """
    Read where rain stations lie.

    The CSV has a column `station` and either `lon` and `lat` (degrees) or `x` and `y` (in the CRS of `grid`).

    Raises
    ------
    InputError
        Where a column is missing, a station stands twice or has no name, or a place is none.
    """
    table = read_table(path, setting=SETTING)
    columns = {str(column).strip().lower(): str(column) for column in table.columns}
    axes = next((pair for pair in (("lon", "lat"), ("x", "y")) if set(pair) <= set(columns)), None)
    if "station" not in columns or axes is None:
        listed = ", ".join(map(repr, columns))
        msg = f"{SETTING} {path.name} needs the columns station, lon, lat (degrees) or station, x, y; it has {listed}"
        raise InputError(msg)
    names = tuple(table[columns["station"]].str.strip())
    for name in names:
        if not name or names.count(name) > 1:
            msg = (
                f"{SETTING} {path.name} has the station {name!r} {'without a name' if not name else 'twice'}; mend that row"
            )
            raise InputError(msg)
    first, second = (np.array([_degrees_or_metres(text) for text in table[columns[axis]]]) for axis in axes)
    if axes == ("x", "y"):
        first, second = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True).transform(first, second)
    wrong = np.flatnonzero(~((np.abs(first) <= 180) & (np.abs(second) <= 90)))
    if wrong.size:
        row = table.iloc[int(wrong[0])]
        at = ", ".join(f"{axis} {row[columns[axis]]!r}" for axis in axes)
        msg = f"{SETTING} {path.name} places {names[int(wrong[0])]!r} at {at}, which is no place; correct it"
        raise InputError(msg)
    return Stations(names, np.asarray(first, dtype=np.float64), np.asarray(second, dtype=np.float64))


def _degrees_or_metres(text: str) -> float:
    """Read a coordinate; NaN where it is none. A longitude of -99 is no mark of a missing value."""
    try:
        return float(text.strip().replace(",", "."))
    except ValueError:
        return np.nan


def nearest_station(grid: Grid, stations: Stations) -> npt.NDArray[np.int16]:
    """
    Tell for each cell which station is nearest to its centre along the ground; the first of equals.

    Blocks whose four corners agree are taken whole: ground nearest to one station has no hollows.
    """
    nearest = _nearest_of(grid, stations)
    rows, cols = (_edges(count) for count in grid.shape)
    corners = nearest(rows.ravel(), cols.ravel()).reshape(rows.shape[0], 2, cols.shape[0], 2)
    found = np.empty(grid.shape, dtype=np.int16)
    for i, (top, bottom) in enumerate(rows):
        for j, (left, right) in enumerate(cols):
            here = np.s_[top : bottom + 1, left : right + 1]
            at = corners[i, :, j, :]
            alike = bool(np.all(at == at[0, 0]))
            found[here] = at[0, 0] if alike else nearest(np.arange(top, bottom + 1), np.arange(left, right + 1))
    return found


def _edges(count: int) -> Integers:
    """Return the first and the last row (or column) of each block."""
    starts = np.append(np.arange(0, count, BLOCK), count)
    return np.array([(start, stop - 1) for start, stop in pairwise(starts)], dtype=np.int64)


def _nearest_of(grid: Grid, stations: Stations) -> Callable[[Integers, Integers], Integers]:
    """Return a function from rows and columns to the nearest station of each of their cells."""
    to_degrees = Transformer.from_crs(CRS.from_user_input(grid.crs).to_2d(), "EPSG:4326", always_xy=True)
    there = _from_the_centre_m(stations.lon, stations.lat)
    a, _, c, _, e, f = grid.affine

    def nearest(rows: Integers, cols: Integers) -> Integers:
        y, x = np.meshgrid(e * (rows + 0.5) + f, a * (cols + 0.5) + c, indexing="ij")
        cells = _from_the_centre_m(*to_degrees.transform(x, y))
        best = np.zeros(x.shape, dtype=np.int64)
        least = np.full(x.shape, np.inf)
        for place, station in enumerate(there):
            chord = ((cells - station) ** 2).sum(axis=-1)
            nearer = chord < least
            best[nearer], least[nearer] = place, chord[nearer]
        return best

    return nearest


def _from_the_centre_m(lon: FloatArray, lat: FloatArray) -> FloatArray:
    """Return places on the ellipsoid in earth-centred metres, (..., 3): their chords rank as ground distances do."""
    east, north = np.radians(lon), np.radians(lat)
    radius = WGS84_A_M / np.sqrt(1.0 - WGS84_E2 * np.sin(north) ** 2)
    x, y = radius * np.cos(north) * np.cos(east), radius * np.cos(north) * np.sin(east)
    return np.stack([x, y, radius * (1.0 - WGS84_E2) * np.sin(north)], axis=-1)
