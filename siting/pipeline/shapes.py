"""Results as layers: shapes around cells, along the flow, and as they were given."""

from typing import Any

import geopandas as gpd
import numpy as np
import numpy.typing as npt
import pandas as pd

from siting.layers import layer
from siting.outputs import line_from_cells, point_from_cell, polygon_from_mask, polygons_from_labels
from siting.pipeline.read import Place
from siting.pipeline.sites import Sites
from siting.plots import catchment_cells, distances_m, overflow_path
from siting.terrain import Terrain, channel_lines
from siting.terrain.edges import SIDES


def plots_layer(frame: pd.DataFrame, sites: Sites, ground: Terrain) -> gpd.GeoDataFrame:
    """Outline the plots along their cells; best rank first."""
    outlines = polygons_from_labels(sites.plots.label, ground.grid)
    columns = [column.name for column in layer("plots").columns if column.name in frame]
    shapes = [outlines[number] for number in frame["plot_id"]]
    found = gpd.GeoDataFrame(frame[columns], geometry=shapes, crs=ground.grid.crs)
    return found.sort_values(["rank", "plot_id"], na_position="last", ignore_index=True)


def catchments_layer(frame: pd.DataFrame, sites: Sites, ground: Terrain) -> gpd.GeoDataFrame:
    """Outline what drains onto each plot; NULL where nothing does."""
    shapes = []
    for plot in range(sites.plots.count):
        cells = catchment_cells(sites.cells, plot, label=sites.plots.label, direction=ground.direction)
        shapes.append(_outline(cells, ground) if cells.size else None)
    sides = [";".join(name for place, name in enumerate(SIDES) if bits >> place & 1) or None for bits in frame["open_bits"]]
    columns = {
        "plot_id": frame["plot_id"],
        "area_m2": frame["catchment_area_m2"],
        "open_catchment": frame["open_catchment"],
        "open_sides": sides,
        "extend_m": np.where(frame["open_catchment"], _extend_m(sites.catchments.longest_path_m), np.nan),
    }
    return gpd.GeoDataFrame(columns, geometry=shapes, crs=ground.grid.crs)


def _extend_m(longest_path_m: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    """Return how far to extend the data above an open catchment: as far again, in steps of 100 m."""
    return np.asarray(np.maximum(np.ceil(longest_path_m / 100.0), 1.0) * 100.0)


def _outline(cells: npt.NDArray[np.int64], ground: Terrain) -> Any:
    row, col = np.divmod(cells, ground.grid.cols)
    row0, col0 = int(row.min()), int(col.min())
    mask = np.zeros((int(row.max()) - row0 + 1, int(col.max()) - col0 + 1), dtype=np.bool_)
    mask[row - row0, col - col0] = True
    return polygon_from_mask(row0, col0, mask, ground.grid)


def intakes_layer(sites: Sites, ground: Terrain) -> gpd.GeoDataFrame:
    """Give the place where most run-on enters each plot; NULL where none does."""
    cells, area = sites.catchments.intake_cell, sites.catchments.intake_area_m2
    shapes = [point_from_cell(int(cell), ground.grid) if cell >= 0 else None for cell in cells]
    return gpd.GeoDataFrame({"plot_id": sites.plot_id, "contributing_area_m2": area}, geometry=shapes, crs=ground.grid.crs)


def overflow_layer(sites: Sites, ground: Terrain, place: Place) -> gpd.GeoDataFrame:
    """Follow what each plot spills to the edge of the property, a pan, or the end of the data."""
    stop = ground.pans.kept_mask()
    if place.inside is not None:
        stop |= ~place.inside
    grid = ground.grid
    shapes, metres = [], []
    for cell in sites.catchments.exit_cell:
        path = overflow_path(int(cell), direction=ground.direction, stop=stop)
        far = distances_m(path, cell_width_m=grid.cell_width_m, cell_height_m=grid.cell_height_m, cols=grid.cols)
        shapes.append(line_from_cells(path, grid))
        metres.append(far[-1] if path.size > 1 else np.nan)
    return gpd.GeoDataFrame({"plot_id": sites.plot_id, "length_m": metres}, geometry=shapes, crs=ground.grid.crs)


def channels_layer(ground: Terrain) -> gpd.GeoDataFrame:
    """Draw the drainage lines from heads and confluences down."""
    lines = channel_lines(ground.channel, ground.direction, ground.contributing_area_m2)
    ends = zip(lines.start[:-1], lines.start[1:], strict=True)
    shapes = [line_from_cells(lines.cells[first:last], ground.grid) for first, last in ends]
    columns = {"contributing_area_m2": lines.contributing_area_m2}
    return gpd.GeoDataFrame(columns, geometry=shapes, crs=ground.grid.crs)


def pans_layer(ground: Terrain) -> gpd.GeoDataFrame:
    """Outline the pans that end the flow, and the doubtful ones."""
    pans = ground.pans
    outlines = polygons_from_labels(pans.label, ground.grid) if pans.pan_id.size else {}
    columns = {
        "pan_id": pans.pan_id,
        "area_m2": pans.area_m2,
        "depth_m": pans.depth_m,
        "volume_m3": pans.volume_m3,
        "status": list(pans.status),
    }
    shapes = [outlines[int(number)] for number in pans.pan_id]
    return gpd.GeoDataFrame(columns, geometry=shapes, crs=ground.grid.crs)
