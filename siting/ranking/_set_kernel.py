"""What one more plot of a set adds and takes away below, compiled: arrays in, arrays out; the caller checks."""

from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt

from siting.terrain._kernels.jit import kernel

Array = npt.NDArray[Any]


class Ground(NamedTuple):
    """
    What does not change while plots are chosen: the forest, and by plot and step the run-on and the room for it, m3.

    Run-on is infinite where it is unknown: what is missing passes such a plot undiminished. `price` is the worth of a
    cubic metre by plot and year; steps of year -1 count for nothing.
    """

    below: Array
    passing: Array
    runon: Array
    room: Array
    price: Array
    year: Array


class State(NamedTuple):
    """Which plots are chosen, what those above keep from each plot, and what each takes (m3 by step)."""

    chosen: Array
    missing: Array
    taken: Array


@kernel
def add_plot(plot: int, ground: Ground, state: State, passed: Array, write: bool) -> float:
    """
    Return the worth that a plot adds, less what the chosen plots below it lose; enter it in the state if asked.

    `passed` has room for one value by step: what more is missing behind the plot where the walk down stands. The walk
    ends where nothing more is missing.
    """
    worth = 0.0
    for step in range(passed.size):
        left = max(ground.runon[plot, step] - state.missing[plot, step], 0.0)
        passed[step] = min(left, ground.room[plot, step])
        if ground.year[step] >= 0:
            worth += passed[step] * ground.price[plot, ground.year[step]]
        if write:
            state.taken[plot, step] = passed[step]
    if write:
        state.chosen[plot] = True
    node, moved = plot, True
    while moved and ground.below[node] >= 0:
        factor, node, moved = ground.passing[node], ground.below[node], False
        for step in range(passed.size):
            if passed[step] <= 0.0:
                continue
            came, missing, more = ground.runon[node, step], state.missing[node, step], factor * passed[step]
            # no more can be missing than came: the rest would have gone into the bed on the way
            kept_away = min(came, missing + more)
            passed[step] = kept_away - min(came, missing)
            if state.chosen[node]:
                takes = min(came - kept_away, ground.room[node, step])
                given_up = state.taken[node, step] - takes
                passed[step] = max(passed[step] - given_up, 0.0)
                if ground.year[step] >= 0:
                    worth -= given_up * ground.price[node, ground.year[step]]
                if write:
                    state.taken[node, step] = takes
            if write:
                state.missing[node, step] = missing + more
            moved = moved or passed[step] > 0.0
    return worth


@kernel
def add_each(plots: Array, ground: Ground, state: State, worth: Array) -> None:
    """Write what each of some plots would add to the set as it stands."""
    passed = np.empty(ground.runon.shape[1])
    for place in range(plots.size):
        worth[plots[place]] = add_plot(plots[place], ground, state, passed, False)
