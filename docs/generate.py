"""
Write the pages on layers and on settings from what the program itself declares.

Run `python docs/generate.py` after a change to `siting/layers` or to `siting/config/defaults.toml`; a test compares.
"""

from collections.abc import Iterable
from pathlib import Path

from siting.config.defaults import Default, defaults, sections
from siting.layers import LAYERS, RASTERS, Classes, Column, Layer, RasterDefinition

DOCS = Path(__file__).parent

MADE = "*Made from the program by `docs/generate.py`: change it there.*"

LAYERS_HEAD = f"""\
# What a run writes

{MADE}

`siting.gpkg` holds the layers and tables below, and its own styles. `rasters/` holds one GeoTIFF for each raster, on the
cells of the elevation model. `styles/` holds the same styles as SLD files. `run.json` says what was run on what: settings,
versions, checksums, assumptions, warnings, and the seconds and memory of each stage.

Unknown is NULL, or the raster's nodata value; it is never 0. Layers are in the CRS of the elevation model. Areas and
lengths are ground metres whatever the CRS. Columns tell of each plot alone, as if no other were built,
but for `set_order` and `set_yield_median_m3`; villages rest on the set.
"""

SETTINGS_HEAD = f"""\
# Settings

{MADE}

A project file is TOML: a section in brackets, then lines of `name = value`. `siting new FOLDER` writes one that holds every
setting with a comment. Paths are relative to the file. An unknown name is refused, and all mistakes are told at once.

Only `place.dem` must be given. What else is left out is either unknown in the results or stands on a default, and every
default that says something about the place is listed among the assumptions. On the command line, `--set
section.name=value` wins over the file.
"""


def layers_page() -> str:
    """Return the page on layers, rasters and codes."""
    parts = [LAYERS_HEAD, "\n## Layers and tables\n", *(_layer(layer) for layer in LAYERS)]
    parts += ["\n## Rasters\n", _rasters(), "\n## Codes and classes\n", *(_classes(classes) for classes in _class_lists())]
    return "".join(parts)


def settings_page() -> str:
    """Return the page on settings."""
    return SETTINGS_HEAD + "".join(_section(name) for name in sections())


def _table(head: tuple[str, ...], rows: Iterable[tuple[str, ...]]) -> str:
    lines = [head, tuple("---" for _ in head), *rows]
    return "\n" + "".join("| " + " | ".join(cell.replace("|", "\\|") for cell in line) + " |\n" for line in lines)


def _layer(layer: Layer) -> str:
    kind = "a table" if layer.geometry == "none" else layer.geometry
    drawn = f", drawn by `{layer.styled_by}`" if layer.styled_by else ""
    rows = (_column(column) for column in layer.columns)
    return f"\n### {layer.name}\n\n{_sentence(layer.description)} ({kind}{drawn})\n" + _table(
        ("column", "unit", "type", "meaning"), rows
    )


def _column(column: Column) -> tuple[str, ...]:
    # a list of codes has its own table below
    meaning = column.description.partition(". ")[0] if column.many else column.description
    if column.classes is not None:
        meaning += f"; see [{column.classes.name}](#{column.classes.name})"
    return f"`{column.name}`", column.unit, column.kind, meaning


def _rasters() -> str:
    rows = ((f"`{one.name}`", one.unit, one.dtype, f"{one.nodata:g}", _raster_meaning(one)) for one in RASTERS)
    return _table(("raster", "unit", "type", "nodata", "meaning"), rows)


def _raster_meaning(raster: RasterDefinition) -> str:
    if raster.style in _class_lists():
        return f"{raster.title.lower()}; see [{raster.style.name}](#{raster.style.name})"
    return raster.description


def _class_lists() -> list[Classes]:
    """Return each list of codes once: those of columns, then those that layers and rasters are drawn by."""
    found = [column.classes for layer in LAYERS for column in layer.columns if column.classes is not None]
    found += [layer.style for layer in LAYERS if layer.style is not None and layer.styled_by]
    found += [raster.style for raster in RASTERS if not raster.is_measure and raster.name != "flow_direction_deg"]
    return list({classes.name: classes for classes in found}.values())


def _classes(classes: Classes) -> str:
    first = "from" if classes.by_size else "code"
    rows = ((f"`{one.value}`", one.label, one.colour, one.sentence) for one in classes.items)
    return f"\n### {classes.name}\n" + _table((first, "label", "colour", "meaning"), rows)


def _section(name: str) -> str:
    rows = (_setting(default) for default in defaults().values() if default.section == name)
    return f"\n## {name}\n" + _table(("setting", "default", "unit", "what it is"), rows)


def _setting(default: Default) -> tuple[str, ...]:
    words = [default.text]
    if default.value is None:
        words.append(f"If left out: {default.otherwise}.")
    if default.source and not default.quiet:
        words.append(f"Default from: {default.source}.")
    if default.effect and not default.quiet:
        words.append(f"It moves: {default.effect}.")
    if default.only_with:
        words.append(f"Only with `{default.only_with}`.")
    if default.example:
        words.append(f"Such as `{default.example}`.")
    return f"`{default.name}`", _value(default.value), default.unit, " ".join(words)


def _value(value: object) -> str:
    if value is None:
        return ""
    if isinstance(value, bool):
        return f"`{str(value).lower()}`"
    return f"`{value:.15g}`" if isinstance(value, float) else f'`"{value}"`' if isinstance(value, str) else f"`{value}`"


def _sentence(text: str) -> str:
    return text[0].upper() + text[1:]


PAGES = {"layers.md": layers_page, "settings.md": settings_page}

if __name__ == "__main__":
    for page, make in PAGES.items():
        (DOCS / page).write_text(make(), encoding="utf-8", newline="\n")
