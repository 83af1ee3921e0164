"""What the crop needs, and what rain and run-on supply of it."""

from siting.demand.crop import adjusted_coefficient, crop_coefficient, daily_coefficients, relative_yield
from siting.demand.reference_et import (
    extraterrestrial_radiation_mj,
    reference_et_hargreaves_mm,
    reference_et_penman_monteith_mm,
)
from siting.demand.seasonal import SeasonTable, seasonal_supply
from siting.demand.seasons import Seasons, season_days
from siting.demand.soil_water import available_water_mm, depletion_fraction, stress_coefficient

__all__ = [
    "SeasonTable",
    "Seasons",
    "adjusted_coefficient",
    "available_water_mm",
    "crop_coefficient",
    "daily_coefficients",
    "depletion_fraction",
    "extraterrestrial_radiation_mj",
    "reference_et_hargreaves_mm",
    "reference_et_penman_monteith_mm",
    "relative_yield",
    "season_days",
    "seasonal_supply",
    "stress_coefficient",
]
