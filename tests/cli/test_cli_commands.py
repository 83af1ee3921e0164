"""The commands as a user calls them: help, mistakes, exit codes, a new project, the demo place."""

import errno
import io
import json
from pathlib import Path

import click
import numpy as np
import pytest
from click.testing import CliRunner, Result
from rich.console import Console

from siting.errors import CapacityError
from siting_cli.commands.check import show_report
from siting_cli.commands.demo import write_demo
from siting_cli.commands.run import share, show_results
from siting_cli.console import Bar, plain, rich_table, show, text
from siting_cli.main import Commands, group
from siting_cli.options import FLAG_KEYS

SUMMARY = {
    "plots": [
        {
            "plot_id": number,
            "rank": number,
            "rank_low": number,
            "rank_high": number + 9,
            "supply_rank": number,
            "area_m2": 12_300.0,
            "x": 694_321.4,
            "y": 3_416_789.6,
            "yield_dry_m3": np.float64(841.0),
            "storm_yield_m3": 99.0,
            "crop_demand_m3": 5_200.0,
            "supply_ratio_dry": 0.61234,
            "supply_ratio_median": np.nan,
            "rain_only_ratio_dry": 0.2,
            "supported_area_m2": 9_000.0,
            "reliability_pct": 82.35,
            "rain_only_reliability_pct": None,
            "cautions": "open_catchment",
        }
        for number in range(1, 8)
    ],
    "n_plots": 7,
    "cells": {"can be cropped": 999, "too steep": 999_000, "pan": 1, "no data": 0},
    "assumptions": [{"id": "soil.crusted", "value": "no", "unit": "", "source": "assumption", "effect": "runoff"}] * 4,
    "warnings": [{"code": "rain_gaps", "text": "The rain record lacks 3 days."}],
    "cautions_text": ["Walk the site."],
    "folder": "results",
    "first_file": "siting.gpkg",
    "seconds": 12.34,
}


def call(*arguments: str) -> Result:
    return CliRunner().invoke(group, list(arguments))


