"""Geometries of a layer as a GeoPackage stores them: one declared type, two dimensions, valid, in one CRS."""

from typing import Any

import geopandas as gpd
import numpy as np
import numpy.typing as npt
import pyproj
import shapely
from shapely.geometry import MultiLineString, MultiPoint, MultiPolygon

from siting.errors import OutputError
from siting.layers.model import Layer

Shapes = npt.NDArray[Any]

_MULTI: dict[str, Any] = {"Polygon": MultiPolygon, "LineString": MultiLineString, "Point": MultiPoint}


def stored_geometry(table: gpd.GeoDataFrame, layer: Layer, crs: str) -> tuple[Shapes, str]:
    """
    Check the geometries of a table and return them with their declared type.

    Polygons become multipolygons where the layer asks for that; missing stays missing. Raises OutputError where the
    table lies in another CRS, a geometry is of another type, or a polygon is not valid.
    """
    if table.crs is None or pyproj.CRS.from_user_input(crs) != table.crs:
        msg = f"{layer.name} lies in {table.crs and table.crs.name}, the results in {pyproj.CRS.from_user_input(crs).name}: "
        msg += "bring both to one CRS"
        raise OutputError(msg)
    shapes = shapely.force_2d(np.asarray(table.geometry.array, dtype=object))
    if layer.geometry == "as given":
        return _common_type(shapes)
    if layer.geometry == "MultiPolygon":
        shapes = _promoted(shapes, "Polygon")
    wrong = {shape.geom_type for shape in shapes if shape is not None} - {layer.geometry}
    if wrong:
        msg = f"{layer.name} must hold {layer.geometry} alone, not {', '.join(sorted(wrong))}"
        raise OutputError(msg)
    broken = [shape for shape in shapes if shape is not None and not shape.is_valid]
    if broken:
        msg = f"{layer.name} holds a geometry that is not valid: {shapely.is_valid_reason(broken[0])}"
        raise OutputError(msg)
    return shapes, layer.geometry


def _promoted(shapes: Shapes, kind: str) -> Shapes:
    found = [_MULTI[kind]([shape]) if shape is not None and shape.geom_type == kind else shape for shape in shapes]
    return _objects(found)


def _common_type(shapes: Shapes) -> tuple[Shapes, str]:
    """Find the one type that holds all: single, multi, or any where the user's file mixes them."""
    kinds = {shape.geom_type for shape in shapes if shape is not None}
    if not kinds:
        return shapes, "Point"
    for single in ("Point", "LineString", "Polygon"):
        if kinds == {single} and single != "Polygon":
            return shapes, single
        if kinds <= {single, f"Multi{single}"}:
            return _promoted(shapes, single), f"Multi{single}"
    return shapes, "Unknown"


def _objects(shapes: list[Any]) -> Shapes:
    array = np.empty(len(shapes), dtype=object)
    array[:] = shapes
    return array
