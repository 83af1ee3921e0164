"""What a column, a layer, a raster and a class list say about themselves."""

from dataclasses import dataclass
from typing import Literal

Kind = Literal["int64", "float64", "text", "bool", "date"]
"""Types of columns; every one of them may be NULL, which means unknown or not applicable."""

Geometry = Literal["Point", "LineString", "MultiPolygon", "as given", "none"]


@dataclass(frozen=True, slots=True)
class Class:
    """
    One class: the value in the data, its label, its colour, and a plain sentence.

    `value` is the code itself, or for classes by size (`Classes.by_size`) the lower limit of the class as text.
    `hatch` marks a class that is drawn with a pattern, so that it differs by more than its colour.
    """

    value: str
    label: str
    colour: str = ""
    sentence: str = ""
    hatch: bool = False


@dataclass(frozen=True, slots=True)
class Classes:
    """A list of classes under one name; with `by_size` each class runs from its value to the next one's."""

    name: str
    items: tuple[Class, ...]
    by_size: bool = False
    unknown: Class | None = None

    @property
    def values(self) -> tuple[str, ...]:
        """The codes, in order."""
        return tuple(item.value for item in self.items)

    def __getitem__(self, value: str | int) -> Class:
        for item in self.items:
            if item.value == str(value):
                return item
        raise KeyError(value)


@dataclass(frozen=True, slots=True)
class Column:
    """
    One column of a vector layer.

    `unit` is "" for text, ids and counts, and "1" for pure ratios. With `classes` the text is one of their values;
    with `many` it is any number of them, joined by semicolons.
    """

    name: str
    unit: str
    kind: Kind
    title: str
    description: str
    classes: Classes | None = None
    many: bool = False


@dataclass(frozen=True, slots=True)
class Layer:
    """
    One vector layer or table: its columns in order, and by which of them it is drawn.

    `styled_by` names the column that `style` classifies; "" draws all features as the first class of `style`.
    """

    name: str
    geometry: Geometry
    title: str
    description: str
    columns: tuple[Column, ...]
    style: Classes | None = None
    styled_by: str = ""

    def __getitem__(self, name: str) -> Column:
        for column in self.columns:
            if column.name == name:
                return column
        raise KeyError(name)


@dataclass(frozen=True, slots=True)
class RasterDefinition:
    """
    One raster: how it is stored, and how it is drawn.

    `overview` is the way in which coarser views are made; "max" keeps the largest value, so that channels stay
    visible. `style` holds the classes, or for measures the values at which its colours stand (between two of them the
    colour runs over). `is_measure` is False for codes, of which a mean would mean nothing.
    """

    name: str
    unit: str
    dtype: Literal["float32", "uint8", "uint16"]
    nodata: float
    overview: Literal["average", "mode", "max"]
    title: str
    description: str
    style: Classes
    is_measure: bool
