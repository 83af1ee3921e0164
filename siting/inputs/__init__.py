"""Files in, values out: read, converted or refused in one sentence."""

from siting.inputs.climate import read_climate
from siting.inputs.dem import read_dem
from siting.inputs.directions import read_flow_direction
from siting.inputs.maps import CodeMap, is_raster, read_map, read_meanings, read_raster_on_grid
from siting.inputs.rain import read_rain, read_rain_stations
from siting.inputs.rain_zones import read_rain_zones
from siting.inputs.soil import SoilInputs, SoilMap, read_soil
from siting.inputs.soil_kinds import SoilKind
from siting.inputs.stations import Stations, nearest_station, read_stations
from siting.inputs.vectors import (
    cells_of_shapes,
    read_boundary,
    read_exclusions,
    read_given_plots,
    read_pan_layer,
    read_villages,
)

__all__ = [
    "CodeMap",
    "SoilInputs",
    "SoilKind",
    "SoilMap",
    "Stations",
    "cells_of_shapes",
    "is_raster",
    "nearest_station",
    "read_boundary",
    "read_climate",
    "read_dem",
    "read_exclusions",
    "read_flow_direction",
    "read_given_plots",
    "read_map",
    "read_meanings",
    "read_pan_layer",
    "read_rain",
    "read_rain_stations",
    "read_rain_zones",
    "read_raster_on_grid",
    "read_soil",
    "read_stations",
    "read_villages",
]
