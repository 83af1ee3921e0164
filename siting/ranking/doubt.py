"""How far the order can be trusted: the same order under many draws of what is not known for sure."""

import math
from collections.abc import Mapping
from dataclasses import dataclass
from functools import partial
from typing import Any

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError
from siting.parallel import run_all, usable_threads
from siting.ranking.score import Components, score
from siting.ranking.supply import supply_order
from siting.ranking.supply_model import DRY, GAIN, MEAN, MEDIAN, PEAK, Inputs, SupplyModel, check_loss

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]
Ranks = npt.NDArray[np.int32]
Flags = npt.NDArray[np.bool_]
Range = tuple[float, float]


@dataclass(frozen=True, slots=True)
class Spread:
    """
    How far each input may be off; all our assumptions but the losses on the way and the abstraction ratios.

    Shifts of the curve number are normal, one for the region and one by cover class, given by standard deviation; a
    threshold that people saw is not shifted. The abstraction ratios are equally likely. Each range is drawn evenly,
    that of the loss on the way, the wetting and the infiltration evenly on a log scale, for these span a factor of two
    and more. Ranges of factors stand on the value in use. Kc, ET0, loss and wetting are one for all plots; soil factors
    are one for each soil class; seasons are drawn with repeats, the same for all plots.
    """

    region_cn_sd: float = 4.0
    cover_cn_sd: float = 3.0
    abstraction_ratios: tuple[float, ...] = (0.2, 0.05)
    loss_per_km: Range = (0.1, 0.8)
    wetting_factor: Range = (0.5, 2.0)
    kc_factor: Range = (0.9, 1.1)
    et0_factor: Range = (0.9, 1.1)
    available_water_factor: Range = (0.8, 1.2)
    infiltration_factor: Range = (0.3, 1.5)
    resample_seasons: bool = True

    def __post_init__(self) -> None:
        for name in ("region_cn_sd", "cover_cn_sd"):
            value = getattr(self, name)
            if not 0 <= value < 100:
                msg = f"{name} of {value:g}: a standard deviation of curve numbers lies between 0 and 100; correct it"
                raise ConfigError(msg)
        if not self.abstraction_ratios:
            msg = "no abstraction ratio to draw from; give 0.2, 0.05 or both"
            raise ConfigError(msg)
        names = ("wetting_factor", "kc_factor", "et0_factor", "available_water_factor", "infiltration_factor")
        for name in ("loss_per_km", *names):
            low, high = getattr(self, name)
            if not 0 < low <= high < math.inf:
                msg = f"{name} from {low:g} to {high:g}: give two values above zero, the smaller one first"
                raise ConfigError(msg)


@dataclass(frozen=True, slots=True, eq=False)
class Doubt:
    """
    What the draws leave of the order.

    `rank_low` and `rank_high` are by plot, whole numbers, NaN where the plot has no rank: no more than the share left
    out at each end (5 % of an interval of 90 %) of the draws ranks it better, or worse. In each draw a plot has its
    `best` and its `worst` rank, (draws, plots), which differ where it ties with others, and 0 where it has none.
    A plot with an open catchment stands in `best` and `worst` on its lower bound, but `rank_low` is the rank that enough
    water would give it.
    """

    rank_low: FloatArray
    rank_high: FloatArray
    best: Ranks
    worst: Ranks

    def share_in_top(self, count: int) -> FloatArray:
        """
        Return by plot the share of draws in which it is among the best `count`, NaN where it has no rank.

        Of plots that tie across the limit each counts in part. At least this share, for an open catchment.
        """
        if count < 1:
            msg = f"the best {count} plots: give a number of at least 1"
            raise ConfigError(msg)
        inside = np.clip((count - self.best + 1.0) / (self.worst - self.best + 1.0), 0.0, 1.0)
        return np.where(np.isnan(self.rank_low), np.nan, inside.mean(axis=0))


