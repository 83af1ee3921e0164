"""Every raster of a run."""

from siting.layers.codes import POSITION_CODES, WHY_NOT
from siting.layers.model import Class, Classes, RasterDefinition

MISSING = -9999.0
"""Nodata of measures in files; inside, missing is NaN."""

NO_CLASS = 255
NO_DIRECTION = 65535
END_OF_FLOW_DEG = 999

_DRY_TO_WET = ("#f9eec4", "#c5c796", "#60a3ae", "#0e74a4", "#03406d")
_LOW_TO_HIGH = ("#2b2622", "#6a5d50", "#a39480", "#d6cab4", "#f8f4ea")


def _ramp(name: str, low: float, high: float, colours: tuple[str, ...]) -> Classes:
    step = (high - low) / (len(colours) - 1)
    stops = ((low + place * step, colour) for place, colour in enumerate(colours))
    return Classes(name, tuple(Class(f"{at:g}", f"{at:g}", colour) for at, colour in stops), by_size=True)


def _stops(name: str, values: tuple[str, ...], colours: tuple[str, ...]) -> Classes:
    return Classes(name, tuple(Class(at, at, colour) for at, colour in zip(values, colours, strict=True)), by_size=True)


_DIRECTION_COLOURS = ("#03406d", "#0e74a4", "#60a3ae", "#c5c796", "#f9eec4", "#e8af53", "#b5893b", "#754c19", "#2b2622")
_DIRECTION_LABELS = (
    ("0", "north"),
    ("45", "north-east"),
    ("90", "east"),
    ("135", "south-east"),
    ("180", "south"),
    ("225", "south-west"),
    ("270", "west"),
    ("315", "north-west"),
    (str(END_OF_FLOW_DEG), "end of flow"),
)
_DIRECTIONS = Classes(
    "flow_direction_deg",
    tuple(Class(value, label, colour) for (value, label), colour in zip(_DIRECTION_LABELS, _DIRECTION_COLOURS, strict=True)),
)


def _measure(name: str, unit: str, title: str, description: str, style: Classes) -> RasterDefinition:
    return RasterDefinition(name, unit, "float32", MISSING, "average", title, description, style, True)


RASTERS = (
    _measure(
        "elevation_conditioned_m",
        "m",
        "Conditioned elevation",
        "elevation with small depressions filled, so that water runs on",
        _ramp("elevation", 0, 3000, _LOW_TO_HIGH),
    ),
    _measure(
        "slope_pct", "%", "Slope", "slope of the ground", _stops("slope", ("0", "2", "5", "10", "20"), _LOW_TO_HIGH[::-1])
    ),
    RasterDefinition(
        "flow_direction_deg",
        "deg",
        "uint16",
        NO_DIRECTION,
        "mode",
        "Flow direction",
        "azimuth to which the cell drains: 0 north, 45 north-east and so on to 315; 999 end of flow",
        _DIRECTIONS,
        False,
    ),
    RasterDefinition(
        "contributing_area_m2",
        "m2",
        "float32",
        MISSING,
        "max",
        "Contributing area",
        "ground area that drains through the cell, the cell included",
        _stops("contributing_area", ("100", "1000", "10000", "100000", "1000000"), _DRY_TO_WET),
        True,
    ),
    _measure(
        "wetness_index",
        "1",
        "Wetness index",
        "ln(contributing area per unit width / tangent of slope)",
        _ramp("wetness", 4, 16, _DRY_TO_WET),
    ),
    _measure(
        "height_above_channel_m",
        "m",
        "Height above the channel",
        "height over the first channel cell on the way down",
        _stops("height_above_channel", ("0", "1", "2", "5", "20"), _DRY_TO_WET[::-1]),
    ),
    RasterDefinition(
        "position",
        "",
        "uint8",
        NO_CLASS,
        "mode",
        "Landscape position",
        "1 summit, 2 shoulder, 3 backslope, 4 footslope, 5 toeslope",
        POSITION_CODES,
        False,
    ),
    _measure(
        "curve_number",
        "1",
        "Curve number",
        "SCS curve number, average moisture",
        _ramp("curve_number", 50, 100, _DRY_TO_WET),
    ),
    _measure(
        "runoff_median_mm",
        "mm",
        "Runoff, median year",
        "runoff of the cell over a year, reached in half of the years",
        _stops("runoff", ("0", "10", "25", "50", "100"), _DRY_TO_WET),
    ),
    RasterDefinition(
        "why_not",
        "",
        "uint8",
        NO_CLASS,
        "mode",
        "Why not",
        "; ".join(f"{item.value} {item.label}" for item in WHY_NOT.items),
        WHY_NOT,
        False,
    ),
)
"""All rasters, in order."""


def raster(name: str) -> RasterDefinition:
    """Return the raster of that name; raises KeyError for any other."""
    for item in RASTERS:
        if item.name == name:
            return item
    raise KeyError(name)
