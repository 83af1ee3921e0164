"""In how many years, and in which order."""

from siting.ranking.exceedance import dependable, exceedance, plotting_position, return_period_years
from siting.ranking.ratio import SufficientRatio, catchment_ratio, sufficient_ratio
from siting.ranking.reliability import Reliability, reliability, wilson_interval
from siting.ranking.score import COMPONENTS, Components, Score, score, score_components, score_order
from siting.ranking.supply import mean_capped_ratio, supply_order
from siting.ranking.supported_area import SupportedArea, supported_area

__all__ = [
    "COMPONENTS",
    "Components",
    "Reliability",
    "Score",
    "SufficientRatio",
    "SupportedArea",
    "catchment_ratio",
    "dependable",
    "exceedance",
    "mean_capped_ratio",
    "plotting_position",
    "reliability",
    "return_period_years",
    "score",
    "score_components",
    "score_order",
    "sufficient_ratio",
    "supply_order",
    "supported_area",
    "wilson_interval",
]
