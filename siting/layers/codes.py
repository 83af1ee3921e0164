"""
Class lists: codes, labels, colours and sentences.

Colours run in order of lightness, from sand to deep blue, so they stay apart in grey print and to colour-blind eyes;
no two classes differ by red against green alone.
"""

from siting.layers.model import Class, Classes

UNKNOWN = Class("", "unknown", "#ffffff", "not known from the data given", hatch=True)

POSITIONS = Classes(
    "position",
    (
        Class("summit", "summit", "#f9eec4", "level ground at the top of a slope"),
        Class("shoulder", "shoulder", "#c5c796", "where a slope begins to fall, rounded outward"),
        Class("backslope", "backslope", "#60a3ae", "the steep middle of a slope"),
        Class("footslope", "footslope", "#0e74a4", "the lower part of a slope, where it flattens"),
        Class("toeslope", "toeslope", "#03406d", "nearly level ground at the foot of a slope", hatch=True),
    ),
    unknown=UNKNOWN,
)

POSITION_CODES = Classes(
    "position_code",
    tuple(
        Class(str(code), item.label, item.colour, item.sentence, item.hatch)
        for code, item in enumerate(POSITIONS.items, start=1)
    ),
)

WHY_NOT = Classes(
    "why_not",
    (
        Class("0", "can be cropped", "#043259", "every test is passed"),
        Class("1", "no data", "#f8f6f2", "no height is known here"),
        Class("2", "outside the boundary", "#e7e5e1", "outside the boundary given"),
        Class("3", "excluded", "#a5a39f", "inside an area to leave out, or in its set-back"),
        Class("4", "channel strip", "#8fcfee", "on a drainage line or too close to it"),
        Class("5", "pan", "#3184c3", "in the deepest part of a closed depression"),
        Class("6", "too steep", "#754c19", "steeper than the limit"),
        Class("7", "not low", "#e8d79b", "neither a slope foot nor low above a channel"),
        Class("8", "soil too shallow", "#b5893b", "the soil is shallower than the limit"),
        Class("9", "too little ground above", "#e8af53", "too little ground drains to this place"),
        Class("10", "too much water above", "#463572", "so much ground drains here that floods are to be feared"),
        Class("11", "patch too small", "#cfa2d0", "the patch of cells that passed is smaller than the least plot"),
        Class("12", "left over", "#146caa", "passed every test, but left over when patches were divided into plots"),
    ),
)

CAUTIONS = Classes(
    "caution",
    (
        Class("open_catchment", "open catchment", "", "ground beyond the data drains here: its area is a lower bound"),
        Class("short_record", "short rain record", "", "the rain record is too short for dependable years"),
        Class("rain_trend", "rain has changed", "", "the last 15 years differ from the whole record by more than 10 %"),
        Class("coarse_cells", "coarse cells", "", "coarse cells: this is a zone to search in, not a plot"),
        Class("marginal_slope", "marginal slope", "", "the slope is nearer to its limit than the error of the heights"),
        Class("channel_in_plot", "channel in the plot", "", "a drainage line crosses the plot"),
        Class("doubtful_pan", "doubtful pan", "", "a depression above may be real and hold water back"),
        Class("outside_boundary", "outside the boundary", "", "part of the catchment lies outside the boundary"),
        Class("large_catchment", "large catchment", "", "one gauge and one storm do not cover a catchment of this size"),
        Class("flood", "flood", "", "a flood peak is expected that an earth bank may not stand"),
        Class("standing_water", "standing water", "", "water would stand long enough to harm the crop"),
        Class("steep_drop", "steep drop", "", "the ground falls much across the plot: levelling in steps is needed"),
        Class("no_exclusions", "nothing excluded", "", "no layer of roads, houses or fields was given: none was left out"),
        Class("no_runon_in_dry_year", "no run-on in a dry year", "", "in the dependable dry year no run-on arrives"),
        Class("takes_from_below", "takes from below", "", "this plot takes water that a plot or village below now receives"),
    ),
)

