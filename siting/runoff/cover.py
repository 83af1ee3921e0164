"""Curve numbers of ground from what covers it and from its soil group."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError
from siting.notes import Notes
from siting.runoff.curve_number import crusted_group
from siting.tables import curve_number
from siting.tables.covers import LEAST_CURVE_NUMBER

GROUPS = "ABCD"


@dataclass(frozen=True, slots=True)
class CoverClass:
    """
    What one value of a cover map means.

    A `curve_number` of the user's own wins over the table; `runs_after_mm`, the rain after which
    people see this ground run, wins over both. None where not given.
    """

    cover: str
    condition: str | None = None
    treatment: str | None = None
    curve_number: float | None = None
    runs_after_mm: float | None = None


def curve_numbers(
    cover_index: npt.NDArray[np.integer],
    covers: Sequence[CoverClass],
    soil_group: npt.NDArray[np.uint8],
    *,
    crusted: bool,
    notes: Notes,
) -> tuple[npt.NDArray[np.float32], npt.NDArray[np.float32]]:
    """
    Look up each cell's curve number and its observed runoff threshold.

    Parameters
    ----------
    cover_index
        Place of each cell's cover in `covers`; below 0 where unknown.
    soil_group
        1 to 4 for A to D, 0 where unknown; same shape.
    crusted
        Count each group two letters towards D.

    Returns
    -------
    curve_number, runs_after_mm
        NaN where cover or group is unknown, and where no threshold was observed.

    Raises
    ------
    ConfigError
        Where a soil group code is above 4, or the table does not hold a cover.

    References
    ----------
    TR-55 (1986) tables 2-2; NEH-630 chapter 9.
    """
    if soil_group.size and soil_group.max() > len(GROUPS):
        msg = f"soil group code {soil_group.max()} is unknown; the codes are 0 to {len(GROUPS)}"
        raise ConfigError(msg)
    number = np.full((len(covers) + 1, 5), np.nan, dtype=np.float32)
    threshold = np.full(len(covers) + 1, np.nan, dtype=np.float32)
    present = set(np.unique(soil_group).tolist()) - {0}
    for place, cover in enumerate(covers):
        if cover.runs_after_mm is not None:
            threshold[place] = cover.runs_after_mm
        if cover.curve_number is not None:
            number[place, :] = cover.curve_number
            continue
        for group in sorted(present):
            number[place, group] = _from_table(cover, group, crusted, notes)
    known = np.where((cover_index >= 0) & (cover_index < len(covers)), cover_index, len(covers))
    found = number[known, soil_group]
    note_low_curve_numbers(found, notes)
    return found, threshold[known]


def note_low_curve_numbers(curve_number: npt.NDArray[np.floating], notes: Notes) -> None:
    """Warn of curve numbers lower than any in print: classes of a map taken for them are. NaN is passed over."""
    low = curve_number < LEAST_CURVE_NUMBER
    if low.any():
        notes.warn(
            "curve_number_low",
            f"{100 * np.mean(low):.3g} % of the cells have a curve number below {LEAST_CURVE_NUMBER:g}, the least in print; "
            f"the lowest is {np.nanmin(curve_number):g}: check that these are curve numbers, not classes of a map.",
        )


def _from_table(cover: CoverClass, group: int, crusted: bool, notes: Notes) -> float:
    letter = GROUPS[(crusted_group(group) if crusted else group) - 1]
    row = curve_number(cover.cover, condition=cover.condition, treatment=cover.treatment, soil_group=letter)
    name = ", ".join(part for part in (cover.cover, cover.treatment, cover.condition) if part)
    notes.assume(
        f"curve_number.{name}.{letter}",
        f"{row.curve_number:g}",
        "",
        row.source,
        "how much of each rain runs off this ground",
    )
    return float(row.curve_number)
