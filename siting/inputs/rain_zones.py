"""Rain in space: the station that each cell takes its rain from, and the factor that a rain map lays on it."""

from pathlib import Path

import numpy as np
import numpy.typing as npt
import rasterio
from pyproj import Geod, Transformer
from rasterio.errors import RasterioError

from siting.errors import InputError
from siting.grid import Grid
from siting.inputs.maps import BAND_ROWS, raster_bands, tell_covered
from siting.inputs.stations import Stations, nearest_station
from siting.notes import Notes
from siting.runoff.rain import StationRain, mean_annual_mm
from siting.runoff.zones import FACTOR_STEP, LARGE_FACTOR, NO_ZONE, SMALL_FACTOR, RainField, RainZones, factor_steps

FloatArray = npt.NDArray[np.float64]
Codes = npt.NDArray[np.int16]

SETTING = "rain.map"
MOST_FACTOR = 10.0
"""Ground with this many times its gauge's rain means another unit (assumption)."""
FAR_KM = 100.0
"""A station farther away than this is marked: its rain is hardly that of the place (assumption)."""

UNKNOWN_STEP, NO_RAIN_STEP, LEAST_STEP = -300, -201, -200
"""Steps of cells without a value, of those without rain, and the least of all others."""
STEPS = 1000
"""More steps than there are, so that station and step can be written as one number."""


def read_rain_zones(
    record: StationRain, grid: Grid, *, stations: Stations | None, rain_map: Path | None, notes: Notes
) -> RainField:
    """
    Divide the ground into zones of rain.

    Parameters
    ----------
    record
        Daily rain of the stations, in their order.
    stations
        Where they lie; each cell takes the rain of the nearest. None for a single gauge somewhere.
    rain_map
        Raster of mean annual rain, mm. The factor of a cell is its value over that at its station, or over the record's
        own mean where the station's place is not known or the map holds nothing there; told in steps of 5 %.

    Returns
    -------
    RainField
        Zones in rising order of station and factor; cells without a value of the map are in none.

    Raises
    ------
    InputError
        Where the map cannot be read, does not meet the DEM or cannot be in mm; where the record has no mean year.
    """
    if len(record.station) > 1 if stations is None else stations.name != record.station:
        msg = f"rain of the stations {', '.join(record.station)} needs a place for each, in that order"
        raise InputError(msg)
    several = stations is not None and len(stations.name) > 1
    station = nearest_station(grid, stations) if stations is not None and several else _everywhere(0, grid)
    used = [int(place) for place in np.unique(station)]
    if stations is not None:
        _note_stations(stations, station, used, grid, notes)
    if rain_map is None:
        zone = np.searchsorted(used, station).astype(np.int16) if len(used) > 1 else _everywhere(0, grid)
        return RainField(zone, RainZones(np.arange(len(used)), np.ones(len(used))), record.take(used))
    reference = np.full(len(record.station), np.nan)
    for place in used:
        reference[place] = _reference_mm(rain_map, record, place, stations, notes)
    return _zoned(_steps(rain_map, grid, station, reference, notes), station, record)


def _everywhere(value: int, grid: Grid) -> Codes:
    """Give one value to all cells; it takes the memory of one."""
    return np.broadcast_to(np.int16(value), grid.shape)


def _note_stations(stations: Stations, station: Codes, used: list[int], grid: Grid, notes: Notes) -> None:
    """Say how much ground takes its rain from each station, and which of them lie far away."""
    if len(stations.name) > 1:
        cells = {place: int(np.count_nonzero(station == place)) for place in used}
        shares = ", ".join(f"{stations.name[place]} {100 * count / station.size:.1f} %" for place, count in cells.items())
        effect = "rain, and with it all water"
        notes.assume("rain.stations", shares, "of the cells", "each cell takes the rain of the nearest station", effect)
    middle = grid.xy((grid.rows - 1) / 2, (grid.cols - 1) / 2)
    lon, lat = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True).transform(*middle)
    for place in used:
        away_km = Geod(ellps="WGS84").inv(lon, lat, stations.lon[place], stations.lat[place])[2] / 1000.0
        if away_km > FAR_KM:
            text = f"The rain station {stations.name[place]!r} lies {away_km:.0f} km from the middle of the DEM"
            notes.warn("rain_station_far", f"{text}: check its place.")


def _reference_mm(rain_map: Path, record: StationRain, place: int, stations: Stations | None, notes: Notes) -> float:
    """Return the mean annual rain that stands for the record of a station, mm, and say where it comes from."""
    name = record.station[place]
    value, source = np.nan, f"{SETTING} at the station"
    if stations is not None:
        value = _value_at(rain_map, float(stations.lon[place]), float(stations.lat[place]))
    if not value > 0:
        why = "the station's place is not given" if stations is None else f"{SETTING} holds none at the station"
        value, source = mean_annual_mm(record.of(place)), f"mean year of the record: {why}"
    if not value > 0:
        msg = f"rain.daily has a mean year of {value:g} mm at {name!r}, so {SETTING} cannot scale it; give a longer record"
        raise InputError(msg)
    notes.assume(f"{SETTING}_reference of {name}", f"{value:.0f}", "mm", source, "rain of every cell, and with it all water")
    return value


