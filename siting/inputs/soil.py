"""The soil of each cell: uniform, or by map with textures, particle sizes, depths and groups."""

from collections.abc import Sequence
from dataclasses import dataclass, fields, replace
from pathlib import Path

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError, InputError
from siting.grid import Grid
from siting.inputs.maps import BAND_ROWS, raster_bands, tell_covered
from siting.inputs.soil_kinds import DEEP_CM, OwnSoil, SoilFacts, SoilKind, note_kinds, soil_kind
from siting.inputs.soil_rows import DEEPEST_M, read_soil_facts
from siting.notes import Notes
from siting.tables.soils import DRY_COUNTRY_ORGANIC_MATTER_PCT

FloatArray = npt.NDArray[np.float64]
Depths = npt.NDArray[np.float32]

GROUP_CODES = {"A": 1, "B": 2, "C": 3, "D": 4}
LAYER_LIMITS_CM = (50.0, 100.0)
"""Depths of a layer at which the handbook changes tables; 100 itself belongs to the middle (table 7-1)."""
DEPTH_CLASSES_CM = (25.0, 75.0, DEEP_CM)
"""A depth that stands for each class: all depths of a class have one group."""


@dataclass(frozen=True, slots=True)
class SoilInputs:
    """What is given of the soil, named as the settings of [soil]; None where not given."""

    texture: str | None = None
    sand_pct: float | None = None
    clay_pct: float | None = None
    organic_matter_pct: float | None = None
    map: Path | None = None
    column: str | None = None
    table: Path | None = None
    depth_m: float | None = None
    depth_column: str | None = None
    depth_map: Path | None = None
    soil_group: str | None = None
    ksat_mm_h: float | None = None
    restrictive_depth_m: float | None = None
    water_table_m: float | None = None
    field_capacity: float | None = None
    wilting_point: float | None = None
    infiltration_mm_h: float | None = None


@dataclass(frozen=True, slots=True, eq=False)
class SoilMap:
    """
    The soil of each cell, all of the grid's shape.

    `code` is the place of its kind in `kinds`, -1 where unknown; `depth_m` is NaN where unknown; `soil_group` is 1 to 4
    for A to D, 0 where unknown. What is alike everywhere takes the memory of one value.
    """

    code: npt.NDArray[np.int16]
    kinds: tuple[SoilKind, ...]
    depth_m: npt.NDArray[np.float32]
    soil_group: npt.NDArray[np.uint8]

    def values(self, name: str) -> FloatArray:
        """Return a number of every kind, with NaN at the end, so that it can be indexed by code: -1 is unknown."""
        return np.array([*(getattr(kind, name) for kind in self.kinds), np.nan], dtype=np.float64)


def read_soil(given: SoilInputs, grid: Grid, *, notes: Notes) -> SoilMap:
    """
    Bring what is given of the soil onto the grid.

    One kind of soil everywhere without `given.map`. A map in polygons has a column of textures named in `given.column`,
    or the columns sand_pct and clay_pct (silt_pct, organic_matter_pct); a raster has a table with them. Either may carry
    soil_group, ksat_mm_h and depth_m (or the column named in `given.depth_column`). What is given as one value wins.

    Raises
    ------
    InputError, ConfigError
        Where a file or column cannot be used, or a value is unknown or impossible.
    """
    code, rows = _everywhere(0, grid), [SoilFacts()]
    if given.map is not None:
        code, rows = read_soil_facts(
            given.map, grid, column=given.column, depth_column=given.depth_column, table=given.table, notes=notes
        )
    own = OwnSoil(given.field_capacity, given.wilting_point, given.infiltration_mm_h)
    kinds = tuple(_kind(_over(facts, given), own, given) for facts in rows)
    present = _present(code, len(kinds))
    note_kinds([kinds[place] for place in present], notes)
    if any(_estimates(rows[place], given) for place in present):
        source, effect = "common practice: bare dryland soil", "water that the soil can hold"
        notes.assume("soil.organic_matter_pct", f"{DRY_COUNTRY_ORGANIC_MATTER_PCT:g}", "%", source, effect)
    depth = _depth(given, code, kinds, grid, notes)
    return SoilMap(code, kinds, depth, _groups(given, code, kinds, depth, notes))


def _everywhere(value: int, grid: Grid) -> npt.NDArray[np.int16]:
    """Give one value to all cells; it takes the memory of one."""
    return np.broadcast_to(np.int16(value), grid.shape)


def _present(code: npt.NDArray[np.int16], kinds: int) -> list[int]:
    """Return the kinds that occur."""
    seen = np.zeros(kinds + 1, dtype=np.bool_)
    for row in code:
        seen[row] = True
    return [place for place in range(kinds) if seen[place]]


def _over(facts: SoilFacts, given: SoilInputs) -> SoilFacts:
    """Lay what is given as one value over what the map says."""
    uniform = {each.name: getattr(given, each.name) for each in fields(SoilFacts)}
    return replace(facts, **{name: value for name, value in uniform.items() if value is not None})


