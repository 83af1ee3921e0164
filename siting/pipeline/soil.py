"""The soil of each plot, as the crop's water needs it."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.config import Project
from siting.demand import PlotSoil, available_water_mm, mean_ponding_mm, total_evaporable_water_mm
from siting.notes import Notes
from siting.pipeline.crop import CropChoice
from siting.tables import TEXTURES, soil, soils
from siting.tables.soils import Soil

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class SoilOfPlots:
    """Soil and bund of each plot; water that it holds at full root depth and that it takes in one event, mm; NaN unknown."""

    soil: PlotSoil
    available_water_mm: FloatArray
    intake_capacity_mm: FloatArray


def soil_of_plots(
    texture: Integers, drop_m: FloatArray, project: Project, crop: CropChoice | None, notes: Notes
) -> SoilOfPlots:
    """Look up each plot's soil by its texture (place in TEXTURES, -1 unknown); values of the user's own win."""
    settings, plots = project.settings.soil, project.settings.plots
    for place in np.unique(texture[texture >= 0]):
        _note(soil(TEXTURES[place]), project, notes)
    capacity = _by_texture(texture, [row.field_capacity for row in soils()], settings.field_capacity)
    wilting = _by_texture(texture, [row.wilting_point for row in soils()], settings.wilting_point)
    rate = _by_texture(texture, [row.infiltration_mm_h for row in soils()], settings.infiltration_mm_h)
    tew = total_evaporable_water_mm(field_capacity=capacity, wilting_point=wilting)
    rew = np.minimum(_by_texture(texture, [readily_evaporable_mm(row)[0] for row in soils()], None), tew)
    if settings.field_capacity is not None and np.isnan(rew).any():
        rew = np.where(np.isnan(rew), _nearest_printed(tew), rew)
    depth = np.full(texture.shape, np.inf if settings.depth_m is None else settings.depth_m)
    ponding = np.full(texture.shape, plots.ponding_mm)
    if not plots.levelled:
        ponding = mean_ponding_mm(plots.ponding_mm, drop_m=drop_m)
    held = PlotSoil(available_water_mm(field_capacity=capacity, wilting_point=wilting, root_depth_m=1.0),
                    depth, rew, tew, rate, ponding)  # fmt: skip
    roots = np.nan if crop is None else np.minimum(crop.water.root_depth_m, depth)
    return SoilOfPlots(held, held.available_mm_per_m * roots, ponding + rate * plots.event_hours)


def _by_texture(texture: Integers, values: list[float], own: float | None) -> FloatArray:
    """Return the value of each plot's texture, NaN where unknown; one of the user's own holds everywhere."""
    if own is not None:
        return np.full(texture.shape, own)
    return np.array([*values, np.nan])[texture]


def readily_evaporable_mm(row: Soil) -> tuple[float, str]:
    """Return REW of a texture and its source; without a printed value that of the printed texture nearest in TEW."""
    if row.rew_mm is not None:
        return row.rew_mm, "FAO-56 (1998) Table 19"
    tew = total_evaporable_water_mm(field_capacity=row.field_capacity, wilting_point=row.wilting_point)
    return float(_nearest_printed(tew)), "assumption: as the texture of FAO-56 Table 19 that is nearest in TEW"


def _nearest_printed(tew_mm: npt.ArrayLike) -> FloatArray:
    """Return the printed REW of the texture whose printed TEW is nearest, mm."""
    printed = [(row.tew_mm, row.rew_mm) for row in soils() if row.tew_mm is not None and row.rew_mm is not None]
    tew, rew = np.array(printed).T
    wanted = np.asarray(tew_mm, dtype=np.float64)
    nearest = np.abs(wanted[..., None] - tew).argmin(axis=-1)
    return np.where(np.isnan(wanted), np.nan, rew[nearest])


def _note(row: Soil, project: Project, notes: Notes) -> None:
    """List what one texture stands for."""
    settings, name = project.settings.soil, row.texture
    if settings.field_capacity is None:
        held = f"{row.wilting_point:.3f} to {row.field_capacity:.3f}"
        notes.assume(f"soil.water of {name}", held, "m3/m3", row.water_source, "water that the soil can hold for the crop")
        rew, source = readily_evaporable_mm(row)
        notes.assume(f"soil.rew of {name}", f"{rew:g}", "mm", source, "water lost from bare soil between crops")
    if settings.infiltration_mm_h is None:
        value, effect = f"{row.infiltration_mm_h:.3g}", "how much of a large flow the plot can take"
        notes.assume(f"soil.infiltration of {name}", value, "mm/h", row.infiltration_source, effect)