SUPPLY_CLASSES = Classes(
    "supply_class",
    (
        Class("0", "under half of the need", "#f6e5ac", "rain and run-on bring less than half of the crop's demand"),
        Class("0.5", "half to three quarters", "#73bdbf", "rain and run-on bring 50 to 75 % of the crop's demand"),
        Class("0.75", "three quarters to all", "#157fb2", "rain and run-on bring 75 to 100 % of the crop's demand"),
        Class("1", "the whole need", "#03406d", "rain and run-on bring all of the crop's demand or more"),
    ),
    by_size=True,
    unknown=UNKNOWN,
)

CHANNEL_SIZES = Classes(
    "channel_size",
    (
        Class("0", "under 0.1 km2 above", "#73bdbf", "less than 100 000 m2 drains here"),
        Class("100000", "0.1 to 1 km2 above", "#157fb2", "100 000 to 1 000 000 m2 drains here"),
        Class("1000000", "1 to 10 km2 above", "#0b5588", "1 to 10 km2 drains here"),
        Class("10000000", "10 km2 and more above", "#032f52", "10 km2 or more drains here"),
    ),
    by_size=True,
)

OPEN_CATCHMENT = Classes(
    "open_catchment",
    (
        Class("false", "closed catchment", "#dfd6c4", "all that drains here lies within the data"),
        Class("true", "open catchment: at least this area", "#b08347", "the catchment goes on beyond the data", hatch=True),
    ),
    unknown=UNKNOWN,
)

PAN_STATUSES = Classes(
    "pan_status",
    (
        Class("kept", "kept", "#03406d", "kept as an end of flow"),
        Class("doubtful", "doubtful", "#dfd6c4", "filled, but may be real: look", hatch=True),
        Class("given", "given", "#b08347", "named by the user as an end of flow"),
    ),
)

VILLAGE_STATUSES = Classes(
    "village_status",
    (
        Class("ranked", "ranked", "#03406d", "ranked on complete data"),
        Class("reach_cut", "reach cut by the data", "#b08347", "data end within reach: lower bounds", hatch=True),
        Class("unknown", "unknown", "#dfd6c4", "data are missing: see the reason", hatch=True),
    ),
)

LIMITS = Classes(
    "limit",
    (
        Class("water", "water", "", "more run-on would allow a larger plot"),
        Class("soil", "soil", "", "the soil holds too little water for a larger plot to keep its yield"),
        Class("land", "land", "", "the patch of fit ground is fully used"),
        Class("too_wet", "too wet", "", "on a smaller plot water would stand too long"),
    ),
)

ORIGINS = Classes(
    "origin",
    (Class("found", "found", "", "found by the search"), Class("given", "given", "", "drawn by the user")),
)

BELOW_KINDS = Classes(
    "below",
    (
        Class("plot", "plot", "", "the next plot below"),
        Class("village", "village", "", "the first channel within 500 m below a village"),
        Class("property_exit", "exit of the property", "", "where the water leaves the boundary given"),
        Class("pan", "pan", "", "a closed depression in which flow ends"),
    ),
)

FAILURES = Classes(
    "failure",
    (
        Class("no_onset", "no onset", "", "no day in the sowing window brought enough water to sow"),
        Class("stand_lost", "stand lost", "", "the young crop dried out, and so did the crop sown once more"),
    ),
)

SOIL_GROUPS = Classes(
    "soil_group",
    (
        Class("A", "group A", "", "low runoff: takes in water fast when wet"),
        Class("B", "group B", "", "rather low runoff"),
        Class("C", "group C", "", "rather high runoff"),
        Class("D", "group D", "", "high runoff: takes in water very slowly when wet"),
    ),
)

_TEXTURES = (
    "sand",
    "loamy sand",
    "sandy loam",
    "loam",
    "silt loam",
    "silt",
    "sandy clay loam",
    "clay loam",
    "silty clay loam",
    "silty clay",
    "sandy clay",
    "clay",
)
TEXTURE_CLASSES = Classes("texture", tuple(Class(name, name, "", f"USDA texture class {name}") for name in _TEXTURES))
