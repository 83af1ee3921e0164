"""Results out: GeoPackage, rasters, styles, run record, and the folder that holds them."""

from siting.outputs.cog import azimuth_deg, write_cog
from siting.outputs.geopackage import write_geopackage
from siting.outputs.polygons import line_from_cells, point_from_cell, polygon_from_mask, polygons_from_labels
from siting.outputs.run_record import file_hashes, sha256, write_run_record
from siting.outputs.staging import StagedFolder
from siting.outputs.styles import write_styles

__all__ = [
    "StagedFolder",
    "azimuth_deg",
    "file_hashes",
    "line_from_cells",
    "point_from_cell",
    "polygon_from_mask",
    "polygons_from_labels",
    "sha256",
    "write_cog",
    "write_geopackage",
    "write_run_record",
    "write_styles",
]
