"""From heights to drainage: fill, flow direction, contributing area, slope, wetness."""
