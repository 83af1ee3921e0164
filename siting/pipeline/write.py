"""The results folder: layers, styles, rasters, and the run record."""

import platform
from collections.abc import Mapping
from importlib.metadata import version
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import numpy.typing as npt
import pandas as pd

from siting.config import Project
from siting.layers import layer, raster
from siting.layers.cautions import GENERAL_CAUTIONS
from siting.notes import Notes
from siting.outputs import azimuth_deg, file_hashes, sha256, write_cog, write_geopackage, write_run_record, write_styles
from siting.outputs.run_record import RUN_RECORD
from siting.pipeline.case import Case
from siting.pipeline.clock import Clock
from siting.pipeline.runoff import daily_runoff_mm
from siting.pipeline.together import Together, told_set
from siting.progress import Progress
from siting.ranking import dependable
from siting.runoff import yearly_totals
from siting.terrain import Terrain

GEOPACKAGE = "siting.gpkg"
InputFiles = Mapping[str, Mapping[str, str]]

LIBRARIES = ("numpy", "numba", "pandas", "geopandas", "pyogrio", "rasterio", "pyproj", "shapely", "pydantic")


def write_layers(folder: Path, tables: Mapping[str, pd.DataFrame | None], ground: Terrain) -> None:
    """Write the GeoPackage, and the styles beside it."""
    write_geopackage(folder / GEOPACKAGE, tables, ground.grid.crs)
    heights = float(np.nanmin(ground.filled)), float(np.nanmax(ground.filled))
    write_styles(folder / "styles", ranges={"elevation_conditioned_m": heights} if heights[0] < heights[1] else None)


def notes_tables(notes: Notes, info: dict[str, str]) -> dict[str, pd.DataFrame]:
    """Return the tables of assumptions and of what was run; the warnings are part of the second."""
    columns = [column.name for column in layer("assumptions").columns]
    assumed = [[getattr(one, name) for name in columns] for one in notes.assumptions]
    said = {f"warning {place}: {one.code}": one.text for place, one in enumerate(notes.warnings, start=1)}
    cautions = {f"caution {place}": sentence for place, sentence in enumerate(GENERAL_CAUTIONS, start=1)}
    return {
        "assumptions": pd.DataFrame(assumed, columns=columns),
        "run_info": pd.DataFrame(
            {"key": [*info, *said, *cautions], "value": [*info.values(), *said.values(), *cautions.values()]}
        ),
    }


def run_info(case: Case, together: Together | None, inputs: InputFiles) -> dict[str, str]:
    """Say what was run on what; nothing of when, or on which machine."""
    settings, grid, weather = case.settings, case.place.dem.grid, case.weather
    found = {
        "title": settings.place.title,
        "siting version": version("siting"),
        "elevation model": settings.place.dem.name,
        "elevation model sha256": inputs["place.dem"]["sha256"],
        "cells": f"{grid.rows} rows x {grid.cols} columns, {grid.typical_cell_m:.4g} m",
        "plots": str(case.sites.plots.count),
        "order": f"by {settings.ranking.order}",
        "abstraction ratio": f"{settings.runoff.abstraction_ratio:g}",
        "dependable year": f"reached in {100 * settings.ranking.dependable:g} % of years",
    }
    if weather is not None:
        labels = weather.years.labels
        found["rain years"] = f"{labels.size} complete, {labels[0]} to {labels[-1]}, from month {weather.years.starts_month}"
    if weather is not None and weather.crops:
        found["seasons"] = str(weather.seasons.label.size)
    if together is not None:
        found["set"] = told_set(together, case.sites)
    return found


def write_rasters(folder: Path, case: Case, progress: Progress) -> None:
    """Write every raster on the grid of the DEM, one after another: each is made when it is written."""
    folder.mkdir()
    ground, compression = case.ground, case.settings.output.compression
    makers: dict[str, Any] = {
        "elevation_conditioned_m": lambda: ground.filled,
        "slope_pct": lambda: np.float32(100.0) * ground.slope,
        "flow_direction_deg": lambda: azimuth_deg(ground.direction),
        "contributing_area_m2": lambda: np.where(ground.direction == 255, np.nan, ground.contributing_area_m2),
        "wetness_index": lambda: ground.wetness_index,
        "height_above_channel_m": lambda: ground.height_above_channel_m,
        "position": lambda: np.where(ground.position == 0, 255, ground.position).astype(np.uint8),
        "curve_number": lambda: np.where(ground.direction == 255, np.nan, case.cell_curve_number),
        "runoff_median_mm": lambda: _runoff_median_mm(case),
        "why_not": lambda: case.sites.plots.reason,
    }
    for done, (name, make) in enumerate(makers.items()):
        progress.stage("rasters", done, len(makers))
        write_cog(folder / f"{name}.tif", make(), ground.grid, raster(name), case.threads, compression=compression)


def _runoff_median_mm(case: Case) -> npt.NDArray[np.float32]:
    """Return each cell's runoff in the median year, by its class; NaN where it is not known."""
    classes, weather = case.classes, case.weather
    by_class = np.full(classes.count + 1, np.nan, dtype=np.float32)
    if weather is not None and classes.count:
        daily = daily_runoff_mm(case, weather, case.settings.runoff.abstraction_ratio)
        by_class[:-1] = dependable(yearly_totals(daily, weather.days, weather.years), probability=0.5)
    return by_class[np.minimum(classes.class_of_cell, classes.count)]


def write_record(folder: Path, case: Case, clock: Clock, summary: Mapping[str, Any], inputs: InputFiles) -> None:
    """Write the run record last: its outputs are those that stand in the folder."""
    record = {
        "title": case.settings.place.title,
        "settings": case.project.record(),
        "inputs": inputs,
        "versions": {"siting": version("siting"), "python": platform.python_version()}
        | {name: version(name) for name in LIBRARIES},
        "assumptions": case.notes.assumptions,
        "warnings": case.notes.warnings,
        "cautions": GENERAL_CAUTIONS,
        "stages": clock.record(),
        "threads": case.threads,
        "cells": summary["cells"],
        "plots": summary["n_plots"],
        "outputs": file_hashes(folder),
    }
    write_run_record(folder / RUN_RECORD, record)


def input_files(project: Project) -> InputFiles:
    """Return the name and the SHA-256 of every input: read whole once, and told in two places."""
    return {key: {"file": path.name, "sha256": sha256(path)} for key, path in _input_paths(project)}


def _input_paths(project: Project) -> list[tuple[str, Path]]:
    """Return every file that a setting names, by its key; one of a list by its place, from 1."""
    found: list[tuple[str, Path]] = []
    for key in project.origin:
        value = project.value(key)
        if isinstance(value, Path):
            found.append((key, value))
        elif isinstance(value, tuple):
            found += [(f"{key} {place}", one) for place, one in enumerate(value, start=1) if isinstance(one, Path)]
    return found


def plain_table(frame: gpd.GeoDataFrame | pd.DataFrame, names: tuple[str, ...]) -> list[dict[str, Any]]:
    """Return rows as mappings, best rank first, with None where nothing is known."""
    wanted = [name for name in names if name in frame]
    ordered = frame.sort_values(["rank", "plot_id"], na_position="last")[wanted]
    rows = [{name: _plain(value) for name, value in row.items()} for row in ordered.to_dict("records")]
    return [{name: row.get(name) for name in names} for row in rows]


def _plain(value: Any) -> Any:
    if value is None or value is pd.NA or (isinstance(value, float) and np.isnan(value)):
        return None
    return value.item() if isinstance(value, np.generic) else value
