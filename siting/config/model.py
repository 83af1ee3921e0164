"""The settings of a run, typed and ranged; frozen, and closed to unknown keys."""

from pathlib import Path
from typing import Annotated, Literal

from pydantic import AfterValidator, BaseModel, BeforeValidator, ConfigDict, Field, Strict, StringConstraints

from siting.units import METRES

Text = Annotated[str, StringConstraints(min_length=1, strip_whitespace=True)]
Above0 = Annotated[float, Field(gt=0)]
AtLeast0 = Annotated[float, Field(ge=0)]
Share = Annotated[float, Field(gt=0, lt=1)]
Percent = Annotated[float, Field(ge=0, le=100)]
CurveNumber = Annotated[float, Field(gt=0, le=100)]
Days = Annotated[int, Field(ge=1, le=365)]
StageDays = Annotated[tuple[Days, Days, Days, Days], Strict(False)]
Kc = Annotated[tuple[Above0, Above0, Above0], Strict(False)]
_Et = Annotated[float, Field(ge=0, le=25)]
Months = Annotated[tuple[_Et, _Et, _Et, _Et, _Et, _Et, _Et, _Et, _Et, _Et, _Et, _Et], Strict(False)]
SoilGroup = Literal["A", "B", "C", "D", "A/D", "B/D", "C/D"]


def _small_letters(value: object) -> object:
    return value.strip().lower() if isinstance(value, str) else value


Condition = Annotated[Literal["poor", "fair", "good"], BeforeValidator(_small_letters)]
DAYS_OF_MONTH = (31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31)
PUBLISHED_RATIOS = (0.2, 0.05)


def _planting(text: str) -> str:
    month, dash, day = text.partition("-")
    plain = dash and len(month) == len(day) == 2 and (month + day).isascii() and (month + day).isdigit()
    if not (plain and 1 <= int(month) <= 12 and 1 <= int(day) <= DAYS_OF_MONTH[int(month) - 1]):
        msg = 'it must be a day of every year as month-day, like "11-15"'
        raise ValueError(msg)
    return text


Day = Annotated[Text, AfterValidator(_planting)]


def _ratio(value: float) -> float:
    if value not in PUBLISHED_RATIOS:
        msg = "it must be 0.2 or 0.05, for only these have published retention"
        raise ValueError(msg)
    return value


def _length(text: str) -> str:
    if text not in METRES:
        msg = f"it must be one of {', '.join(METRES)}"
        raise ValueError(msg)
    return text


class _Section(BaseModel):
    # hidden input keeps a whole section out of messages; strict keeps "5" and true from passing as numbers
    model_config = ConfigDict(frozen=True, extra="forbid", strict=True, allow_inf_nan=False, hide_input_in_errors=True)


class Place(_Section):
    """Where: the elevation model and the outlines on it."""

    title: str
    dem: Path
    dem_band: Annotated[int, Field(ge=1)]
    boundary: Path | None = None
    exclude: Annotated[tuple[Path, ...], Strict(False)] = ()
    setback_m: AtLeast0
    crs: Text | None = None
    elevation_unit: Annotated[Text, AfterValidator(_length)] | None = None
    vertical_error_m: Above0 | None = None


class Ground(_Section):
    """Channels and pans."""

    channel_area_m2: Above0
    channel_width_m: Above0
    pan_min_area_m2: Above0
    pans: Path | None = None
    flow_direction: Path | None = None


class Soil(_Section):
    """Soil, uniform or by map."""

    texture: Text | None = None
    sand_pct: Percent | None = None
    clay_pct: Percent | None = None
    organic_matter_pct: Annotated[float, Field(ge=0, le=8)] | None = None
    map: Path | None = None
    column: Text | None = None
    table: Path | None = None
    depth_m: Above0 | None = None
    depth_column: Text | None = None
    depth_map: Path | None = None
    soil_group: SoilGroup | None = None
    ksat_mm_h: Above0 | None = None
    restrictive_depth_m: AtLeast0 | None = None
    water_table_m: AtLeast0 | None = None
    field_capacity: Share | None = None
    wilting_point: Share | None = None
    infiltration_mm_h: Above0 | None = None
    crusted: bool


class Cover(_Section):
    """Cover, uniform or by map, or curve numbers of the user's own."""

    cover: Text | None = None
    condition: Condition | None = None
    treatment: Text | None = None
    map: Path | None = None
    table: Path | None = None
    column: Text | None = None
    curve_number: CurveNumber | Path | None = None
    runs_after_mm: Above0 | None = None


