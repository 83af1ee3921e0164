"""Every vector layer and table of the GeoPackage, in order."""

from siting.layers.codes import (
    BELOW_KINDS,
    CHANNEL_SIZES,
    FAILURES,
    OPEN_CATCHMENT,
    PAN_STATUSES,
    SUPPLY_CLASSES,
    VILLAGE_STATUSES,
)
from siting.layers.model import Class, Classes, Column, Layer
from siting.layers.plots import PLOT_COLUMNS, PLOT_ID

PLOTS = Layer(
    "plots",
    "MultiPolygon",
    "Plots",
    "low places that could be cropped on run-on, ranked",
    PLOT_COLUMNS,
    SUPPLY_CLASSES,
    "supply_ratio_dry",
)

CATCHMENTS = Layer(
    "catchments",
    "MultiPolygon",
    "Catchments",
    "all ground that drains onto each plot; catchments of plots on one flow path overlap",
    (
        PLOT_ID,
        Column("area_m2", "m2", "float64", "Catchment area", "ground area of the catchment, the plot left out"),
        Column(
            "open_catchment", "", "bool", "Open catchment", "true: it goes on beyond the data, the area is a lower bound"
        ),
        Column(
            "open_sides",
            "",
            "text",
            "Open sides",
            "sides on which it meets the end of the data, such as N;E; NULL where closed",
        ),
        Column(
            "extend_m",
            "m",
            "float64",
            "Extend by",
            "metres by which to extend the data on these sides: as far again as its longest flow path (our assumption)",
        ),
    ),
    OPEN_CATCHMENT,
    "open_catchment",
)

INTAKES = Layer(
    "intakes",
    "Point",
    "Intakes",
    "cell of each plot where most run-on enters",
    (
        PLOT_ID,
        Column(
            "contributing_area_m2",
            "m2",
            "float64",
            "Contributing area",
            "ground area that drains into the plot through this cell",
        ),
    ),
    Classes("intake", (Class("", "intake", "#b08347", "where most run-on enters"),)),
)

OVERFLOW_PATHS = Layer(
    "overflow_paths",
    "LineString",
    "Overflow paths",
    "where surplus water goes from each plot",
    (
        PLOT_ID,
        Column(
            "length_m", "m", "float64", "Length", "length of the flow path on the ground, from cell centre to cell centre"
        ),
    ),
    Classes("overflow_path", (Class("", "overflow path", "#5b4a86", "where surplus goes", hatch=True),)),
)

CHANNELS = Layer(
    "channels",
    "LineString",
    "Channels",
    "drainage lines",
    (Column("contributing_area_m2", "m2", "float64", "Contributing area", "ground area that drains through the lower end"),),
    CHANNEL_SIZES,
    "contributing_area_m2",
)

PANS = Layer(
    "pans",
    "MultiPolygon",
    "Pans",
    "closed depressions: kept as ends of flow, doubtful, or given",
    (
        Column("pan_id", "", "int64", "Pan", "number of the pan"),
        Column("area_m2", "m2", "float64", "Area", "ground area below the level at which it spills"),
        Column("depth_m", "m", "float64", "Depth", "greatest depth below the level at which it spills"),
        Column("volume_m3", "m3", "float64", "Volume", "volume below the level at which it spills"),
        Column("status", "", "text", "Status", "whether it is an end of flow", PAN_STATUSES),
    ),
    PAN_STATUSES,
    "status",
)

VILLAGES = Layer(
    "villages",
    "as given",
    "Villages",
    "villages with the plots in their reach; the columns that came with the file stand first",
    (
        Column("village_id", "", "int64", "Village", "number of the village, in the order of the file"),
        Column("rank", "", "int64", "Rank", "place in the order of area per person in the dependable year, 1 is best"),
        Column("rank_low", "", "int64", "Rank, best possible", "best rank that the doubt leaves"),
        Column("rank_high", "", "int64", "Rank, worst possible", "worst rank that the doubt leaves"),
        Column("plots_in_reach", "", "int64", "Plots in reach", "number of plots within walking distance"),
        Column("plots_shared", "", "int64", "Plots shared", "number of those plots that other villages reach as well"),
        Column(
            "supported_dry_m2",
            "m2",
            "float64",
            "Supported area",
            "area supported in the dependable year, each plot counted once",
        ),
        Column(
            "supported_dry_m2_per_person",
            "m2 per person",
            "float64",
            "Supported area per person",
            "supported_dry_m2 / people; NULL where people are unknown",
        ),
        Column("best_plot_id", "", "int64", "Best plot", "plot_id of the best ranked plot in reach"),
        Column(
            "runoff_lost_dry_pct",
            "%",
            "float64",
            "Run-on lost, dry year",
            "share that no longer reaches the village in a dry year",
        ),
        Column(
            "runoff_lost_median_pct",
            "%",
            "float64",
            "Run-on lost, median year",
            "share that no longer reaches the village in a median year",
        ),
        Column("status", "", "text", "Status", "how far the data carry the rank", VILLAGE_STATUSES),
        Column("reason", "", "text", "Reason", "why the status is not `ranked`"),
    ),
    VILLAGE_STATUSES,
    "status",
)

