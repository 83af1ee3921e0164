"""Mistakes that no single value shows: settings that do not go together, names in no table, files that are not there."""

from collections.abc import Callable, Collection, Iterator, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

from siting.config.mistakes import shown
from siting.errors import ConfigError
from siting.tables import crop, curve_number, soil

if TYPE_CHECKING:
    from siting.config.model import Crop, Settings

LONGEST_SEASON_DAYS = 365
OWN_CROP_VALUES = ("stage_days", "kc", "root_depth_m", "depletion_fraction", "ky", "height_m")
NEEDED_CROP_VALUES = ("stage_days", "kc", "root_depth_m", "depletion_fraction")

DECIDE_COVER = {"cover.condition", "cover.treatment"}

PAIRS_AT_ODDS = (
    ("terrain.pans", "terrain.flow_direction", "both say where flow ends: keep one of them"),
    ("soil.texture", "soil.map", "keep one of them"),
    ("cover.cover", "cover.map", "keep one of them"),
    ("soil.column", "soil.table", "a column goes with polygons, a table with a raster: keep one of them"),
    ("soil.texture", "soil.sand_pct", "the texture follows from the sizes: keep one of them"),
    ("soil.map", "soil.sand_pct", "a map has columns of its own: keep one of them"),
    ("soil.depth_m", "soil.depth_map", "keep one of them"),
    ("soil.depth_m", "soil.depth_column", "keep one of them"),
    ("soil.depth_map", "soil.depth_column", "keep one of them"),
)
NEEDS = (
    ("soil.column", ("soil.map",)),
    ("soil.table", ("soil.map",)),
    ("soil.depth_column", ("soil.map",)),
    ("soil.sand_pct", ("soil.clay_pct",)),
    ("soil.clay_pct", ("soil.sand_pct",)),
    ("soil.organic_matter_pct", ("soil.sand_pct", "soil.map")),
    ("cover.table", ("cover.map",)),
    ("cover.column", ("cover.map",)),
    ("cover.map", ("cover.table",)),
    ("cover.condition", ("cover.cover",)),
    ("cover.treatment", ("cover.cover",)),
    ("place.setback_m", ("place.exclude",)),
    ("villages.people", ("villages.file",)),
    ("villages.walk_km", ("villages.file",)),
    ("villages.most_lost_pct", ("villages.file",)),
    ("villages.name", ("villages.file",)),
    ("crop.planting", ("crop.name", "crop.kc")),
    ("crop.planting_until", ("crop.planting",)),
    ("crop.second_planting", ("crop.planting",)),
    ("crop.onset_mm", ("crop.planting_until",)),
    ("runoff.growing_from", ("runoff.growing_until",)),
    ("runoff.growing_until", ("runoff.growing_from",)),
    ("rain.stations", ("rain.daily",)),
    ("rain.map", ("rain.daily",)),
    ("rain.generator", ("rain.daily",)),
    ("rain.wet_day_mm", ("rain.generator",)),
    ("rain.seed", ("rain.generator",)),
    ("rain.unit", ("rain.daily",)),
    ("rain.year_starts", ("rain.daily",)),
)
"""A setting, and those of which it needs one: alone it would change nothing, which nobody means."""


def missing_files(merged: Mapping[str, Mapping[str, Any]], given: Mapping[str, Any]) -> Iterator[str]:
    """Name each file that a setting asks for and that is not there."""
    for section, entries in merged.items():
        for name, value in entries.items():
            for one in value if isinstance(value, tuple) else (value,):
                if isinstance(one, Path) and not one.exists():
                    written = _as_written(one, given[f"{section}.{name}"])
                    yield f"{section}.{name} is {shown(written)}, which does not exist ({one}); give the path of a file"


def _as_written(path: Path, value: Any) -> str:
    """Find how the user wrote a path: one of a list, or the only one."""
    written = [str(one) for one in (value if isinstance(value, list | tuple) else [value])]
    return next((one for one in written if path.name == Path(one).name), path.name)


