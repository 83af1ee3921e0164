"""In how many years, and in which order."""

from siting.ranking.choice import ChosenSet, Guard, PlotForest, SetWater, choose_set, set_water
from siting.ranking.doubt import Doubt, Spread, draw_inputs, rank_doubt, weight_doubt
from siting.ranking.exceedance import dependable, exceedance, plotting_position, return_period_years
from siting.ranking.ledger import LostShares, Reaches, lost_downstream, lost_share
from siting.ranking.ratio import SufficientRatio, catchment_ratio, sufficient_ratio
from siting.ranking.reliability import Reliability, reliability, wilson_interval
from siting.ranking.score import COMPONENTS, Components, Score, score, score_components, score_order
from siting.ranking.score_doubt import ScoreBasis, score_doubt
from siting.ranking.supply import mean_capped_ratio, supply_order
from siting.ranking.supply_model import Inputs, PlotInputs, SupplyModel, supply_model
from siting.ranking.supported_area import SupportedArea, supported_area
from siting.ranking.swaps import Swaps, neighbour_swaps
from siting.ranking.villages import VillageRanks, rank_villages

__all__ = [
    "COMPONENTS",
    "ChosenSet",
    "Components",
    "Doubt",
    "Guard",
    "Inputs",
    "LostShares",
    "PlotForest",
    "PlotInputs",
    "Reaches",
    "Reliability",
    "Score",
    "ScoreBasis",
    "SetWater",
    "Spread",
    "SufficientRatio",
    "SupplyModel",
    "SupportedArea",
    "Swaps",
    "VillageRanks",
    "catchment_ratio",
    "choose_set",
    "dependable",
    "draw_inputs",
    "exceedance",
    "lost_downstream",
    "lost_share",
    "mean_capped_ratio",
    "neighbour_swaps",
    "plotting_position",
    "rank_doubt",
    "rank_villages",
    "reliability",
    "return_period_years",
    "score",
    "score_components",
    "score_doubt",
    "score_order",
    "set_water",
    "sufficient_ratio",
    "supply_model",
    "supply_order",
    "supported_area",
    "weight_doubt",
    "wilson_interval",
]
