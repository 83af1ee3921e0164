"""A soil map as a list of soils: its columns, or those of the table that goes with it, understood or refused."""

from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

from siting.errors import CapacityError, ConfigError, InputError
from siting.grid import Grid
from siting.inputs.maps import is_raster, plain_text, read_map, read_meanings, tell_covered, tell_overlap
from siting.inputs.soil_kinds import SoilFacts
from siting.inputs.vectors import NO_VALUE, burn, read_vector
from siting.notes import Notes

Row = dict[str, str]

GROUPS = ("A", "B", "C", "D", "A/D", "B/D", "C/D")
DEPTHS = ("depth_m", "restrictive_depth_m", "water_table_m")
NUMBERS = ("sand_pct", "silt_pct", "clay_pct", "organic_matter_pct", "ksat_mm_h", *DEPTHS)
SLACK_PCT = 0.5
"""What rounded particle sizes may lack of 100 %."""
MOST_KINDS = 32_767
DEEPEST_M = 20.0
"""A soil deeper than this is told in another unit (assumption)."""


def read_soil_facts(
    path: Path, grid: Grid, *, column: str | None, depth_column: str | None, table: Path | None, notes: Notes
) -> tuple[npt.NDArray[np.int16], list[SoilFacts]]:
    """
    Read a soil map: the place of each cell's facts in a list of those that differ, -1 where unknown.

    Parameters
    ----------
    path
        Polygons, or a raster that goes with a table.
    column, depth_column
        Columns of textures and of depths, m, under names of their own.
    table
        CSV with map_value and the columns of a map in polygons.

    Raises
    ------
    InputError, ConfigError, CapacityError
        Where file, table or column cannot be used, a value is impossible, or there are too many kinds of soil.
    """
    if is_raster(path):
        code, rows = _raster_rows(path, table, grid, notes)
        shapes: list[tuple[Any, int]] = []
    else:
        shapes, rows = _polygon_rows(path, table, grid)
        code = burn(shapes, grid)
    what = f"soil.map {path.name}" if table is None else f"soil.table {table.name}"
    facts = [_facts(row, what) for row in _soil_columns(rows, column, depth_column, what)]
    different = {one: place for place, one in enumerate(dict.fromkeys(one for one in facts if one is not None))}
    if len(different) > MOST_KINDS:
        msg = f"{what} holds {len(different)} kinds of soil: at most {MOST_KINDS}; round their values"
        raise CapacityError(msg)
    places = [NO_VALUE if one is None else different[one] for one in facts]
    tell_overlap(path, [(shape, places[row]) for shape, row in shapes], grid, setting="soil.map", notes=notes)
    found = np.array([*places, NO_VALUE], dtype=np.int16)[code]
    tell_covered(path, float(np.mean(found >= 0)), setting="soil.map", notes=notes)
    return found, list(different)


def _raster_rows(path: Path, table: Path | None, grid: Grid, notes: Notes) -> tuple[npt.NDArray[np.int32], list[Row]]:
    if table is None:
        msg = f"soil.map {path.name} holds map values; say what they mean in soil.table, a CSV with map_value and texture, "
        msg += "or map_value, sand_pct and clay_pct"
        raise ConfigError(msg)
    meanings = read_meanings(table, needed=(), setting="soil.table")
    found = read_map(path, grid, column=None, setting="soil.map", notes=notes)
    for value in found.values:
        if value not in meanings:
            msg = f"soil.map {path.name} has the value {value}, which soil.table {table.name} does not explain; add its row"
            raise ConfigError(msg)
    rows = [meanings[value] for value in found.values]
    return found.code, rows


