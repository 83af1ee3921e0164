"""The columns of the plots, in the order in which a planner reads them."""

from siting.layers.codes import CAUTIONS, LIMITS, ORIGINS, POSITIONS, SOIL_GROUPS, TEXTURE_CLASSES
from siting.layers.model import Column

PLOT_ID = Column("plot_id", "", "int64", "Plot", "number of the plot, the same in every layer and table")

_CAUTION_CODES = "; ".join(f"{item.value}: {item.sentence}" for item in CAUTIONS.items)

FIRST_READ = (
    PLOT_ID,
    Column("rank", "", "int64", "Rank", "place in the order, 1 is best"),
    Column("rank_low", "", "int64", "Rank, best likely", "best rank that the doubt leaves: 5 % of the draws rank it better"),
    Column(
        "rank_high", "", "int64", "Rank, worst likely", "worst rank that the doubt leaves: 5 % of the draws rank it worse"
    ),
    Column("area_m2", "m2", "float64", "Plot area", "ground area of the plot"),
    Column(
        "supported_area_m2", "m2", "float64", "Supported area", "largest part of the plot that keeps the target reliability"
    ),
    Column(
        "supply_ratio_dry",
        "1",
        "float64",
        "Supply ratio, dry year",
        "(rain on the plot + usable run-on) / crop demand, reached in the dependable share of seasons; 1 is enough",
    ),
    Column("reliability_pct", "%", "float64", "Reliability", "share of seasons in which the yield reaches the target"),
    Column(
        "rain_only_reliability_pct",
        "%",
        "float64",
        "Reliability on rain alone",
        "share of seasons in which the yield reaches the target with the run-on shut off",
    ),
    Column(
        "catchment_area_m2", "m2", "float64", "Catchment area", "all ground that drains onto the plot, the plot left out"
    ),
    Column(
        "open_catchment",
        "",
        "bool",
        "Open catchment",
        "true: the catchment goes on beyond the data, its area is a lower bound",
    ),
    Column("cautions", "", "text", "Cautions", f"codes, joined by semicolons. {_CAUTION_CODES}", CAUTIONS, many=True),
)

PLACE = (
    Column("slope_pct", "%", "float64", "Slope", "slope of a plane fitted to the plot"),
    Column("drop_m", "m", "float64", "Drop across the plot", "fall of the fitted plane from the upper to the lower side"),
    Column(
        "wetness_index", "1", "float64", "Wetness index", "mean of ln(contributing area per unit width / tangent of slope)"
    ),
    Column(
        "height_above_channel_m",
        "m",
        "float64",
        "Height above the channel",
        "mean height over the first channel that the water reaches",
    ),
    Column("position", "", "text", "Landscape position", "commonest position on the plot, in soil-survey terms", POSITIONS),
    Column("soil_group", "", "text", "Soil group", "hydrologic soil group, A sheds least and D most", SOIL_GROUPS),
    Column("texture", "", "text", "Soil texture", "USDA texture class", TEXTURE_CLASSES),
    Column(
        "curve_number", "1", "float64", "Curve number", "area-weighted SCS curve number of the catchment, average moisture"
    ),
    Column("available_water_mm", "mm", "float64", "Available water", "water that the full root depth can hold for the crop"),
)

WATER = (
    Column("catchment_ratio", "1", "float64", "Catchment ratio", "catchment area / plot area"),
    Column(
        "needed_ratio",
        "1",
        "float64",
        "Catchment ratio needed",
        "catchment area / plot area that would meet the demand in the dependable share of seasons; "
        "NULL where such a season has no run-on",
    ),
    Column(
        "yield_dry_m3",
        "m3",
        "float64",
        "Catchment yield, dry year",
        "run-on volume at the intake, reached in the dependable share of years; this plot alone",
    ),
    Column(
        "yield_median_m3",
        "m3",
        "float64",
        "Catchment yield, median year",
        "run-on volume at the intake, reached in half of the years",
    ),
    Column(
        "yield_wet_m3",
        "m3",
        "float64",
        "Catchment yield, wet year",
        "run-on volume at the intake, reached in 20 % of the years",
    ),
    Column(
        "yield_dry_other_ratio_m3",
        "m3",
        "float64",
        "Catchment yield, dry year, other ratio",
        "yield_dry_m3 under the other abstraction ratio (0.05 where the run used 0.2, and 0.2 where it did not): "
        "the truth may lie anywhere between the two",
    ),
    Column(
        "supply_ratio_dry_other_ratio",
        "1",
        "float64",
        "Supply ratio, dry year, other ratio",
        "supply_ratio_dry under the other abstraction ratio (0.05 where the run used 0.2, and 0.2 where it did not)",
    ),
    Column(
        "storm_yield_m3",
        "m3",
        "float64",
        "Yield of one storm",
        "run-on volume at the intake of one storm of rain.design_storm_mm",
    ),
    Column(
        "runon_dry_mm",
        "mm",
        "float64",
        "Usable run-on, dry year",
        "usable run-on spread over the plot, dependable share of seasons",
    ),
    Column(
        "runon_median_mm",
        "mm",
        "float64",
        "Usable run-on, median year",
        "usable run-on spread over the plot, half of the seasons",
    ),
    Column(
        "crop_demand_mm",
        "mm",
        "float64",
        "Crop demand, depth",
        "water that the crop needs over the season, median of seasons",
    ),
    Column("crop_demand_m3", "m3", "float64", "Crop demand, volume", "crop_demand_mm over the plot area"),
    Column(
        "supply_ratio_median",
        "1",
        "float64",
        "Supply ratio, median year",
        "supply ratio reached or bettered in half of the seasons",
    ),
    Column(
        "mean_yield_pct",
        "%",
        "float64",
        "Mean yield",
        "mean over the seasons of the yield relative to a crop short of nothing",
    ),
    Column("standing_water_days", "d", "int64", "Days of standing water", "days on which water stands, in the worst season"),
    Column("limit", "", "text", "What limits the area", "what holds the supported area", LIMITS),
)

