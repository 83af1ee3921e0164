"""Published values as tables with their sources, and typed look-ups."""

from siting.tables.antecedent import AntecedentRain, antecedent_rain
from siting.tables.covers import CurveNumber, arc_rows, covers, curve_number
from siting.tables.crops import Crop, crop, crops
from siting.tables.peak_discharge import RAIN_DISTRIBUTIONS, UnitPeak, unit_peaks
from siting.tables.soils import (
    TEXTURES,
    Soil,
    SoilWater,
    nearest_printed_rew_mm,
    soil,
    soil_group,
    soil_water,
    soils,
    texture_class,
)
from siting.tables.velocity import PermissibleVelocity, permissible_velocity

__all__ = [
    "RAIN_DISTRIBUTIONS",
    "TEXTURES",
    "AntecedentRain",
    "Crop",
    "CurveNumber",
    "PermissibleVelocity",
    "Soil",
    "SoilWater",
    "UnitPeak",
    "antecedent_rain",
    "arc_rows",
    "covers",
    "crop",
    "crops",
    "curve_number",
    "nearest_printed_rew_mm",
    "permissible_velocity",
    "soil",
    "soil_group",
    "soil_water",
    "soils",
    "texture_class",
    "unit_peaks",
]
