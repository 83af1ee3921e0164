"""Daily water of plots, compiled: arrays in, arrays out; the caller checks. Depths in mm, places of days as int64."""

from typing import Any, NamedTuple

import numpy.typing as npt

from siting.terrain._kernels.jit import kernel

Array = npt.NDArray[Any]

EVAPORATING_M = 0.1  # depth of soil that evaporation dries out, m (FAO-56 eq. 73: 0.10 to 0.15)
OPEN_WATER = 1.05  # evaporation of shallow water over reference ET (FAO-56 Table 12)
WET_SOIL = 1.15  # evaporation of bare wet soil over reference ET (FAO-56 chapter 7, Kc max at full wetness)
NO_UPTAKE = 0.01  # stress nears 0 by halves and never gets there: below this it counts as 0 (assumption)
WAITING, GROWING, HARVESTED = 0, 1, 2
NOT_FAILED, NO_ONSET, STAND_LOST = 0, 1, 2
RAIN, RUNON, OVERFLOW, STANDING_LOSS, SOIL_LOSS, PERCOLATION, STORED, SHORTAGE = range(8)


class Soil(NamedTuple):
    """One plot: available water per metre, depth that roots can reach, what it evaporates and what it takes in."""

    available_mm_per_m: float
    full_m: float
    rew_mm: float
    tew_mm: float
    takes_in_day_mm: float
    takes_in_event_mm: float


class Rules(NamedTuple):
    """The crop and how it is sown, as numbers; counts of days as floats."""

    root_start_m: float
    growth_days: float
    depletion_fraction: float
    length_days: float
    window_days: float
    onset_mm: float
    onset_days: float
    drowned_after_days: float
    lost_after_days: float
    lost_within_days: float


class Water(NamedTuple):
    """Water that stands, depletion of the top layer and of the soil below it, depth of that layer, days under water."""

    standing: float
    top: float
    below: float
    depth_m: float
    days_under: float


class Loss(NamedTuple):
    """What a day takes: stress (Ks, or Kr in the fallow), need and use of the crop, evaporation, loss of the soil."""

    stress: float
    needed: float
    used: float
    standing: float
    soil: float


class Intake(NamedTuple):
    """What a day brings into the soil, and what it cannot hold."""

    overflow: float
    infiltration: float
    percolation: float


@kernel
def half_full(soil: Soil) -> Water:
    """Give bare soil that holds half of its available water."""
    half = 0.5 * soil.available_mm_per_m
    return Water(0.0, half * EVAPORATING_M, half * (soil.full_m - EVAPORATING_M), EVAPORATING_M, 0.0)


@kernel
def deepen(water: Water, to_m: float, full_m: float) -> Water:
    """Let the top layer take over soil below it, with its share of what is short there."""
    if to_m <= water.depth_m:
        return water
    # the last step takes all: a quotient of rounded depths would leave a trace behind
    moved = water.below if to_m >= full_m else water.below * (to_m - water.depth_m) / (full_m - water.depth_m)
    return Water(water.standing, water.top + moved, water.below - moved, to_m, water.days_under)


@kernel
def share_out(water: Water) -> Water:
    """Share what is short in the root zone by depth to the evaporating layer and the soil below, at harvest."""
    above = water.top * EVAPORATING_M / water.depth_m
    return Water(water.standing, above, water.below + (water.top - above), EVAPORATING_M, water.days_under)


@kernel
def root_depth_m(season_day: int, rules: Rules, full_m: float) -> float:
    """Depth of roots `season_day` days after sowing."""
    start = min(rules.root_start_m, full_m)
    if season_day >= rules.growth_days:
        return full_m
    return start + (full_m - start) * season_day / rules.growth_days


@kernel
def evaporation_reduction(depletion: float, rew: float, tew: float) -> float:
    """Share of the evaporation of wet soil that drying soil keeps up: Kr, FAO-56 eq. 74."""
    if depletion <= rew:
        return 1.0
    if depletion >= tew:
        return 0.0
    return (tew - depletion) / (tew - rew)


@kernel
def water_stress(depletion: float, available: float, fraction: float) -> float:
    """Share of its need that a crop takes up: Ks, FAO-56 eq. 84."""
    if depletion >= available:
        return 0.0
    return min(1.0, (available - depletion) / ((1.0 - fraction) * available))