@pytest.fixture
def empty(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """An empty folder, entered."""
    monkeypatch.chdir(tmp_path)
    return tmp_path


@pytest.mark.parametrize("command", list(group.commands))
def test_every_command_has_help_in_whole_sentences(command: str) -> None:
    result = call(command, "--help")
    assert result.exit_code == 0
    assert group.commands[command].get_short_help_str(limit=60).endswith(".")
    assert all(parameter.help for parameter in group.commands[command].params if isinstance(parameter, click.Option))


@pytest.mark.parametrize("command", ["run", "check"])
def test_without_a_project_the_way_out_is_named(command: str, empty: Path) -> None:
    result = call(command)
    assert result.exit_code == 3
    assert result.stdout == ""
    assert "no project file is named and there is no project.toml here" in result.stderr
    assert "siting new FOLDER" in result.stderr


@pytest.mark.parametrize("command", ["run", "check"])
def test_a_mistake_in_the_settings_is_told_without_a_traceback(command: str, empty: Path) -> None:
    (empty / "dem.tif").write_bytes(b"")
    (empty / "project.toml").write_text('[place]\ndem = "dem.tif"\n[plots]\nmax_slope = 3\n')
    result = call(command, "--set", "rain.unit=cm")
    assert result.exit_code == 3
    assert "did you mean plots.max_slope_pct?" in result.stderr
    assert 'rain.unit is "cm"' in result.stderr
    assert "Traceback" not in result.output
    assert sorted(path.name for path in empty.iterdir()) == ["dem.tif", "project.toml"]


def test_flags_alone_make_a_project_and_their_mistakes_are_named(empty: Path) -> None:
    (empty / "project.toml").write_text("this is not looked at")
    result = call("run", "--dem", "no.tif", "--crop", "sorgum", "--planting", "06-15", "--texture", "loam")
    assert result.exit_code == 3
    assert 'place.dem is "no.tif", which does not exist' in result.stderr
    assert "crop 'sorgum' is not in the table" in result.stderr
    assert "TOML" not in result.stderr


def test_every_flag_sets_a_setting_that_there_is() -> None:
    from siting.config import defaults

    assert set(FLAG_KEYS.values()) <= set(defaults())


def test_a_folder_that_holds_a_project_can_be_named(empty: Path) -> None:
    (empty / "place").mkdir()
    (empty / "place" / "project.toml").write_text("[plot]\n")
    assert "did you mean [plots]?" in call("check", "place").stderr


@pytest.mark.parametrize("arguments", [("run", "--nope"), ("run", "--threads", "0"), ("new",)])
def test_wrong_usage_has_its_own_code(arguments: tuple[str, ...]) -> None:
    assert call(*arguments).exit_code == 2


@pytest.mark.parametrize(
    ("error", "code", "words"),
    [
        (CapacityError("the run needs 9 GB and 4 GB are free; take larger cells"), 5, "9 GB"),
        (MemoryError(), 5, "memory"),
        (KeyboardInterrupt(), 130, "Interrupted"),
        (ZeroDivisionError("of ours"), 1, "a mistake in siting, not yours"),
        (OSError(errno.EIO, "of ours"), 1, "a mistake in siting, not yours"),
    ],
)
def test_an_error_inside_a_command_ends_with_its_code(error: BaseException, code: int, words: str) -> None:
    @click.command()
    def fails() -> None:
        raise error

    other = Commands()
    other.add_command(fails)
    result = CliRunner().invoke(other, ["fails"])
    assert result.exit_code == code
    assert words in result.stderr
    assert ("Traceback" in result.stderr) == (code == 1)
    assert result.stdout == ""


def test_new_writes_a_project_that_check_sends_back_line_by_line(empty: Path) -> None:
    assert call("new", "place").exit_code == 0
    assert (empty / "place" / "inputs").is_dir()
    result = call("check", "place/project.toml")
    assert result.exit_code == 3
    assert "crop.name is empty; give a value, like" in result.stderr


def test_new_leaves_an_earlier_project_as_it_is(empty: Path) -> None:
    (empty / "project.toml").write_text("mine")
    result = call("new", ".")
    assert result.exit_code == 3
    assert "is there already" in result.stderr
    assert (empty / "project.toml").read_text() == "mine"
    (empty / "file").write_text("")
    assert call("new", "file").exit_code == 3


def test_the_demo_place_is_written_whole_and_loads(empty: Path) -> None:
    from siting.config import load_project

    project = load_project(write_demo(Path("place")))
    assert project.settings.place.title.endswith("(invented)")
    assert not (empty / "place" / "make_demo.py").exists()
    assert write_demo(Path("place")) == Path("place/project.toml")  # the same files again: nothing is lost


def test_the_demo_place_leaves_other_files_as_they_are(empty: Path) -> None:
    (empty / "place").mkdir()
    (empty / "place" / "rain.csv").write_text("mine")
    result = call("demo", "place")
    assert result.exit_code == 3
    assert "is not the demo's own" in result.stderr
    assert [path.name for path in (empty / "place").iterdir()] == ["rain.csv"]


def test_the_screen_of_a_run_shows_plots_reasons_assumptions_and_cautions(capsys: pytest.CaptureFixture[str]) -> None:
    show_results(SUMMARY, as_json=False)
    out, err = capsys.readouterr()
    assert "7 plots, the best 5" in out
    rows = [line.split() for line in out.splitlines() if "694321" in line]
    assert [row[0] for row in rows] == ["1", "2", "3", "4", "5"]
    assert rows[0][1:4] == ["1", "to", "10"]
    assert rows[0][7:] == ["1.23", "0.9", "841", "5200", "0.6123", "8.2", "-", "open_catchment"]
    assert "99.9 %  too steep (999000)" in out
    assert "< 0.1 %  pan (1)" in out
    assert "no data" not in out
    assert "Assumed, 3 of 4" in out
    assert "- Walk the site." in out
    assert "open first: siting.gpkg" in out
    assert err == "Warning: The rain record lacks 3 days.\n"


def test_a_run_without_plots_says_so(capsys: pytest.CaptureFixture[str]) -> None:
    show_results(SUMMARY | {"plots": [], "n_plots": 0}, as_json=False)
    assert capsys.readouterr().out.startswith("No plot was found")


def test_json_holds_all_plots_and_null_for_the_unknown(capsys: pytest.CaptureFixture[str]) -> None:
    show_results(SUMMARY, as_json=True)
    found = json.loads(capsys.readouterr().out)
    assert len(found["plots"]) == 7
    assert found["plots"][0]["supply_ratio_median"] is None
    assert found["plots"][0]["yield_dry_m3"] == 841.0


def test_a_check_is_shown_by_section(capsys: pytest.CaptureFixture[str]) -> None:
    report = {
        "dem": {"cells": 12, "voids": np.int64(3), "crs": None},
        "maps": {"soil": {"unit": "texture"}},
        "rain": {},
        "assumptions": [{"id": "a", "value": "1"}],
        "warnings": [{"code": "x", "text": "Beware."}],
    }
    show_report(report, as_json=False)
    out, err = capsys.readouterr()
    assert "dem:\n  cells: 12\n  voids: 3\n  crs: -\n" in out
    assert "  soil:\n    unit: texture\n" in out
    assert "rain:" not in out
    assert "id  value\na   1\n" in out
    assert err == "Warning: Beware.\n"
    show_report(report, as_json=True)
    assert json.loads(capsys.readouterr().out)["dem"]["voids"] == 3


@pytest.mark.parametrize(
    ("value", "shown"),
    [
        (None, "-"),
        (float("nan"), "-"),
        (True, "yes"),
        (12_345.6, "12346"),
        (0.12345, "0.1235"),
        ((1, 2.5), "1/2.5"),
        ("a", "a"),
    ],
)
def test_values_are_shown_as_people_read_them(value: object, shown: str) -> None:
    assert text(value) == shown


def test_a_small_share_is_never_shown_as_none() -> None:
    assert [share(number, 100_000) for number in (0, 1, 100, 50_000)] == ["0.0 %", "< 0.1 %", "0.1 %", "50.0 %"]


def test_arrays_and_paths_become_plain_json() -> None:
    assert plain({1: np.array([1.0, np.inf]), "p": Path("a/b"), "s": {3}}) == {"1": [1.0, None], "p": "a/b", "s": [3]}


def test_a_table_on_a_terminal_keeps_brackets_and_every_cell() -> None:
    page = io.StringIO()
    rows: list[dict[str, object]] = [{"name": "[red] valley", "area": 12.5}, {"name": "b", "area": None}]
    rich_table(rows, Console(file=page, force_terminal=True, width=80, no_color=True))
    assert "[red] valley" in page.getvalue()
    assert "12.5" in page.getvalue()


def test_long_texts_stand_once_below_a_table(capsys: pytest.CaptureFixture[str]) -> None:
    rows = [{"name": name, "source": source} for name, source in (("a", "long"), ("b", "longer"), ("c", "long"))]
    show(rows, footnotes=("source",))
    assert capsys.readouterr().out == "name  source\na     [1]\nb     [2]\nc     [1]\n\n[1] long\n[2] longer\n"
    show(rows, as_json=True, footnotes=("source",))
    assert json.loads(capsys.readouterr().out) == rows


def test_the_bar_shows_each_stage_with_its_percent() -> None:
    page = io.StringIO()
    with Bar(Console(file=page, force_terminal=True, width=100, no_color=True)) as bar:
        bar.stage("terrain", 0, 4)
        bar.stage("terrain", 4, 4)
        bar.stage("plots", 1, 2)
    last = page.getvalue()
    assert "terrain" in last and "100%" in last
    assert "plots" in last and "50%" in last


def test_nothing_moves_where_no_one_watches(capsys: pytest.CaptureFixture[str]) -> None:
    from siting.progress import Silent
    from siting_cli.console import listener

    with listener() as progress:
        progress.stage("terrain", 1, 2)
    assert isinstance(progress, Silent)
    assert capsys.readouterr().err == ""
