"""Curve numbers by cover, treatment, condition and soil group (TR-55 and NEH-630 chapter 9)."""

from dataclasses import dataclass
from functools import cache

from siting.errors import ConfigError
from siting.tables._rows import nearest, rows

ALIGNER_SOURCE = "CN_A = -60.8 + 1.6083 CN_B (Woodward et al. 2002): no group A value in print"

LEAST_CURVE_NUMBER = 30.0
"""Lower ones are computed with as 30 (note under the tables of TR-55; from memory)."""


@dataclass(frozen=True, slots=True)
class CurveNumber:
    """One curve number for average moisture and an abstraction ratio of 0.2."""

    cover: str
    treatment: str
    condition: str
    soil_group: str
    curve_number: float
    source: str
    confidence: str


@cache
def covers() -> tuple[CurveNumber, ...]:
    """Return every printed curve number."""
    return tuple(
        CurveNumber(
            row["cover"],
            row["treatment"],
            row["condition"],
            row["soil_group"],
            float(row["curve_number"]),
            row["source"],
            row["confidence"],
        )
        for row in rows("curve_numbers")
    )


def curve_number(
    cover: str,
    *,
    condition: str | None = None,
    treatment: str | None = None,
    soil_group: str,
) -> CurveNumber:
    """
    Look up the curve number of a cover.

    Parameters
    ----------
    cover
        As printed, or its first words where they are enough ("desert shrub", "herbaceous range").
    condition
        "poor", "fair" or "good", where the table distinguishes them.
    treatment
        As printed, for farmed land with several.
    soil_group
        "A" to "D"; a dual group ("A/D") counts as its second letter.

    Raises
    ------
    ConfigError
        Where the cover is unknown, or the table needs a condition or treatment to decide.

    References
    ----------
    TR-55 (1986) tables 2-2a to 2-2d; NEH-630 chapter 9; the aligner for group A by Woodward et al. (2002).
    """
    letter = soil_group.split("/")[-1].strip().upper()
    if letter not in ("A", "B", "C", "D"):
        msg = f"soil group {soil_group!r} is unknown; the groups are A, B, C, D, A/D, B/D and C/D"
        raise ConfigError(msg)
    matching = _narrow(_of_cover(cover), cover, condition, treatment)
    for row in matching:
        if row.soil_group == letter:
            return row
    return _aligned(matching, cover, letter)


def _of_cover(cover: str) -> list[CurveNumber]:
    wanted = cover.strip().lower()
    names = list(dict.fromkeys(row.cover for row in covers()))
    chosen = [name for name in names if name.lower() == wanted]
    chosen = chosen or [name for name in names if name.lower().startswith(wanted)]
    if len(chosen) != 1 or not wanted:
        msg = f"cover {cover!r} is not in the table or not alone; did you mean {nearest(cover, names)}? "
        msg += "`siting covers` lists all"
        raise ConfigError(msg)
    return [row for row in covers() if row.cover == chosen[0]]


def _narrow(matching: list[CurveNumber], cover: str, condition: str | None, treatment: str | None) -> list[CurveNumber]:
    for name, wanted in (("treatment", treatment), ("condition", condition)):
        values = list(dict.fromkeys(getattr(row, name) for row in matching))
        if wanted is None and len(values) > 1:
            msg = f"cover {cover!r} needs a {name}: {', '.join(value or '(none)' for value in values)}"
            raise ConfigError(msg)
        if wanted is None:
            continue
        kept = [row for row in matching if getattr(row, name).lower() == wanted.strip().lower()]
        if not kept:
            if values == [""]:
                continue  # the table does not distinguish it for this cover
            known = ", ".join(value or "(none)" for value in values)
            msg = f"cover {cover!r} has no {name} {wanted!r}; in print: {known}"
            raise ConfigError(msg)
        matching = kept
    return matching


def _aligned(matching: list[CurveNumber], cover: str, letter: str) -> CurveNumber:
    """Stand in for a missing group A by the published aligner; no other group has a stand-in."""
    for row in matching:
        if letter == "A" and row.soil_group == "B":
            value = -60.8 + 1.6083 * row.curve_number
            source = ALIGNER_SOURCE
            if value < LEAST_CURVE_NUMBER:
                value, source = LEAST_CURVE_NUMBER, f"{ALIGNER_SOURCE}; below 30, so 30 is used"
            return CurveNumber(row.cover, row.treatment, row.condition, "A", value, source, "computed")
    msg = f"cover {cover!r} has no curve number in print for soil group {letter}; give cover.curve_number"
    raise ConfigError(msg)


@cache
def arc_rows(column: str) -> tuple[tuple[float, float], ...]:
    """Return (curve number, that of `column`) in rising order; NEH-630 table 10-1."""
    pairs = ((float(row["curve_number"]), float(row[column])) for row in rows("arc_conversion"))
    return tuple(sorted(pairs))
