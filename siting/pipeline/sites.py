"""From terrain to plots and what drains onto them."""

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from siting.config import Project
from siting.layers.codes import WHY_NOT
from siting.notes import Notes
from siting.pipeline.read import Place
from siting.plots import (
    FOUND,
    Catchments,
    Ground,
    Limits,
    PlotCells,
    PlotLabels,
    deepest_part,
    make_plots,
    plot_cells,
    screen,
    trace_catchments,
    without_plots,
)
from siting.plots.screening import TOO_LITTLE_ABOVE
from siting.runoff import RunoffClasses
from siting.terrain import Terrain

WITH_LOSSES, GROSS = 0, 1
"""Places of the effective areas: with the loss on the way in use, and without any."""

MOST_UNCLASSED_SHARE = 0.05
"""With more of its catchment without a curve number a plot's run-on is unknown (our assumption)."""

DRAWN_LOSSES = (0.1, 0.2, 0.3, 0.5, 0.8)
"""Losses between which the draws of the doubt lie, 1/km: areas are summed once, and no draw routes again."""


@dataclass(frozen=True, slots=True, eq=False)
class Sites:
    """The plots of a run, their cells, and their catchments, whose effective areas are summed at each `loss_per_km`."""

    plots: PlotLabels
    cells: PlotCells
    catchments: Catchments
    channel_in_plot: npt.NDArray[np.bool_]
    loss_per_km: npt.NDArray[np.float64]

    @property
    def plot_id(self) -> npt.NDArray[np.int64]:
        """Return the numbers of the plots, from 1."""
        return np.arange(1, self.plots.count + 1, dtype=np.int64)


def find_sites(place: Place, ground: Terrain, classes: RunoffClasses, project: Project, notes: Notes) -> Sites:
    """Screen the ground, make plots of what passed and of what was given, and trace their catchments."""
    grid, size = ground.grid, _cell_size(ground)
    settings = project.settings
    screening = screen(*screening_of(place, ground, project))
    plots = make_plots(
        passed=screening.passed if settings.plots.search else np.zeros(grid.shape, dtype=np.bool_),
        given=place.given_label,
        catchment_weight=ground.contributing_area_m2,
        direction=ground.direction,
        min_area_m2=settings.plots.min_area_m2,
        target_area_m2=settings.plots.target_area_m2,
        reason=screening.reason,
        given_names=place.given_names or None,
        **size,
    )
    losses = (settings.runoff.conveyance_loss_per_km, 0.0, *DRAWN_LOSSES)
    cells = plot_cells(plots.label, plots.count)
    catchments = trace(cells, plots.label, place, ground, classes, losses)
    unfed = _unfed(plots, catchments, settings.plots.min_catchment_ratio)
    if unfed.any():
        # cells were fed by ground that belongs to the plot itself
        plots = without_plots(plots, unfed, reason=TOO_LITTLE_ABOVE)
        cells = plot_cells(plots.label, plots.count)
        catchments = trace(cells, plots.label, place, ground, classes, losses)
    _tell(plots, place, notes)
    in_plot = np.bincount(cells.plot, weights=ground.channel.ravel()[cells.cell], minlength=plots.count)
    return Sites(plots, cells, catchments, in_plot > 0, np.array(losses))


def _unfed(plots: PlotLabels, catchments: Catchments, least_ratio: float) -> npt.NDArray[np.bool_]:
    """Tell which found plots have less ground above them than the least multiple of their own area."""
    found = np.array([origin == FOUND for origin in plots.origin], dtype=np.bool_)
    return found & (catchments.area_m2 < least_ratio * plots.area_m2)


def trace(
    cells: PlotCells,
    label: npt.NDArray[np.int32],
    place: Place,
    ground: Terrain,
    classes: RunoffClasses,
    loss_per_km: tuple[float, ...],
) -> Catchments:
    """Trace what drains onto plots, or onto places that are reckoned as plots of one cell."""
    return trace_catchments(
        cells,
        label=label,
        direction=ground.direction,
        contributing_area_m2=ground.contributing_area_m2,
        elevation=ground.filled,
        slope=ground.slope,
        channel=ground.channel,
        doubtful_pan=ground.pans.doubtful_mask(),
        inside=place.inside,
        class_of_cell=classes.class_of_cell,
        classes=classes.count,
        loss_per_km=loss_per_km,
        cell_area_m2=ground.grid.cell_area_m2,
        **_cell_size(ground),
    )


