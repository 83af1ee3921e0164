"""The soil of each plot, as the crop's water needs it."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.config import Project
from siting.demand import PlotSoil, available_water_mm, mean_ponding_mm
from siting.inputs import SoilMap
from siting.pipeline.crop import CropChoice
from siting.pipeline.surface import PlotGround

FloatArray = npt.NDArray[np.float64]

LEAST_SOIL_M = 0.1
"""A given plot with no more soil than the evaporating layer carries no crop: its water is unknown."""


@dataclass(frozen=True, slots=True, eq=False)
class SoilOfPlots:
    """Soil and bund of each plot; water that it holds at full root depth and that it takes in one event, mm; NaN unknown."""

    soil: PlotSoil
    available_water_mm: FloatArray
    intake_capacity_mm: FloatArray


def soil_of_plots(soil: SoilMap, own: PlotGround, project: Project, crop: CropChoice | None) -> SoilOfPlots:
    """Take each plot's soil from the commonest kind on it; depths are means, unknown ones hold no root back."""
    plots, kind = project.settings.plots, own.soil_kind
    rate = soil.values("infiltration_mm_h")[kind]
    depth = np.where(np.isnan(own.soil_depth_m), np.inf, own.soil_depth_m)
    bare = depth <= LEAST_SOIL_M
    holds = available_water_mm(
        field_capacity=soil.values("field_capacity")[kind],
        wilting_point=soil.values("wilting_point")[kind],
        root_depth_m=np.where(bare, np.nan, 1.0),
    )
    ponding = np.full(kind.shape, plots.ponding_mm)
    if not plots.levelled:
        ponding = mean_ponding_mm(plots.ponding_mm, drop_m=own.drop_m)
    depth = np.where(bare, np.inf, depth)
    held = PlotSoil(holds, depth, soil.values("rew_mm")[kind], soil.values("tew_mm")[kind], rate, ponding)
    roots = np.nan if crop is None else np.minimum(crop.water.root_depth_m, depth)
    return SoilOfPlots(held, held.available_mm_per_m * roots, ponding + rate * plots.event_hours)
