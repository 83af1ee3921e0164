"""
The style table that desktop viewers read from a GeoPackage.

Exchange only: element and attribute names are those that these viewers expect, the classes are ours.
"""

import sqlite3
import xml.etree.ElementTree as ET
from collections.abc import Sequence

from siting.layers.model import Class, Classes, Layer
from siting.outputs.styles import EDGE, HATCH, sld_text, vector_sld

_TABLE = """
CREATE TABLE layer_styles (id INTEGER PRIMARY KEY AUTOINCREMENT NOT NULL, f_table_catalog TEXT(256),
  f_table_schema TEXT(256), f_table_name TEXT(256), f_geometry_column TEXT(256), styleName TEXT(30), styleQML TEXT,
  styleSLD TEXT, useAsDefault BOOLEAN, description TEXT, owner TEXT(30), ui TEXT(30),
  update_time DATETIME DEFAULT (strftime('%Y-%m-%dT%H:%M:%fZ','now')))
"""
_CONTENTS = "INSERT INTO gpkg_contents (table_name, data_type, identifier, description, last_change) VALUES (?, ?, ?, ?, ?)"
_STYLE = (
    "INSERT INTO layer_styles (f_table_catalog, f_table_schema, f_table_name, f_geometry_column, styleName, styleQML,"
    " styleSLD, useAsDefault, description, owner, ui, update_time) VALUES ('', '', ?, 'geom', ?, ?, ?, 1, ?, '', NULL, ?)"
)

_SYMBOL_OF = {"MultiPolygon": "fill", "LineString": "line", "MultiLineString": "line"}


def write_embedded_styles(database: sqlite3.Connection, layers: Sequence[tuple[Layer, str | None]], date: str) -> None:
    """Write one default style for each layer with its geometry type; all of them carry the same date."""
    database.execute(_TABLE)
    database.execute(_CONTENTS, ("layer_styles", "attributes", "Layer styles", "how each layer is drawn", date))
    for layer, geometry in layers:
        text = viewer_style(layer, _SYMBOL_OF.get(geometry or "", "marker"))
        sld = sld_text(vector_sld(layer))
        database.execute(_STYLE, (layer.name, layer.name, text, sld, layer.description, date))


def viewer_style(layer: Layer, symbol: str) -> str:
    """Return the style of a layer in the form that the table holds; `symbol` is fill, line or marker."""
    root = ET.Element("qgis", {"version": "3.22.0", "styleCategories": "Symbology"})
    renderer = ET.SubElement(root, "renderer-v2", {"type": "RuleRenderer", "symbollevels": "0", "enableorderby": "0"})
    rules = ET.SubElement(renderer, "rules", {"key": f"{{{layer.name}}}"})
    symbols = ET.SubElement(renderer, "symbols")
    style = layer.style or Classes(layer.name, (Class("", layer.title, HATCH),))
    items = [*style.items] if style.unknown is None else [*style.items, style.unknown]
    for place, item in enumerate(items):
        rule = {"key": f"{{{layer.name}_{place}}}", "symbol": str(place), "label": item.label}
        if layer.styled_by:
            rule["filter"] = _filter(layer, style, place)
        ET.SubElement(rules, "rule", rule)
        _symbol(symbols, symbol, item, place)
    ET.indent(root)
    return "<!DOCTYPE qgis>\n" + ET.tostring(root, encoding="unicode") + "\n"


def _filter(layer: Layer, style: Classes, place: int) -> str:
    column = f'"{layer.styled_by}"'
    if place == len(style.items):
        return f"{column} IS NULL"
    value = style.items[place].value
    if style.by_size:
        upper = f" AND {column} < {style.items[place + 1].value}" if place + 1 < len(style.items) else ""
        return f"{column} >= {value}{upper}"
    if layer[layer.styled_by].kind == "bool":  # these viewers hold true equal to neither 1 nor 'true'
        return column if value == "true" else f"NOT {column}"
    return f"{column} = '{value}'"


def _symbol(symbols: ET.Element, kind: str, item: Class, place: int) -> None:
    symbol = ET.SubElement(symbols, "symbol", {"type": kind, "name": str(place), "alpha": "1", "clip_to_extent": "1"})
    if kind == "fill":
        _layer(symbol, "SimpleFill", color=_rgba(item.colour, 204), outline_color=_rgba(EDGE), outline_width="0.2")
        if item.hatch:
            _layer(symbol, "LinePatternFill", angle="45", distance="2", line_width="0.26", color=_rgba(HATCH))
    elif kind == "line":
        width = f"{0.3 + 0.2 * place:g}"
        dashes = "dash" if item.hatch else "solid"
        _layer(symbol, "SimpleLine", line_color=_rgba(item.colour), line_width=width, line_style=dashes)
    else:
        shape = "square" if item.hatch else "circle"
        _layer(symbol, "SimpleMarker", name=shape, color=_rgba(item.colour), outline_color=_rgba(EDGE), size="2.6")


def _layer(symbol: ET.Element, kind: str, /, **properties: str) -> None:
    layer = ET.SubElement(symbol, "layer", {"class": kind, "enabled": "1", "locked": "0", "pass": "0"})
    for key, value in properties.items():
        ET.SubElement(layer, "prop", {"k": key, "v": value})


def _rgba(colour: str, opacity: int = 255) -> str:
    return ",".join(str(int(colour[at : at + 2], 16)) for at in (1, 3, 5)) + f",{opacity}"
