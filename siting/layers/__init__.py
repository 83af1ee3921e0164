"""Every output column, raster and code: name, unit, type, meaning, colour."""

from siting.layers.codes import (
    CAUTIONS,
    CHANNEL_SIZES,
    FAILURES,
    LIMITS,
    OPEN_CATCHMENT,
    ORIGINS,
    PAN_STATUSES,
    POSITION_CODES,
    POSITIONS,
    SOIL_GROUPS,
    SUPPLY_CLASSES,
    TEXTURE_CLASSES,
    VILLAGE_STATUSES,
    WHY_NOT,
)
from siting.layers.model import Class, Classes, Column, Kind, Layer, RasterDefinition
from siting.layers.rasters import RASTERS, raster
from siting.layers.vectors import LAYERS, layer

__all__ = [
    "CAUTIONS",
    "CHANNEL_SIZES",
    "FAILURES",
    "LAYERS",
    "LIMITS",
    "OPEN_CATCHMENT",
    "ORIGINS",
    "PAN_STATUSES",
    "POSITIONS",
    "POSITION_CODES",
    "RASTERS",
    "SOIL_GROUPS",
    "SUPPLY_CLASSES",
    "TEXTURE_CLASSES",
    "VILLAGE_STATUSES",
    "WHY_NOT",
    "Class",
    "Classes",
    "Column",
    "Kind",
    "Layer",
    "RasterDefinition",
    "layer",
    "raster",
]
