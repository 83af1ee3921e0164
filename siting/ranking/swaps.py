"""What would have to be different for two neighbours in rank to change places."""

import math
from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import partial

import numpy as np
import numpy.typing as npt

from siting.errors import ConfigError
from siting.parallel import run_all, usable_threads
from siting.ranking.doubt import Range, Spread, ranked_places
from siting.ranking.supply_model import MEAN, Inputs, SupplyModel, check_loss

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]
Flags = npt.NDArray[np.bool_]

STEPS = 12
"""Values tried on each side of the one in use; a swap that holds only between two of them is not seen."""

BISECTIONS = 10
"""They bring the change within a ten thousandth of the range on its side."""

NORMAL_SDS = 3.0
"""A normal shift is searched to this many standard deviations."""

NO_GROUP = -1


@dataclass(frozen=True, slots=True, eq=False)
class Swaps:
    """
    The smallest change of one input that swaps neighbours in rank, one entry for each pair, from the best pair on.

    `upper_id` stands above `lower_id`. `input` names what changes: curve_number, cover_curve_number, abstraction_ratio,
    conveyance_loss_per_km, channel_wetting_mm, reference_et, available_water or infiltration; `group` the cover or soil
    class that it belongs to, -1 where it is one for all. `change` is what is added to the value in use, in `unit` (for a
    factor, per cent of it); `change_sd` is that over the standard deviation of the draws. "tie" with a change of 0 where
    the two are equal now; "" and NaN where no input, within its own range and alone, swaps them.
    """

    upper_id: Integers
    lower_id: Integers
    input: npt.NDArray[np.str_]
    group: Integers
    change: FloatArray
    unit: npt.NDArray[np.str_]
    change_sd: FloatArray


@dataclass(frozen=True, slots=True)
class _Axis:
    """One input in doubt: its value in use, the values to try outward from it on each side, and how to set one."""

    name: str
    group: int
    unit: str
    per_unit: float
    in_use: float
    sides: tuple[tuple[float, ...], ...]
    sd: float
    stepless: bool
    put: Callable[[float], Inputs]

    def change_sd(self, value: float) -> float:
        return abs(value - self.in_use) / self.sd


@dataclass(frozen=True, slots=True)
class _Found:
    """A value that swaps a pair, and the nearest one tried that does not."""

    axis: _Axis
    keeps: float
    swaps: float

    def change_sd(self) -> float:
        return self.axis.change_sd(self.swaps)


def neighbour_swaps(model: SupplyModel, spread: Spread, *, pairs: int | None = None, threads: int | None = None) -> Swaps:
    """
    Find for each pair of neighbours in the order by supply the smallest change of one input that swaps them.

    Each input is moved alone, outward from its value in use to the ends of its range in `spread`, and the order run
    again: in even steps for all plots, then by bisection for the pair. Every change returned was run and does swap
    the two. Kc is not listed: it multiplies ET0, so that the same change of either does the same.

    Parameters
    ----------
    model, spread
        As in `rank_doubt`.
    pairs
        Only so many pairs from the best on; all by default. Plots without a rank are in no pair.
    threads
        Default: as many as this process may use.

    Raises
    ------
    ConfigError
        Losses beyond those for which areas were summed, or a number of pairs below 1.
    """
    check_loss(model.plots, *spread.loss_per_km)
    if pairs is not None and pairs < 1:
        msg = f"{pairs} pairs of neighbours: give at least 1, or leave it out for all"
        raise ConfigError(msg)
    keys = model.keys(model.in_use)
    places = ranked_places(keys, model.plots.plot_id)[: int((keys[MEAN] > -np.inf).sum())]
    places = places[: places.size if pairs is None else pairs + 1]
    equal = (keys[:, places[:-1]] == keys[:, places[1:]]).all(axis=0)
    brackets: list[list[_Found]] = [[] for _ in range(equal.size)]
    usable = usable_threads(threads)
    axes = [axis for axis in _axes(model, spread) if axis.sd > 0]
    for some in run_all(partial(_scan, model, places), [(axis, side) for axis in axes for side in axis.sides], usable):
        for pair, found in some:
            brackets[pair].append(found)
    parts = [(places[pair : pair + 2], brackets[pair]) for pair in range(equal.size)]
    least = run_all(partial(_least, model), parts, usable)
    return _table(model.plots.plot_id[places], equal, least)


