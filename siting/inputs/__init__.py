"""Files in, values out: read, converted or refused in one sentence."""

from siting.inputs.dem import read_dem
from siting.inputs.rain import read_rain

__all__ = ["read_dem", "read_rain"]