@kernel
def bare_day(water: Water, soil: Soil, et0: float) -> Loss:
    """Evaporation of a day in the fallow: standing water first, then the top layer, never more than it holds."""
    reduction = evaporation_reduction(water.top, soil.rew_mm, soil.tew_mm)
    standing = min(water.standing, OPEN_WATER * et0)
    dried = min(max(0.0, WET_SOIL * et0 * reduction - standing), max(0.0, soil.tew_mm - water.top))
    return Loss(reduction, 0.0, 0.0, standing, dried)


@kernel
def crop_day(water: Water, soil: Soil, rules: Rules, et0: float, kc: float) -> Loss:
    """Evaporation and uptake of a day with a crop; a crop long under water has no air and takes up nothing."""
    available = soil.available_mm_per_m * water.depth_m
    needed = kc * et0
    fraction = min(max(rules.depletion_fraction + 0.04 * (5.0 - needed), 0.1), 0.8)
    stress = 0.0
    if water.days_under <= rules.drowned_after_days:
        stress = water_stress(water.top, available, fraction)
    standing = min(water.standing, OPEN_WATER * et0)
    # on shallow soil a day's need can exceed what is left to take
    dried = min(max(0.0, stress * needed - standing), max(0.0, available - water.top))
    return Loss(stress, needed, min(stress * needed, standing + dried), standing, dried)


@kernel
def receive(water: Water, soil: Soil, loss: Loss, arrival: float) -> tuple[Water, Intake]:
    """Take in what arrives: over the bund, into the soil, through it; FAO-56 eq. 85."""
    pool = water.standing - loss.standing + arrival
    overflow = max(0.0, pool - soil.takes_in_event_mm)
    pool -= overflow
    infiltration = min(pool, soil.takes_in_day_mm)
    top, below, percolation = water.top - infiltration + loss.soil, water.below, 0.0
    if top < 0.0:
        below += top
        top = 0.0
        if below < 0.0:
            percolation = -below
            below = 0.0
    after = Water(pool - infiltration, top, below, water.depth_m, water.days_under)
    return after, Intake(overflow, infiltration, percolation)


@kernel
def is_onset(day: int, arrival: Array, rules: Rules) -> bool:
    """Tell whether the days up to this one brought enough water to sow."""
    total = 0.0
    for back in range(int(rules.onset_days)):
        if day - back >= 0:
            total += arrival[day - back]
    return total >= rules.onset_mm


@kernel
def add_day(sums: Array, rain: float, runon: float, loss: Loss, intake: Intake, before: Water, after: Water) -> None:
    """Add a day's terms to the sums of its period."""
    sums[RAIN] += rain
    sums[RUNON] += runon
    sums[OVERFLOW] += intake.overflow
    sums[STANDING_LOSS] += loss.standing
    sums[SOIL_LOSS] += loss.soil
    sums[PERCOLATION] += intake.percolation
    sums[STORED] += (after.standing - before.standing) - (after.top - before.top) - (after.below - before.below)
    sums[SHORTAGE] += loss.needed - loss.used


@kernel
def write_day(row: Array, growing: bool, loss: Loss, intake: Intake, after: Water) -> None:
    """Write a day of the trace, in the order of its columns; what a fallow has not stays as it is (NaN)."""
    if growing:
        row[0] = after.depth_m
        row[2] = loss.needed
    row[1] = loss.stress
    row[3] = loss.standing
    row[4] = loss.soil
    row[5] = intake.overflow
    row[6] = intake.infiltration
    row[7] = after.standing
    row[8] = after.top
    row[9] = after.below
    row[10] = intake.percolation


@kernel
def note_day(
    sums: Array,
    number: int,
    trace: Array,
    day: int,
    growing: bool,
    rain: float,
    runon: float,
    loss: Loss,
    intake: Intake,
    before: Water,
    after: Water,
) -> None:
    """Note a day in the sums of its period and in the trace, where there are any."""
    if number >= 0:
        add_day(sums[number], rain, runon, loss, intake, before, after)
    if trace.shape[0] > 0:
        write_day(trace[day], growing, loss, intake, after)


