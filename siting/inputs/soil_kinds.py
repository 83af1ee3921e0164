"""From what is known of a soil to its water, its intake and its hydrologic group, each with its source."""

import math
from dataclasses import dataclass

from siting.demand import total_evaporable_water_mm
from siting.errors import ConfigError
from siting.notes import Notes
from siting.tables import nearest_printed_rew_mm, soil, soil_group, soil_water, texture_class
from siting.tables.soils import DRY_COUNTRY_ORGANIC_MATTER_PCT, Soil, SoilWater

UNKNOWN = "not known"
AS_GIVEN = "as given"
DEEP_CM = 200.0
"""Stands for a layer or water table deeper than the handbook asks about (100 cm)."""
UM_S_PER_MM_H = 1.0 / 3.6
SHALLOW_LAYER_CM, HIGH_WATER_CM = 50.0, 60.0
"""A layer or water table less deep makes any soil group D; NEH-630 chapter 7, table 7-1."""
BY_TEXTURE = "TR-55 (1986) appendix A, by texture"
BY_DEPTH = "NEH-630 chapter 7, table 7-1, by depth"
BY_CONDUCTIVITY = "NEH-630 chapter 7, table 7-1, by conductivity and depth"

MOST_LISTED = 12
"""Kinds of soil that are listed one by one."""


@dataclass(frozen=True, slots=True)
class SoilFacts:
    """
    What is known of one soil; None where it is not.

    Particle sizes and organic matter in % by weight. `depth_m` is what roots can use, `restrictive_depth_m` the depth to
    rock or a layer that holds water up: fissured rock stops roots and not water, so neither stands for the other.
    """

    texture: str | None = None
    sand_pct: float | None = None
    clay_pct: float | None = None
    organic_matter_pct: float | None = None
    soil_group: str | None = None
    ksat_mm_h: float | None = None
    depth_m: float | None = None
    restrictive_depth_m: float | None = None
    water_table_m: float | None = None


@dataclass(frozen=True, slots=True)
class OwnSoil:
    """Values of the user's own, which hold for every soil; None where not given."""

    field_capacity: float | None = None
    wilting_point: float | None = None
    infiltration_mm_h: float | None = None


@dataclass(frozen=True, slots=True)
class SoilKind:
    """
    One kind of soil: water contents in m3/m3, depths in mm or m, rates in mm/h; NaN and None where unknown.

    `rew_mm` and `tew_mm` are what the top 0.1 m evaporates readily and in all. `soil_group` may be a dual one ("A/D"),
    which counts as its second letter.
    """

    name: str
    texture: str | None
    field_capacity: float
    wilting_point: float
    infiltration_mm_h: float
    rew_mm: float
    tew_mm: float
    soil_group: str | None
    depth_m: float
    water_source: str
    infiltration_source: str
    rew_source: str
    group_source: str


def soil_kind(facts: SoilFacts, own: OwnSoil) -> SoilKind:
    """
    Build a kind of soil.

    Texture class from particle sizes where they are given. Water: own values, else Saxton & Rawls (2006) from particle
    sizes, else FAO-56 table 19 by texture. Intake: own, else measured conductivity, else the FAO manual by texture, else
    Saxton & Rawls. Group: as given, else by measured conductivity and depths, else by texture (D above a shallow layer or
    water table), else by estimated conductivity and depths; depths that are not given count as deep.

    Raises
    ------
    ConfigError
        Where a texture is unknown or particle sizes are impossible.
    """
    row, water, name = _class_and_water(facts)
    capacity, wilting, water_source = _water(row, water, own)
    rate, rate_source = _intake(facts, row, water, own)
    tew = float(total_evaporable_water_mm(field_capacity=capacity, wilting_point=wilting))
    rew, rew_source = _rew(row, tew)
    group, group_source = _group(facts, row, water)
    return SoilKind(
        name,
        None if row is None else row.texture,
        capacity,
        wilting,
        rate,
        rew,
        tew,
        group,
        math.nan if facts.depth_m is None else facts.depth_m,
        water_source,
        rate_source,
        rew_source,
        group_source,
    )


def _class_and_water(facts: SoilFacts) -> tuple[Soil | None, SoilWater | None, str]:
    """Return the texture class, soil water by particle sizes where they allow it, and a name."""
    if facts.sand_pct is None or facts.clay_pct is None:
        row = None if facts.texture is None else soil(facts.texture)
        return row, None, "soil" if row is None else row.texture
    row = soil(texture_class(facts.sand_pct, 100.0 - facts.sand_pct - facts.clay_pct, facts.clay_pct))
    organic = facts.organic_matter_pct
    name = f"{row.texture} (sand {facts.sand_pct:g} %, clay {facts.clay_pct:g} %)"
    try:
        organic = DRY_COUNTRY_ORGANIC_MATTER_PCT if organic is None else organic
        return row, soil_water(facts.sand_pct, facts.clay_pct, organic), name
    except ConfigError:  # beyond the fit: the class has values in print
        return row, None, name


