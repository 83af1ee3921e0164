"""Rain, reference ET, years and seasons of a run, brought together."""

from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from siting.config import Project
from siting.demand import CropRecord, FieldRules, Seasons, complete_seasons, reference_et_daily, sowing_seasons
from siting.notes import Notes
from siting.pipeline.crop import CropChoice
from siting.pipeline.read import Place
from siting.ranking import dependable
from siting.runoff import Rain, Years, hydrological_years, yearly_totals

FloatArray = npt.NDArray[np.float64]

TREND_YEARS, TREND_SHARE = 15, 0.1


@dataclass(frozen=True, slots=True, eq=False)
class Weather:
    """
    Rain and reference ET (mm, NaN unknown) on the days of the record, its years, and what the crop makes of them.

    `record` holds the crop's seasons, None without a crop.
    """

    rain: Rain
    et0_mm: FloatArray
    years: Years
    record: CropRecord | None
    rain_trend: bool

    @property
    def fixed_seasons(self) -> Seasons:
        """Seasons of the seasonal method: within a sowing window it counts from the first day."""
        assert self.record is not None  # there is a crop
        seasons = self.record.seasons
        return replace(seasons, end=seasons.sowing + sum(self.record.crop.stage_days))


def weather_of(place: Place, project: Project, crop: CropChoice | None, altitude_m: float, notes: Notes) -> Weather | None:
    """Bring rain, ET, years and seasons together; None without a rain record."""
    if place.rain is None:
        notes.warn("no_rain", "No rain record is given: all that needs years of rain is unknown, and plots are not ranked.")
        return None
    settings, rain = project.settings, place.rain
    years = hydrological_years(
        rain, starts_month=settings.rain.year_starts, max_missing=settings.rain.max_missing_share, notes=notes
    )
    et0_mm = reference_et_daily(
        place.climate,
        days=rain.days,
        latitude_deg=_latitude(place, settings.climate.latitude, notes),
        altitude_m=altitude_m,
        monthly_mm_per_day=settings.climate.reference_et,
        notes=notes,
    )
    if np.isnan(et0_mm).all():
        text = "Neither climate.daily nor climate.reference_et is given: the crop's demand is unknown."
        notes.warn("no_reference_et", text)
    record = None if crop is None else _crop_record(rain, et0_mm, crop, project, notes)
    return Weather(rain, et0_mm, years, record, _rain_trend(rain, years, settings.ranking.dependable, notes))


def _crop_record(rain: Rain, et0_mm: FloatArray, crop: CropChoice, project: Project, notes: Notes) -> CropRecord:
    settings = project.settings
    found = sowing_seasons(rain.days, planting=crop.planting, crop=crop.water)
    missing = np.isnan(rain.rain_mm)
    seasons = complete_seasons(found, missing=missing, max_missing=settings.rain.max_missing_share, notes=notes)
    field = FieldRules(settings.plots.event_hours, settings.crop.standing_water_days)
    return CropRecord(rain.days, rain.as_dry_mm, et0_mm, seasons, crop.water, crop.planting, field)


def _latitude(place: Place, given: float | None, notes: Notes) -> float:
    if given is not None:
        return given
    latitude = place.middle_lonlat[1]
    notes.assume(
        "climate.latitude", f"{latitude:.3f}", "degree", "middle of the elevation model", "reference ET from temperature"
    )
    return latitude


def _rain_trend(rain: Rain, years: Years, share: float, notes: Notes) -> bool:
    """Tell whether the dependable rain of the last 15 years is more than 10 % off that of all; unknown is no."""
    totals = yearly_totals(rain.as_dry_mm, rain.days, years)
    if totals.size <= TREND_YEARS:
        return False
    whole, late = (float(dependable(part, probability=share)) for part in (totals, totals[-TREND_YEARS:]))
    changed = abs(late - whole) > TREND_SHARE * whole
    if changed:
        text = f"Rain reached in {100 * share:.0f} % of years is {late:.0f} mm in the last {TREND_YEARS} years, "
        text += f"{whole:.0f} mm in all."
        notes.warn("rain_trend", text)
    return changed