SAFETY = (
    Column(
        "peak_flow_10y_m3s", "m3/s", "float64", "Peak flow, 10 years", "peak flow at the intake, reached once in 10 years"
    ),
    Column(
        "peak_flow_25y_m3s", "m3/s", "float64", "Peak flow, 25 years", "peak flow at the intake, reached once in 25 years"
    ),
    Column(
        "spillway_width_m",
        "m",
        "float64",
        "Spillway width",
        "width that passes the 25-year peak by the broad-crested weir formula",
    ),
    Column(
        "spillway_velocity_m_s",
        "m/s",
        "float64",
        "Velocity over the spillway",
        "critical flow over the sill in the 25-year peak; faster than the soil stands, it must be lined",
    ),
    Column(
        "permissible_velocity_m_s",
        "m/s",
        "float64",
        "Permissible velocity",
        "clear water that bare soil of the plot's texture stands in a channel (Fortier & Scobey 1926)",
    ),
)

_SCORE_RANGE = "component of the score, 0.01 to 1; NULL for all plots where one of them lacks it"

DOUBT = (
    Column("supply_rank", "", "int64", "Rank by supply", "place in the order by supply ratio, 1 is best"),
    Column("reliability_low_pct", "%", "float64", "Reliability, low", "lower end of the 90 % interval of the reliability"),
    Column("reliability_high_pct", "%", "float64", "Reliability, high", "upper end of the 90 % interval of the reliability"),
    Column(
        "catchment_outside_pct", "%", "float64", "Catchment outside", "share of the catchment that lies outside the boundary"
    ),
    Column(
        "behind_pan_pct", "%", "float64", "Behind doubtful pans", "share of the catchment that drains through a doubtful pan"
    ),
    Column(
        "top_5_pct", "%", "float64", "Among the best five", "share of the draws in which the plot is among the best five"
    ),
    Column(
        "rank_low_weights",
        "",
        "int64",
        "Rank, best under other weights",
        "best rank where each weight of the score is drawn between half and twice itself; no error in the data is in it",
    ),
    Column(
        "rank_high_weights", "", "int64", "Rank, worst under other weights", "worst rank under the same draws of weights"
    ),
    Column("score", "1", "float64", "Score", "weighted geometric mean of the components below, 0.01 to 1"),
    Column("score_water", "1", "float64", "Score: water", f"reliability; {_SCORE_RANGE}"),
    Column("score_gain", "1", "float64", "Score: gain", f"what run-on adds to rain alone; {_SCORE_RANGE}"),
    Column("score_soil", "1", "float64", "Score: soil", f"water that the soil can hold; {_SCORE_RANGE}"),
    Column("score_ease", "1", "float64", "Score: ease", f"how level the plot is; {_SCORE_RANGE}"),
    Column("score_safety", "1", "float64", "Score: safety", f"flood peak and standing water; {_SCORE_RANGE}"),
    Column(
        "score_certainty", "1", "float64", "Score: certainty", f"closed catchment, years of rain, relief; {_SCORE_RANGE}"
    ),
)

TOGETHER = (
    Column("plots_upstream", "", "int64", "Plots upstream", "number of plots whose surplus would reach this one"),
    Column(
        "next_plot_id", "", "int64", "Next plot below", "plot_id of the next plot on the way down; NULL where there is none"
    ),
    Column(
        "set_order",
        "",
        "int64",
        "Order in the set",
        "place in which the plot joins the set that counts water once; NULL outside it",
    ),
    Column(
        "set_yield_median_m3",
        "m3",
        "float64",
        "Yield in the set, median year",
        "run-on volume that the plots of the set above leave to this one, reached in half of the years",
    ),
)

ORIGIN = (
    Column("origin", "", "text", "Origin", "how the plot came about", ORIGINS),
    Column("given_name", "", "text", "Given name", "name that the user gave; NULL for a plot that was found"),
)

PLOT_COLUMNS = FIRST_READ + PLACE + WATER + SAFETY + DOUBT + TOGETHER + ORIGIN
