"""Styles as OGC Styled Layer Descriptors 1.0, one file for each layer and raster."""

import xml.etree.ElementTree as ET
from collections.abc import Iterable, Mapping
from pathlib import Path

from siting.layers.model import Class, Classes, Layer, RasterDefinition
from siting.layers.rasters import RASTERS
from siting.layers.vectors import LAYERS

_SLD = "http://www.opengis.net/sld"
_OGC = "http://www.opengis.net/ogc"

EDGE = "#2b2622"
HATCH = "#8a7f70"


def write_styles(
    folder: Path, names: Iterable[str] | None = None, *, ranges: Mapping[str, tuple[float, float]] | None = None
) -> list[Path]:
    """
    Write `<name>.sld` for every layer with a geometry and every raster, or for those named alone.

    `ranges` gives the lowest and highest value between which the colours of a measure run, by name of raster: heights
    differ too much from place to place for one fixed ramp. Makes the folder; returns the files in order.
    """
    folder.mkdir(parents=True, exist_ok=True)
    wanted = None if names is None else set(names)
    spans = ranges or {}
    trees = {layer.name: vector_sld(layer) for layer in LAYERS if layer.geometry != "none"}
    trees |= {item.name: raster_sld(item, spans.get(item.name)) for item in RASTERS}
    files = []
    for name, tree in trees.items():
        if wanted is None or name in wanted:
            files.append(folder / f"{name}.sld")
            files[-1].write_text(sld_text(tree), encoding="utf-8", newline="\n")
    return files


def sld_text(tree: ET.Element) -> str:
    """Return the document as text, indented, with its declaration."""
    ET.register_namespace("", _SLD)
    ET.register_namespace("ogc", _OGC)
    ET.indent(tree)
    return '<?xml version="1.0" encoding="UTF-8"?>\n' + ET.tostring(tree, encoding="unicode") + "\n"


def vector_sld(layer: Layer) -> ET.Element:
    """Return the style of a vector layer: one rule for each class, and one for unknown values."""
    root, rules = _document(layer.name, layer.title)
    style = layer.style or Classes(layer.name, (Class("", layer.title, "#8a7f70"),))
    for place, item in enumerate(style.items):
        rule = _rule(rules, f"{layer.name}_{place}", item)
        if layer.styled_by:
            _filter(rule, layer, style, place)
        _symbolise(rule, layer, item, place)
    if style.unknown is not None:
        rule = _rule(rules, f"{layer.name}_unknown", style.unknown)
        null = ET.SubElement(ET.SubElement(rule, f"{{{_OGC}}}Filter"), f"{{{_OGC}}}PropertyIsNull")
        ET.SubElement(null, f"{{{_OGC}}}PropertyName").text = layer.styled_by
        _symbolise(rule, layer, style.unknown, 0)
    return root


def raster_sld(definition: RasterDefinition, span: tuple[float, float] | None = None) -> ET.Element:
    """Return the style of a raster: a colour at each code or value, its label beside it."""
    root, rules = _document(definition.name, definition.title)
    rule = _rule(rules, definition.name, Class("", definition.title))
    colours = ET.SubElement(_sub(rule, "RasterSymbolizer"), f"{{{_SLD}}}ColorMap")
    unit = f" {definition.unit}" if definition.unit not in ("", "1") and definition.is_measure else ""
    for value, item in zip(_stops(definition.style, span), definition.style.items, strict=True):
        label = f"{value}{unit}" if definition.is_measure else item.label
        _sub(colours, "ColorMapEntry", color=item.colour, quantity=value, label=label)
    return root


def _stops(style: Classes, span: tuple[float, float] | None) -> list[str]:
    """Return the values at which colours stand, stretched to the span where one is given."""
    if span is None:
        return list(style.values)
    low, high = float(style.values[0]), float(style.values[-1])
    share = [(float(value) - low) / (high - low) for value in style.values]
    return [f"{span[0] + part * (span[1] - span[0]):.6g}" for part in share]


def _sub(parent: ET.Element, name: str, text: str = "", /, **attributes: str) -> ET.Element:
    element = ET.SubElement(parent, f"{{{_SLD}}}{name}", attributes)
    if text:
        element.text = text
    return element


