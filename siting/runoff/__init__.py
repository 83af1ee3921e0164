"""From rain to the water that reaches a plot, by day and by year."""

from siting.runoff.antecedent import (
    EventBounds,
    antecedent_bounds_mm,
    antecedent_condition,
    five_day_rain_mm,
    growing_days,
)
from siting.runoff.classes import RunoffClasses, class_rain_mm, class_runoff_mm, classify
from siting.runoff.cover import CoverClass, curve_numbers
from siting.runoff.curve_number import (
    aligned_curve_number_a,
    composite_curve_number,
    crusted_group,
    dry_curve_number,
    retention_for_ratio,
    retention_mm,
    slope_adjusted_curve_number,
    wet_curve_number,
)
from siting.runoff.delivery import delivered_m3
from siting.runoff.design_rain import annual_max_mm, design_rain_mm, few_years_for_design
from siting.runoff.event import runoff_depth_mm
from siting.runoff.generator import RainGenerator, daily_from_monthly
from siting.runoff.peak import (
    PeakFlowLimits,
    critical_velocity_m_s,
    lag_h,
    peak_flow_limits,
    peak_flow_m3s,
    spillway_width_m,
    time_of_concentration_h,
)
from siting.runoff.rain import Rain, StationRain, mean_annual_mm
from siting.runoff.slope import slope_adjusted
from siting.runoff.years import Years, driest_month, hydrological_years, yearly_totals
from siting.runoff.zones import RainField, RainZones, zone_rain_mm

__all__ = [
    "CoverClass",
    "EventBounds",
    "PeakFlowLimits",
    "Rain",
    "RainField",
    "RainGenerator",
    "RainZones",
    "RunoffClasses",
    "StationRain",
    "Years",
    "aligned_curve_number_a",
    "annual_max_mm",
    "antecedent_bounds_mm",
    "antecedent_condition",
    "class_rain_mm",
    "class_runoff_mm",
    "classify",
    "composite_curve_number",
    "critical_velocity_m_s",
    "crusted_group",
    "curve_numbers",
    "daily_from_monthly",
    "delivered_m3",
    "design_rain_mm",
    "driest_month",
    "dry_curve_number",
    "few_years_for_design",
    "five_day_rain_mm",
    "growing_days",
    "hydrological_years",
    "lag_h",
    "mean_annual_mm",
    "peak_flow_limits",
    "peak_flow_m3s",
    "retention_for_ratio",
    "retention_mm",
    "runoff_depth_mm",
    "slope_adjusted",
    "slope_adjusted_curve_number",
    "spillway_width_m",
    "time_of_concentration_h",
    "wet_curve_number",
    "yearly_totals",
    "zone_rain_mm",
]
