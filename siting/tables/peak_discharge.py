"""Coefficients of the unit peak discharge, by rain distribution (TR-55 appendix F)."""

from dataclasses import dataclass
from functools import cache

from siting.errors import ConfigError
from siting.tables._rows import rows

RAIN_DISTRIBUTIONS = tuple(dict.fromkeys(row["rain_distribution"] for row in rows("peak_discharge_coefficients")))
"""The 24-hour rain distributions in print: I, IA, II, III."""


@dataclass(frozen=True, slots=True)
class UnitPeak:
    """
    The unit peak discharge at one Ia/P: log10 qu = c0 + c1 log10 Tc + c2 (log10 Tc)^2.

    qu in ft3/s for each square mile and inch of runoff, as printed; Tc in hours.
    """

    rain_distribution: str
    ia_over_p: float
    c0: float
    c1: float
    c2: float
    source: str
    confidence: str


@cache
def unit_peaks(rain_distribution: str) -> tuple[UnitPeak, ...]:
    """
    Return the coefficients of a rain distribution, by rising Ia/P.

    Raises
    ------
    ConfigError
        Where the distribution is none of RAIN_DISTRIBUTIONS.
    """
    if rain_distribution not in RAIN_DISTRIBUTIONS:
        msg = f"rain distribution {rain_distribution!r} is unknown; use one of {', '.join(RAIN_DISTRIBUTIONS)}"
        raise ConfigError(msg)
    found = (
        UnitPeak(
            row["rain_distribution"],
            float(row["ia_over_p"]),
            float(row["c0"]),
            float(row["c1"]),
            float(row["c2"]),
            row["source"],
            row["confidence"],
        )
        for row in rows("peak_discharge_coefficients")
        if row["rain_distribution"] == rain_distribution
    )
    return tuple(sorted(found, key=lambda peak: peak.ia_over_p))
