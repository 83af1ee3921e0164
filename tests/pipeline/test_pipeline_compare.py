"""Two results side by side: what moved, and which input did it."""

import shutil
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from siting.config import load_project
from siting.errors import InputError
from siting.pipeline import compare, run

DEMO = Path(__file__).parents[2] / "demo_dem"


@pytest.fixture(scope="module")
def place(tmp_path_factory: pytest.TempPathFactory, write_dem: Callable[..., Path], valley: np.ndarray) -> Path:
    folder = tmp_path_factory.mktemp("place")
    write_dem(folder / "dem.tif", valley, 10.0)
    for name in ("rain.csv", "climate.csv"):
        shutil.copy(DEMO / name, folder / name)
    (folder / "project.toml").write_text(
        '[place]\ndem = "dem.tif"\n[rain]\ndaily = "rain.csv"\n[climate]\ndaily = "climate.csv"\n'
        '[crop]\nname = "barley"\nplanting = "11-15"\n[cover]\ncurve_number = 85\n[soil]\ntexture = "loam"\n'
        "[output]\nrasters = false\n[ranking]\ndraws = 0\n"
    )
    for name, changes in {
        "first": (),
        "again": (),
        "soil": ("soil.texture=sand",),
        "both": ("soil.texture=sand", "plots.max_slope_pct=3"),
    }.items():
        run(load_project(folder / "project.toml", changes), out=folder / name, threads=2)
    return folder


def test_the_same_run_moves_nothing(place: Path) -> None:
    found = compare(place / "first", place / "again")
    assert found["inputs"] == []
    assert found["effects"] == []
    assert (found["sum"]["gone"], found["sum"]["new"], found["sum"]["moved"]) == (0, 0, 0)
    assert all(row["plot_id_before"] == row["plot_id_after"] for row in found["plots"])


def test_one_changed_input_is_named_as_what_did_it(place: Path) -> None:
    found = compare(place / "first", place / "soil")
    assert found["inputs"] == [{"key": "soil.texture", "before": "loam", "after": "sand"}]
    assert [one["group"] for one in found["effects"]] == ["soil"]
    assert found["sum"]["same_ground"] == len(found["plots"])
    assert found["sum"]["moved"] > 0


def test_of_two_changed_inputs_each_is_tried_alone(place: Path) -> None:
    found = compare(place / "first", place / "both")
    effects = {one["group"]: one for one in found["effects"]}
    assert set(effects) == {"soil", "plots"}
    alone = compare(place / "first", place / "soil")["sum"]
    assert {name: effects["soil"][name] for name in alone} == alone
    assert effects["plots"]["gone"] + effects["plots"]["new"] > 0
    assert found["effects_unknown_because"] is None


def test_an_input_that_has_changed_since_cannot_tell_what_did_it(place: Path, tmp_path: Path) -> None:
    shutil.copytree(place, tmp_path / "moved")
    with (tmp_path / "moved" / "rain.csv").open("a") as file:
        file.write("2024-01-01,3.0\n")
    found = compare(tmp_path / "moved" / "first", tmp_path / "moved" / "both")
    assert found["effects"] == []
    assert "rain.csv is not beside the results as it was" in found["effects_unknown_because"]
    assert found["plots"]


def test_a_folder_without_results_is_refused(place: Path, tmp_path: Path) -> None:
    with pytest.raises(InputError, match="is no results folder"):
        compare(place / "first", tmp_path)
