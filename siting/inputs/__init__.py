"""Files in, values out: read, converted or refused in one sentence."""

from siting.inputs.checksum import sha256_of
from siting.inputs.climate import read_climate
from siting.inputs.dem import read_dem
from siting.inputs.maps import CodeMap, is_raster, read_map, read_meanings, read_raster_on_grid
from siting.inputs.rain import read_rain
from siting.inputs.vectors import (
    read_boundary,
    read_exclusions,
    read_given_plots,
    read_pan_layer,
    read_villages,
)

__all__ = [
    "CodeMap",
    "is_raster",
    "read_boundary",
    "read_climate",
    "read_dem",
    "read_exclusions",
    "read_given_plots",
    "read_map",
    "read_meanings",
    "read_pan_layer",
    "read_rain",
    "read_raster_on_grid",
    "read_villages",
    "sha256_of",
]