def draw_inputs(model: SupplyModel, spread: Spread, seed: np.random.SeedSequence) -> Inputs:
    """Draw one value of every input in doubt; the same seed gives the same values."""
    rng, in_use = np.random.default_rng(seed), model.in_use
    known = model.season.size
    return Inputs(
        region_shift=rng.normal(0.0, spread.region_cn_sd),
        cover_shift=rng.normal(0.0, spread.cover_cn_sd, model.cover_class.size),
        abstraction_ratio=spread.abstraction_ratios[rng.integers(len(spread.abstraction_ratios))],
        loss_per_km=float(_evenly_in_logs(rng, spread.loss_per_km)),
        channel_wetting_mm=in_use.channel_wetting_mm * float(_evenly_in_logs(rng, spread.wetting_factor)),
        kc_factor=rng.uniform(*spread.kc_factor),
        et0_factor=rng.uniform(*spread.et0_factor),
        available_water_factor=rng.uniform(*spread.available_water_factor, model.soil_class.size),
        infiltration_factor=_evenly_in_logs(rng, spread.infiltration_factor, model.soil_class.size),
        seasons=np.sort(rng.integers(known, size=known)) if spread.resample_seasons else in_use.seasons,
    )


def _evenly_in_logs(rng: np.random.Generator, limits: Range, size: int | None = None) -> Any:
    low, high = limits
    # rounding must not lead outside, where no effective area is known
    return np.clip(low * (high / low) ** rng.random(size), low, high)


def rank_doubt(
    model: SupplyModel,
    spread: Spread,
    *,
    draws: int,
    seed: int,
    confidence: float = 0.90,
    threads: int | None = None,
) -> Doubt:
    """
    Rank the plots by supply under many draws of the inputs.

    Errors are drawn as nature shares them, never plot by plot: what moves all plots alike reorders none, and only
    differences between plots widen an interval. Every draw has a seed of its own, so threads change nothing.

    Parameters
    ----------
    model
        As `supply_model` makes it.
    spread
        How far the inputs may be off; its losses must lie within those of `model.plots.loss_per_km`.
    draws, seed
        Number of draws, at least 1, and the seed of all of them, at least 0.
    confidence
        Share of the draws that the interval holds, between 0 and 1.
    threads
        Default: as many as this process may use.

    Raises
    ------
    ConfigError
        A number out of its range, or losses beyond those for which areas were summed.
    """
    check_loss(model.plots, *spread.loss_per_km)
    rank = partial(_ranks_of_draw, model, spread)
    return collected(rank, seeds_of(draws, seed), confidence, usable_threads(threads))


def _ranks_of_draw(model: SupplyModel, spread: Spread, seed: np.random.SeedSequence) -> tuple[Ranks, Ranks, Ranks]:
    """Return best and worst rank in one draw, and the best where open catchments bring enough water."""
    keys = model.keys(draw_inputs(model, spread, seed))
    best, worst = tied_ranks(keys, model.plots.plot_id)
    return best, worst, _best_if_fed(keys, best, model.plots.open_catchment)


def tied_ranks(keys: FloatArray, plot_id: Integers) -> tuple[Ranks, Ranks]:
    """Return the first and the last of the ranks that each plot shares with those equal in all keys."""
    order = ranked_places(keys, plot_id)
    ranked = keys[:, order]
    starts = np.ones(order.size, dtype=np.bool_)
    starts[1:] = (ranked[:, 1:] != ranked[:, :-1]).any(axis=0)
    first = np.flatnonzero(starts)
    group, last = np.cumsum(starts) - 1, np.append(first[1:], order.size)
    best, worst = (np.empty(order.size, dtype=np.int32) for _ in range(2))
    best[order], worst[order] = first[group] + 1, last[group]
    no_rank = keys[MEAN] == -np.inf
    best[no_rank], worst[no_rank] = 0, 0
    return best, worst