def _kind(facts: SoilFacts, own: OwnSoil, given: SoilInputs) -> SoilKind:
    try:
        return soil_kind(facts, own)
    except ConfigError as error:
        if given.map is None:
            raise
        msg = f"soil.map {given.map.name}: {error}"
        raise InputError(msg) from error


def _estimates(facts: SoilFacts, given: SoilInputs) -> bool:
    """Tell whether water is estimated from particle sizes with an organic matter that nobody gave."""
    known = _over(facts, given)
    return known.sand_pct is not None and known.organic_matter_pct is None and given.field_capacity is None


def _depth(given: SoilInputs, code: npt.NDArray[np.int16], kinds: Sequence[SoilKind], grid: Grid, notes: Notes) -> Depths:
    """Return the depth of soil of each cell, m: as given, by its own map, else by the kind of soil."""
    if given.depth_map is not None:
        return _depth_by_map(given.depth_map, grid, notes)
    of_kind = np.array([*(kind.depth_m for kind in kinds), np.nan], dtype=np.float32)
    if given.depth_m is not None or given.map is None or np.isnan(of_kind).all():
        return np.broadcast_to(of_kind[0], grid.shape)
    return np.asarray(of_kind[code])


def _depth_by_map(path: Path, grid: Grid, notes: Notes) -> Depths:
    depth = np.empty(grid.shape, dtype=np.float32)
    known = 0
    for band, values in raster_bands(path, grid, setting="soil.depth_map"):
        wrong = values[(values < 0) | (values > DEEPEST_M)]
        if wrong.size:
            msg = f"soil.depth_map {path.name} has a depth of {wrong[0]:g}; it must be 0 to {DEEPEST_M:g} m, "
            msg += "so convert it to metres, or declare its nodata"
            raise InputError(msg)
        depth[band] = values
        known += int(np.count_nonzero(~np.isnan(values)))
    tell_covered(path, known / depth.size, setting="soil.depth_map", notes=notes)
    return depth


def _groups(
    given: SoilInputs, code: npt.NDArray[np.int16], kinds: Sequence[SoilKind], depth_m: Depths, notes: Notes
) -> npt.NDArray[np.uint8]:
    """Return the soil group of each cell, by its kind and by the class of depth of the layer below."""
    water_cm = DEEP_CM if given.water_table_m is None else 100.0 * given.water_table_m
    letters = [
        [kind.group_at(layer_depth_cm=layer_cm, water_table_cm=water_cm) for layer_cm in DEPTH_CLASSES_CM] for kind in kinds
    ]
    _note_groups(given, kinds, letters, depth_m, notes)
    codes = [[0 if letter is None else GROUP_CODES[letter.split("/")[-1]] for letter in row] for row in letters]
    table = np.array([*codes, [0, 0, 0]], dtype=np.uint8)
    layer_m = depth_m if given.restrictive_depth_m is None else np.float32(given.restrictive_depth_m)
    if given.map is None and given.depth_map is None:
        return np.broadcast_to(table[0, _depth_class(layer_m).flat[0]], code.shape)
    groups = np.empty(code.shape, dtype=np.uint8)
    layer = np.broadcast_to(layer_m, code.shape)
    for row in range(0, code.shape[0], BAND_ROWS):
        band = slice(row, row + BAND_ROWS)
        groups[band] = table[code[band], _depth_class(layer[band])]
    return groups


def _depth_class(layer_m: npt.ArrayLike) -> npt.NDArray[np.int64]:
    """Return the class of the depth of a layer, 0 to 2; an unknown depth counts as deep."""
    layer_cm = 100.0 * np.nan_to_num(np.asarray(layer_m, dtype=np.float64), nan=DEEP_CM / 100.0)
    shallow, deep = LAYER_LIMITS_CM
    return np.asarray((layer_cm >= shallow).astype(np.int64) + (layer_cm > deep))


def _note_groups(
    given: SoilInputs, kinds: Sequence[SoilKind], letters: list[list[str | None]], depth_m: Depths, notes: Notes
) -> None:
    """Say what stands for depths that were not given, and what dual groups count as."""
    effect = "curve numbers, and with them all runoff"
    by_depth = any(kind.ksat_mm_h is not None and not kind.group_given for kind in kinds)
    if given.water_table_m is None and by_depth:
        notes.assume("soil.water_table_m", "deeper than 1", "m", "assumption: dry country", effect)
    if given.restrictive_depth_m is None and any(len(set(row)) > 1 for row in letters):
        if not np.isnan(depth_m).all():
            source = "common practice: what stops roots stops water; where unknown, deeper than 1 m"
            notes.assume("soil.restrictive_depth_m", "the depth of the soil", "m", source, effect)
        elif by_depth:
            notes.assume("soil.restrictive_depth_m", "deeper than 1", "m", "assumption", effect)
    dual = sorted({letter for row in letters for letter in row if letter and "/" in letter})
    if dual:
        counted = ", ".join(f"{letter} as {letter[-1]}" for letter in dual)
        notes.assume("soil.dual_groups", counted, "", "NEH-630 chapter 7: ground that is not drained", effect)