def _cell_size(ground: Terrain) -> dict[str, Any]:
    return {"cell_width_m": ground.grid.cell_width_m, "cell_height_m": ground.grid.cell_height_m}


def screening_of(place: Place, ground: Terrain, project: Project) -> tuple[Ground, Limits]:
    """Return what the tests look at, and the limits in use."""
    settings, pans = project.settings.plots, ground.pans
    deepest = deepest_part(elevation=ground.elevation, pan_label=pans.label, pan_depth_m=pans.depth_m)
    looked_at = Ground(
        valid=ground.direction != 255,
        inside=place.inside,
        excluded=place.excluded,
        soil_depth_m=place.soil.depth_m,
        slope=ground.slope,
        position=ground.position,
        height_above_channel_m=ground.height_above_channel_m,
        multiple_flow_area_m2=ground.multiple_flow_area_m2,
        contributing_area_m2=ground.contributing_area_m2,
        channel=ground.channel,
        direction=ground.direction,
        pan_deepest=deepest & pans.kept_mask(),
        **_cell_size(ground),
    )
    limits = Limits(
        max_slope_pct=settings.max_slope_pct,
        max_height_above_channel_m=settings.max_height_above_channel_m,
        min_soil_depth_m=settings.min_soil_depth_m,
        min_catchment_ratio=settings.min_catchment_ratio,
        target_area_m2=settings.target_area_m2,
        max_catchment_m2=settings.max_catchment_m2,
        channel_width_m=project.settings.terrain.channel_width_m,
        channel_setback_m=settings.channel_setback_m,
    )
    return looked_at, limits


def _tell(plots: PlotLabels, place: Place, notes: Notes) -> None:
    """Say what became of the sizes asked for, of slivers, and of the plots that the user drew."""
    if plots.coarse_cells:
        notes.warn(
            "coarse_cells",
            "Cells are coarse beside the plots asked for: sizes were raised to 4 cells at least and 9 cells as target, and "
            "what is found are zones to search in, not plots.",
        )
    if plots.slivers:
        source, effect = "left over when patches were divided", "ground that fits but is in no plot"
        notes.assume("plots.slivers", plots.slivers, "pieces", source, effect)
    for number, given in enumerate(plots.given_label[plots.given_label > 0], start=1):
        _tell_given(place.given_names[int(given) - 1], plots.reason[plots.label == number], notes)


def _tell_given(name: str, reasons: npt.NDArray[np.uint8], notes: Notes) -> None:
    counts = np.bincount(reasons, minlength=13)
    counts[0] += counts[11] + counts[12]
    if counts[0] == reasons.size:
        return
    labels = {int(item.value): item.label for item in WHY_NOT.items}
    parts = [
        f"{100 * counts[code] / reasons.size:.0f} % {labels[code]}"
        for code in np.argsort(-counts[1:11], kind="stable") + 1
        if counts[code]
    ]
    fit = 100 * counts[0] / reasons.size
    notes.warn("given_plot", f"Of the given plot {name!r}, {fit:.0f} % can be cropped by the rules; {', '.join(parts)}.")


def poorly_classed(catchments: Catchments) -> npt.NDArray[np.bool_]:
    """Tell of which plots too much of the catchment has no curve number."""
    return np.asarray(catchments.unclassed_m2 > MOST_UNCLASSED_SHARE * catchments.area_m2)


def mean_curve_number(sites: Sites, classes: RunoffClasses) -> npt.NDArray[np.float64]:
    """
    Return the area-weighted curve number of each catchment, for orientation, lag and Ia/P; runoff goes by class.

    A class with an observed threshold has the number that gives it; NaN where much of the catchment has no class.
    """
    area = sites.catchments.effective_area_m2[GROSS]
    number = 25_400.0 / (254.0 + classes.retention_mm(abstraction_ratio=0.2))
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = (area * number).sum(axis=1) / area.sum(axis=1)
    return np.where(poorly_classed(sites.catchments), np.nan, mean)
