"""From a project's settings to the values of its place: every input read, nothing computed."""

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import numpy.typing as npt
from pyproj import Transformer

from siting import inputs
from siting.config import Project
from siting.demand.weather import Climate
from siting.errors import ConfigError
from siting.grid import Grid, Raster
from siting.inputs import SoilMap
from siting.notes import Notes
from siting.runoff import CoverClass, RainField, RainGenerator, curve_numbers
from siting.runoff.cover import note_low_curve_numbers


@dataclass(frozen=True, slots=True, eq=False)
class Place:
    """Everything read, on the DEM's grid; None where it was not given."""

    dem: Raster
    inside: npt.NDArray[np.bool_] | None
    excluded: npt.NDArray[np.bool_] | None
    pan_layer: npt.NDArray[np.int8] | None
    flow_direction: npt.NDArray[np.uint8] | None
    soil: SoilMap
    curve_number: npt.NDArray[np.float32]
    runs_after_mm: npt.NDArray[np.float32]
    given_label: npt.NDArray[np.int32] | None
    given_names: list[str]
    rain: RainField | None
    climate: Climate | None
    villages: gpd.GeoDataFrame | None

    @property
    def middle_lonlat(self) -> tuple[float, float]:
        """Return longitude and latitude (WGS 84, degrees) of the middle of the DEM."""
        grid = self.dem.grid
        x, y = grid.xy((grid.rows - 1) / 2, (grid.cols - 1) / 2)
        lon, lat = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True).transform(x, y)
        return float(lon), float(lat)


def read_place(project: Project, notes: Notes) -> Place:
    """Read every input of a project; what is wrong raises, what is assumed or partial is noted."""
    settings = project.settings
    dem = inputs.read_dem(
        settings.place.dem,
        band=settings.place.dem_band,
        crs=settings.place.crs,
        elevation_unit=settings.place.elevation_unit,
        notes=notes,
    )
    grid, outline = dem.grid, settings.place
    soil = inputs.read_soil(inputs.SoilInputs(**settings.soil.model_dump(exclude={"crusted"})), grid, notes=notes)
    number, runs_after = _curve_number(settings, grid, soil.soil_group, notes)
    label: npt.NDArray[np.int32] | None = None
    names: list[str] = []
    if settings.plots.given is not None:
        label, names = inputs.read_given_plots(settings.plots.given, grid, notes=notes)
    villages = settings.villages
    return Place(
        dem,
        None if outline.boundary is None else inputs.read_boundary(outline.boundary, grid, notes=notes),
        inputs.read_exclusions(outline.exclude, grid, setback_m=outline.setback_m, notes=notes) if outline.exclude else None,
        None if settings.terrain.pans is None else inputs.read_pan_layer(settings.terrain.pans, grid),
        None
        if settings.terrain.flow_direction is None
        else inputs.read_flow_direction(settings.terrain.flow_direction, grid),
        soil,
        number,
        runs_after,
        label,
        names,
        None if settings.rain.daily is None else _rain(settings.rain.daily, settings.rain, grid, notes),
        None if settings.climate.daily is None else inputs.read_climate(settings.climate.daily),
        None
        if villages.file is None
        else inputs.read_villages(villages.file, grid, name=villages.name, people=villages.people, notes=notes),
    )


def _everywhere(value: Any, grid: Grid) -> npt.NDArray[Any]:
    """Give one value to all cells; it takes the memory of one."""
    return np.broadcast_to(value, grid.shape)


def _rain(daily: Path, settings: Any, grid: Grid, notes: Notes) -> RainField:
    """Read the record, of one gauge or of several, and which of it falls where."""
    stations = None if settings.stations is None else inputs.read_stations(settings.stations, grid)
    generator = RainGenerator(settings.wet_day_mm, settings.seed) if settings.generator else None
    names = None if stations is None else stations.name
    record = inputs.read_rain_stations(daily, names, unit=settings.unit, generator=generator, notes=notes)
    return inputs.read_rain_zones(record, grid, stations=stations, rain_map=settings.map, notes=notes)


def _meanings(table: Path | None, needed: tuple[str, ...], setting: str, of: Path) -> dict[str, dict[str, str]]:
    if table is None:
        msg = f"{of.name} holds map values; say what they mean in {setting}, a CSV with map_value, {', '.join(needed)}"
        raise ConfigError(msg)
    return inputs.read_meanings(table, needed=needed, setting=setting)


def _meaning(meanings: dict[str, dict[str, str]], value: str, of: Path, table: Path) -> dict[str, str]:
    if value not in meanings:
        msg = f"cover.map {of.name} has the value {value}, which cover.table {table.name} does not explain; add its row"
        raise ConfigError(msg)
    return meanings[value]


def _curve_number(
    settings: Any, grid: Grid, group: npt.NDArray[np.uint8], notes: Notes
) -> tuple[npt.NDArray[np.float32], npt.NDArray[np.float32]]:
    """Return each cell's curve number and observed threshold, mm; NaN where unknown."""
    cover = settings.cover
    runs_after = _everywhere(np.float32(np.nan if cover.runs_after_mm is None else cover.runs_after_mm), grid)
    if isinstance(cover.curve_number, Path):
        own = inputs.read_raster_on_grid(cover.curve_number, grid, setting="cover.curve_number")
        note_low_curve_numbers(own, notes)
        return own.astype(np.float32), runs_after
    if cover.curve_number is not None:
        note_low_curve_numbers(np.array([cover.curve_number]), notes)
        return _everywhere(np.float32(cover.curve_number), grid), runs_after
    index, classes = _covers(cover, grid, notes)
    if not classes:
        return _everywhere(np.float32(np.nan), grid), runs_after
    number, seen = curve_numbers(index, classes, group, crusted=settings.soil.crusted, notes=notes)
    return number, np.where(np.isnan(runs_after), seen, runs_after).astype(np.float32)


def _covers(cover: Any, grid: Grid, notes: Notes) -> tuple[npt.NDArray[np.int32], list[CoverClass]]:
    if cover.map is None:
        if cover.cover is None:
            return _everywhere(np.int32(-1), grid), []
        return _everywhere(np.int32(0), grid), [CoverClass(cover.cover, cover.condition, cover.treatment)]
    found = inputs.read_map(cover.map, grid, column=cover.column, setting="cover.map", notes=notes)
    meanings = _meanings(cover.table, ("cover", "condition"), "cover.table", cover.map)
    rows = [_meaning(meanings, value, cover.map, cover.table) for value in found.values]
    return found.code, [_cover_class(row) for row in rows]


def _cover_class(row: dict[str, str]) -> CoverClass:
    """Read one row of a cover table; `treatment`, `curve_number` and `runs_after_mm` are optional columns."""
    values: dict[str, float] = {}
    for name in ("curve_number", "runs_after_mm"):
        text = row.get(name, "")
        if text:
            try:
                values[name] = float(text)
            except ValueError as error:
                msg = f"cover.table has {name} = {text!r} for map value {row['map_value']}; write a number"
                raise ConfigError(msg) from error
    return CoverClass(row["cover"], row["condition"] or None, row.get("treatment") or None, **values)
