"""What the crop needs, and what rain and run-on supply of it."""

from siting.demand.climate import climate_adjusted_kc, reference_et_daily
from siting.demand.crop import adjusted_coefficient, crop_coefficient, daily_coefficients, relative_yield
from siting.demand.planting import CropWater, Planting, sowing_seasons
from siting.demand.plot_soil import FieldRules, PlotSoil, mean_ponding_mm, total_evaporable_water_mm
from siting.demand.reference_et import (
    extraterrestrial_radiation_mj,
    reference_et_hargreaves_mm,
    reference_et_penman_monteith_mm,
)
from siting.demand.root_zone import (
    LEAST_FITTED_ET_RATIO,
    CropRecord,
    DailyTrace,
    SeasonYields,
    WaterBalance,
    daily_balance,
    daily_trace,
)
from siting.demand.seasonal import SeasonTable, seasonal_supply
from siting.demand.seasons import Seasons, complete_seasons, season_days
from siting.demand.soil_water import available_water_mm, depletion_fraction, stress_coefficient
from siting.demand.weather import Climate

__all__ = [
    "LEAST_FITTED_ET_RATIO",
    "Climate",
    "CropRecord",
    "CropWater",
    "DailyTrace",
    "FieldRules",
    "Planting",
    "PlotSoil",
    "SeasonTable",
    "SeasonYields",
    "Seasons",
    "WaterBalance",
    "adjusted_coefficient",
    "available_water_mm",
    "climate_adjusted_kc",
    "complete_seasons",
    "crop_coefficient",
    "daily_balance",
    "daily_coefficients",
    "daily_trace",
    "depletion_fraction",
    "extraterrestrial_radiation_mj",
    "mean_ponding_mm",
    "reference_et_daily",
    "reference_et_hargreaves_mm",
    "reference_et_penman_monteith_mm",
    "relative_yield",
    "season_days",
    "seasonal_supply",
    "sowing_seasons",
    "stress_coefficient",
    "total_evaporable_water_mm",
]
