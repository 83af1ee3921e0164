"""From heights to drainage: fill, flow direction, contributing area, slope, wetness, position, pans."""

from siting.terrain.analyse import Terrain, analyse
from siting.terrain.area import accumulate, multiple_flow_area
from siting.terrain.channel_lines import ChannelLines, channel_lines
from siting.terrain.channels import channel_cells, height_above_channel_m, landscape_position
from siting.terrain.condition import Conditioned, condition
from siting.terrain.downstream import any_above, first_below, flow_path, highest_above
from siting.terrain.edges import enclosed_voids, open_sides, sides_feeding
from siting.terrain.given import follow
from siting.terrain.pans import Pans, find_pans
from siting.terrain.surface import profile_curvature, slope, wetness_index

__all__ = [
    "ChannelLines",
    "Conditioned",
    "Pans",
    "Terrain",
    "accumulate",
    "analyse",
    "any_above",
    "channel_cells",
    "channel_lines",
    "condition",
    "enclosed_voids",
    "find_pans",
    "first_below",
    "flow_path",
    "follow",
    "height_above_channel_m",
    "highest_above",
    "landscape_position",
    "multiple_flow_area",
    "open_sides",
    "profile_curvature",
    "sides_feeding",
    "slope",
    "wetness_index",
]
