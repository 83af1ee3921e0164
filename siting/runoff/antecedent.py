"""How wet the ground is before an event: bounds of a single event, and the old rule of five days."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.errors import InputError
from siting.notes import Notes
from siting.runoff.classes import RunoffClasses, class_rain_mm
from siting.runoff.event import runoff_depth_mm
from siting.runoff.rain import Days
from siting.runoff.zones import RainZones
from siting.tables import antecedent_rain

FloatArray = npt.NDArray[np.float64]
Mask = npt.NDArray[np.bool_]

DRY, AVERAGE, WET = 1, 2, 3
"""Codes of the antecedent conditions I, II and III."""

DAYS_BEFORE = 5
"""Days before an event whose rain the rule counts."""


@dataclass(frozen=True, slots=True, eq=False)
class EventBounds:
    """Runoff of one event by class, mm, on dry (I), average (II) and wet (III) ground."""

    dry_mm: FloatArray
    average_mm: FloatArray
    wet_mm: FloatArray


def antecedent_bounds_mm(
    rain_mm: npt.ArrayLike, classes: RunoffClasses, *, abstraction_ratio: float, zones: RainZones | None = None
) -> EventBounds:
    """
    Bound the runoff of one event by the wetness of the ground before it.

    Conditions I and III describe single events: over years their errors cancel, so neither is a bound of yearly run-on.

    Parameters
    ----------
    rain_mm
        Rain of the event: one depth, or with zones one for each station, mm.

    References
    ----------
    NRCS, National Engineering Handbook part 630, chapter 10, table 10-1.
    """
    depth = np.asarray(rain_mm, dtype=np.float64)
    if depth.ndim > 1:
        msg = f"rain of shape {depth.shape} is more than one event; give one depth, or one for each station"
        raise InputError(msg)
    rain = class_rain_mm(depth.reshape(-1, 1), classes, zones=zones)
    retention = classes.antecedent_retention_mm(abstraction_ratio=abstraction_ratio)
    runoff = runoff_depth_mm(rain, retention, abstraction_ratio=abstraction_ratio)
    return EventBounds(*(runoff[:, side] for side in range(3)))


def antecedent_condition(
    rain_mm: npt.ArrayLike,
    classes: RunoffClasses,
    *,
    growing: Mask,
    zones: RainZones | None = None,
    notes: Notes,
) -> npt.NDArray[np.int8]:
    """
    Tell each day's antecedent condition (1 to 3) by the rain of the five days before it.

    Withdrawn from the handbook after 1993, for the rain of five days tells little of the runoff; still in use.

    Parameters
    ----------
    rain_mm, zones
        As in `class_rain_mm`: the unbroken record, dry days too.
    growing
        By day: whether plants grow, (days,).

    Returns
    -------
    array
        (classes, days), or (1, days) where it rains alike everywhere. Average (2) where one of the five days is missing
        or before the record.

    References
    ----------
    SCS NEH-4 (1972) table 4.2.
    """
    before = five_day_rain_mm(class_rain_mm(rain_mm, classes, zones=zones))
    if growing.shape != before.shape[-1:]:
        msg = f"the growing season is told for {growing.size} days, the rain for {before.shape[-1]}; give one for each day"
        raise InputError(msg)
    dormant, green = antecedent_rain("dormant"), antecedent_rain("growing")
    condition = np.full(before.shape, AVERAGE, dtype=np.int8)
    condition[before < np.where(growing, green.dry_below_mm, dormant.dry_below_mm)] = DRY
    condition[before > np.where(growing, green.wet_above_mm, dormant.wet_above_mm)] = WET
    notes.warn(
        "antecedent_rule",
        "Wet and dry ground are told by the rain of the five days before, a rule withdrawn from the handbook after 1993: "
        "compare with runoff.antecedent = 'II'.",
    )
    return condition


def five_day_rain_mm(rain_mm: npt.ArrayLike) -> FloatArray:
    """Return the rain of the five days before each day, mm: (..., days); NaN where one is missing or before the record."""
    rain = np.asarray(rain_mm, dtype=np.float64)
    before = np.full(rain.shape, np.nan)
    if rain.shape[-1] > DAYS_BEFORE:
        # each sum by itself: a running one would leave crumbs of a downpour that is over
        before[..., DAYS_BEFORE:] = sum(rain[..., lag : lag - DAYS_BEFORE] for lag in range(DAYS_BEFORE))
    return before


def growing_days(days: Days, *, first: tuple[int, int], last: tuple[int, int]) -> Mask:
    """
    Tell for each day whether it lies between two days of the year (month, day), both included.

    A season may run over the turn of the year: `first` (11, 1) and `last` (4, 30).
    """
    months = days.astype("datetime64[M]")
    of_year = months.astype(np.int64) % 12 * 100 + (days.astype("datetime64[D]") - months).astype(np.int64) + 101
    begin, end = first[0] * 100 + first[1], last[0] * 100 + last[1]
    if begin <= end:
        return np.asarray((of_year >= begin) & (of_year <= end))
    return np.asarray((of_year >= begin) | (of_year <= end))
