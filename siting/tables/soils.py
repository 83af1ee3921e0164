"""Soils: texture classes, water, infiltration and hydrologic groups, with their sources."""

import math
from dataclasses import dataclass
from functools import cache

from siting.errors import ConfigError
from siting.tables._rows import Row, nearest, number, rows

TEXTURES = tuple(row["texture_class"] for row in rows("soils"))
"""Texture classes in the order of their codes."""

MOST_CLAY_PCT = 60.0
"""Soils with more clay were left out of the fit of Saxton & Rawls (from memory)."""

DRY_COUNTRY_ORGANIC_MATTER_PCT = 0.5
"""Organic matter of bare dryland soil, % (common practice); used where a class has no FAO-56 row."""

_FAO_SOURCE = "middle of the range of FAO-56 (1998) Table 19"
_SAXTON_SOURCE = "Saxton & Rawls (2006) from the class's typical sand and clay, 0.5 % organic matter"


@dataclass(frozen=True, slots=True)
class SoilWater:
    """Water contents in m3/m3, saturated conductivity in mm/h, density in g/cm3."""

    wilting_point: float
    field_capacity: float
    saturation: float
    ksat_mm_h: float
    density_g_cm3: float


@dataclass(frozen=True, slots=True)
class Soil:
    """One texture class: m3/m3, mm per m, mm, A to D (None where not in print), mm/h."""

    texture: str
    field_capacity: float
    wilting_point: float
    rew_mm: float | None
    tew_mm: float | None
    soil_group: str | None
    infiltration_mm_h: float
    water_source: str
    infiltration_source: str
    source: str
    confidence: str

    @property
    def available_mm_per_m(self) -> float:
        """Available water in mm for each metre of depth."""
        return 1000.0 * (self.field_capacity - self.wilting_point)


def soil_water(sand_pct: float, clay_pct: float, organic_matter_pct: float) -> SoilWater:
    """
    Estimate soil water from sand, clay and organic matter, each in % by weight.

    Raises
    ------
    ConfigError
        Where the shares are impossible, organic matter is above 8 % or clay above 60 %, and where the equations give
        no possible soil (almost pure sand without organic matter).

    References
    ----------
    Saxton & Rawls (2006), Soil Sci. Soc. Am. J. 70:1569, table 1.
    """
    _check_fractions(sand_pct, 100.0 - sand_pct - clay_pct, clay_pct)
    if not 0.0 <= organic_matter_pct <= 8.0:
        msg = f"organic matter is {organic_matter_pct} %; the equations hold from 0 to 8 %"
        raise ConfigError(msg)
    if clay_pct > MOST_CLAY_PCT:
        msg = f"clay is {clay_pct} %; the equations of soil water hold to {MOST_CLAY_PCT:g} %"
        raise ConfigError(msg)
    sand, clay, om = sand_pct / 100.0, clay_pct / 100.0, organic_matter_pct

    def first(quantity: str) -> float:
        row = next(row for row in rows("saxton_rawls_coefficients") if row["quantity"] == quantity)
        terms = {
            "sand": sand,
            "clay": clay,
            "organic_matter_pct": om,
            "sand_x_om": sand * om,
            "clay_x_om": clay * om,
            "sand_x_clay": sand * clay,
            "constant": 1.0,
        }
        return sum(float(row[name]) * value for name, value in terms.items())

    wilting = first("theta_1500_first")
    wilting += 0.14 * wilting - 0.02
    x = first("theta_33_first")
    capacity = x + (1.283 * x * x - 0.374 * x - 0.015)
    x = first("theta_sat_minus_33_first")
    above = x + (0.636 * x - 0.107)
    saturation = capacity + above - 0.097 * sand + 0.043
    if not 0.0 < wilting < capacity < saturation:
        msg = f"sand {sand_pct}, clay {clay_pct}, organic matter {organic_matter_pct} % give no possible soil water by the "
        msg += "equations; give soil.field_capacity and soil.wilting_point"
        raise ConfigError(msg)
    slope = (math.log(1500.0) - math.log(33.0)) / (math.log(capacity) - math.log(wilting))
    ksat = 1930.0 * (saturation - capacity) ** (3.0 - 1.0 / slope)
    return SoilWater(wilting, capacity, saturation, ksat, 2.65 * (1.0 - saturation))


def _check_fractions(sand_pct: float, silt_pct: float, clay_pct: float) -> None:
    parts = (sand_pct, silt_pct, clay_pct)
    if not all(0.0 <= part <= 100.0 for part in parts) or abs(sum(parts) - 100.0) > 0.5:
        msg = f"sand, silt and clay are {sand_pct}, {silt_pct}, {clay_pct} %; they must sum to 100"
        raise ConfigError(msg)