@kernel
def run_season(
    water: Water,
    soil: Soil,
    rules: Rules,
    kc: Array,
    bounds: tuple[int, int, int],
    rain: Array,
    arrival: Array,
    et0: Array,
    record: bool,
    period: Array,
    sums: Array,
    trace: Array,
    result: Array,
    event: Array,
) -> Water:
    """
    Run one plot from one harvest to the next; return its water at the end.

    `bounds` are the first day, the first on which it may be sown, and the day after the last. `result` gets use and
    need of the crop, days under water, run-on, overflow, percolation; `event` the day of sowing (-1: none), the failure.
    """
    first, opens, end = bounds
    state, sowings_left, sown = WAITING, 2, -1
    used, needed, under, dry_run = 0.0, 0.0, 0.0, 0
    runon, overflow, percolation = 0.0, 0.0, 0.0
    for day in range(first, end):
        days_under = water.days_under + 1.0 if water.standing > 0.0 else 0.0
        water = Water(water.standing, water.top, water.below, water.depth_m, days_under)
        before = water
        in_window = opens <= day < opens + rules.window_days
        if state == WAITING and sowings_left > 0 and in_window and is_onset(day, arrival, rules):
            state, sown = GROWING, day
            sowings_left -= 1
            used, needed, under, dry_run = 0.0, 0.0, 0.0, 0
        growing = state == GROWING
        if growing:
            water = deepen(water, root_depth_m(day - sown, rules, soil.full_m), soil.full_m)
            loss = crop_day(water, soil, rules, et0[day], kc[min(day - sown, kc.size - 1)])
        else:
            loss = bare_day(water, soil, et0[day])
        water, intake = receive(water, soil, loss, arrival[day])
        from_above = arrival[day] - rain[day]
        runon, overflow, percolation = runon + from_above, overflow + intake.overflow, percolation + intake.percolation
        if record:
            note_day(sums, period[day], trace, day, growing, rain[day], from_above, loss, intake, before, water)
        if growing:
            used += loss.used
            needed += loss.needed
            under += 1.0 if days_under > 0.0 else 0.0
            dry_run = dry_run + 1 if loss.stress < NO_UPTAKE else 0
            age = day - sown + 1
            if dry_run >= rules.lost_after_days and age <= rules.lost_within_days:
                state = WAITING
            elif age >= rules.length_days or day == end - 1:
                state = HARVESTED
            if state != GROWING:
                water = share_out(water)
    result[0], result[1], result[2], result[3], result[4], result[5] = used, needed, under, runon, overflow, percolation
    event[0] = sown
    event[1] = NOT_FAILED if state == HARVESTED else NO_ONSET if sown < 0 else STAND_LOST
    return water


@kernel
def run_plots(
    plots: tuple[int, int],
    known: Array,
    runon_m3: Array,
    mm_per_m3: Array,
    soils: Array,
    rules: Rules,
    kc: Array,
    seasons: Array,
    anew: Array,
    spin_up: bool,
    rain: Array,
    et0: Array,
    period: Array,
    sums: Array,
    trace: Array,
    results: Array,
    events: Array,
) -> None:
    """
    Run the plots from `plots[0]` to before `plots[1]` through all seasons, each run of seasons from half-full soil.

    `seasons` has a row of bounds for each; where `anew` is true a run of seasons begins, and its first year is run
    twice where `spin_up` is. One row of `runon_m3` serves all plots, else each has its own.
    """
    for plot in range(plots[0], plots[1]):
        if not known[plot]:
            continue
        soil = Soil(soils[plot, 0], soils[plot, 1], soils[plot, 2], soils[plot, 3], soils[plot, 4], soils[plot, 5])
        arrival = rain + mm_per_m3[plot] * runon_m3[0 if runon_m3.shape[0] == 1 else plot]
        water = half_full(soil)
        for season in range(seasons.shape[0]):
            bounds = (seasons[season, 0], seasons[season, 1], seasons[season, 2])
            result, event = results[plot, season], events[plot, season]
            if anew[season]:
                water = half_full(soil)
                if spin_up:
                    water = run_season(
                        water, soil, rules, kc, bounds, rain, arrival, et0, False, period, sums[plot], trace, result, event
                    )
            water = run_season(
                water, soil, rules, kc, bounds, rain, arrival, et0, True, period, sums[plot], trace, result, event
            )
