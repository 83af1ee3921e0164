"""Ground that runs off alike: runoff is computed by class, never from a mean curve number."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.errors import CapacityError, ConfigError
from siting.runoff.curve_number import checked, retention_for_ratio
from siting.runoff.event import runoff_depth_mm

FloatArray = npt.NDArray[np.float64]

NO_CLASS = 65535
"""Class of cells whose curve number is unknown."""

UNKNOWN_KIND = 0
BAND_ROWS = 256
"""Rows sorted at once: what is made on the way stays small beside the raster."""


@dataclass(frozen=True, slots=True, eq=False)
class RunoffClasses:
    """
    Classes of ground, and each cell's class.

    `curve_number` and `runs_after_mm` have one value per class; the second, where it is not NaN, is
    the rain after which this ground was seen to run, and wins.
    """

    class_of_cell: npt.NDArray[np.uint16]
    curve_number: FloatArray
    runs_after_mm: FloatArray

    @property
    def count(self) -> int:
        """Return the number of classes."""
        return int(self.curve_number.size)

    @property
    def label(self) -> list[str]:
        """Return the name of each class, as "CN 85" or "runs after 12 mm"."""
        pairs = zip(self.curve_number, self.runs_after_mm, strict=True)
        return [f"CN {number:g}" if np.isnan(seen) else f"runs after {seen:g} mm" for number, seen in pairs]

    def retention_mm(self, *, abstraction_ratio: float) -> FloatArray:
        """Return S of each class: runs_after / l where observed, else from the curve number."""
        by_table = retention_for_ratio(self.curve_number, abstraction_ratio=abstraction_ratio)
        return np.where(np.isnan(self.runs_after_mm), by_table, self.runs_after_mm / abstraction_ratio)

    def starts_at_mm(self, *, abstraction_ratio: float) -> FloatArray:
        """Return the rain at which each class begins to run: the check that people can answer."""
        return abstraction_ratio * self.retention_mm(abstraction_ratio=abstraction_ratio)


def classify(
    *,
    curve_number: npt.NDArray[np.floating],
    runs_after_mm: npt.NDArray[np.floating] | float | None,
    valid: npt.NDArray[np.bool_],
) -> RunoffClasses:
    """
    Sort cells into classes of equal curve number (to 0.1) and equal observed threshold (to 0.1 mm).

    `curve_number` has the shape of `valid`, and so has `runs_after_mm` unless it is one value for all
    ground; a cell without either (NaN), or not valid, gets NO_CLASS. Classes come in rising order, so
    that the same ground gives the same numbers.

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
    kinds = [np.unique(_kinds(curve_number, seen, valid, band)) for band in bands]
    found = np.setdiff1d(np.concatenate(kinds), [UNKNOWN_KIND])
    if found.size >= NO_CLASS:
        msg = f"{found.size} classes of runoff: at most {NO_CLASS - 1}; round the curve numbers"
        raise CapacityError(msg)
    classes = np.full(valid.shape, NO_CLASS, dtype=np.uint16)
    for band in bands:
        kind = _kinds(curve_number, seen, valid, band)
        known = kind != UNKNOWN_KIND
        classes[band][known] = np.searchsorted(found, kind[known]).astype(np.uint16)
    numbers, thresholds = found // 100_000 / 10.0, found % 100_000
    return RunoffClasses(
        classes,
        np.where(numbers > 0, numbers, np.nan),
        np.where(thresholds > 0, thresholds / 10.0, np.nan),
    )


def _kinds(
    curve_number: npt.NDArray[np.floating],
    runs_after_mm: npt.NDArray[np.floating] | None,
    valid: npt.NDArray[np.bool_],
    band: slice,
) -> npt.NDArray[np.int64]:
    """Write curve number and threshold of each cell of a band of rows as one number, checked."""
    number = _tenths(checked(np.where(valid[band], curve_number[band], np.nan)))
    if runs_after_mm is None:
        return number * 100_000
    seen = np.where(valid[band], runs_after_mm[band], np.nan)
    wrong = seen[(seen < 0.1) | (seen > 1000.0)]
    if wrong.size:
        msg = f"cover.runs_after_mm of {wrong[0]:g} mm is outside 0.1 to 1000 mm; leave it out where unknown"
        raise ConfigError(msg)
    threshold = _tenths(seen)
    # an observed threshold needs no curve number: it decides alone
    return np.where(threshold > 0, threshold, number * 100_000)


def _tenths(values: npt.NDArray[np.floating]) -> npt.NDArray[np.int64]:
    """Return values in whole tenths, at least 1; 0 where NaN."""
    return np.nan_to_num(np.maximum(np.round(values.astype(np.float64) * 10.0), 1.0), nan=0.0).astype(np.int64)


def class_runoff_mm(rain_mm: npt.ArrayLike, classes: RunoffClasses, *, abstraction_ratio: float) -> FloatArray:
    """Return the runoff of every class on every day, mm: shape (classes, days)."""
    retention = classes.retention_mm(abstraction_ratio=abstraction_ratio)
    rain = np.asarray(rain_mm, dtype=np.float64)
    return runoff_depth_mm(rain[None, :], retention[:, None], abstraction_ratio=abstraction_ratio)
