"""Crops: coefficients, stages, roots and yield response (FAO-56 tables 11, 12, 22, 24; FAO-33)."""

from dataclasses import dataclass
from functools import cache

from siting.errors import ConfigError
from siting.tables._rows import Row, nearest, number, rows

NO_KY = "no yield response factor in print: 1.0 is assumed"


@dataclass(frozen=True, slots=True)
class Crop:
    """
    One crop as printed.

    `kc` is initial, mid and end; `stage_days` the four stages in days, None where none are in print;
    `root_depth_m` the larger figure (FAO-56's advice for rain-fed crops), `root_depth_low_m` the
    smaller; `depletion_fraction` holds at 5 mm/d.
    """

    name: str
    group: str
    kc: tuple[float, float, float]
    stage_days: tuple[int, int, int, int] | None
    stage_region: str
    root_depth_low_m: float
    root_depth_m: float
    depletion_fraction: float
    ky: float
    ky_source: str
    height_m: float
    source: str
    confidence: str


@cache
def crops() -> tuple[Crop, ...]:
    """Return every crop of the table."""
    return tuple(_crop(row) for row in rows("crops"))


def _crop(row: Row) -> Crop:
    def must(name: str) -> float:
        return float(row[name])

    stages = [number(row[f"days_{stage}"]) for stage in ("ini", "dev", "mid", "late")]
    days = [int(days) for days in stages if days is not None]
    ky = number(row["ky_total"])
    return Crop(
        row["crop"],
        row["group"],
        (must("kc_ini"), must("kc_mid"), must("kc_end")),
        (days[0], days[1], days[2], days[3]) if len(days) == 4 else None,
        row["stage_region"],
        must("root_depth_low_m"),
        must("root_depth_high_m"),
        must("depletion_fraction_p"),
        1.0 if ky is None else ky,
        NO_KY if ky is None else "FAO-33 (1979), FAO-56 (1998) Table 24",
        must("height_m"),
        row["source"],
        row["confidence"],
    )


def crop(name: str) -> Crop:
    """
    Look up a crop by its printed name or its first words ("sorghum" is "sorghum, grain").

    Raises
    ------
    ConfigError
        Where no crop of the table begins so, or several do and none of them is the grain crop.
    """
    wanted = name.strip().lower()
    for row in crops():
        if row.name.lower() == wanted:
            return row
    begin = [row for row in crops() if wanted and row.name.lower().startswith(wanted)]
    grain = [row for row in begin if row.name.lower() == f"{wanted}, grain"]
    if len(begin) == 1 or grain:
        return (grain or begin)[0]
    if begin:
        msg = f"crop {name!r} is in the table more than once: {', '.join(repr(row.name) for row in begin)}; name one"
        raise ConfigError(msg)
    known = [row.name for row in crops()]
    msg = f"crop {name!r} is not in the table; did you mean {nearest(name, known)}? "
    msg += "`siting crops` lists all, and [crop] takes values of your own"
    raise ConfigError(msg)
