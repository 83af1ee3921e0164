"""A project file laid over the defaults, and every mistake in it told at once."""

import tomllib
from pathlib import Path

import pytest
from pydantic import ValidationError

from siting.config import default_vertical_error_m, defaults, load_project, note_defaults, project_template, sections
from siting.config.model import Settings
from siting.errors import ConfigError
from siting.notes import Notes

DEMO = Path(__file__).parents[2] / "demo_dem" / "project.toml"


@pytest.fixture
def project_file(tmp_path: Path) -> Path:
    """A project with the one setting that has no default; tests add to it."""
    (tmp_path / "dem.tif").write_bytes(b"")
    path = tmp_path / "project.toml"
    path.write_text('[place]\ndem = "dem.tif"\n', encoding="utf-8")
    return path


def complaints(path: Path | None, *overrides: str) -> list[str]:
    with pytest.raises(ConfigError) as caught:
        load_project(path, overrides)
    lines = str(caught.value).splitlines()
    return lines if len(lines) == 1 else [line.removeprefix("- ") for line in lines[1:]]


def test_the_demo_project_is_a_good_one() -> None:
    project = load_project(DEMO)
    assert project.settings.crop.planting_day == (11, 15)
    assert project.settings.place.exclude == (DEMO.parent / "road.geojson",)
    assert project.value("place.setback_m") == 20


def test_the_origin_of_each_value_is_known(project_file: Path) -> None:
    project = load_project(project_file, ["plots.ponding_mm=150", "runoff.abstraction_ratio=0.05"], {"soil.texture": "loam"})
    assert project.origin["place.dem"] == "project file"
    assert project.origin["plots.ponding_mm"] == project.origin["soil.texture"] == "command line"
    assert project.origin["plots.efficiency"] == "default"
    assert "soil.depth_m" not in project.origin


def test_the_command_line_wins_over_the_file_and_the_file_over_defaults(project_file: Path) -> None:
    project_file.write_text(project_file.read_text() + "[plots]\nponding_mm = 100\nevent_hours = 4\n")
    project = load_project(project_file, ["plots.ponding_mm=150"])
    got = project.settings.plots
    assert (got.ponding_mm, got.event_hours, got.efficiency) == (150.0, 4.0, defaults()["plots.efficiency"].value)


def test_an_empty_override_puts_the_default_back(project_file: Path) -> None:
    project_file.write_text(project_file.read_text() + "[plots]\nponding_mm = 100\n")
    project = load_project(project_file, ["plots.ponding_mm="])
    assert project.settings.plots.ponding_mm == defaults()["plots.ponding_mm"].value
    assert project.origin["plots.ponding_mm"] == "default"