def _polygon_rows(path: Path, table: Path | None, grid: Grid) -> tuple[list[tuple[Any, int]], list[Row]]:
    """Return the shapes, each with the place of its row, and the rows."""
    if table is not None:
        msg = f"soil.table goes with a raster, and soil.map {path.name} holds polygons; name a column in soil.column instead"
        raise ConfigError(msg)
    frame = read_vector(path, grid, setting="soil.map", areas=True)
    records = frame.drop(columns=frame.geometry.name).to_dict("records")
    rows = [{str(name): plain_text(cell) for name, cell in record.items()} for record in records]
    shapes = [(shape, place) for place, shape in enumerate(frame.geometry) if shape is not None and not shape.is_empty]
    return shapes, rows


def _soil_columns(rows: list[Row], column: str | None, depth_column: str | None, what: str) -> list[Row]:
    """Keep the columns that tell of soil, under our names: a named column of textures stands before particle sizes."""
    known = {name.lower(): name for name in rows[0]}
    columns = {name: known[name] for name in (*NUMBERS, "soil_group", "texture") if name in known}
    for ours, theirs in (("texture", column), ("depth_m", depth_column)):
        if theirs is not None:
            if theirs not in rows[0]:
                setting = "soil.column" if ours == "texture" else "soil.depth_column"
                msg = f"{setting} is {theirs!r}, which {what} does not have; it has {', '.join(map(repr, rows[0]))}"
                raise InputError(msg)
            columns[ours] = theirs
    sizes = {"sand_pct", "clay_pct"} <= set(columns)
    if not sizes and not {"texture", "soil_group", "ksat_mm_h"} & set(columns):
        msg = f"{what} tells no soil: it needs a column of textures (of polygons named in soil.column), or sand_pct and "
        msg += f"clay_pct; it has {', '.join(map(repr, rows[0]))}"
        raise InputError(msg)
    dropped = ("sand_pct", "silt_pct", "clay_pct") if column is not None or not sizes else ()
    return [{name: row[theirs] for name, theirs in columns.items() if name not in dropped} for row in rows]


def _facts(row: Row, what: str) -> SoilFacts | None:
    """Read one row of a map or table, None where it tells no soil. Particle sizes stand before a texture class."""
    number = {name: _number(row.get(name, ""), name, what) for name in NUMBERS}
    sand, silt, clay = (number[f"{part}_pct"] for part in ("sand", "silt", "clay"))
    if (sand is None) != (clay is None):
        msg = f"{what} has sand_pct without clay_pct, or the other way round, in a row; give both or neither"
        raise InputError(msg)
    if sand is not None and clay is not None and sand + clay > 100.0:
        msg = f"{what} has sand of {sand:g} % and clay of {clay:g} %, which together exceed 100 %; correct them"
        raise InputError(msg)
    if sand is not None and clay is not None and silt is not None and abs(sand + silt + clay - 100.0) > SLACK_PCT:
        msg = f"{what} has sand, silt and clay of {sand:g}, {silt:g} and {clay:g} %; they must sum to 100"
        raise InputError(msg)
    if (number["depth_m"] or 0.0) > DEEPEST_M:
        msg = f"{what} has a soil depth of {number['depth_m']:g} m; it must be 0 to {DEEPEST_M:g}, give metres"
        raise InputError(msg)
    group = row.get("soil_group", "").upper() or None
    if group is not None and group not in GROUPS:
        msg = f"{what} has the soil group {group!r}; the groups are {', '.join(GROUPS)}"
        raise InputError(msg)
    texture = row.get("texture") or None
    if sand is not None:
        texture = None
    if texture is None and sand is None and group is None and number["ksat_mm_h"] is None:
        return None
    return SoilFacts(
        texture, sand, clay, number["organic_matter_pct"], group, number["ksat_mm_h"], *(number[d] for d in DEPTHS)
    )


def _number(text: str, name: str, what: str) -> float | None:
    if not text:
        return None
    try:
        value = float(text)
    except ValueError:
        value = np.nan
    if not np.isfinite(value) or value < 0:
        msg = f"{what} has {name} = {text!r}; write a number of at least 0 with a point, or leave it empty"
        raise InputError(msg)
    return value