def texture_class(sand_pct: float, silt_pct: float, clay_pct: float) -> str:
    """
    Name the texture class of a soil from its particle sizes, % by weight.

    Sizes that sum to 99.5 to 100.5 are scaled to 100; others, and NaN, are refused with ConfigError.

    References
    ----------
    USDA Soil Survey Manual, chapter 3; Benham et al. (2009).
    """
    _check_fractions(sand_pct, silt_pct, clay_pct)
    # the classes leave no gap only where the three sum to 100
    total = sand_pct + silt_pct + clay_pct
    sand, silt, clay = (100.0 * part / total for part in (sand_pct, silt_pct, clay_pct))
    tests = (
        ("sand", silt + 1.5 * clay < 15),
        ("loamy sand", silt + 2 * clay < 30),
        ("sandy loam", (7 <= clay < 20 and sand > 52) or (clay < 7 and silt < 50)),
        ("loam", 7 <= clay < 27 and 28 <= silt < 50 and sand <= 52),
        ("silt", silt >= 80 and clay < 12),
        ("silt loam", silt >= 50 and clay < 27),
        ("sandy clay loam", 20 <= clay < 35 and silt < 28 and sand > 45),
        ("clay loam", 27 <= clay < 40 and 20 < sand <= 45),
        ("silty clay loam", 27 <= clay < 40 and sand <= 20),
        ("sandy clay", clay >= 35 and sand > 45),
        ("silty clay", clay >= 40 and silt >= 40),
    )
    return next((name for name, holds in tests if holds), "clay")


@cache
def soils() -> tuple[Soil, ...]:
    """Return every texture class, in the order of TEXTURES."""
    return tuple(_soil(row) for row in rows("soils"))


def _soil(row: Row) -> Soil:
    estimate = soil_water(float(row["sand_pct"]), float(row["clay_pct"]), DRY_COUNTRY_ORGANIC_MATTER_PCT)
    low, high = number(row["fc_min"]), number(row["fc_max"])
    dry_low, dry_high = number(row["wp_min"]), number(row["wp_max"])
    printed = None not in (low, high, dry_low, dry_high)
    rate = number(row["infiltration_mm_h"])
    return Soil(
        row["texture_class"],
        ((low or 0.0) + (high or 0.0)) / 2 if printed else estimate.field_capacity,
        ((dry_low or 0.0) + (dry_high or 0.0)) / 2 if printed else estimate.wilting_point,
        _middle(row, "rew"),
        _middle(row, "tew"),
        row["hsg_by_texture"] or None,
        estimate.ksat_mm_h if rate is None else rate,
        _FAO_SOURCE if printed else _SAXTON_SOURCE,
        _SAXTON_SOURCE if rate is None else "FAO AGL/MISC/17/91 section 2.3.7",
        row["source"],
        row["confidence"],
    )


def _middle(row: Row, name: str) -> float | None:
    low, high = number(row[f"{name}_min_mm"]), number(row[f"{name}_max_mm"])
    return None if low is None or high is None else (low + high) / 2


def soil(texture: str) -> Soil:
    """Look up a texture class; raises ConfigError with the nearest names."""
    wanted = " ".join(texture.strip().lower().replace("_", " ").split())
    for row in soils():
        if row.texture == wanted:
            return row
    msg = f"texture {texture!r} is unknown; did you mean {nearest(wanted, list(TEXTURES))}? "
    msg += "`siting soils` lists all"
    raise ConfigError(msg)


def nearest_printed_rew_mm(tew_mm: float) -> float:
    """
    Return the readily evaporable water of the texture of FAO-56 table 19 whose evaporable water is nearest, mm.

    For soils without a printed value (assumption); at most `tew_mm`. NaN stays NaN.
    """
    if math.isnan(tew_mm):
        return math.nan
    printed = [(row.tew_mm, row.rew_mm) for row in soils() if row.tew_mm is not None and row.rew_mm is not None]
    return min(tew_mm, min(printed, key=lambda pair: abs(pair[0] - tew_mm))[1])


def soil_group(*, layer_depth_cm: float, water_table_cm: float, ksat_um_s: float) -> str:
    """
    Assign the hydrologic soil group, also dual ("A/D").

    Parameters
    ----------
    layer_depth_cm, water_table_cm
        Depth to a layer that holds water up, and to the seasonal high water table.
    ksat_um_s
        Least saturated conductivity over the depth that the table asks for, micrometres a second.

    References
    ----------
    NEH-630 chapter 7, table 7-1 (January 2009).
    """
    for name, value in (
        ("depth to a layer", layer_depth_cm),
        ("depth to water", water_table_cm),
        ("conductivity", ksat_um_s),
    ):
        if not value >= 0:
            msg = f"the {name} is {value}; it must be a number of at least 0"
            raise ConfigError(msg)
    layer = "< 50" if layer_depth_cm < 50 else "50-100" if layer_depth_cm <= 100 else "> 100"
    for row in rows("hsg_criteria"):
        if row["impermeable_layer_depth_cm"] != layer:
            continue
        above, most = number(row["ksat_above_um_s"]), number(row["ksat_at_most_um_s"])
        if not _holds(row["water_table_depth_cm"], water_table_cm):
            continue
        if (above is None or ksat_um_s > above) and (most is None or ksat_um_s <= most):
            return row["hydrologic_soil_group"]
    msg = "no soil group for these depths"  # the table covers every case: this is our mistake
    raise AssertionError(msg)


def _holds(limits: str, value: float) -> bool:
    """Tell whether a depth lies in a printed range such as "< 60", ">= 60", "60-100", "any"."""
    if limits == "any":
        return True
    if limits.startswith(">="):
        return value >= float(limits[2:])
    if limits.startswith("<"):
        return value < float(limits[1:])
    if limits.startswith(">"):
        return value > float(limits[1:])
    low, high = limits.split("-")
    return float(low) <= value <= float(high)
