"""The settings there are, each with its default and where that comes from; read from `defaults.toml`."""

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from types import MappingProxyType
from typing import Any


@dataclass(frozen=True, slots=True)
class Default:
    """
    One setting.

    `key` is `section.name`. `value` is None where there is no default; `otherwise` then says what happens.
    `source` and `effect` go with the default into the list of assumptions, unless `quiet`. `only_with` names
    the setting without which the default plays no part. `by_cell_size_m` are steps of (largest cell, value).
    """

    key: str
    text: str
    unit: str
    value: Any = None
    source: str = ""
    effect: str = ""
    otherwise: str = ""
    only_with: str = ""
    example: str = ""
    quiet: bool = False
    open: bool = False
    by_cell_size_m: tuple[tuple[float, float], ...] = ()

    @property
    def section(self) -> str:
        """The section of the project file."""
        return self.key.partition(".")[0]

    @property
    def name(self) -> str:
        """The name within the section."""
        return self.key.partition(".")[2]

    @property
    def may_be_path(self) -> bool:
        """Whether the value may name a file."""
        return self.unit.startswith("path")


@cache
def defaults() -> Mapping[str, Default]:
    """Return every setting by its key, in the order of the project file."""
    text = files("siting.config").joinpath("defaults.toml").read_text(encoding="utf-8")
    found = {}
    for section, settings in tomllib.loads(text).items():
        for name, fields in settings.items():
            steps = tuple((size, value) for size, value in fields.pop("by_cell_size_m", ()))
            key = f"{section}.{name}"
            found[key] = Default(key, **fields, by_cell_size_m=steps)
    return MappingProxyType(found)


def sections() -> tuple[str, ...]:
    """Return the sections of the project file in their order."""
    return tuple(dict.fromkeys(default.section for default in defaults().values()))


def default_vertical_error_m(cell_m: float) -> float:
    """Return the local vertical error (sd, m) that stands for a DEM with cells of `cell_m` where none is given."""
    steps = defaults()["place.vertical_error_m"].by_cell_size_m
    return next(value for largest, value in steps if cell_m <= largest)