def mistakes_across(settings: "Settings", given: Collection[str]) -> Iterator[str]:
    """Name settings that contradict, or need, each other; `given` holds the keys that the user set."""
    for one, other, way_out in PAIRS_AT_ODDS:
        if one in given and other in given:
            yield f"{one} and {other} are both given; {way_out}"
    for key, needed in NEEDS:
        if key in given and not any(other in given for other in needed):
            yield f"{key} is given without {' or '.join(needed)}; give it too, or take {key} out"
    yield from _sizes_and_seasons(settings)
    yield from _water_and_plots(settings)


def _sizes_and_seasons(settings: "Settings") -> Iterator[str]:
    sand, clay = settings.soil.sand_pct, settings.soil.clay_pct
    if sand is not None and clay is not None and sand + clay > 100:
        yield f"soil.sand_pct and soil.clay_pct sum to {sand + clay:g}; they must not exceed 100"
    if settings.runoff.growing_from is not None and settings.runoff.antecedent != "rule":
        yield 'runoff.growing_from changes nothing without runoff.antecedent = "rule"; say that too, or take it out'


def _water_and_plots(settings: "Settings") -> Iterator[str]:
    dry, full = settings.soil.wilting_point, settings.soil.field_capacity
    if (dry is None) != (full is None):
        yield "soil.field_capacity and soil.wilting_point go together; give both or none"
    elif dry is not None and full is not None and not dry < full:
        yield f"soil.wilting_point is {dry:g}; it must be below soil.field_capacity, {full:g}"
    plots = settings.plots
    if plots.min_area_m2 > plots.target_area_m2:
        least, target = plots.min_area_m2, plots.target_area_m2
        yield f"plots.min_area_m2 is {least:g}; it must be at most plots.target_area_m2, {target:g}"
    if not plots.search and plots.given is None:
        yield "plots.search is false and plots.given is not set; give polygons of your own, or let it search"


def mistakes_against_tables(settings: "Settings", refused: Collection[str] = ()) -> Iterator[str]:
    """
    Name what is in no table: texture, cover, crop; and what a crop still lacks.

    `refused` holds the keys whose values were refused: the cover is not looked up without what decides its row.
    """
    texture, cover = settings.soil.texture, settings.cover
    if texture is not None:
        yield from _complaint("soil.texture", lambda: soil(texture))
    if cover.cover is not None and not DECIDE_COVER & set(refused):
        name = cover.cover
        # every printed row holds a value for group D, so this asks for the row alone
        yield from _complaint(
            "cover.cover",
            lambda: curve_number(name, condition=cover.condition, treatment=cover.treatment, soil_group="D"),
        )
    yield from _crop(settings.crop)


def _complaint(key: str, look_up: Callable[[], object]) -> Iterator[str]:
    try:
        look_up()
    except ConfigError as error:
        yield f"{key}: {error}"


def _crop(chosen: "Crop") -> Iterator[str]:
    own = [name for name in OWN_CROP_VALUES if getattr(chosen, name) is not None]
    if chosen.name is None and not own:
        return
    stages = chosen.stage_days
    if chosen.name is None:
        lacking = [f"crop.{name}" for name in NEEDED_CROP_VALUES if getattr(chosen, name) is None]
        if lacking:
            yield f"crop.name is not given and {', '.join(lacking)} missing; name a crop or give all its values"
    else:
        name = chosen.name
        complaints = list(_complaint("crop.name", lambda: crop(name)))
        yield from complaints
        if not complaints and stages is None:
            stages = crop(name).stage_days
            if stages is None:
                yield f"crop.name is {shown(name)}, for which no stages are in print; give crop.stage_days, four numbers"
    if stages is not None and sum(stages) > LONGEST_SEASON_DAYS:
        yield f"crop.stage_days sum to {sum(stages)} days; they must not exceed {LONGEST_SEASON_DAYS}"
    if chosen.planting is None:
        yield 'crop.planting is missing; give the day of sowing as month-day, like "11-15"'
