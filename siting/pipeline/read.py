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
from siting.notes import Notes
from siting.runoff import CoverClass, Rain, curve_numbers
from siting.tables import TEXTURES, soil

UNKNOWN_TEXTURE = -1
GROUP_CODES = {"A": 1, "B": 2, "C": 3, "D": 4}


@dataclass(frozen=True, slots=True, eq=False)
class Place:
    """Everything read, on the DEM's grid; None where it was not given."""

    dem: Raster
    inside: npt.NDArray[np.bool_] | None
    excluded: npt.NDArray[np.bool_] | None
    pan_layer: npt.NDArray[np.int8] | None
    texture: npt.NDArray[np.int8]
    soil_group: npt.NDArray[np.uint8]
    curve_number: npt.NDArray[np.float32]
    runs_after_mm: npt.NDArray[np.float32]
    given_label: npt.NDArray[np.int32] | None
    given_names: list[str]
    rain: Rain | None
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
    texture = _texture(settings.soil, grid, notes)
    group = _soil_group(settings.soil, texture)
    number, runs_after = _curve_number(settings, grid, group, notes)
    label, names = (None, []) if settings.plots.given is None else inputs.read_given_plots(settings.plots.given, grid)
    villages = settings.villages
    return Place(
        dem,
        None if outline.boundary is None else inputs.read_boundary(outline.boundary, grid, notes=notes),
        inputs.read_exclusions(outline.exclude, grid, setback_m=outline.setback_m, notes=notes) if outline.exclude else None,
        None if settings.terrain.pans is None else inputs.read_pan_layer(settings.terrain.pans, grid),
        texture,
        group,
        number,
        runs_after,
        label,
        names,
        None if settings.rain.daily is None else inputs.read_rain(settings.rain.daily, unit=settings.rain.unit, notes=notes),
        None if settings.climate.daily is None else inputs.read_climate(settings.climate.daily),
        None
        if villages.file is None
        else inputs.read_villages(villages.file, grid, name=villages.name, people=villages.people),
    )


def _everywhere(value: Any, grid: Grid) -> npt.NDArray[Any]:
    """Give one value to all cells; it takes the memory of one."""
    return np.broadcast_to(value, grid.shape)


def _texture(settings: Any, grid: Grid, notes: Notes) -> npt.NDArray[np.int8]:
    """Return the texture class of each cell as its place in TEXTURES, -1 where unknown."""
    if settings.map is None:
        code = UNKNOWN_TEXTURE if settings.texture is None else TEXTURES.index(soil(settings.texture).texture)
        return _everywhere(np.int8(code), grid)
    found = inputs.read_map(settings.map, grid, column=settings.column, setting="soil.map", notes=notes)
    names = found.values
    if inputs.is_raster(settings.map):
        meanings = _meanings(settings.table, ("texture",), "soil.table", settings.map)
        names = tuple(_meaning(meanings, value, "soil.table")["texture"] for value in found.values)
    codes = [TEXTURES.index(soil(name).texture) for name in names]
    return np.array([*codes, UNKNOWN_TEXTURE], dtype=np.int8)[found.code]


def _meanings(table: Path | None, needed: tuple[str, ...], setting: str, of: Path) -> dict[str, dict[str, str]]:
    if table is None:
        msg = f"{of.name} holds map values; say what they mean in {setting}, a CSV with map_value, {', '.join(needed)}"
        raise ConfigError(msg)
    return inputs.read_meanings(table, needed=needed, setting=setting)


def _meaning(meanings: dict[str, dict[str, str]], value: str, setting: str) -> dict[str, str]:
    if value not in meanings:
        msg = f"the map has the value {value}, which {setting} does not explain; add a row for it"
        raise ConfigError(msg)
    return meanings[value]


def _soil_group(settings: Any, texture: npt.NDArray[np.int8]) -> npt.NDArray[np.uint8]:
    """Return the soil group of each cell: as given, else by texture; 0 where unknown."""
    if settings.soil_group is not None:
        letter = settings.soil_group.split("/")[-1]
        return np.broadcast_to(np.uint8(GROUP_CODES[letter]), texture.shape)
    codes = np.zeros(len(TEXTURES) + 1, dtype=np.uint8)
    for place in np.unique(texture[texture >= 0]):
        group = soil(TEXTURES[place]).soil_group
        if group is None:
            msg = f"texture {TEXTURES[place]!r} has no hydrologic soil group in print; give it in soil.soil_group"
            raise ConfigError(msg)
        codes[place] = GROUP_CODES[group]
    return codes[texture]


def _curve_number(
    settings: Any, grid: Grid, group: npt.NDArray[np.uint8], notes: Notes
) -> tuple[npt.NDArray[np.float32], npt.NDArray[np.float32]]:
    """Return each cell's curve number and observed threshold, mm; NaN where unknown."""
    cover = settings.cover
    runs_after = _everywhere(np.float32(np.nan if cover.runs_after_mm is None else cover.runs_after_mm), grid)
    if isinstance(cover.curve_number, Path):
        own = inputs.read_raster_on_grid(cover.curve_number, grid, setting="cover.curve_number")
        return own.astype(np.float32), runs_after
    if cover.curve_number is not None:
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
    rows = [_meaning(meanings, value, "cover.table") for value in found.values]
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
