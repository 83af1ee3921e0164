"""Runs as a user starts them: the demo, a project of flags alone, and inputs that are wrong, each with its code."""

import json
import shutil
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import rasterio
from affine import Affine
from click.testing import CliRunner, Result

from siting_cli.main import group

DEMO = Path(__file__).parents[2] / "demo_dem"


def call(*arguments: str) -> Result:
    return CliRunner().invoke(group, list(arguments))


@pytest.fixture(scope="module")
def place(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Cut a corner of 300 x 300 cells from the demo's ground, with its weather."""
    folder = tmp_path_factory.mktemp("place")
    with rasterio.open(DEMO / "dem.tif") as file:
        heights = file.read(1, window=((100, 400), (350, 650))) * file.scales[0]
        corner = (file.transform.c + 3500, file.transform.f - 1000)
        crs = file.crs
    write(folder / "dem.tif", heights, corner, crs)
    for name in ("rain.csv", "climate.csv", "villages.csv"):
        shutil.copy(DEMO / name, folder / name)
    return folder


def write(path: Path, heights: np.ndarray, corner: tuple[float, float], crs: object, **extra: object) -> Path:
    with rasterio.open(
        path, "w", driver="GTiff", height=heights.shape[0], width=heights.shape[1], count=1, dtype="float32", crs=crs,
        transform=Affine(10, 0, corner[0], 0, -10, corner[1]), **extra,
    ) as file:  # fmt: skip
        file.write(heights.astype(np.float32), 1)
    return path


def flags(place: Path, **changed: str) -> list[str]:
    given = {
        "dem": str(place / "dem.tif"),
        "rain": str(place / "rain.csv"),
        "climate": str(place / "climate.csv"),
        "crop": "barley",
        "planting": "11-15",
        "cover": "desert shrub",
        "condition": "poor",
        "texture": "loam",
    } | changed
    return [part for name, value in given.items() if value for part in (f"--{name}", value)]


def test_a_run_on_flags_alone_tells_plots_reasons_assumptions_and_cautions(place: Path, tmp_path: Path) -> None:
    result = call("run", *flags(place), "--out", str(tmp_path / "out"))
    assert result.exit_code == 0, result.output
    assert "plots, the best 5 first" in result.stdout
    assert "can be cropped" in result.stdout
    assert "licensed practice" in result.stdout
    assert "No layer of roads, houses or fields was given" in result.stdout
    assert f"Results in {tmp_path / 'out'}" in result.stdout
    assert (tmp_path / "out" / "siting.gpkg").exists()


def test_the_same_as_json_with_a_project_file_and_hostile_names(place: Path, tmp_path: Path) -> None:
    folder = tmp_path / "a place"
    shutil.copytree(place, folder)
    villages = pd.read_csv(folder / "villages.csv")
    villages.loc[0, "name"], villages.loc[1, "name"] = "=cmd|'/c'!A1", "<script>alert(1)</script>"
    villages["rank"] = "a rank of their own"
    villages.to_csv(folder / "villages.csv", index=False)
    (folder / "project.toml").write_text(
        '[place]\ntitle = "<b>Ünder & over</b>"\ndem = "dem.tif"\n[rain]\ndaily = "rain.csv"\n'
        '[climate]\ndaily = "climate.csv"\n[crop]\nname = "barley"\nplanting = "11-15"\n[cover]\ncurve_number = 85\n'
        '[soil]\ntexture = "loam"\n[villages]\nfile = "villages.csv"\n[output]\nrasters = false\n'
    )
    result = call("run", str(folder), "--json", "--threads", "1")
    assert result.exit_code == 0, result.output
    summary = json.loads(result.stdout)
    assert summary["n_plots"] == len(summary["plots"]) > 5
    assert [one["rank"] for one in summary["plots"][:3]] == [1, 2, 3]
    import pyogrio

    found = pyogrio.read_dataframe(folder / "results" / "siting.gpkg", layer="villages")
    assert found["name"].tolist()[:2] == ["=cmd|'/c'!A1", "<script>alert(1)</script>"]
    assert (found["given_rank"] == "a rank of their own").all()
    assert not (folder / "results" / "rasters").exists()
    again = call("run", str(folder))
    assert again.exit_code == 3
    assert "give --overwrite" in again.stderr
    assert call("run", str(folder), "--overwrite", "--strict").exit_code == 4  # a warning was given


def test_check_tells_the_inputs_and_writes_nothing(place: Path) -> None:
    before = sorted(path.name for path in place.iterdir())
    result = call("check", *flags(place))
    assert result.exit_code == 0, result.output
    for words in ("300 x 300", "UTM zone 36N", "complete years: 34", "CN 77", "memory, GB"):
        assert words in result.stdout
    assert sorted(path.name for path in place.iterdir()) == before


def test_check_says_before_any_work_that_catchments_will_be_open(place: Path, tmp_path: Path) -> None:
    with rasterio.open(place / "dem.tif") as file:
        west, south, east, north = file.bounds
    corners = [[west + 100, south + 300], [east - 1500, south + 300], [east - 1500, north], [west + 100, north]]
    shape = {"type": "Polygon", "coordinates": [[*corners, corners[0]]]}
    crs = {"type": "name", "properties": {"name": "urn:ogc:def:crs:EPSG::32636"}}
    feature = {"type": "Feature", "properties": {}, "geometry": shape}
    text = json.dumps({"type": "FeatureCollection", "crs": crs, "features": [feature]})
    (tmp_path / "b.geojson").write_text(text)
    result = call("check", *flags(place, boundary=str(tmp_path / "b.geojson")))
    assert result.exit_code == 0, result.output
    assert "N 0 m, S 300 m, W 100 m beyond it" in result.stderr
    assert "extend it to 1414 m" in result.stderr
    assert "E, m: 1500" in result.stdout


Spoil = Callable[[Path, Path], dict[str, str]]


def _dem(change: Callable[[np.ndarray], np.ndarray], *, crs: object = "EPSG:32636", **extra: object) -> Spoil:
    def spoil(place: Path, folder: Path) -> dict[str, str]:
        with rasterio.open(place / "dem.tif") as file:
            heights, corner = file.read(1), (file.transform.c, file.transform.f)
        return {"dem": str(write(folder / "dem.tif", change(heights), corner, crs, **extra))}

    return spoil


def _truncated(place: Path, folder: Path) -> dict[str, str]:
    whole = (place / "dem.tif").read_bytes()
    (folder / "dem.tif").write_bytes(whole[: len(whole) // 2])
    return {"dem": str(folder / "dem.tif")}


def _renamed(place: Path, folder: Path) -> dict[str, str]:
    shutil.copy(place / "rain.csv", folder / "dem.tif")
    return {"dem": str(folder / "dem.tif")}


def _empty(_: Path, folder: Path) -> dict[str, str]:
    (folder / "dem.tif").write_bytes(b"")
    return {"dem": str(folder / "dem.tif")}


def _boundary_elsewhere(_: Path, folder: Path) -> dict[str, str]:
    text = '{"type": "Polygon", "coordinates": [[[10, 50], [10.1, 50], [10.1, 50.1], [10, 50]]]}'
    (folder / "b.geojson").write_text(text)
    return {"boundary": str(folder / "b.geojson")}


def _rain(change: Callable[[pd.DataFrame], pd.DataFrame]) -> Spoil:
    def spoil(place: Path, folder: Path) -> dict[str, str]:
        change(pd.read_csv(place / "rain.csv")).to_csv(folder / "rain.csv", index=False)
        return {"rain": str(folder / "rain.csv")}

    return spoil


@pytest.mark.parametrize(
    ("spoil", "words"),
    [
        (_truncated, "cannot be read"),
        (_renamed, "cannot be read as a raster"),
        (_empty, "cannot be read as a raster"),
        (_dem(lambda z: np.full_like(z, -9999.0), nodata=-9999.0), "no height"),
        (_dem(lambda z: np.where(z < 500, -9999.0, z)), "-9999"),
        (_dem(lambda z: z, crs=None), "CRS"),
        (_dem(lambda z: z, crs="EPSG:4326"), "outside the range of the CRS"),
        (_boundary_elsewhere, "does not meet the DEM"),
        (_rain(lambda r: r.head(200)), "no complete year"),
        (_rain(lambda r: r.assign(rain_mm=-1.0)), "-1"),
        (_rain(lambda r: r.drop(columns="date")), "two columns at least"),
    ],
)
def test_wrong_inputs_end_with_one_sentence_and_code_3(place: Path, tmp_path: Path, spoil: Spoil, words: str) -> None:
    result = call("run", *flags(place, **spoil(place, tmp_path)), "--out", str(tmp_path / "out"))
    assert result.exit_code == 3, result.output
    errors = [line for line in result.stderr.splitlines() if line.startswith("Error")]
    assert len(errors) == 1
    assert words in errors[0]
    assert "Traceback" not in result.output
    assert not (tmp_path / "out").exists()
    assert not list(tmp_path.glob(".out*"))


@pytest.mark.parametrize(
    ("spoil", "words"),
    [
        (_dem(lambda z: np.full_like(z, 500.0)), "level"),
        (_dem(lambda z: np.where(np.arange(90_000).reshape(300, 300) % 3041 == 0, np.nan, z)), "holes"),
        (_rain(lambda r: r.drop(index=range(2000, 2100))), "too many days are missing"),
    ],
)
def test_doubtful_inputs_run_and_are_warned_of(place: Path, tmp_path: Path, spoil: Spoil, words: str) -> None:
    result = call("run", *flags(place, **spoil(place, tmp_path)), "--out", str(tmp_path / "out"))
    assert result.exit_code == 0, result.output
    assert words in result.stderr


def test_the_demo_runs_from_an_empty_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    result = call("demo")
    assert result.exit_code == 0, result.output
    assert "it is invented" in result.stderr
    assert (tmp_path / "siting-demo" / "results" / "siting.gpkg").exists()
