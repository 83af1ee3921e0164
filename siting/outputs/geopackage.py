"""The GeoPackage of a run: every layer with its full schema, titles, units, classes and styles."""

import sqlite3
from collections.abc import Iterator, Mapping
from contextlib import closing, contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pandas as pd
import pyogrio
import pyogrio.errors
import pyogrio.raw
import shapely

from siting.errors import OutputError, one_line
from siting.layers.model import Column, Layer
from siting.layers.vectors import LAYERS
from siting.outputs.columns import Stored, empty_column, given_columns, given_values, stored_column
from siting.outputs.embedded_styles import write_embedded_styles
from siting.outputs.geometries import Shapes, stored_geometry
from siting.outputs.schema_tables import write_schema_tables

Table = pd.DataFrame
"""A table of rows; a GeoDataFrame where the layer has a geometry."""

FIXED_DATE = "2000-01-01T00:00:00.000Z"
"""Written wherever the format asks when something changed, so that two runs give the same bytes."""


@dataclass(frozen=True, slots=True, eq=False)
class Written:
    """One layer as it stands in the file: its columns with those given by the user, and its geometry type."""

    layer: Layer
    columns: tuple[Column, ...]
    geometry: str | None


def write_geopackage(path: Path, tables: Mapping[str, Table | None], crs: str) -> None:
    """
    Write all layers of a run into one GeoPackage 1.3; the same tables give the same bytes.

    Parameters
    ----------
    path
        File to write; it must not exist.
    tables
        Rows by name of layer. A layer without a table is written empty, a missing column is NULL in every row.
        `villages` is left out unless given; its columns beyond our own come first, as text where they are no numbers.
    crs
        WKT2 or `EPSG:` code of all layers.

    Raises
    ------
    OutputError
        Where the file exists or cannot be written, a layer or column is unknown, or a value does not fit its column.
    """
    if path.exists():
        msg = f"{path.name} exists already; choose another folder"
        raise OutputError(msg)
    known = {layer.name for layer in LAYERS}
    for name in tables:
        if name not in known:
            msg = f"layer {name!r} is unknown; known are {', '.join(layer.name for layer in LAYERS)}"
            raise OutputError(msg)
    try:
        with _fixed_date():
            written = [_write_layer(path, layer, tables.get(layer.name), crs) for layer in LAYERS if _wanted(layer, tables)]
        _finish(path, written)
    except (pyogrio.errors.DataSourceError, sqlite3.Error, OSError) as error:
        msg = f"{path.name} cannot be written: {one_line(error)}; is there room on the disk, and may you write there?"
        raise OutputError(msg) from error


def _wanted(layer: Layer, tables: Mapping[str, Table | None]) -> bool:
    return layer.name != "villages" or tables.get(layer.name) is not None


@contextmanager
def _fixed_date() -> Iterator[None]:
    before = pyogrio.get_gdal_config_option("OGR_CURRENT_DATE")
    pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": FIXED_DATE})
    try:
        yield
    finally:
        pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": before})


def _write_layer(path: Path, layer: Layer, table: Table | None, crs: str) -> Written:
    columns, stored, rows = _fields(layer, table)
    geometry, kind = _geometry(layer, table, rows, crs)
    pyogrio.raw.write(
        str(path),
        geometry,
        [values for values, _ in stored],
        np.array([column.name for column in columns], dtype=object),
        field_mask=[null for _, null in stored],
        layer=layer.name,
        driver="GPKG",
        geometry_type=kind,
        crs=crs if kind else None,
        encoding="UTF-8",
        append=False,
        dataset_options=None if path.exists() else {"VERSION": "1.3"},
        layer_options=_layer_options(layer, kind),
    )
    return Written(layer, columns, kind)


def _layer_options(layer: Layer, kind: str | None) -> dict[str, str]:
    options = {"FID": "fid", "IDENTIFIER": layer.title, "DESCRIPTION": layer.description}
    return options | {"GEOMETRY_NAME": "geom"} if kind else options


def _fields(layer: Layer, table: Table | None) -> tuple[tuple[Column, ...], list[Stored], int]:
    if table is None:
        return layer.columns, [empty_column(column, 0) for column in layer.columns], 0
    geometry = table.geometry.name if isinstance(table, gpd.GeoDataFrame) else None
    given = given_columns(table, layer, geometry)
    if given and layer.geometry != "as given":
        msg = f"{layer.name} has no column {next(iter(given))!r}; every column is declared once, in siting/layers"
        raise OutputError(msg)
    stored = [stored_column(given_values(table[name], column.kind), column, layer.name) for name, column in given.items()]
    for column in layer.columns:
        missing = column.name not in table.columns
        stored.append(empty_column(column, len(table)) if missing else stored_column(table[column.name], column, layer.name))
    return (*given.values(), *layer.columns), stored, len(table)


def _geometry(layer: Layer, table: Table | None, rows: int, crs: str) -> tuple[Any, str | None]:
    if layer.geometry == "none":
        return None, None
    if table is None:
        return np.empty(0, dtype=object), layer.geometry
    if not isinstance(table, gpd.GeoDataFrame):
        msg = f"{layer.name} came without geometries; give {rows} rows of {layer.geometry}"
        raise OutputError(msg)
    shapes: Shapes
    shapes, kind = stored_geometry(table, layer, crs)
    return shapely.to_wkb(shapes), kind


def _finish(path: Path, written: list[Written]) -> None:
    """Add what describes the columns and how to draw them, then lay out the file anew: the last two steps fix its bytes."""
    with closing(sqlite3.connect(path, isolation_level=None)) as database:
        database.execute("PRAGMA journal_mode = DELETE")
        database.execute("BEGIN")
        write_schema_tables(database, [(item.layer.name, item.columns) for item in written])
        write_embedded_styles(database, [(item.layer, item.geometry) for item in written if item.geometry], FIXED_DATE)
        database.execute("COMMIT")
        database.execute("VACUUM")
