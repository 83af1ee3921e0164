"""In how many years, and in which order."""

from siting.ranking.exceedance import dependable, exceedance
from siting.ranking.supply import catchment_ratio, supply_order

__all__ = ["catchment_ratio", "dependable", "exceedance", "supply_order"]
