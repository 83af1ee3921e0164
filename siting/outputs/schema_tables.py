"""The schema extension of a GeoPackage: titles, descriptions and class lists of columns."""

import sqlite3
from collections.abc import Iterable, Sequence

from siting.layers.model import Classes, Column

_DEFINITION = "http://www.geopackage.org/spec130/#extension_schema"

_TABLES = """
CREATE TABLE IF NOT EXISTS gpkg_extensions (table_name TEXT, column_name TEXT, extension_name TEXT NOT NULL,
  definition TEXT NOT NULL, scope TEXT NOT NULL, CONSTRAINT ge_tce UNIQUE (table_name, column_name, extension_name))
;
CREATE TABLE IF NOT EXISTS gpkg_data_columns (table_name TEXT NOT NULL, column_name TEXT NOT NULL, name TEXT, title TEXT,
  description TEXT, mime_type TEXT, constraint_name TEXT, CONSTRAINT pk_gdc PRIMARY KEY (table_name, column_name),
  CONSTRAINT gdc_tn UNIQUE (table_name, name))
;
CREATE TABLE IF NOT EXISTS gpkg_data_column_constraints (constraint_name TEXT NOT NULL, constraint_type TEXT NOT NULL,
  value TEXT, min NUMERIC, min_is_inclusive BOOLEAN, max NUMERIC, max_is_inclusive BOOLEAN, description TEXT,
  CONSTRAINT gdcc_ntv UNIQUE (constraint_name, constraint_type, value))
"""


def write_schema_tables(database: sqlite3.Connection, layers: Sequence[tuple[str, Sequence[Column]]]) -> None:
    """Write title, description with unit, and class list of every column; `name` is left NULL."""
    for statement in _TABLES.split(";"):
        database.execute(statement)
    database.executemany(
        "INSERT INTO gpkg_extensions VALUES (?, NULL, 'gpkg_schema', ?, 'read-write')",
        [("gpkg_data_columns", _DEFINITION), ("gpkg_data_column_constraints", _DEFINITION)],
    )
    classes: dict[str, Classes] = {}
    for layer, columns in layers:
        for column in columns:
            constraint = _enum(column)
            if constraint is not None:
                classes[constraint.name] = constraint
            database.execute(
                "INSERT INTO gpkg_data_columns VALUES (?, ?, NULL, ?, ?, NULL, ?)",
                (layer, column.name, titled(column), described(column), constraint.name if constraint else None),
            )
    _write_enums(database, classes.values())


def _enum(column: Column) -> Classes | None:
    """Return the class list that binds every value; a column of several codes is bound by its description alone."""
    return column.classes if column.kind == "text" and not column.many else None


def _write_enums(database: sqlite3.Connection, classes: Iterable[Classes]) -> None:
    for group in classes:
        for item in group.items:
            database.execute(
                "INSERT INTO gpkg_data_column_constraints VALUES (?, 'enum', ?, NULL, NULL, NULL, NULL, ?)",
                (group.name, item.value, f"{item.label}: {item.sentence}" if item.sentence else item.label),
            )


def titled(column: Column) -> str:
    """Return the title with the unit, as in `Plot area (m2)`; ratios, ids and texts have none."""
    return f"{column.title} ({column.unit})" if column.unit not in ("", "1") else column.title


def described(column: Column) -> str:
    """Return the description as a sentence that ends with the unit."""
    sentence = column.description[0].upper() + column.description[1:]
    unit = {"": "", "1": " Pure ratio."}.get(column.unit, f" Unit: {column.unit}.")
    return f"{sentence}.{unit}"