def ranked_places(keys: FloatArray, plot_id: Integers) -> Integers:
    """Return the places of plots in the order by supply, the best first."""
    rank = supply_order(
        supply_ratio_dry=keys[DRY],
        supply_ratio_median=keys[MEDIAN],
        supply_ratio_mean=keys[MEAN],
        gain=keys[GAIN],
        peak_flow_10y_m3s=-keys[PEAK],
        plot_id=plot_id,
    )
    return np.argsort(rank)


def _best_if_fed(keys: FloatArray, best: Ranks, open_catchment: Flags) -> Ranks:
    """Give open catchments the rank that they have with a supply of 1 in every season: the smaller peak decides alone."""
    lost = np.sort(keys[PEAK, keys[MEAN] >= 1.0])
    before = lost.size - np.searchsorted(lost, keys[PEAK], side="right")
    fed = np.minimum(before + 1, best).astype(np.int32)
    return np.where(open_catchment, fed, best)


def weight_doubt(
    components: Components,
    weights: Mapping[str, float],
    *,
    factor: float = 2.0,
    draws: int,
    seed: int,
    confidence: float = 0.90,
    threads: int | None = None,
) -> Doubt:
    """
    Rank the plots by score under other weights: what the judgement in the score moves, and no error in the data.

    Parameters
    ----------
    components, weights
        As in `score`; what a plot lacks is left out for all.
    factor
        Each weight is drawn between itself divided by this and multiplied by it, evenly on a log scale; at least 1
        (assumption: 2).
    draws, seed, confidence, threads
        As in `rank_doubt`.

    Raises
    ------
    ConfigError
        A number or a weight out of its range.
    """
    if not 1 <= factor < math.inf:
        msg = f"a factor of {factor:g} on the weights: it must be at least 1; 2 halves and doubles them"
        raise ConfigError(msg)
    rank = partial(_ranks_of_weights, components, weights, factor)
    return collected(rank, seeds_of(draws, seed), confidence, usable_threads(threads))


def _ranks_of_weights(
    components: Components, weights: Mapping[str, float], factor: float, seed: np.random.SeedSequence
) -> tuple[Ranks, Ranks, Ranks]:
    moved = _evenly_in_logs(np.random.default_rng(seed), (1.0 / factor, factor), len(weights))
    drawn = {name: weights[name] * by for name, by in zip(sorted(weights), moved.tolist(), strict=True)}
    found = score(components, drawn).score
    # rounded as `score_order` does
    keys = np.zeros((PEAK + 1, found.size))
    keys[MEAN] = np.where(np.isnan(found), -np.inf, np.round(found, 12))
    best, worst = tied_ranks(keys, np.arange(found.size))
    return best, worst, best


def seeds_of(draws: int, seed: int) -> list[np.random.SeedSequence]:
    """Give every draw a seed of its own, so that threads change nothing."""
    if draws < 1 or seed < 0:
        msg = f"{draws} draws from seed {seed}: give at least 1 draw and a seed of at least 0"
        raise ConfigError(msg)
    return np.random.SeedSequence(seed).spawn(draws)


def collected(rank: Any, seeds: list[np.random.SeedSequence], confidence: float, threads: int) -> Doubt:
    """Rank in every draw, and leave out the ends."""
    if not 0 < confidence < 1:
        msg = f"confidence {confidence:g} is outside 0 to 1; give a share, so 90 % is 0.9"
        raise ConfigError(msg)
    best, worst, fed = (np.stack(part) for part in zip(*run_all(rank, [(one,) for one in seeds], threads), strict=True))
    # the draws left out at each end; rounding must not lose a whole one
    beyond = int(0.5 * (1.0 - confidence) * len(seeds) + 1e-9)
    low = np.sort(fed, axis=0)[beyond].astype(np.float64)
    high = np.sort(worst, axis=0)[-1 - beyond].astype(np.float64)
    no_rank = worst[0] == 0
    low[no_rank] = high[no_rank] = np.nan
    return Doubt(low, high, best, worst)