def _document(name: str, title: str) -> tuple[ET.Element, ET.Element]:
    root = ET.Element(f"{{{_SLD}}}StyledLayerDescriptor", {"version": "1.0.0"})
    layer = _sub(root, "NamedLayer")
    _sub(layer, "Name", name)
    style = _sub(layer, "UserStyle")
    _sub(style, "Name", name)
    _sub(style, "Title", title)
    _sub(style, "IsDefault", "1")
    return root, _sub(style, "FeatureTypeStyle")


def _rule(rules: ET.Element, name: str, item: Class) -> ET.Element:
    rule = _sub(rules, "Rule")
    _sub(rule, "Name", name)
    _sub(rule, "Title", item.label)
    if item.sentence:
        _sub(rule, "Abstract", item.sentence)
    return rule


def _filter(rule: ET.Element, layer: Layer, style: Classes, place: int) -> None:
    parent, column = ET.SubElement(rule, f"{{{_OGC}}}Filter"), layer.styled_by
    if layer[column].kind == "bool":
        _truth(parent, column, style.items[place].value)
        return
    if not style.by_size:
        _compare(parent, "PropertyIsEqualTo", column, style.items[place].value)
        return
    if place + 1 < len(style.items):
        parent = ET.SubElement(parent, f"{{{_OGC}}}And")
        _compare(parent, "PropertyIsGreaterThanOrEqualTo", column, style.items[place].value)
        _compare(parent, "PropertyIsLessThan", column, style.items[place + 1].value)
        return
    _compare(parent, "PropertyIsGreaterThanOrEqualTo", column, style.items[place].value)


def _truth(parent: ET.Element, column: str, value: str) -> None:
    """Ask for true as known and not false: readers that ask the file, where true is 1, find nothing equal to `true`."""
    both = ET.SubElement(parent, f"{{{_OGC}}}And")
    null = ET.SubElement(ET.SubElement(both, f"{{{_OGC}}}Not"), f"{{{_OGC}}}PropertyIsNull")
    ET.SubElement(null, f"{{{_OGC}}}PropertyName").text = column
    _compare(both, "PropertyIsNotEqualTo", column, "false" if value == "true" else "true")


def _compare(parent: ET.Element, test: str, column: str, value: str) -> None:
    element = ET.SubElement(parent, f"{{{_OGC}}}{test}")
    ET.SubElement(element, f"{{{_OGC}}}PropertyName").text = column
    ET.SubElement(element, f"{{{_OGC}}}Literal").text = value


def _symbolise(rule: ET.Element, layer: Layer, item: Class, place: int) -> None:
    if layer.geometry == "MultiPolygon":
        _fill(_sub(rule, "PolygonSymbolizer"), item)
        if item.hatch:
            _hatch(_sub(rule, "PolygonSymbolizer"))
    elif layer.geometry == "LineString":
        _stroke(_sub(rule, "LineSymbolizer"), item.colour, 1.0 + 0.7 * place, dashed=item.hatch)
    else:  # points, and villages given as areas: drawn at their middle
        _mark(_sub(_sub(rule, "PointSymbolizer"), "Graphic"), "square" if item.hatch else "circle", item.colour, 9)


def _fill(symbol: ET.Element, item: Class) -> None:
    fill = _sub(symbol, "Fill")
    _sub(fill, "CssParameter", item.colour, name="fill")
    _sub(fill, "CssParameter", "0.8", name="fill-opacity")
    _stroke(symbol, EDGE, 0.5)


def _hatch(symbol: ET.Element) -> None:
    graphic = _sub(_sub(_sub(symbol, "Fill"), "GraphicFill"), "Graphic")
    _mark(graphic, "x", HATCH, 6)


def _mark(graphic: ET.Element, shape: str, colour: str, size: int) -> None:
    mark = _sub(graphic, "Mark")
    _sub(mark, "WellKnownName", shape)
    _sub(_sub(mark, "Fill"), "CssParameter", colour, name="fill")
    _stroke(mark, EDGE if shape != "x" else colour, 0.5)
    _sub(graphic, "Size", str(size))


def _stroke(symbol: ET.Element, colour: str, width: float, *, dashed: bool = False) -> None:
    stroke = _sub(symbol, "Stroke")
    _sub(stroke, "CssParameter", colour, name="stroke")
    _sub(stroke, "CssParameter", f"{width:g}", name="stroke-width")
    if dashed:
        _sub(stroke, "CssParameter", "6 4", name="stroke-dasharray")
