"""Ground that runs off alike: runoff is computed by class, never from a mean curve number."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.errors import CapacityError, ConfigError, InputError
from siting.runoff.curve_number import (
    STANDARD_RATIO,
    checked,
    dry_curve_number,
    retention_for_ratio,
    retention_mm,
    wet_curve_number,
)
from siting.runoff.event import runoff_depth_mm
from siting.runoff.zones import RainZones, zone_rain_mm

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]

NO_CLASS = 65535
"""Class of cells whose curve number is unknown."""

UNKNOWN_KIND = 0
THRESHOLD_PLACES, ZONE_PLACES = 100_000, 1_000_000_000
"""Where curve number and zone begin in the number that stands for a kind of ground; the threshold is its end."""

BAND_ROWS = 256
"""Rows sorted at once: what is made on the way stays small beside the raster."""


@dataclass(frozen=True, slots=True, eq=False)
class RunoffClasses:
    """
    Classes of ground, and each cell's class.

    `curve_number` and `runs_after_mm` have one value per class; the second, where it is not NaN, is
    the rain after which this ground was seen to run, and wins. `zone` is the rain zone of each class, None where
    it rains alike everywhere.
    """

    class_of_cell: npt.NDArray[np.uint16]
    curve_number: FloatArray
    runs_after_mm: FloatArray
    zone: Integers | None = None

    @property
    def count(self) -> int:
        """Return the number of classes."""
        return int(self.curve_number.size)

    @property
    def label(self) -> list[str]:
        """Return the name of each class, as "CN 85", "runs after 12 mm" or "CN 85, rain zone 3" (counted from 1)."""
        pairs = zip(self.curve_number, self.runs_after_mm, strict=True)
        ground = [f"CN {number:g}" if np.isnan(seen) else f"runs after {seen:g} mm" for number, seen in pairs]
        if self.zone is None:
            return ground
        return [f"{name}, rain zone {zone + 1}" for name, zone in zip(ground, self.zone, strict=True)]

    def retention_mm(self, *, abstraction_ratio: float) -> FloatArray:
        """Return S of each class: runs_after / l where observed, else from the curve number."""
        by_table = retention_for_ratio(self.curve_number, abstraction_ratio=abstraction_ratio)
        return np.where(np.isnan(self.runs_after_mm), by_table, self.runs_after_mm / abstraction_ratio)

    def antecedent_retention_mm(self, *, abstraction_ratio: float) -> FloatArray:
        """
        Return S of each class on dry, average and wet ground (conditions I, II, III): (classes, 3).

        By NEH-630 table 10-1. An observed threshold holds for average ground; it moves as that of the curve number
        with the same threshold does (assumption).
        """
        seen = ~np.isnan(self.runs_after_mm)
        number = np.where(seen, 25400.0 / (254.0 + self.runs_after_mm / STANDARD_RATIO), self.curve_number)
        sides = []
        for moved in (dry_curve_number(number), wet_curve_number(number)):
            by_table = retention_for_ratio(moved, abstraction_ratio=abstraction_ratio)
            by_sight = STANDARD_RATIO * retention_mm(moved) / abstraction_ratio
            sides.append(np.where(seen, by_sight, by_table))
        return np.stack([sides[0], self.retention_mm(abstraction_ratio=abstraction_ratio), sides[1]], axis=1)

    def starts_at_mm(self, *, abstraction_ratio: float) -> FloatArray:
        """Return the rain at which each class begins to run: the check that people can answer."""
        return abstraction_ratio * self.retention_mm(abstraction_ratio=abstraction_ratio)


def classify(
    *,
    curve_number: npt.NDArray[np.floating],
    runs_after_mm: npt.NDArray[np.floating] | float | None,
    rain_zone: npt.NDArray[np.integer] | None = None,
    valid: npt.NDArray[np.bool_],
) -> RunoffClasses:
    """
    Sort cells into classes of equal rain zone, curve number (to 0.1) and observed threshold (to 0.1 mm).

    `curve_number` has the shape of `valid`, and so have `rain_zone` and, unless it is one value for all ground,
    `runs_after_mm`. A cell without curve number and threshold (NaN), without a zone (below 0), or not valid, gets
    NO_CLASS. Classes come in rising order, so that the same ground gives the same numbers.

    Raises
    ------
    ConfigError
        Where a valid cell has a curve number outside 0 to 100 (0 excluded), or a threshold that is
        not between 0.1 and 1000 mm: unknown is NaN, never 0.
    CapacityError
        Where there are more classes than codes for them.
    """
    bands = [slice(row, row + BAND_ROWS) for row in range(0, valid.shape[0], BAND_ROWS)]
    seen = None if runs_after_mm is None else np.broadcast_to(np.asarray(runs_after_mm), valid.shape)
    found = np.array([UNKNOWN_KIND], dtype=np.int64)
    for band in bands:
        found = np.union1d(found, _kinds(curve_number, seen, rain_zone, valid, band))
    found = found[found != UNKNOWN_KIND]
    if found.size >= NO_CLASS:
        msg = f"{found.size} classes of runoff: at most {NO_CLASS - 1}; round the curve numbers"
        raise CapacityError(msg)
    classes = np.full(valid.shape, NO_CLASS, dtype=np.uint16)
    for band in bands:
        kind = _kinds(curve_number, seen, rain_zone, valid, band)
        known = kind != UNKNOWN_KIND
        classes[band][known] = np.searchsorted(found, kind[known]).astype(np.uint16)
    ground = found % ZONE_PLACES
    numbers, thresholds = ground // THRESHOLD_PLACES / 10.0, ground % THRESHOLD_PLACES
    return RunoffClasses(
        classes,
        np.where(numbers > 0, numbers, np.nan),
        np.where(thresholds > 0, thresholds / 10.0, np.nan),
        None if rain_zone is None else found // ZONE_PLACES,
    )


def _kinds(
    curve_number: npt.NDArray[np.floating],
    runs_after_mm: npt.NDArray[np.floating] | None,
    rain_zone: npt.NDArray[np.integer] | None,
    valid: npt.NDArray[np.bool_],
    band: slice,
) -> Integers:
    """Write zone, curve number and threshold of each cell of a band of rows as one number, checked."""
    ground = _ground(curve_number, runs_after_mm, valid, band)
    if rain_zone is None:
        return ground
    zone = rain_zone[band].astype(np.int64)
    return np.where((ground != UNKNOWN_KIND) & (zone >= 0), zone * ZONE_PLACES + ground, UNKNOWN_KIND)


def _ground(
    curve_number: npt.NDArray[np.floating],
    runs_after_mm: npt.NDArray[np.floating] | None,
    valid: npt.NDArray[np.bool_],
    band: slice,
) -> Integers:
    """Write curve number and threshold of each cell of a band of rows as one number, checked."""
    number = _tenths(checked(np.where(valid[band], curve_number[band], np.nan)))
    if runs_after_mm is None:
        return number * THRESHOLD_PLACES
    seen = np.where(valid[band], runs_after_mm[band], np.nan)
    wrong = seen[(seen < 0.1) | (seen > 1000.0)]
    if wrong.size:
        msg = f"cover.runs_after_mm of {wrong[0]:g} mm is outside 0.1 to 1000 mm; leave it out where unknown"
        raise ConfigError(msg)
    threshold = _tenths(seen)
    # an observed threshold needs no curve number: it decides alone
    return np.where(threshold > 0, threshold, number * THRESHOLD_PLACES)


def _tenths(values: npt.NDArray[np.floating]) -> Integers:
    """Return values in whole tenths, at least 1; 0 where NaN."""
    return np.nan_to_num(np.maximum(np.round(values.astype(np.float64) * 10.0), 1.0), nan=0.0).astype(np.int64)


def class_rain_mm(rain_mm: npt.ArrayLike, classes: RunoffClasses, *, zones: RainZones | None = None) -> FloatArray:
    """
    Daily rain on every class of ground, mm.

    Parameters
    ----------
    rain_mm
        (days,), or (stations, days) with zones.
    zones
        The zones that `classes.zone` names; None where it rains alike everywhere.

    Returns
    -------
    array
        (classes, days), or (1, days) where it rains alike everywhere; NaN stays NaN.

    Raises
    ------
    InputError
        Where classes and zones do not go together, or several stations come without zones.
    """
    if (zones is None) != (classes.zone is None):
        which = (
            "zones are given for classes without them" if classes.zone is None else "classes of rain zones lack the zones"
        )
        msg = f"rain {which}; give both or neither"
        raise InputError(msg)
    if zones is None or classes.zone is None:
        rain = np.atleast_2d(np.asarray(rain_mm, dtype=np.float64))
        if rain.shape[0] != 1:
            msg = f"rain of {rain.shape[0]} stations needs rain zones; give them, or the rain of one station"
            raise InputError(msg)
        return rain
    if classes.zone.size and classes.zone.max() >= zones.count:
        msg = f"a class lies in rain zone {classes.zone.max() + 1} of {zones.count}; classify by the same zones"
        raise InputError(msg)
    return zone_rain_mm(rain_mm, zones)[classes.zone]


def class_runoff_mm(
    rain_mm: npt.ArrayLike,
    classes: RunoffClasses,
    *,
    abstraction_ratio: float,
    zones: RainZones | None = None,
    condition: npt.NDArray[np.integer] | None = None,
) -> FloatArray:
    """
    Runoff of every class on every day, each day one event.

    The rain of a class is scaled by its zone's factor before the curve number: runoff does not grow in proportion.

    Parameters
    ----------
    rain_mm, zones
        As in `class_rain_mm`.
    condition
        Antecedent condition, 1 to 3, of every class and day, as from `antecedent_condition`; None for II always.

    Returns
    -------
    array
        mm, (classes, days); NaN stays NaN.
    """
    rain = class_rain_mm(rain_mm, classes, zones=zones)
    if condition is None:
        retention = classes.retention_mm(abstraction_ratio=abstraction_ratio)[:, None]
    else:
        by_condition = classes.antecedent_retention_mm(abstraction_ratio=abstraction_ratio)
        retention = np.take_along_axis(by_condition, condition.astype(np.int64) - 1, axis=1)
    return runoff_depth_mm(rain, retention, abstraction_ratio=abstraction_ratio)
