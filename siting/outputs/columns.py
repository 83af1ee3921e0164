"""From table columns to what a GeoPackage stores: checked, typed, NULL where unknown."""

import re
import unicodedata
from typing import Any

import numpy as np
import numpy.typing as npt
import pandas as pd

from siting.errors import OutputError
from siting.layers.model import Column, Kind, Layer

Stored = tuple[npt.NDArray[Any], npt.NDArray[np.bool_]]
"""Values, and True where they are NULL."""

RESERVED = ("fid", "geom", "geometry")


def stored_column(series: "pd.Series[Any]", column: Column, layer: str) -> Stored:
    """
    Check one column and return its values and where they are NULL.

    None, NaN, NA and NaT are NULL. Raises OutputError where a value is infinite, not whole in a column of whole
    numbers, not a text in a column of texts, or not among the classes of the column.
    """
    where = f"{layer}.{column.name}"
    try:
        values, null = _CONVERT[column.kind](series)
    except (TypeError, ValueError, OverflowError) as error:
        msg = f"{where} must hold {_MEANING[column.kind]}: {error}"
        raise OutputError(msg) from error
    if column.kind == "float64" and bool(np.isinf(values).any()):
        msg = f"{where} holds an infinite number; leave it NULL where it is unknown"
        raise OutputError(msg)
    if column.classes is not None and column.kind == "text":
        _check_classes(values[~null], column, where)
    return values, null


def empty_column(column: Column, rows: int) -> Stored:
    """Return a column of NULLs."""
    return _CONVERT[column.kind](pd.Series([None] * rows, dtype="object"))[0], np.ones(rows, dtype=np.bool_)


def _integers(series: "pd.Series[Any]") -> Stored:
    numbers = pd.to_numeric(series).astype("Int64")
    return numbers.to_numpy(dtype=np.int64, na_value=0), numbers.isna().to_numpy()


def _floats(series: "pd.Series[Any]") -> Stored:
    values = pd.to_numeric(series).astype("Float64").to_numpy(dtype=np.float64, na_value=np.nan)
    return values, np.isnan(values)


def _booleans(series: "pd.Series[Any]") -> Stored:
    values = series.astype("boolean")
    return values.to_numpy(dtype=np.bool_, na_value=False), values.isna().to_numpy()


def _texts(series: "pd.Series[Any]") -> Stored:
    null = series.isna().to_numpy(dtype=np.bool_)
    values = np.empty(len(series), dtype=object)
    for place, value in enumerate(series):
        if null[place]:
            continue
        if not isinstance(value, str) or "\0" in value:
            msg = f"row {place} holds {value!r}"
            raise ValueError(msg)
        values[place] = value
    return values, null


def _dates(series: "pd.Series[Any]") -> Stored:
    moments = pd.to_datetime(series)
    if bool((moments.dropna() != moments.dropna().dt.normalize()).any()):
        msg = "a value has a time of day"
        raise ValueError(msg)
    values = moments.to_numpy(dtype="datetime64[D]")
    return values, np.isnat(values)


_CONVERT = {"int64": _integers, "float64": _floats, "bool": _booleans, "text": _texts, "date": _dates}
_MEANING: dict[Kind, str] = {
    "int64": "whole numbers",
    "float64": "numbers",
    "bool": "true or false",
    "text": "text",
    "date": "days",
}


def _check_classes(texts: npt.NDArray[Any], column: Column, where: str) -> None:
    known = column.classes.values if column.classes else ()
    for text in dict.fromkeys(texts):
        for code in text.split(";") if column.many else [text]:
            if code not in known:
                msg = f"{where} holds {code!r}; known are {', '.join(known)}"
                raise OutputError(msg)


def given_columns(table: pd.DataFrame, layer: Layer, geometry: str | None) -> dict[str, Column]:
    """
    Describe the columns of a table that are not the layer's own: those that came with the user's file.

    Returns them by their name in the table. Their names in the file are ASCII lower_snake and differ from all others;
    the title keeps the name as given.
    """
    own = {column.name for column in layer.columns}
    taken = own | set(RESERVED)
    found: dict[str, Column] = {}
    for name in table.columns:
        if name in own or name == geometry:
            continue
        new = _free_name(_snake(str(name)), taken)
        taken.add(new)
        found[name] = Column(new, "", _kind(table[name]), str(name), "as given with the file")
    return found


def _snake(name: str) -> str:
    """Write a name in ASCII lower_snake; letters without an ASCII form are left out."""
    plain = unicodedata.normalize("NFKD", name).encode("ascii", "ignore").decode()
    snake = re.sub(r"[^a-z0-9]+", "_", plain.lower()).strip("_")
    return snake if snake and snake[0].isalpha() else f"given_{snake}".rstrip("_")


def _free_name(name: str, taken: set[str]) -> str:
    """Return the name, or one like it that nobody has."""
    if name not in taken:
        return name
    prefixed = f"given_{name}" if not name.startswith("given") else name
    number, free = 2, prefixed
    while free in taken:
        free, number = f"{prefixed}_{number}", number + 1
    return free


def _kind(series: "pd.Series[Any]") -> Kind:
    if pd.api.types.is_bool_dtype(series):
        return "bool"
    if pd.api.types.is_integer_dtype(series) and series.dtype != np.uint64:
        return "int64"
    if pd.api.types.is_float_dtype(series):
        return "float64"
    return "text"


def given_values(series: "pd.Series[Any]", kind: Kind) -> "pd.Series[Any]":
    """Turn a column of the user's into its kind: whatever is neither number nor truth goes in as text."""
    if kind != "text":
        return series
    texts = [None if missing else str(value) for value, missing in zip(series, series.isna(), strict=True)]
    return pd.Series(texts, dtype="object", index=series.index)