def _value_at(rain_map: Path, lon: float, lat: float) -> float:
    """Return the value of the map under a place in degrees; NaN where it holds none."""
    try:
        with rasterio.open(rain_map) as file:
            if file.crs is None:
                return np.nan  # refused in words where the map is laid on the grid
            x, y = Transformer.from_crs("EPSG:4326", file.crs, always_xy=True).transform(lon, lat)
            value = next(file.sample([(x, y)], indexes=1, masked=True))[0]
            inside = file.bounds.left <= x <= file.bounds.right and file.bounds.bottom <= y <= file.bounds.top
            known = inside and not np.ma.is_masked(value) and np.isfinite(value)
            return float(value) * float(file.scales[0]) + float(file.offsets[0]) if known else np.nan
    except RasterioError as error:
        msg = f"{SETTING} {rain_map.name} cannot be read as a raster; check that it exists and is whole"
        raise InputError(msg) from error


def _steps(rain_map: Path, grid: Grid, station: Codes, reference_mm: FloatArray, notes: Notes) -> Codes:
    """Return each cell's factor in steps of 5 %; tell how much ground the map leaves out, and how far it scales."""
    step = np.empty(grid.shape, dtype=np.int16)
    known, beyond, least, most = 0, 0, np.inf, 0.0
    for band, annual in raster_bands(rain_map, grid, setting=SETTING):
        factor = annual / reference_mm[station[band]]
        _refuse_impossible(rain_map, annual, factor)
        step[band] = _step_of(factor)
        held = factor[~np.isnan(factor)]
        known += held.size
        beyond += int(np.count_nonzero((held < SMALL_FACTOR) | (held > LARGE_FACTOR)))
        least, most = min(least, held.min(initial=np.inf)), max(most, held.max(initial=0.0))
    tell_covered(rain_map, known / step.size, setting=SETTING, notes=notes)
    if beyond:
        notes.warn(
            "rain_factor",
            f"{SETTING} scales the record by {least:.2f} to {most:.2f}; on {100 * beyond / step.size:.1f} % of the cells "
            f"beyond {SMALL_FACTOR:g} to {LARGE_FACTOR:g}: wetter places have more rains, not only larger ones.",
        )
    return step


def _refuse_impossible(rain_map: Path, annual: FloatArray, factor: FloatArray) -> None:
    known = annual[~np.isnan(annual)]
    if known.min(initial=0.0) < 0:
        msg = (
            f"{SETTING} {rain_map.name} has a mean annual rain of {known.min():g} mm; if that means nodata, declare it with "
        )
        msg += f"`gdal_edit.py -a_nodata {known.min():g} {rain_map.name}`"
        raise InputError(msg)
    times = factor[~np.isnan(factor)].max(initial=0.0)
    if times > MOST_FACTOR:
        msg = f"{SETTING} {rain_map.name} has {known.max():g}, {times:.3g} times the rain at its station; "
        msg += "give mean annual rain in mm, and declare nodata"
        raise InputError(msg)


def _step_of(factor: FloatArray) -> Codes:
    """Return factors in steps; none and unknown have codes of their own."""
    step = np.where(np.isnan(factor), UNKNOWN_STEP, NO_RAIN_STEP).astype(np.int16)
    positive = factor > 0
    step[positive] = np.maximum(factor_steps(factor[positive]), LEAST_STEP)
    return step


def _zoned(step: Codes, station: Codes, record: StationRain) -> RainField:
    """Give numbers to the pairs of station and step that occur; cells of an unknown step are in no zone."""
    bands = [slice(row, row + BAND_ROWS) for row in range(0, step.shape[0], BAND_ROWS)]
    pairs = np.zeros(0, dtype=np.int64)
    for band in bands:
        pairs = np.union1d(pairs, _pairs(station[band], step[band]))
    pairs = pairs[pairs != NO_ZONE]
    zone = np.full(step.shape, NO_ZONE, dtype=np.int16)
    for band in bands:
        pair = _pairs(station[band], step[band])
        known = pair != NO_ZONE
        zone[band][known] = np.searchsorted(pairs, pair[known])
    of_zone, step_of_zone = pairs // STEPS, pairs % STEPS + UNKNOWN_STEP
    factor = np.where(step_of_zone == NO_RAIN_STEP, 0.0, FACTOR_STEP ** step_of_zone.astype(np.float64))
    used = np.unique(of_zone)
    return RainField(zone, RainZones(np.searchsorted(used, of_zone), factor), record.take(used.tolist()))


def _pairs(station: Codes, step: Codes) -> npt.NDArray[np.int64]:
    """Write station and step as one number; NO_ZONE where the step is unknown."""
    pair = station.astype(np.int64) * STEPS + step - UNKNOWN_STEP
    return np.where(step == UNKNOWN_STEP, NO_ZONE, pair)