SEASONS = Layer(
    "seasons",
    "none",
    "Seasons",
    "one row for each plot and season; a season runs from harvest to harvest",
    (
        PLOT_ID,
        Column("season", "", "int64", "Season", "year of sowing"),
        Column("sown", "", "date", "Sown on", "day of sowing; NULL where nothing was sown"),
        Column("rain_mm", "mm", "float64", "Rain", "rain on the plot from sowing to harvest"),
        Column("runon_mm", "mm", "float64", "Run-on", "run-on spread over the plot since the last harvest"),
        Column("supply_ratio", "1", "float64", "Supply ratio", "(rain on the plot + usable run-on) / crop demand"),
        Column(
            "et_ratio",
            "1",
            "float64",
            "ET ratio",
            "water that the crop took up / needed; below 0.5 the yield line was not fitted",
        ),
        Column("relative_yield", "1", "float64", "Relative yield", "yield relative to a crop short of nothing, 0 to 1"),
        Column(
            "rain_only_relative_yield",
            "1",
            "float64",
            "Relative yield on rain alone",
            "the same with the run-on shut off, 0 to 1",
        ),
        Column("standing_water_days", "d", "int64", "Days of standing water", "days of the season on which water stands"),
        Column("failure", "", "text", "Failure", "why the season failed; NULL where it did not", FAILURES),
    ),
)

MONTHS = Layer(
    "months",
    "none",
    "Months",
    "water of each plot by calendar month, means over the years of the record",
    (
        PLOT_ID,
        Column("month", "", "int64", "Month", "1 January to 12 December"),
        Column("rain_mm", "mm", "float64", "Rain", "rain on the plot"),
        Column("runon_mm", "mm", "float64", "Run-on", "run-on spread over the plot"),
        Column("surplus_mm", "mm", "float64", "Surplus", "water that flows over the bund or seeps below the roots"),
        Column("shortage_mm", "mm", "float64", "Shortage", "water that the crop needs and does not get"),
    ),
)

AREA_CURVES = Layer(
    "area_curves",
    "none",
    "Reliability by area",
    "reliability of each plot if its run-on were spread over a part of it",
    (
        PLOT_ID,
        Column("area_m2", "m2", "float64", "Area", "area over which the same run-on is spread"),
        Column("reliability_pct", "%", "float64", "Reliability", "share of seasons in which the yield reaches the target"),
    ),
)

DOWNSTREAM = Layer(
    "downstream",
    "none",
    "What is lost below",
    "share of the water that no longer reaches each place below, by plot alone and by the whole set",
    (
        Column("plot_id", "", "int64", "Plot", "plot that takes the water, alone; NULL: all plots of the set together"),
        Column("below", "", "text", "Below", "what lies below", BELOW_KINDS),
        Column("below_id", "", "int64", "Number below", "plot_id, village_id or pan_id; NULL for an exit of the property"),
        Column("lost_dry_pct", "%", "float64", "Lost, dry year", "share that no longer arrives in the dependable year"),
        Column("lost_median_pct", "%", "float64", "Lost, median year", "share that no longer arrives in the median year"),
    ),
)

ASSUMPTIONS = Layer(
    "assumptions",
    "none",
    "Assumptions",
    "every value that was not given, with its source and what it moves",
    (
        Column("id", "", "text", "Name", "stable name of the assumption"),
        Column("value", "", "text", "Value", "value used"),
        Column("unit", "", "text", "Unit", "unit of the value"),
        Column("source", "", "text", "Source", "where the value comes from"),
        Column("effect", "", "text", "Effect", "what the value moves"),
    ),
)

RUN_INFO = Layer(
    "run_info",
    "none",
    "About this run",
    "what was run on what",
    (Column("key", "", "text", "Key", "what is said"), Column("value", "", "text", "Value", "what it is")),
)

LAYERS = (
    *(PLOTS, CATCHMENTS, INTAKES, OVERFLOW_PATHS, CHANNELS, PANS, VILLAGES),
    *(SEASONS, MONTHS, AREA_CURVES, DOWNSTREAM, ASSUMPTIONS, RUN_INFO),
)
"""All layers and tables in the order of the file; `villages` is written only when villages were given."""


def layer(name: str) -> Layer:
    """Return the layer of that name; raises KeyError for any other."""
    for item in LAYERS:
        if item.name == name:
            return item
    raise KeyError(name)
