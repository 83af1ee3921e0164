"""Runoff of each class of ground, day by day, as the settings of a run have it."""

import numpy as np
import numpy.typing as npt

from siting.config import Project
from siting.notes import Notes
from siting.pipeline.case import Case
from siting.pipeline.read import Place
from siting.pipeline.weather import Weather
from siting.runoff import (
    RunoffClasses,
    antecedent_condition,
    class_runoff_mm,
    classify,
    growing_days,
    slope_adjusted,
    zone_rain_mm,
)
from siting.terrain import Terrain

FloatArray = npt.NDArray[np.float64]


def runoff_classes(
    place: Place, ground: Terrain, project: Project, notes: Notes
) -> tuple[RunoffClasses, npt.NDArray[np.float32]]:
    """
    Sort the ground by how it runs off, and return each cell's curve number as used.

    The rain after which each class runs is noted, for people can confirm it.
    """
    ratio, number = project.settings.runoff.abstraction_ratio, place.curve_number
    if project.settings.runoff.slope_adjusted:
        number = slope_adjusted(number, ground.slope)
    zone = None if place.rain is None or place.rain.zones.count == 1 else place.rain.zone_of_cell
    classes = classify(curve_number=number, runs_after_mm=place.runs_after_mm, rain_zone=zone, valid=ground.direction != 255)
    if classes.count and np.isnan(classes.runs_after_mm).any():
        starts = zip(classes.label, classes.starts_at_mm(abstraction_ratio=ratio), strict=True)
        told = ", ".join(dict.fromkeys(f"{label} after {rain_mm:.0f}" for label, rain_mm in starts))
        source = "the abstraction ratio; ask people whether it is so, and else set cover.runs_after_mm"
        notes.assume("runoff.starts", told, "mm of rain in a day", source, "all run-on, most of all in dry years")
    return classes, number


def daily_runoff_mm(case: Case, weather: Weather, abstraction_ratio: float) -> FloatArray:
    """Return the runoff of every class on every day, mm: (classes, days); one row of zeros where there is no class."""
    classes = case.classes
    if classes.count == 0:
        return np.zeros((1, weather.days.size))
    zones = None if classes.zone is None else weather.zones
    # one zone alone is not written into the classes; its factor still holds
    dry, read = weather.record.as_dry_mm, weather.record.rain_mm
    if zones is None:
        dry, read = (zone_rain_mm(rain, weather.zones)[0] for rain in (dry, read))
    condition = None
    if case.settings.runoff.antecedent == "rule":
        growing = _growing(case, weather)
        condition = antecedent_condition(read, classes, growing=growing, zones=zones, notes=case.notes)
    return class_runoff_mm(dry, classes, abstraction_ratio=abstraction_ratio, zones=zones, condition=condition)


def _growing(case: Case, weather: Weather) -> npt.NDArray[np.bool_]:
    """Return the days on which plants grow; where no season is named, all: the cautious side."""
    first, last = case.settings.runoff.growing_from, case.settings.runoff.growing_until
    if first is None or last is None:
        source = "assumption, the cautious side: the higher limits of the rule"
        case.notes.assume("runoff.growing_from", "all year", "", source, "when ground counts as wet")
        return np.ones(weather.days.size, dtype=np.bool_)
    return growing_days(weather.days, first=_month_day(first), last=_month_day(last))


def _month_day(text: str) -> tuple[int, int]:
    month, _, day = text.partition("-")
    return int(month), int(day)
