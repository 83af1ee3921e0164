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
from siting.runoff import Rain, RainZones, StationRain, Years, hydrological_years, yearly_totals, zone_rain_mm

FloatArray = npt.NDArray[np.float64]

TREND_YEARS, TREND_SHARE = 15, 0.1


@dataclass(frozen=True, slots=True, eq=False)
class Weather:
    """
    Rain by station and zone, reference ET (mm, NaN unknown), years, and what the crop makes of them.

    `record` holds the stations in use. `crops` has one record for each rain zone, alike but for the rain on the plot;
    empty without a crop.
    """

    record: StationRain
    zones: RainZones
    et0_mm: FloatArray
    years: Years
    crops: tuple[CropRecord, ...]
    rain_trend: bool

    @property
    def days(self) -> npt.NDArray[np.datetime64]:
        """Return the days of the record."""
        return self.record.days

    @property
    def seasons(self) -> Seasons:
        """Return the crop's seasons; there is a crop."""
        return self.crops[0].seasons

    @property
    def fixed_seasons(self) -> Seasons:
        """Seasons of the seasonal method: within a sowing window it counts from the first day; there is a crop."""
        return replace(self.seasons, end=self.seasons.sowing + sum(self.crops[0].crop.stage_days))


def weather_of(place: Place, project: Project, crop: CropChoice | None, altitude_m: float, notes: Notes) -> Weather | None:
    """Bring rain, ET, years and seasons together; None without a rain record."""
    if place.rain is None:
        notes.warn("no_rain", "No rain record is given: all that needs years is unknown; one storm alone ranks the plots.")
        return None
    settings, record, zones = project.settings, place.rain.record, place.rain.zones
    years = hydrological_years(
        record, starts_month=settings.rain.year_starts, max_missing=settings.rain.max_missing_share, notes=notes
    )
    et0_mm = reference_et_daily(
        place.climate,
        days=record.days,
        latitude_deg=_latitude(place, settings.climate.latitude, notes),
        altitude_m=altitude_m,
        monthly_mm_per_day=settings.climate.reference_et,
        notes=notes,
    )
    if np.isnan(et0_mm).all():
        text = "Neither climate.daily nor climate.reference_et is given: the crop's demand is unknown."
        notes.warn("no_reference_et", text)
    crops = () if crop is None else _crop_records(record, zones, et0_mm, crop, project, notes)
    trend = _rain_trend(record.of(0), years, settings.ranking.dependable, notes)
    return Weather(record, zones, et0_mm, years, crops, trend)


def _crop_records(
    record: StationRain, zones: RainZones, et0_mm: FloatArray, crop: CropChoice, project: Project, notes: Notes
) -> tuple[CropRecord, ...]:
    """Make one record for each zone; a season counts where no station lacks too many of its days."""
    settings = project.settings
    found = sowing_seasons(record.days, planting=crop.planting, crop=crop.water, second_opens=crop.second_opens)
    missing = np.asarray(np.isnan(record.rain_mm).any(axis=0))
    seasons = complete_seasons(found, missing=missing, max_missing=settings.rain.max_missing_share, notes=notes)
    field = FieldRules(settings.plots.event_hours, settings.crop.standing_water_days)
    on_zone = zone_rain_mm(record.as_dry_mm, zones)
    return tuple(CropRecord(record.days, rain, et0_mm, seasons, crop.water, crop.planting, field) for rain in on_zone)


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
