"""From terrain to plots: screening, patches, division, catchments, who lies above whom."""

from siting.plots.catchments import (
    Catchments,
    PlotCells,
    catchment_cells,
    distances_m,
    overflow_path,
    plot_cells,
    trace_catchments,
)
from siting.plots.division import FOUND, GIVEN, PlotLabels, make_plots, without_plots
from siting.plots.patches import PlotSize, plot_size
from siting.plots.screening import Ground, Limits, Screening, deepest_part, judge, screen, strip_share_left
from siting.plots.surface import PlotPlane, commonest, fit_planes, plot_means, slope_margin

__all__ = [
    "FOUND",
    "GIVEN",
    "Catchments",
    "Ground",
    "Limits",
    "PlotCells",
    "PlotLabels",
    "PlotPlane",
    "PlotSize",
    "Screening",
    "catchment_cells",
    "commonest",
    "deepest_part",
    "distances_m",
    "fit_planes",
    "judge",
    "make_plots",
    "overflow_path",
    "plot_cells",
    "plot_means",
    "plot_size",
    "screen",
    "slope_margin",
    "strip_share_left",
    "trace_catchments",
    "without_plots",
]
