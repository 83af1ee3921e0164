import re

from siting.layers.codes import CAUTIONS, TEXTURE_CLASSES, WHY_NOT
from siting.layers.plots import PLOT_COLUMNS
from siting.layers.rasters import RASTERS, raster
from siting.layers.vectors import LAYERS, layer
from siting.tables.soils import TEXTURES
from siting.terrain.pans import DOUBTFUL, GIVEN, KEPT


def test_names_are_ascii_lower_snake_and_differ() -> None:
    for item in LAYERS:
        names = [column.name for column in item.columns]
        assert len(set(names)) == len(names)
        assert all(re.fullmatch(r"[a-z][a-z0-9_]*", name) for name in [item.name, *names])


def test_a_unit_in_a_name_is_the_unit_declared() -> None:
    units = {"m3s": "m3/s", "m3": "m3", "m2": "m2", "mm": "mm", "pct": "%", "m": "m", "days": "d"}
    for item in LAYERS:
        for column in item.columns:
            ending = column.name.rsplit("_", 1)[-1]
            if ending in units:
                assert column.unit == units[ending], column.name


def test_every_column_has_a_title_and_a_description() -> None:
    assert all(column.title and column.description for item in LAYERS for column in item.columns)


def test_plots_begin_with_what_a_planner_reads() -> None:
    first = [column.name for column in PLOT_COLUMNS[:12]]
    assert first == [
        "plot_id",
        "rank",
        "rank_low",
        "rank_high",
        "area_m2",
        "supported_area_m2",
        "supply_ratio_dry",
        "reliability_pct",
        "rain_only_reliability_pct",
        "catchment_area_m2",
        "open_catchment",
        "cautions",
    ]


def test_both_abstraction_ratios_stand_side_by_side() -> None:
    names = [column.name for column in PLOT_COLUMNS]
    at = names.index("yield_wet_m3")
    assert names[at + 1 : at + 3] == ["yield_dry_other_ratio_m3", "supply_ratio_dry_other_ratio"]


def test_textures_are_those_of_the_soil_table() -> None:
    assert TEXTURE_CLASSES.values == TEXTURES


def test_pan_statuses_are_those_of_the_terrain() -> None:
    classes = layer("pans")["status"].classes
    assert classes is not None
    assert set(classes.values) == {KEPT, DOUBTFUL, GIVEN}


def test_reason_codes_run_from_0_to_12_and_cautions_are_plain_codes() -> None:
    assert WHY_NOT.values == tuple(str(code) for code in range(13))
    assert all(re.fullmatch(r"[a-z_]+", code) for code in CAUTIONS.values)
    assert len(CAUTIONS.values) == 15


def test_largest_contributing_area_survives_in_overviews() -> None:
    assert [item.name for item in RASTERS if item.overview == "max"] == ["contributing_area_m2"]
    assert all((item.overview == "mode") == (not item.is_measure) for item in RASTERS)
    assert raster("position").nodata == 255
