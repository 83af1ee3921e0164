"""The demo place is what its script invents, and it holds what its page says."""

import importlib.util
from functools import cache
from pathlib import Path
from types import ModuleType

import numpy as np
import pandas as pd

from siting.inputs import read_dem, read_rain
from siting.notes import Notes
from siting.runoff import hydrological_years, yearly_totals
from siting.tables import curve_number
from siting.terrain import Terrain, analyse

DEMO = Path(__file__).parents[2] / "demo_dem"


@cache
def script() -> ModuleType:
    spec = importlib.util.spec_from_file_location("make_demo", DEMO / "make_demo.py")
    assert spec is not None and spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@cache
def terrain() -> Terrain:
    dem = read_dem(DEMO / "dem.tif", notes=Notes())
    return analyse(dem, vertical_error_m=1.0, channel_area_m2=50_000.0, pan_min_area_m2=10_000.0, pan_layer=None, threads=2)


def test_the_script_makes_the_ground_that_lies_beside_it() -> None:
    ground = read_dem(DEMO / "dem.tif", notes=Notes()).values
    # rounding to a centimetre may fall the other way on another processor, and then a rill may take another way
    assert float(np.mean(np.abs(ground - script().elevation()) < 0.011)) > 0.999


def test_the_script_makes_the_rain_and_cover_that_lie_beside_it() -> None:
    daily = script().weather()
    pd.testing.assert_frame_equal(daily[["date", "rain_mm"]], pd.read_csv(DEMO / "rain.csv"), atol=0.11)
    assert set(np.unique(script().cover_codes())) == set(pd.read_csv(DEMO / "cover_table.csv")["map_value"])


def test_rain_is_that_of_dry_country() -> None:
    rain = read_rain(DEMO / "rain.csv", notes=Notes())
    years = hydrological_years(rain, starts_month=None, max_missing=0.05, notes=Notes())
    totals = yearly_totals(rain.as_dry_mm, rain.days, years)
    assert years.labels.size == 34
    assert 150 < totals.mean() < 250
    assert rain.rain_mm.max() < 120


def test_two_pans_and_a_bank_hold_water() -> None:
    pans = terrain().pans
    for east, north, *_ in script().PANS:
        row, col = terrain().grid.cell(script().WEST_M + east, script().NORTH_M - script().SIZE_M + north)
        number = int(pans.label[row, col])
        assert pans.status[number - 1] == "kept"
    (east, south), (_, north) = script().ROAD
    bank = np.zeros(terrain().grid.shape, dtype=np.bool_)
    top, left = terrain().grid.cell(script().WEST_M + east - 400, script().NORTH_M - script().SIZE_M + north)
    low, right = terrain().grid.cell(script().WEST_M + east + 400, script().NORTH_M - script().SIZE_M + south)
    bank[top:low, left:right] = True
    assert np.any(terrain().filled[bank] > terrain().elevation[bank] + 0.5) or np.any(pans.label[bank] > 0)


def test_every_cell_drains_and_no_water_is_lost() -> None:
    ground = terrain()
    ends = (ground.direction == 9) | (ground.direction == 10)
    assert not np.any(ground.direction == 0)
    assert ground.contributing_area_m2[ends].sum() == ground.grid.cell_area_m2.sum() * ground.grid.cols


def test_every_cover_of_the_demo_has_a_curve_number() -> None:
    for row in pd.read_csv(DEMO / "cover_table.csv", keep_default_na=False).itertuples():
        number = curve_number(
            str(row.cover), condition=str(row.condition) or None, treatment=str(row.treatment) or None, soil_group="C"
        )
        assert 50 < number.curve_number < 95
