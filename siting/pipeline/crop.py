"""The crop of a run: printed values with the user's own laid over them, and when it is sown."""

import re
from dataclasses import dataclass
from typing import Any

from siting.config import Project
from siting.demand import CropWater, Planting, climate_adjusted_kc
from siting.demand.planting import PERENNIAL_GROUPS
from siting.demand.weather import Climate
from siting.notes import Notes
from siting.tables import crop

MONTHS = ("Jan", "Feb", "Mar", "Apr", "May", "Jun", "Jul", "Aug", "Sep", "Oct", "Nov", "Dec")

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
    """One crop, complete, and when it is sown."""

    name: str
    water: CropWater
    planting: Planting
    second_opens: tuple[int, int] | None


def choose_crop(project: Project, climate: Climate | None, notes: Notes) -> CropChoice | None:
    """Return the crop of a project, None where none is named; printed values that stand in are noted."""
    chosen = project.settings.crop
    opens = chosen.planting_day
    if opens is None or (chosen.name is None and chosen.kc is None):
        notes.warn("no_crop", "No crop is named: its demand is unknown, so plots have volumes of water but no supply ratio.")
        return None
    printed = None if chosen.name is None else crop(chosen.name)
    values: dict[str, Any] = {}
    for name, unit, effect in _PRINTED:
        own = getattr(chosen, name)
        values[name] = own if own is not None or printed is None else getattr(printed, name)
        if name == "stage_days" and own is None and printed is not None:
            _warn_of_other_sowing(printed.name, printed.stage_region, opens, notes)
        if own is None and printed is not None:
            source = printed.ky_source if name == "ky" else printed.source
            if name == "stage_days":
                source = f"{printed.source}; for {printed.stage_region}"
            notes.assume(f"crop.{name}", _shown(values[name]), unit, source, effect)
    if values["ky"] is None:
        values["ky"] = 1.0
        notes.assume("crop.ky", 1.0, "", "assumption: no value given", "the yield of a crop that lacked water")
    height_m = values.pop("height_m")
    if chosen.kc is None and height_m is not None:
        values["kc"] = climate_adjusted_kc(
            climate, kc=values["kc"], stage_days=values["stage_days"], planting=opens, height_m=height_m, notes=notes
        )
    perennial = printed is not None and printed.group in PERENNIAL_GROUPS
    planting = Planting(opens, chosen.last_planting_day, chosen.onset_mm)
    _note_common_practice(planting, values, notes)
    name = "own values" if printed is None else printed.name
    return CropChoice(name, CropWater(**values, perennial=perennial), planting, chosen.second_planting_day)


def _warn_of_other_sowing(name: str, region: str, opens: tuple[int, int], notes: Notes) -> None:
    """Warn where the printed stages are of a crop sown at another time of the year: they may not fit."""
    months = [MONTHS.index(word) + 1 for word in re.findall("|".join(MONTHS), region)]
    if not months or opens[0] in (set(months) if " or " in region else _span(months)):
        return
    notes.warn(
        "crop_stages_elsewhere",
        f"The stages in print for {name} are of {region}, and here it is sown in {MONTHS[opens[0] - 1]}: give "
        "crop.stage_days as people know them here.",
    )


def _span(months: list[int]) -> set[int]:
    """Return the months from the first to the last, across the new year if need be; a lone one is itself."""
    return {(months[0] - 1 + step) % 12 + 1 for step in range((months[-1] - months[0]) % 12 + 1)}


def _note_common_practice(planting: Planting, values: dict[str, Any], notes: Notes) -> None:
    """List what the sowing rule and young roots rest on."""
    source, water = "common practice", CropWater(**values)
    lost = f"{planting.lost_after_days} days without uptake, within {planting.lost_within_days} of sowing"
    notes.assume("crop.stand_lost_after", lost, "", source, "seasons in which the young crop dries out")
    notes.assume("crop.root_start_m", water.root_start_m, "m", source, "water within reach of the young crop")


def _shown(value: object) -> str:
    return "/".join(str(part) for part in value) if isinstance(value, tuple) else str(value)