def test_paths_of_the_file_start_at_the_file_and_those_of_the_command_line_here(
    project_file: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    elsewhere = tmp_path / "elsewhere"
    elsewhere.mkdir()
    (elsewhere / "rain.csv").write_bytes(b"")
    monkeypatch.chdir(elsewhere)
    project = load_project(Path("../project.toml"), ["rain.daily=rain.csv"])
    assert project.settings.place.dem == tmp_path / "dem.tif"
    assert project.settings.rain.daily == elsewhere / "rain.csv"
    assert project.folder == tmp_path


def test_the_record_of_the_settings_holds_no_absolute_path(project_file: Path, tmp_path: Path) -> None:
    record = load_project(project_file, (), {"soil.map": tmp_path / "dem.tif", "soil.column": "texture"}).record()
    assert record["place.dem"] == {"value": "dem.tif", "origin": "project file"}
    assert record["soil.map"]["value"] == "dem.tif"
    assert record["runoff.abstraction_ratio"] == {"value": 0.2, "origin": "default"}
    assert str(tmp_path) not in str(record)


@pytest.mark.parametrize(
    ("written", "expected"),
    [
        ("[plots]\nmax_slope = 3", "unknown setting plots.max_slope; did you mean plots.max_slope_pct?"),
        ("[terrain]\nponding_mm = 3", "unknown setting terrain.ponding_mm; did you mean plots.ponding_mm?"),
        ("[plot]\nponding_mm = 3", "unknown section [plot]; did you mean [plots]?"),
        ("[rain]\nqqq = 3", "unknown setting rain.qqq; [rain] knows daily, stations, map, generator"),
    ],
)
def test_an_unknown_key_is_refused_with_the_nearest(project_file: Path, written: str, expected: str) -> None:
    project_file.write_text(project_file.read_text() + written + "\n")
    got = complaints(project_file)
    assert len(got) == 1
    assert got[0].startswith(expected)


def test_a_key_outside_any_section_is_sent_to_its_place(project_file: Path) -> None:
    project_file.write_text('ponding_mm = 3\nplace = 4\n[rain]\n"daily.x" = 1\n')
    got = complaints(project_file)
    assert "the setting ponding_mm stands outside any section; did you mean plots.ponding_mm?" in got
    assert any(line.startswith("place is 4; write it as a section") for line in got)
    assert any(line.startswith("place.dem is missing") for line in got)


@pytest.mark.parametrize(
    ("override", "expected"),
    [
        ("plots.max_slope_pct=5 %", 'plots.max_slope_pct is "5 %"; it must be a number (%); the default is 5'),
        ("plots.ponding_mm=true", "plots.ponding_mm is true; it must be a number (mm); the default is 200"),
        ("plots.ponding_mm=-1", "plots.ponding_mm is -1; it must be at least 0 (mm); the default is 200"),
        ("plots.efficiency=1.2", "plots.efficiency is 1.2; it must be at most 1; the default is 0.65"),
        ("ranking.dependable=1", "ranking.dependable is 1; it must be below 1; the default is 0.8"),
        ("place.vertical_error_m=nan", "place.vertical_error_m is nan; it must be a finite number (m)"),
        ("plots.event_hours=inf", "plots.event_hours is inf; it must be a finite number (h); the default is 6"),
        ("soil.crusted=1", "soil.crusted is 1; it must be true or false; the default is false"),
        ("place.dem_band=1.5", "place.dem_band is 1.5; it must be a whole number; the default is 1"),
        ("ranking.order=luck", "ranking.order is \"luck\"; it must be 'score' or 'supply'; the default is \"score\""),
        ("cover.curve_number=101", "cover.curve_number is 101; it must be at most 100"),
        (
            "cover.curve_number=true",
            "cover.curve_number is true; it must be a number above 0 and at most 100, or",
        ),
        ("climate.reference_et=[1, 2]", "climate.reference_et is [1, 2]; it must hold 12 values (mm/d)"),
        ("crop.stage_days=[20, 30, 0, 20]", "value 3 of crop.stage_days is 0; it must be at least 1 (d)"),
        ("rain.unit=cm", "rain.unit is \"cm\"; it must be 'mm' or 'inch'"),
        ("place.elevation_unit=feet", 'place.elevation_unit is "feet"; it must be one of metre, foot, us_survey_foot'),
        ("runoff.abstraction_ratio=0.1", "runoff.abstraction_ratio is 0.1; it must be 0.2 or 0.05"),
        ("place.boundary=none.gpkg", 'place.boundary is "none.gpkg", which does not exist'),
        ("rain.unit", "the setting 'rain.unit' cannot be read; write it as section.name=value"),
    ],
)
def test_a_wrong_value_is_named_with_what_it_must_be(project_file: Path, override: str, expected: str) -> None:
    assert any(line.startswith(expected) for line in complaints(project_file, override))


@pytest.mark.parametrize("text", ["11-31", "02-29", "00-10", "13-01", "1-5", "11/15", "15-11", "1l-15", "-11-15"])
def test_a_day_of_sowing_must_be_a_day_of_every_year(project_file: Path, text: str) -> None:
    got = complaints(project_file, "crop.name=barley", f"crop.planting={text}")
    assert got == [f'crop.planting is "{text}"; it must be a day of every year as month-day, like "11-15"']


@pytest.mark.parametrize(
    ("overrides", "expected"),
    [
        (["soil.wilting_point=0.3", "soil.field_capacity=0.2"], "soil.wilting_point is 0.3; it must be below"),
        (["soil.field_capacity=0.2"], "soil.field_capacity and soil.wilting_point go together"),
        (["plots.min_area_m2=20000"], "plots.min_area_m2 is 20000; it must be at most plots.target_area_m2, 10000"),
        (["plots.search=false"], "plots.search is false and plots.given is not set"),
        (["soil.texture=loam", "soil.map=dem.tif", "soil.column=t"], "soil.texture and soil.map are both given"),
        (["soil.sand_pct=60"], "soil.sand_pct is given without soil.clay_pct"),
        (["soil.sand_pct=60", "soil.clay_pct=50"], "soil.sand_pct and soil.clay_pct sum to 110; they must not exceed 100"),
        (["soil.texture=loam", "soil.sand_pct=60", "soil.clay_pct=10"], "soil.texture and soil.sand_pct are both given"),
        (["soil.organic_matter_pct=2"], "soil.organic_matter_pct is given without soil.sand_pct or soil.map"),
        (["soil.depth_m=1", "soil.depth_map=dem.tif"], "soil.depth_m and soil.depth_map are both given"),
        (["soil.depth_column=z"], "soil.depth_column is given without soil.map"),
        (["rain.map=dem.tif"], "rain.map is given without rain.daily"),
        (["rain.wet_day_mm=9"], "rain.wet_day_mm is given without rain.generator"),
        (
            ["runoff.growing_from=11-01", "runoff.antecedent=rule"],
            "runoff.growing_from is given without runoff.growing_until",
        ),
        (
            ["runoff.growing_from=11-01", "runoff.growing_until=04-30"],
            "runoff.growing_from changes nothing without runoff.ant",
        ),
        (["cover.map=dem.tif"], "cover.map is given without cover.table"),
        (["place.setback_m=10"], "place.setback_m is given without place.exclude"),
        (["rain.unit=inch"], "rain.unit is given without rain.daily"),
        (["crop.name=sorghum"], "crop.planting is missing"),
        (["crop.name=sisal", "crop.planting=03-01"], 'crop.name is "sisal", for which no stages are in print'),
        (
            ["crop.kc=[0.3, 1.1, 0.3]", "crop.planting=03-01"],
            "crop.name is not given and crop.stage_days, crop.root",
        ),
        (["crop.name=barley", "crop.planting=03-01", "crop.stage_days=[99, 99, 99, 99]"], "crop.stage_days sum to 396 days"),
        (["crop.name=sorgum", "crop.planting=03-01"], "crop.name: crop 'sorgum' is not in the table; did you mean"),
        (["soil.texture=loamy"], "soil.texture: texture 'loamy' is unknown; did you mean"),
        (["cover.cover=desert shrub"], "cover.cover: cover 'desert shrub' needs a condition: poor, fair, good"),
    ],
)
def test_settings_that_do_not_go_together_are_named(
    project_file: Path, monkeypatch: pytest.MonkeyPatch, overrides: list[str], expected: str
) -> None:
    monkeypatch.chdir(project_file.parent)
    got = complaints(project_file, *overrides)
    assert len(got) == 1
    assert got[0].startswith(expected)


def test_all_mistakes_are_told_at_once(project_file: Path) -> None:
    project_file.write_text(
        '[place]\ndem = "no.tif"\nsetback = 2\n[crop]\nname = "sorgum"\nplanting = "13-01"\n'
        '[plots]\nmax_slope_pct = "5"\n[soil]\ntexture = "mud"\n[rain]\ndaily = ""\n'
    )
    got = complaints(project_file)
    begins = (
        "place.dem",
        "unknown setting place.setback",
        "crop.name",
        "crop.planting",
        "plots.max_slope_pct",
        "soil.texture",
    )
    assert all(sum(line.startswith(begin) for line in got) == 1 for begin in (*begins, "rain.daily is empty"))
    assert len(got) == 7


def test_a_refused_value_entails_no_second_complaint(project_file: Path) -> None:
    got = complaints(project_file, "crop.name=barley", "crop.planting=13-01")
    assert len(got) == 1


@pytest.mark.parametrize(
    ("content", "expected"),
    [
        (b"[crop]\nplanting = 11-15\n", "is not valid TOML"),
        ("[place]\ntitle = 'Jos\u00e9'\n".encode("latin-1"), "is not text in UTF-8"),
    ],
)
def test_a_file_that_is_no_toml_is_refused(tmp_path: Path, content: bytes, expected: str) -> None:
    path = tmp_path / "project.toml"
    path.write_bytes(content)
    assert expected in complaints(path)[0]


def test_a_file_that_is_not_there_or_is_a_folder_is_refused(tmp_path: Path) -> None:
    assert "does not exist" in complaints(tmp_path / "none.toml")[0]
    assert "cannot be read" in complaints(tmp_path)[0]


def test_a_byte_order_mark_does_no_harm(project_file: Path) -> None:
    project_file.write_bytes(b"\xef\xbb\xbf" + project_file.read_bytes())
    assert load_project(project_file).settings.place.dem.name == "dem.tif"


def test_numbers_on_the_command_line_are_read_as_people_write_them(project_file: Path) -> None:
    project = load_project(project_file, ["plots.efficiency=.5", "plots.max_catchment_m2=1e6", "place.title=Wadi 5"])
    assert (project.value("plots.efficiency"), project.value("plots.max_catchment_m2")) == (0.5, 1e6)
    assert project.value("place.title") == "Wadi 5"


def test_settings_are_frozen(project_file: Path) -> None:
    settings = load_project(project_file).settings
    with pytest.raises(ValidationError):
        settings.plots.ponding_mm = 3.0


def test_every_setting_is_in_the_model_and_in_the_defaults_and_nowhere_else() -> None:
    model = {
        f"{section}.{name}"
        for section, field in Settings.model_fields.items()
        for name in field.annotation.model_fields  # type: ignore[union-attr]
    }
    assert model == set(defaults())
    assert tuple(Settings.model_fields) == sections()


def test_every_default_says_where_it_comes_from_and_what_it_moves() -> None:
    for default in defaults().values():
        assert default.text.endswith("."), default.key
        if default.value is None:
            assert default.otherwise and default.example, default.key
        else:
            assert default.source and default.effect, default.key


def test_each_default_that_plays_a_part_is_noted(project_file: Path) -> None:
    notes = Notes()
    note_defaults(load_project(project_file, ["plots.ponding_mm=150"]), notes)
    noted = {assumption.id: assumption for assumption in notes.assumptions}
    assert noted["runoff.conveyance_loss_per_km"].value == "0.3"
    assert "Simanton" in noted["runoff.conveyance_loss_per_km"].source
    assert noted["plots.max_catchment_m2"].value == "2000000"
    assert "plots.ponding_mm" not in noted  # given
    assert "place.setback_m" not in noted  # nothing is excluded, so there is nothing to keep away from
    assert "output.compression" not in noted  # no assumption about the place
    assert "villages.walk_km" not in noted


def test_a_default_is_noted_once_the_setting_it_goes_with_is_given(project_file: Path, tmp_path: Path) -> None:
    notes = Notes()
    note_defaults(load_project(project_file, (), {"villages.file": tmp_path / "dem.tif"}), notes)
    assert "villages.walk_km" in {assumption.id for assumption in notes.assumptions}


@pytest.mark.parametrize(
    ("cell_m", "error_m"), [(1.0, 0.15), (3.0, 0.15), (10.0, 1.0), (12.0, 1.0), (30.0, 2.0), (1000.0, 2.0)]
)
def test_the_vertical_error_follows_the_cell(cell_m: float, error_m: float) -> None:
    assert default_vertical_error_m(cell_m) == error_m


def test_the_new_project_file_leaves_open_what_a_first_run_needs_and_no_more() -> None:
    written = tomllib.loads(project_template())
    open_keys = {f"{section}.{name}" for section, entries in written.items() for name in entries}
    assert open_keys == {
        *("place.dem", "rain.daily", "crop.name", "crop.planting", "cover.cover", "cover.condition", "soil.texture"),
    }


def test_an_unfilled_project_file_is_refused_line_by_line(tmp_path: Path) -> None:
    path = tmp_path / "project.toml"
    path.write_text(project_template(), encoding="utf-8")
    got = complaints(path)
    assert len(got) == 7
    assert sum("is empty; give a value, like" in line for line in got) == 5


def test_every_commented_line_of_the_new_project_file_is_a_good_one(tmp_path: Path) -> None:
    for default in defaults().values():
        values = tomllib.loads(f"v = {default.example}") if default.example else {"v": default.value}
        assert Settings.model_validate(_settings_with(default.key, values["v"], tmp_path))


def _settings_with(key: str, value: object, folder: Path) -> dict[str, dict[str, object]]:
    merged: dict[str, dict[str, object]] = {section: {} for section in sections()}
    for default in defaults().values():
        chosen = value if default.key == key else default.value
        if default.may_be_path and isinstance(chosen, str | list):
            chosen = tuple(folder / one for one in chosen) if isinstance(chosen, list) else folder / chosen
        if chosen is not None:
            merged[default.section][default.name] = chosen
    merged["place"].setdefault("dem", folder / "dem.tif")
    return merged


@pytest.mark.parametrize("condition", ["Poor", "POOR", " poor "])
def test_a_condition_may_be_written_in_any_case(project_file: Path, condition: str) -> None:
    project = load_project(project_file, [], {"cover.cover": "desert shrub", "cover.condition": condition})
    assert project.value("cover.condition") == "poor"


def test_a_wrong_condition_is_one_mistake(project_file: Path) -> None:
    (complaint,) = complaints(project_file, "cover.cover=desert shrub", "cover.condition=bare")
    assert complaint.startswith("cover.condition is \"bare\"; it must be 'poor', 'fair' or 'good'")