def _better(keys: FloatArray, other: FloatArray) -> Flags:
    """Tell where the first key that differs is the larger one."""
    first = np.argmax(keys != other, axis=0)
    at = (first, np.arange(first.size))
    return np.asarray(keys[at] > other[at])


def _scan(model: SupplyModel, places: Integers, axis: _Axis, side: tuple[float, ...]) -> list[tuple[int, _Found]]:
    """Move one input outward for all plots; return the pairs that swap, and between which values each first does."""
    found: list[tuple[int, _Found]] = []
    waiting = np.ones(max(places.size - 1, 0), dtype=np.bool_)
    keeps = axis.in_use
    for value in side:
        keys = model.keys(axis.put(value), places)
        swapped = waiting & _better(keys[:, 1:], keys[:, :-1])
        found.extend((int(pair), _Found(axis, keeps, value)) for pair in np.flatnonzero(swapped))
        waiting &= ~swapped
        keeps = value
    return found


def _least(model: SupplyModel, pair: Integers, brackets: list[_Found]) -> _Found | None:
    """Return the smallest change, in standard deviations, among the inputs that swap a pair; the first of equals."""
    best: _Found | None = None
    for one in sorted(brackets, key=_Found.change_sd):
        found = one if best is None else _nearer(model, pair, one, best.change_sd())
        if found is not None:
            best = _bisected(model, pair, found) if found.axis.stepless else found
    return best


def _nearer(model: SupplyModel, pair: Integers, found: _Found, limit_sd: float) -> _Found | None:
    """Return the bracket of a swap cut off at a change, None where the swap needs a larger one."""
    axis = found.axis
    if axis.change_sd(found.keeps) >= limit_sd:
        return None
    if found.change_sd() < limit_sd:
        return found
    limit = axis.in_use + math.copysign(limit_sd * axis.sd, found.swaps - axis.in_use)
    return replace(found, swaps=limit) if axis.stepless and _swapped(model, pair, axis.put(limit)) else None


def _swapped(model: SupplyModel, pair: Integers, inputs: Inputs) -> bool:
    keys = model.keys(inputs, pair)
    return bool(_better(keys[:, 1:], keys[:, :1])[0])


def _bisected(model: SupplyModel, pair: Integers, found: _Found) -> _Found:
    for _ in range(BISECTIONS):
        middle = 0.5 * (found.keeps + found.swaps)
        swapped = _swapped(model, pair, found.axis.put(middle))
        found = replace(found, swaps=middle) if swapped else replace(found, keeps=middle)
    return found


def _table(plot_id: Integers, equal: Flags, least: list[_Found | None]) -> Swaps:
    rows: list[tuple[str, int, float, str, float]] = []
    for tied, found in zip(equal, least, strict=True):
        if tied:
            rows.append(("tie", NO_GROUP, 0.0, "", 0.0))
        elif found is None:
            rows.append(("", NO_GROUP, math.nan, "", math.nan))
        else:
            axis = found.axis
            change = axis.per_unit * (found.swaps - axis.in_use)
            rows.append((axis.name, axis.group, change, axis.unit, found.change_sd()))
    name, group, change_by, unit, sd = zip(*rows, strict=True) if rows else ((),) * 5
    return Swaps(
        plot_id[:-1],
        plot_id[1:],
        np.array(name, dtype=np.str_),
        np.array(group, dtype=np.int64),
        np.array(change_by, dtype=np.float64),
        np.array(unit, dtype=np.str_),
        np.array(sd, dtype=np.float64),
    )


