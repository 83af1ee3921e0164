"""In how many years, and in which order."""

from siting.ranking.exceedance import dependable, exceedance, plotting_position, return_period_years
from siting.ranking.ratio import SufficientRatio, catchment_ratio, sufficient_ratio
from siting.ranking.supply import mean_capped_ratio, supply_order

__all__ = [
    "SufficientRatio",
    "catchment_ratio",
    "dependable",
    "exceedance",
    "mean_capped_ratio",
    "plotting_position",
    "return_period_years",
    "sufficient_ratio",
    "supply_order",
]
