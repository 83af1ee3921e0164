"""How far the order by score can be trusted, under the same draws as the order by supply."""

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from functools import partial

import numpy as np
import numpy.typing as npt

from siting.errors import InputError
from siting.parallel import usable_threads
from siting.ranking.doubt import Doubt, Ranks, Spread, collected, draw_inputs, seeds_of, tied_ranks
from siting.ranking.score import FULL_SOIL_MM, LEAST, Components, score
from siting.ranking.supply import mean_capped_ratio
from siting.ranking.supply_model import MEAN, PEAK, SupplyModel

FloatArray = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class ScoreBasis:
    """
    What the score of each plot rests on with the inputs in use.

    `components` and `weights` as in `score`; reliability and mean relative yields as in `score_components`. NaN leaves a
    plot without a rank. `target_yield` is that of the reliability.
    """

    components: Components
    weights: Mapping[str, float]
    reliability: FloatArray
    mean_yield: FloatArray
    rain_only_mean_yield: FloatArray
    target_yield: float


def score_doubt(
    model: SupplyModel,
    spread: Spread,
    basis: ScoreBasis,
    *,
    draws: int,
    seed: int,
    confidence: float = 0.90,
    threads: int | None = None,
) -> Doubt:
    """
    Rank the plots by score under many draws of the inputs.

    The daily balance is too long for hundreds of draws, so the seasonal method stands in for it, plot by plot set to agree
    with it where the inputs are those in use (our assumption): a season of a draw is good if its supply ratio reaches the
    one that as many seasons reach now as the daily balance finds good; mean yields rise and fall with the mean of the
    capped ratios. Soil follows its draw; ease, safety and certainty stay.

    Parameters
    ----------
    model, spread, draws, seed, confidence, threads
        As in `rank_doubt`.

    Raises
    ------
    ConfigError
        As `rank_doubt`.
    InputError
        A basis of another number of plots than the model.
    """
    plots = model.plots.plot_id.size
    if basis.reliability.shape != (plots,):
        msg = f"{basis.reliability.size} plots of a score meet a model of {plots}: give both for the same plots"
        raise InputError(msg)
    rank = partial(_ranks_of_draw, _Stand(model, basis), spread)
    return collected(rank, seeds_of(draws, seed), confidence, usable_threads(threads))


@dataclass(slots=True, eq=False)
class _Stand:
    """The seasonal method, set so that it agrees with the daily balance where the inputs are those in use."""

    model: SupplyModel
    basis: ScoreBasis
    enough: FloatArray = field(init=False)
    met: FloatArray = field(init=False)
    capped: FloatArray = field(init=False)
    rain_capped: float = field(init=False)

    def __post_init__(self) -> None:
        ratio, rain_only = self.model.season_ratios(self.model.in_use)
        self.enough = _good_from(ratio, self.basis.reliability, self.basis.target_yield)
        self.met = (ratio >= self.enough[:, None]).mean(axis=1)
        self.capped, self.rain_capped = mean_capped_ratio(ratio), float(mean_capped_ratio(rain_only))

    def components(self, seed: np.random.SeedSequence, spread: Spread) -> Components:
        """Return the components of one draw."""
        inputs, basis, plots = draw_inputs(self.model, spread, seed), self.basis, self.model.plots
        ratio, rain_only = self.model.season_ratios(inputs)
        ratio, rain_only = ratio[:, inputs.seasons], rain_only[inputs.seasons]
        water = basis.reliability + (ratio >= self.enough[:, None]).mean(axis=1) - self.met
        fed = np.clip(basis.mean_yield + mean_capped_ratio(ratio) - self.capped, 0.0, 1.0)
        rain_change = float(mean_capped_ratio(rain_only)) - self.rain_capped
        alone = np.clip(basis.rain_only_mean_yield + rain_change, 0.0, 1.0)
        gain = np.divide(fed - alone, 1.0 - alone, out=np.zeros_like(fed), where=alone < 1.0)
        holds = plots.available_water_mm * inputs.available_water_factor[self.model.soil_of_plot]
        return replace(
            basis.components,
            water=np.clip(water, LEAST, 1.0),
            gain=np.clip(np.where(np.isnan(fed), np.nan, gain), LEAST, 1.0),
            soil=np.clip(holds / FULL_SOIL_MM, LEAST, 1.0),
        )


def _good_from(ratio: FloatArray, reliability: FloatArray, target_yield: float) -> FloatArray:
    """
    Return for each plot the supply ratio that its reliable share of seasons reaches.

    It lies half way between the last season that is good and the first that is not; where all or none are good, at the
    target yield if that is farther.
    """
    plots, seasons = ratio.shape
    ranked = np.sort(ratio, axis=1)[:, ::-1]
    good = np.round(np.nan_to_num(reliability) * seasons).astype(np.int64)
    place = np.arange(plots)
    above = np.where(good > 0, ranked[place, np.maximum(good - 1, 0)], np.maximum(ranked[:, 0], target_yield))
    below = np.where(good < seasons, ranked[place, np.minimum(good, seasons - 1)], np.minimum(ranked[:, -1], target_yield))
    none, every = good == 0, good == seasons
    middle = np.where(none, np.nextafter(above, np.inf), np.where(every, below, 0.5 * (above + below)))
    return np.where(np.isnan(reliability), np.nan, middle)


def _ranks_of_draw(stand: _Stand, spread: Spread, seed: np.random.SeedSequence) -> tuple[Ranks, Ranks, Ranks]:
    """Return best and worst rank in one draw, and the best where open catchments bring enough water."""
    components, weights = stand.components(seed, spread), stand.basis.weights
    known = ~np.isnan(stand.basis.reliability) & stand.model.known
    best, worst, fed = (np.zeros(known.size, dtype=np.int32) for _ in range(3))
    some = _of(components, known)
    found = score(some, weights).score
    best[known], worst[known] = _ranks(found)
    full = np.ones(found.size)
    if_fed = score(replace(some, water=full, gain=full), weights).score
    ahead = found.size - np.searchsorted(np.sort(found), if_fed, side="right")
    fed[known] = np.minimum(best[known], ahead + 1)
    return best, worst, np.where(stand.model.plots.open_catchment, fed, best).astype(np.int32)


def _ranks(found: FloatArray) -> tuple[Ranks, Ranks]:
    keys = np.zeros((PEAK + 1, found.size))
    keys[MEAN] = np.where(np.isnan(found), -np.inf, np.round(found, 12))  # rounded as `score_order` does
    return tied_ranks(keys, np.arange(found.size))


def _of(components: Components, plots: npt.NDArray[np.bool_]) -> Components:
    return Components(**{name: getattr(components, name)[plots] for name in Components.__dataclass_fields__})