def _axes(model: SupplyModel, spread: Spread) -> list[_Axis]:
    """List the inputs that can be moved alone; seasons drawn anew are no number, and Kc acts as ET0 does."""
    in_use = model.in_use
    wetting, loss = in_use.channel_wetting_mm, in_use.loss_per_km
    low, high = (wetting * factor for factor in spread.wetting_factor)
    axes = [
        _normal("curve_number", NO_GROUP, spread.region_cn_sd, lambda value: replace(in_use, region_shift=value)),
        _of_ratio(in_use, spread.abstraction_ratios),
        _ranged(
            "conveyance_loss_per_km", "1/km", loss, spread.loss_per_km, lambda value: replace(in_use, loss_per_km=value)
        ),
        _ranged("channel_wetting_mm", "mm", wetting, (low, high), lambda value: replace(in_use, channel_wetting_mm=value)),
        _factor("reference_et", NO_GROUP, spread.et0_factor, lambda value: replace(in_use, et0_factor=value), logs=False),
    ]
    for place, code in enumerate(model.cover_class):
        put = partial(_with_element, in_use, "cover_shift", place)
        axes.append(_normal("cover_curve_number", int(code), spread.cover_cn_sd, put))
    for place, code in enumerate(model.soil_class):
        water = partial(_with_element, in_use, "available_water_factor", place)
        axes.append(_factor("available_water", int(code), spread.available_water_factor, water, logs=False))
        rate = partial(_with_element, in_use, "infiltration_factor", place)
        axes.append(_factor("infiltration", int(code), spread.infiltration_factor, rate, logs=True))
    return axes


def _with_element(inputs: Inputs, name: str, place: int, value: float) -> Inputs:
    changed = getattr(inputs, name).copy()
    changed[place] = value
    return replace(inputs, **{name: changed})


def _sides(in_use: float, low: float, high: float) -> tuple[tuple[float, ...], ...]:
    """Return the values to try below and above the one in use, outward; none where it lies beyond that end."""
    ends = [end for end, beyond in ((low, low < in_use), (high, high > in_use)) if beyond]
    return tuple(tuple(np.linspace(in_use, end, STEPS + 1)[1:].tolist()) for end in ends)


def _normal(name: str, group: int, sd: float, put: Callable[[float], Inputs]) -> _Axis:
    return _Axis(name, group, "", 1.0, 0.0, _sides(0.0, -NORMAL_SDS * sd, NORMAL_SDS * sd), sd, True, put)


def _ranged(name: str, unit: str, in_use: float, limits: Range, put: Callable[[float], Inputs]) -> _Axis:
    return _Axis(name, NO_GROUP, unit, 1.0, in_use, _sides(in_use, *limits), _sd_in_logs(*limits), True, put)


def _factor(name: str, group: int, limits: Range, put: Callable[[float], Inputs], *, logs: bool) -> _Axis:
    low, high = limits
    sd = _sd_in_logs(low, high) if logs else (high - low) / math.sqrt(12.0)
    return _Axis(name, group, "%", 100.0, 1.0, _sides(1.0, low, high), sd, True, put)


def _of_ratio(in_use: Inputs, ratios: tuple[float, ...]) -> _Axis:
    others = tuple((ratio,) for ratio in dict.fromkeys(ratios) if ratio != in_use.abstraction_ratio)
    put = partial(_with_ratio, in_use)
    return _Axis("abstraction_ratio", NO_GROUP, "", 1.0, in_use.abstraction_ratio, others, float(np.std(ratios)), False, put)


def _with_ratio(in_use: Inputs, value: float) -> Inputs:
    return replace(in_use, abstraction_ratio=value)


def _sd_in_logs(low: float, high: float) -> float:
    """Return the standard deviation, in the unit of the values, of draws that are even on a log scale."""
    if low == high:
        return 0.0
    span = math.log(high / low)
    mean = (high - low) / span
    return math.sqrt(max((high * high - low * low) / (2.0 * span) - mean * mean, 0.0))
