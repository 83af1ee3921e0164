"""What the read-me tells of the demo is what a run of it says."""

import re
from pathlib import Path

import pyogrio
import pytest

from siting.config import load_project
from siting.pipeline import run

ROOT = Path(__file__).parents[2]
DEMO = ROOT / "demo_dem" / "project.toml"


@pytest.fixture(scope="module")
def text() -> str:
    return " ".join((ROOT / "README.md").read_text(encoding="utf-8").split())


def test_figures_of_the_demo_are_those_of_a_run(text: str, tmp_path: Path) -> None:
    results = run(load_project(DEMO, ("output.rasters=false",)), out=tmp_path / "results", threads=2)
    best = results.summary["plots"][0]
    told = re.search(
        r"The best of its (\d+) plots, ([\d.]+) ha below ([\d.]+) ha of catchment, would reach the target yield in (\d+) "
        r"% of the seasons, and on rain alone in (\d+) %\. Its rank lies between (\d+) and (\d+):",
        text,
    )
    assert told is not None
    plots = pyogrio.read_dataframe(tmp_path / "results" / "siting.gpkg", layer="plots", where="rank = 1")
    assert told.groups() == (
        str(results.summary["n_plots"]),
        f"{best['area_m2'] / 1e4:.2f}",
        f"{plots['catchment_area_m2'].item() / 1e4:.1f}",
        f"{best['reliability_pct']:.0f}",
        f"{best['rain_only_reliability_pct']:.0f}",
        str(best["rank_low"]),
        str(best["rank_high"]),
    )


def test_the_picture_is_there_and_light(text: str) -> None:
    (picture,) = re.findall(r"!\[[^]]+\]\(([^)]+)\)", text)
    assert (ROOT / picture).stat().st_size < 300_000
