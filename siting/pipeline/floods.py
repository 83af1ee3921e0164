"""What a big storm sends to each plot, and how wide the water must be let out: for cautions, not for design."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from siting.pipeline.case import Case
from siting.pipeline.sites import GROSS
from siting.pipeline.weather import Weather
from siting.runoff import (
    annual_max_mm,
    critical_velocity_m_s,
    design_rain_mm,
    few_years_for_design,
    lag_h,
    peak_flow_limits,
    peak_flow_m3s,
    runoff_depth_mm,
    spillway_width_m,
    time_of_concentration_h,
)
from siting.tables import permissible_velocity

FloatArray = npt.NDArray[np.float64]

PERIODS_YEARS = (10.0, 25.0)


@dataclass(frozen=True, slots=True, eq=False)
class Floods:
    """
    Flood of each plot; NaN unknown.

    Peak flow at the intake in the 10- and the 25-year storm, m3/s, spillway width, m, and the velocity of the flow over
    it beside the one that bare soil of the plot stands, m/s.
    """

    peak_10y_m3s: FloatArray
    peak_25y_m3s: FloatArray
    spillway_width_m: FloatArray
    spillway_velocity_m_s: FloatArray
    permissible_velocity_m_s: FloatArray


def plot_floods(case: Case, weather: Weather) -> Floods:
    """
    Estimate flood peaks by the lag and the graphical method, from design rain of the record.

    Runoff is summed by class; the mean curve number serves the lag and Ia/P alone. Open catchments give at least this.
    """
    settings, catchments, notes, curve_number = case.settings, case.sites.catchments, case.notes, case.curve_number
    by_zone = np.array([_design_rain(weather, zone) for zone in range(weather.zones.count)])
    maxima = annual_max_mm(weather.record.of(int(weather.zones.station[0])), weather.years)
    rains = by_zone[0]
    if not np.isnan(rains).any():
        told = " and ".join(f"{rain:.0f} mm in {years:.0f} years" for rain, years in zip(rains, PERIODS_YEARS, strict=True))
        few = "; fewer than 20 years, so uncertain" if few_years_for_design(maxima) else ""
        source = f"Gumbel by moments from {maxima.size} yearly maxima, x 1.13 for readings at a fixed hour{few}"
        notes.assume("design_rain", told, "", source, "flood peaks and spillway widths")
    fed = catchments.area_m2 > 0
    slope_pct = np.where(fed, 100.0 * catchments.mean_slope, np.nan)
    hours = time_of_concentration_h(
        lag_h=lag_h(
            flow_length_m=np.where(fed, catchments.longest_path_m, np.nan),
            curve_number=np.where(fed, curve_number, np.nan),
            slope_pct=slope_pct,
        )
    )
    on_plots = by_zone[np.maximum(case.own.rain_zone, 0)]
    peaks = [_peak(case, on_plots[:, period], hours) for period in range(len(PERIODS_YEARS))]
    held = peak_flow_limits(rain_mm=on_plots[:, 0], curve_number=curve_number, time_of_concentration_h=hours)
    count = int(np.count_nonzero((held.ia_over_p | held.time_of_concentration)[fed]))
    if count:
        source = "printed limits of the graphical method: Ia/P 0.1 to 0.5, time of concentration 0.1 to 10 h"
        notes.assume("peak_flow.held_to_limits", f"{count} of {fed.size}", "plots", source, "their flood peaks")
    width = spillway_width_m(
        flow_m3s=peaks[1], head_m=settings.plots.spillway_head_m, coefficient=settings.plots.weir_coefficient
    )
    velocity = np.where(width > 0, critical_velocity_m_s(head_m=settings.plots.spillway_head_m), np.nan)
    return Floods(peaks[0], peaks[1], width, velocity, _permissible_m_s(case))


def _permissible_m_s(case: Case) -> FloatArray:
    """Return the velocity of clear water that bare soil of each plot stands, NaN where its texture is unknown."""
    textures = [kind.texture for kind in case.place.soil.kinds]
    by_kind = [np.nan if texture is None else permissible_velocity(texture).clear_water_m_s for texture in textures]
    return np.array([*by_kind, np.nan])[case.own.soil_kind]


def _design_rain(weather: Weather, zone: int) -> FloatArray:
    """Return the design rains of a zone, mm, one for each period."""
    maxima = annual_max_mm(weather.record.of(int(weather.zones.station[zone])), weather.years)
    return np.asarray(weather.zones.factor[zone] * design_rain_mm(maxima, return_period_years=np.array(PERIODS_YEARS)))


def _peak(case: Case, rain_mm: FloatArray, hours: FloatArray) -> FloatArray:
    """Return the peak of one storm at each plot; 0 where nothing drains to it, NaN where unknown."""
    area, ratio = case.sites.catchments.area_m2, case.settings.runoff.abstraction_ratio
    by_class = case.sites.catchments.effective_area_m2[GROSS]
    retention = case.classes.retention_mm(abstraction_ratio=ratio)
    depth = runoff_depth_mm(rain_mm[:, None], retention, abstraction_ratio=ratio)
    known = by_class.sum(axis=1)
    with np.errstate(invalid="ignore", divide="ignore"):
        runoff_mm = (by_class * depth).sum(axis=1) / known
    peak = peak_flow_m3s(
        area_m2=area,
        runoff_mm=runoff_mm,
        rain_mm=rain_mm,
        curve_number=case.curve_number,
        time_of_concentration_h=hours,
        rain_distribution=case.settings.runoff.rain_distribution,
    )
    return np.where(area > 0, peak, 0.0)
