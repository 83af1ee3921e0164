import sqlite3
import xml.etree.ElementTree as ET
from contextlib import closing
from pathlib import Path

import pytest

from siting.layers.model import Class, Classes, Column, Layer
from siting.layers.rasters import RASTERS
from siting.layers.vectors import LAYERS, layer
from siting.outputs.embedded_styles import viewer_style
from siting.outputs.geopackage import write_geopackage
from siting.outputs.styles import sld_text, vector_sld, write_styles

SLD = "{http://www.opengis.net/sld}"
OGC = "{http://www.opengis.net/ogc}"
# Order of elements in a rule and in a polygon symbol: OGC 02-070, Styled Layer Descriptor 1.0, from memory.
RULE = ["Name", "Title", "Abstract", "Filter", "PolygonSymbolizer", "LineSymbolizer", "PointSymbolizer", "RasterSymbolizer"]


def names(element: ET.Element) -> list[str]:
    return [child.tag.split("}")[1] for child in element]


def test_every_layer_and_raster_has_a_style_with_its_name(tmp_path: Path) -> None:
    files = write_styles(tmp_path / "styles")
    wanted = [item.name for item in LAYERS if item.geometry != "none"] + [item.name for item in RASTERS]
    assert [file.stem for file in files] == wanted
    for file in files:
        root = ET.parse(file).getroot()
        assert root.tag == f"{SLD}StyledLayerDescriptor"
        assert root.findtext(f"{SLD}NamedLayer/{SLD}Name") == file.stem
        for rule in root.iter(f"{SLD}Rule"):
            places = [RULE.index(name) for name in names(rule)]
            assert places == sorted(places)


def test_rules_are_the_classes_with_labels_and_colours(tmp_path: Path) -> None:
    write_styles(tmp_path, ["plots"])
    assert [file.name for file in tmp_path.iterdir()] == ["plots.sld"]
    root = ET.parse(tmp_path / "plots.sld").getroot()
    titles = [rule.findtext(f"{SLD}Title") for rule in root.iter(f"{SLD}Rule")]
    assert titles == [
        "under half of the need",
        "half to three quarters",
        "three quarters to all",
        "the whole need",
        "unknown",
    ]
    assert [item.text for item in root.iter(f"{OGC}Literal")] == ["0", "0.5", "0.5", "0.75", "0.75", "1", "1"]
    assert len(list(root.iter(f"{OGC}PropertyIsNull"))) == 1


def test_a_raster_of_codes_has_one_colour_for_each_code(tmp_path: Path) -> None:
    write_styles(tmp_path, ["why_not"])
    entries = list(ET.parse(tmp_path / "why_not.sld").getroot().iter(f"{SLD}ColorMapEntry"))
    assert [entry.get("quantity") for entry in entries] == [str(code) for code in range(13)]
    assert entries[5].get("label") == "pan"


def test_colours_of_heights_run_over_the_range_given(tmp_path: Path) -> None:
    write_styles(tmp_path, ["elevation_conditioned_m"], ranges={"elevation_conditioned_m": (1200.0, 1280.0)})
    entries = list(ET.parse(tmp_path / "elevation_conditioned_m.sld").getroot().iter(f"{SLD}ColorMapEntry"))
    assert [entry.get("quantity") for entry in entries] == ["1200", "1220", "1240", "1260", "1280"]
    assert entries[0].get("label") == "1200 m"


def test_text_is_escaped_in_every_style() -> None:
    evil = "<script>&\"'"
    classes = Classes("evil", (Class(evil.replace("'", ""), evil, "#112233", evil),))
    item = Layer("evil", "Point", evil, evil, (Column("kind", "", "text", "Kind", "kind", classes),), classes, "kind")
    for text in (sld_text(vector_sld(item)), viewer_style(item, "marker")):
        assert "<script>" not in text
        assert "&lt;script&gt;&amp;" in text
        ET.fromstring(text)
    assert next(ET.fromstring(sld_text(vector_sld(item))).iter(f"{SLD}Rule")).findtext(f"{SLD}Title") == evil


@pytest.fixture(scope="module")
def styles(tmp_path_factory: pytest.TempPathFactory) -> list[tuple[str, str, str, int, str]]:
    path = tmp_path_factory.mktemp("styles") / "siting.gpkg"
    write_geopackage(path, {}, "EPSG:32636")
    query = "SELECT f_table_name, styleQML, styleSLD, useAsDefault, update_time FROM layer_styles"
    with closing(sqlite3.connect(path)) as database:
        assert database.execute("SELECT data_type FROM gpkg_contents WHERE table_name = 'layer_styles'").fetchall() == [
            ("attributes",)
        ]
        return database.execute(query).fetchall()


def test_each_layer_with_a_geometry_carries_one_default_style(styles: list[tuple[str, str, str, int, str]]) -> None:
    assert [row[0] for row in styles] == [
        item.name for item in LAYERS if item.geometry != "none" and item.name != "villages"
    ]
    assert {row[3] for row in styles} == {1}
    assert len({row[4] for row in styles}) == 1


def test_embedded_rules_point_to_symbols_that_exist(styles: list[tuple[str, str, str, int, str]]) -> None:
    for _, text, sld, _, _ in styles:
        renderer = ET.fromstring(text).find("renderer-v2")
        assert renderer is not None
        symbols = [symbol.get("name") for symbol in renderer.iter("symbol")]
        rules = list(renderer.iter("rule"))
        assert [rule.get("symbol") for rule in rules] == symbols
        titles = [rule.findtext(f"{SLD}Title") for rule in ET.fromstring(sld.encode()).iter(f"{SLD}Rule")]
        assert [rule.get("label") for rule in rules] == titles
        assert len({rule.get("key") for rule in rules}) == len(rules)


def test_a_column_of_true_and_false_is_drawn_by_its_truth() -> None:
    # compared with 1, such a column matched no rule in a desktop viewer that was tried
    item = layer("catchments")
    filters = [rule.get("filter") for rule in ET.fromstring(viewer_style(item, "fill")).iter("rule")]
    assert filters == ['NOT "open_catchment"', '"open_catchment"', '"open_catchment" IS NULL']
    # the first rule is that of a closed catchment: known, and not true
    assert [element.findtext(f"{OGC}Literal") for element in vector_sld(item).iter(f"{OGC}PropertyIsNotEqualTo")] == [
        "true",
        "false",
    ]