def _water(row: Soil | None, water: SoilWater | None, own: OwnSoil) -> tuple[float, float, str]:
    if own.field_capacity is not None and own.wilting_point is not None:
        return own.field_capacity, own.wilting_point, AS_GIVEN
    if water is not None:
        return water.field_capacity, water.wilting_point, "Saxton & Rawls (2006) from sand, clay and organic matter"
    if row is not None:
        return row.field_capacity, row.wilting_point, row.water_source
    return math.nan, math.nan, UNKNOWN


def _intake(facts: SoilFacts, row: Soil | None, water: SoilWater | None, own: OwnSoil) -> tuple[float, str]:
    if own.infiltration_mm_h is not None:
        return own.infiltration_mm_h, AS_GIVEN
    if facts.ksat_mm_h is not None:
        return facts.ksat_mm_h, "the conductivity given"
    if row is None:
        return math.nan, UNKNOWN
    printed = row.infiltration_source.startswith("FAO")
    if water is not None and not printed:
        return water.ksat_mm_h, "Saxton & Rawls (2006) from sand, clay and organic matter"
    return row.infiltration_mm_h, row.infiltration_source


def _rew(row: Soil | None, tew_mm: float) -> tuple[float, str]:
    if math.isnan(tew_mm):
        return math.nan, UNKNOWN
    if row is not None and row.rew_mm is not None:
        return min(row.rew_mm, tew_mm), "FAO-56 (1998) Table 19, at most the water that can evaporate"
    return nearest_printed_rew_mm(tew_mm), "assumption: as the texture of FAO-56 Table 19 that is nearest in TEW"


def _group(facts: SoilFacts, row: Soil | None, water: SoilWater | None) -> tuple[str | None, str]:
    """Return the hydrologic soil group and its source."""
    layer_cm = DEEP_CM if facts.restrictive_depth_m is None else 100.0 * facts.restrictive_depth_m
    water_cm = DEEP_CM if facts.water_table_m is None else 100.0 * facts.water_table_m
    if facts.soil_group is not None:
        return facts.soil_group, AS_GIVEN
    ksat, source = facts.ksat_mm_h, BY_CONDUCTIVITY
    if ksat is None:
        if row is None:
            return None, UNKNOWN
        if layer_cm < SHALLOW_LAYER_CM or water_cm < HIGH_WATER_CM:
            return "D", BY_DEPTH
        if row.soil_group is not None:
            return row.soil_group, BY_TEXTURE
        ksat = row.infiltration_mm_h if water is None else water.ksat_mm_h
        source = f"{BY_CONDUCTIVITY} estimated by Saxton & Rawls (2006): no group by this texture in print"
    group = soil_group(layer_depth_cm=layer_cm, water_table_cm=water_cm, ksat_um_s=ksat * UM_S_PER_MM_H)
    return group, source


def note_kinds(kinds: list[SoilKind], notes: Notes) -> None:
    """List what each kind of soil stands for and where it comes from; many kinds in one line for each value."""
    for quantity, unit, source, effect, value in (
        ("water", "m3/m3", "water_source", "water that the soil can hold for the crop", _held),
        ("rew", "mm", "rew_source", "water lost from bare soil between crops", lambda kind: f"{kind.rew_mm:.3g}"),
        (
            "infiltration",
            "mm/h",
            "infiltration_source",
            "how much of a large flow the plot can take",
            lambda kind: f"{kind.infiltration_mm_h:.3g}",
        ),
        ("group", "", "group_source", "curve numbers, and with them all runoff", lambda kind: kind.soil_group),
    ):
        told = [kind for kind in kinds if getattr(kind, source) not in (AS_GIVEN, UNKNOWN)]
        if len(told) > MOST_LISTED:
            sources = "; ".join(sorted({str(getattr(kind, source)) for kind in told}))
            notes.assume(f"soil.{quantity}", f"{len(told)} kinds of soil", "", sources, effect)
            continue
        for kind in told:
            notes.assume(f"soil.{quantity} of {kind.name}", value(kind), unit, getattr(kind, source), effect)


def _held(kind: SoilKind) -> str:
    return f"{kind.wilting_point:.3f} to {kind.field_capacity:.3f}"
