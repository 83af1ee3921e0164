"""The soil of each cell: uniform, or by map with textures, particle sizes, depths and groups."""

from collections.abc import Sequence
from dataclasses import dataclass, fields, replace
from pathlib import Path

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError, InputError
from siting.grid import Grid
from siting.inputs.maps import raster_bands, tell_covered
from siting.inputs.soil_kinds import OwnSoil, SoilFacts, SoilKind, note_kinds, soil_kind
from siting.inputs.soil_rows import DEEPEST_M, read_soil_facts
from siting.notes import Notes
from siting.tables.soils import DRY_COUNTRY_ORGANIC_MATTER_PCT

FloatArray = npt.NDArray[np.float64]
Depths = npt.NDArray[np.float32]

GROUP_CODES = {"A": 1, "B": 2, "C": 3, "D": 4}
GROUP_EFFECT = "curve numbers, and with them all runoff"
SHALLOW_M = 0.5
"""A layer that holds water up, less deep than this, makes any soil group D; NEH-630 chapter 7, table 7-1."""


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
    soil_group, ksat_mm_h, restrictive_depth_m, water_table_m and depth_m (or the column named in `given.depth_column`).
    What is given as one value wins.

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
    facts = [_over(row, given) for row in rows]
    kinds = tuple(_kind(one, own, given) for one in facts)
    present = _present(code, len(kinds))
    note_kinds([kinds[place] for place in present], notes)
    if given.field_capacity is None and any(_lacks_organic_matter(facts[place]) for place in present):
        source, effect = "common practice: bare dryland soil", "water that the soil can hold"
        notes.assume("soil.organic_matter_pct", f"{DRY_COUNTRY_ORGANIC_MATTER_PCT:g}", "%", source, effect)
    depth = _depth(given, code, kinds, grid, notes)
    _note_depths([facts[place] for place in present], depth, notes)
    return SoilMap(code, kinds, depth, _groups(kinds, code, notes))


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


def _lacks_organic_matter(facts: SoilFacts) -> bool:
    """Tell whether water is estimated from particle sizes with an organic matter that nobody gave."""
    return facts.sand_pct is not None and facts.organic_matter_pct is None


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


def _groups(kinds: Sequence[SoilKind], code: npt.NDArray[np.int16], notes: Notes) -> npt.NDArray[np.uint8]:
    """Return the soil group of each cell; a dual one counts as its second letter, which is said."""
    groups = [kind.soil_group for kind in kinds]
    dual = sorted({group for group in groups if group and "/" in group})
    if dual:
        counted = ", ".join(f"{group} as {group[-1]}" for group in dual)
        notes.assume("soil.dual_groups", counted, "", "NEH-630 chapter 7: ground that is not drained", GROUP_EFFECT)
    codes = np.array([*(GROUP_CODES[group[-1]] if group else 0 for group in groups), 0], dtype=np.uint8)
    return np.broadcast_to(codes[0], code.shape) if code.strides == (0, 0) else codes[code]


def _note_depths(facts: Sequence[SoilFacts], depth_m: Depths, notes: Notes) -> None:
    """Say what stands for depths that decide soil groups and were not given."""
    open_groups = [one for one in facts if one.soil_group is None]
    measured = [one for one in open_groups if one.ksat_mm_h is not None]
    for name in ("restrictive_depth_m", "water_table_m"):
        if any(getattr(one, name) is None for one in measured):
            notes.assume(f"soil.{name}", "deeper than 1", "m", "assumption where not given", GROUP_EFFECT)
    if not any(one.restrictive_depth_m is None for one in open_groups):
        return
    shallow = float(np.mean(depth_m < SHALLOW_M))
    if shallow:
        notes.warn(
            "shallow_soil_group",
            f"On {100 * shallow:.1f} % of the cells the soil is less than {SHALLOW_M:g} m deep, which soil groups do not "
            "heed: where what lies below holds water up, the group is D; say so in soil.restrictive_depth_m.",
        )
