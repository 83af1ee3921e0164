"""Results of an earlier run, read back."""

import json
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import geopandas as gpd

from siting.errors import InputError

RECORD, LAYERS = "run.json", "siting.gpkg"


@dataclass(frozen=True, slots=True, eq=False)
class EarlierRun:
    """A results folder: its run record, and its plots."""

    folder: Path
    record: dict[str, Any]
    plots: gpd.GeoDataFrame


def read_results(folder: Path) -> EarlierRun:
    """Read the record and the plots of a results folder; InputError where it is none."""
    try:
        record = json.loads((folder / RECORD).read_text(encoding="utf-8"))
        settings = record["settings"]
    except (OSError, ValueError, KeyError, TypeError) as error:
        msg = f"{folder} is no results folder: it holds no readable {RECORD}; name the folder that a run has written"
        raise InputError(msg) from error
    if not isinstance(settings, dict):
        msg = f"{folder / RECORD} holds no settings; name the folder that a run has written"
        raise InputError(msg)
    try:
        plots = gpd.read_file(folder / LAYERS, layer="plots")
    except Exception as error:  # pyogrio and the drivers below it raise many kinds
        msg = f"{folder / LAYERS} cannot be read; run the project again"
        raise InputError(msg) from error
    return EarlierRun(folder, record, plots)
