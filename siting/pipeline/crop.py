"""The crop of a run: printed values with the user's own laid over them, and the soil that it stands in."""

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from siting.config import Project
from siting.demand import available_water_mm
from siting.demand.climate import climate_adjusted_kc
from siting.demand.weather import Climate
from siting.notes import Notes
from siting.tables import TEXTURES, crop, soil

FloatArray = npt.NDArray[np.float64]

_PRINTED = (
    ("stage_days", "d", "the length of the season and the crop's demand"),
    ("kc", "", "the crop's demand"),
    ("root_depth_m", "m", "water that the soil can hold for the crop"),
    ("depletion_fraction", "", "when the crop suffers"),
    ("ky", "", "the yield of a crop that lacked water"),
    ("height_m", "m", "how wind and humidity change the crop's demand"),
)
"""Settings of a crop that a table can fill, their units and what they move."""


@dataclass(frozen=True, slots=True)
class CropChoice:
    """One crop, complete: days, -, m, share, -, m (None unknown), month and day of sowing."""

    name: str
    stage_days: tuple[int, int, int, int]
    kc: tuple[float, float, float]
    root_depth_m: float
    depletion_fraction: float
    ky: float
    height_m: float | None
    planting: tuple[int, int]


def choose_crop(project: Project, climate: Climate | None, notes: Notes) -> CropChoice | None:
    """Return the crop of a project, None where none is named; printed values that stand in are noted."""
    chosen = project.settings.crop
    planting = chosen.planting_day
    if planting is None or (chosen.name is None and chosen.kc is None):
        notes.warn("no_crop", "No crop is named: its demand is unknown, so plots have volumes of water but no supply ratio.")
        return None
    printed = None if chosen.name is None else crop(chosen.name)
    values: dict[str, Any] = {}
    for name, unit, effect in _PRINTED:
        own = getattr(chosen, name)
        values[name] = own if own is not None or printed is None else getattr(printed, name)
        if own is None and printed is not None:
            source = printed.ky_source if name == "ky" else printed.source
            if name == "stage_days":
                source = f"{printed.source}; for {printed.stage_region}"
            notes.assume(f"crop.{name}", _shown(values[name]), unit, source, effect)
    if values["ky"] is None:
        values["ky"] = 1.0
        notes.assume("crop.ky", 1.0, "", "assumption: no value given", "the yield of a crop that lacked water")
    if chosen.kc is None and values["height_m"] is not None:
        values["kc"] = climate_adjusted_kc(
            climate,
            kc=values["kc"],
            stage_days=values["stage_days"],
            planting=planting,
            height_m=values["height_m"],
            notes=notes,
        )
    return CropChoice(name="own values" if printed is None else printed.name, planting=planting, **values)


def _shown(value: object) -> str:
    return "/".join(str(part) for part in value) if isinstance(value, tuple) else str(value)


@dataclass(frozen=True, slots=True, eq=False)
class SoilOfPlots:
    """Water that the soil of each plot holds for the crop (mm), and what it takes in one event (mm); NaN unknown."""

    available_water_mm: FloatArray
    intake_capacity_mm: FloatArray


def soil_of_plots(texture: npt.NDArray[np.int64], project: Project, root_depth_m: float | None, notes: Notes) -> SoilOfPlots:
    """Look up each plot's soil by its texture (place in TEXTURES, -1 unknown); values of the user's own win."""
    settings, plots = project.settings.soil, project.settings.plots
    shown = {}
    capacity, wilting, rate = (np.full(len(TEXTURES) + 1, np.nan) for _ in range(3))
    for place, name in enumerate(TEXTURES):
        row = soil(name)
        capacity[place], wilting[place], rate[place] = row.field_capacity, row.wilting_point, row.infiltration_mm_h
        shown[place] = row
    own_water = settings.field_capacity is not None and settings.wilting_point is not None
    for place in np.unique(texture[texture >= 0]):
        row = shown[int(place)]
        if not own_water:
            held = f"{row.wilting_point:.3f} to {row.field_capacity:.3f}"
            effect = "water that the soil can hold for the crop"
            notes.assume(f"soil.water of {row.texture}", held, "m3/m3", row.water_source, effect)
        if settings.infiltration_mm_h is None:
            value, effect = f"{row.infiltration_mm_h:.3g}", "how much of a large flow the plot can take"
            notes.assume(f"soil.infiltration of {row.texture}", value, "mm/h", row.infiltration_source, effect)
    if own_water:
        capacity[:], wilting[:] = settings.field_capacity, settings.wilting_point
    if settings.infiltration_mm_h is not None:
        rate[:] = settings.infiltration_mm_h
    depth = np.nan if root_depth_m is None else root_depth_m
    if settings.depth_m is not None:
        depth = min(depth, settings.depth_m)
    water = available_water_mm(field_capacity=capacity[texture], wilting_point=wilting[texture], root_depth_m=depth)
    return SoilOfPlots(water, plots.ponding_mm + rate[texture] * plots.event_hours)
