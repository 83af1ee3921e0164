"""What the crop needs, and what rain and run-on supply of it."""

from siting.demand.climate import climate_adjusted_kc, reference_et_daily
from siting.demand.crop import adjusted_coefficient, crop_coefficient, daily_coefficients, relative_yield
from siting.demand.reference_et import (
    extraterrestrial_radiation_mj,
    reference_et_hargreaves_mm,
    reference_et_penman_monteith_mm,
)
from siting.demand.seasonal import SeasonTable, seasonal_supply
from siting.demand.seasons import Seasons, complete_seasons, season_days
from siting.demand.soil_water import available_water_mm, depletion_fraction, stress_coefficient
from siting.demand.weather import Climate

__all__ = [
    "Climate",
    "SeasonTable",
    "Seasons",
    "adjusted_coefficient",
    "available_water_mm",
    "climate_adjusted_kc",
    "complete_seasons",
    "crop_coefficient",
    "daily_coefficients",
    "depletion_fraction",
    "extraterrestrial_radiation_mj",
    "reference_et_daily",
    "reference_et_hargreaves_mm",
    "reference_et_penman_monteith_mm",
    "relative_yield",
    "season_days",
    "seasonal_supply",
    "stress_coefficient",
]