class Runoff(_Section):
    """From rain to run-on."""

    abstraction_ratio: Annotated[float, AfterValidator(_ratio)]
    antecedent: Literal["II", "rule"]
    growing_from: Day | None = None
    growing_until: Day | None = None
    slope_adjusted: bool
    conveyance_loss_per_km: AtLeast0
    channel_wetting_mm: AtLeast0
    rain_distribution: Literal["I", "IA", "II", "III"]


class Rain(_Section):
    """The rain record."""

    daily: Path | None = None
    stations: Path | None = None
    map: Path | None = None
    generator: bool
    wet_day_mm: Annotated[float, Field(ge=3)]
    seed: Annotated[int, Field(ge=0)]
    unit: Literal["mm", "inch"] | None = None
    year_starts: Annotated[int, Field(ge=1, le=12)] | None = None
    max_missing_share: Annotated[float, Field(ge=0, lt=1)]
    design_storm_mm: Annotated[float, Field(gt=0, le=500)]


class Climate(_Section):
    """What reference ET rests on."""

    daily: Path | None = None
    reference_et: Months | None = None
    latitude: Annotated[float, Field(ge=-90, le=90)] | None = None


class Crop(_Section):
    """A crop by name, by values, or by name with values of the user's own laid over it."""

    name: Text | None = None
    planting: Day | None = None
    planting_until: Day | None = None
    second_planting: Day | None = None
    onset_mm: AtLeast0
    stage_days: StageDays | None = None
    kc: Kc | None = None
    root_depth_m: Above0 | None = None
    depletion_fraction: Share | None = None
    ky: Above0 | None = None
    height_m: Above0 | None = None
    standing_water_days: Annotated[int, Field(ge=0)]
    target_yield: Annotated[float, Field(gt=0, le=1)]
    target_reliability: Share

    @property
    def planting_day(self) -> tuple[int, int] | None:
        """Month and day of sowing, or on which the sowing window opens; None where not given."""
        return _month_and_day(self.planting)

    @property
    def second_planting_day(self) -> tuple[int, int] | None:
        """Month and day of the second sowing in a year; None where there is none."""
        return _month_and_day(self.second_planting)

    @property
    def last_planting_day(self) -> tuple[int, int] | None:
        """Month and day on which the sowing window closes; None for a fixed day of sowing."""
        return _month_and_day(self.planting_until)


def _month_and_day(text: str | None) -> tuple[int, int] | None:
    if text is None:
        return None
    month, _, day = text.partition("-")
    return int(month), int(day)


class Plots(_Section):
    """What ground can be cropped, and how a plot takes water."""

    given: Path | None = None
    search: bool
    max_slope_pct: Above0
    max_height_above_channel_m: Above0
    min_soil_depth_m: AtLeast0
    min_catchment_ratio: AtLeast0
    max_catchment_m2: Above0
    channel_setback_m: AtLeast0
    min_area_m2: Above0
    target_area_m2: Above0
    ponding_mm: AtLeast0
    levelled: bool
    event_hours: Annotated[float, Field(gt=0, le=24)]
    efficiency: Annotated[float, Field(gt=0, le=1)]
    spillway_head_m: Above0
    weir_coefficient: Annotated[float, Field(ge=1.35, le=1.83)]


class Ranking(_Section):
    """How plots are put in order."""

    order: Literal["score", "supply"]
    dependable: Share
    draws: Annotated[int, Field(ge=0, le=10_000)]
    seed: Annotated[int, Field(ge=0)]
    set_area_m2: Above0 | None = None
    set_plots: Annotated[int, Field(ge=1)] | None = None
    set_people: Annotated[int, Field(ge=1)] | None = None
    area_per_person_m2: Above0
    weight_water: AtLeast0
    weight_gain: AtLeast0
    weight_soil: AtLeast0
    weight_ease: AtLeast0
    weight_safety: AtLeast0
    weight_certainty: AtLeast0


class Villages(_Section):
    """Villages to rank."""

    file: Path | None = None
    name: Text
    people: Text | None = None
    walk_km: Above0
    most_lost_pct: Annotated[float, Field(ge=0, le=100)] | None = None


class Output(_Section):
    """What is written."""

    rasters: bool
    compression: Literal["deflate", "zstd"]


class Settings(_Section):
    """All settings of a run; paths are absolute."""

    place: Place
    terrain: Ground
    soil: Soil
    cover: Cover
    runoff: Runoff
    rain: Rain
    climate: Climate
    crop: Crop
    plots: Plots
    ranking: Ranking
    villages: Villages
    output: Output
