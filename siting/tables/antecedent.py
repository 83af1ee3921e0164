"""Rain of the five days before an event, by which the handbook once told dry ground from wet."""

from dataclasses import dataclass
from functools import cache

from siting.tables._rows import rows

MM_PER_INCH = 25.4


@dataclass(frozen=True, slots=True)
class AntecedentRain:
    """
    Limits of one season, mm of rain in five days.

    Below `dry_below_mm` ground is in condition I, above `wet_above_mm` in III, else in II. `season` is "dormant" or
    "growing".
    """

    season: str
    dry_below_mm: float
    wet_above_mm: float
    source: str
    confidence: str


@cache
def antecedent_rain(season: str) -> AntecedentRain:
    """Return the limits of the "dormant" or the "growing" season; SCS NEH-4 (1972) table 4.2, withdrawn after 1993."""
    row = next(row for row in rows("antecedent_rain") if row["season"] == season)
    dry, wet = (MM_PER_INCH * float(row[name]) for name in ("dry_below_in", "wet_above_in"))
    return AntecedentRain(season, dry, wet, row["source"], row["confidence"])
