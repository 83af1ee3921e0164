"""Places below the plots, and what of their water the plots keep: the next plot, villages, the property's exit, pans."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import pandas as pd

from siting.pipeline.case import Case
from siting.pipeline.read import Place
from siting.pipeline.sites import trace
from siting.pipeline.water import Water, yearly_volumes
from siting.pipeline.weather import Weather
from siting.plots import distances_m, overflow_path, plot_cells
from siting.ranking import ChosenSet, PlotForest, Reaches, lost_downstream, lost_share
from siting.terrain import Terrain

FloatArray = npt.NDArray[np.float64]
Integers = npt.NDArray[np.int64]

PLOT, VILLAGE, EXIT, PAN = "plot", "village", "property_exit", "pan"

VILLAGE_CHANNEL_M = 500.0
"""A village lives on the first channel below it, not farther than this (our assumption)."""


@dataclass(frozen=True, slots=True, eq=False)
class Below:
    """
    Places below the plots, one entry each, but for plots: kind, number of village or pan (0 for exits), and flat cell.

    `came_m3` is the water of each by year with nothing taken above, NaN unknown; `reaches` tells which plot reaches which.
    """

    kind: list[str]
    number: Integers
    cell: Integers
    came_m3: FloatArray
    reaches: Reaches

    def of(self, kind: str) -> Integers:
        """Return the places of one kind."""
        return np.flatnonzero([one == kind for one in self.kind])


def places_below(case: Case, weather: Weather, village_cell: Integers) -> Below:
    """Follow the water from every plot's exit to the end, and find what it meets; then what comes to each place."""
    found: dict[tuple[str, int, int], int] = {}
    met: dict[tuple[int, int], float] = {}
    ground = case.ground
    nowhere = np.zeros(ground.grid.shape, dtype=np.bool_)
    for plot, exit_cell in enumerate(case.sites.catchments.exit_cell):
        path = overflow_path(int(exit_cell), direction=ground.direction, stop=nowhere)
        far = _distances(path, ground)
        for key, at in _met_by(path, case.place, village_cell, ground):
            number = found.setdefault(key, len(found))
            met.setdefault((plot, number), float(far[at]))
    for village, cell in enumerate(village_cell):
        if cell >= 0:
            found.setdefault((VILLAGE, village, int(cell)), len(found))
    loss_per_m = case.settings.runoff.conveyance_loss_per_km / 1000.0
    pairs = np.array(list(met), dtype=np.int64).reshape(-1, 2)
    passing = np.exp(-loss_per_m * np.array(list(met.values())))
    cells = np.array([cell for _, _, cell in found], dtype=np.int64)
    came = _came(case, weather, cells)
    numbers = np.array([number for _, number, _ in found], dtype=np.int64)
    return Below([kind for kind, _, _ in found], numbers, cells, came, Reaches(pairs[:, 0], pairs[:, 1], passing))


def _distances(path: Integers, ground: Terrain) -> FloatArray:
    grid = ground.grid
    return distances_m(path, cell_width_m=grid.cell_width_m, cell_height_m=grid.cell_height_m, cols=grid.cols)


def _met_by(path: Integers, place: Place, village_cell: Integers, ground: Terrain) -> list[tuple[tuple[str, int, int], int]]:
    """List what a path meets, each with its place on the path: villages' channels, the property's exit, a pan."""
    met: list[tuple[tuple[str, int, int], int]] = []
    for village in np.flatnonzero(np.isin(village_cell, path[1:])):
        cell = int(village_cell[village])
        met.append(((VILLAGE, int(village), cell), int(np.flatnonzero(path == cell)[0])))
    if place.inside is not None:
        outside = np.flatnonzero(~place.inside.ravel()[path])
        if outside.size and outside[0] > 0:
            at = int(outside[0]) - 1
            met.append(((EXIT, 0, int(path[at])), at))
    pan = int(ground.pans.label.ravel()[path[-1]])
    if pan and ground.pans.status[pan - 1] != "doubtful" and int(ground.pans.bottom_cell[pan - 1]) == int(path[-1]):
        met.append(((PAN, pan - 1, int(path[-1])), path.size - 1))
    return met


def _came(case: Case, weather: Weather, cells: Integers) -> FloatArray:
    """Return what comes to each cell by year with nothing taken above, m3; reckoned as for plots of one cell."""
    years = weather.years.labels.size
    if cells.size == 0 or case.classes.count == 0:
        return np.full((cells.size, years), np.nan)
    unique, at = np.unique(cells, return_inverse=True)
    label = np.zeros(case.ground.grid.shape, dtype=np.int32)
    label.ravel()[unique] = np.arange(1, unique.size + 1)
    loss = (case.settings.runoff.conveyance_loss_per_km,)
    cell_list = plot_cells(label, unique.size)
    catchments = trace(cell_list, label, case.place, case.ground, case.classes, loss)
    return np.asarray(yearly_volumes(case, weather, catchments)[at])


def village_channels(start_cell: Integers, start: Integers, villages: int, ground: Terrain) -> Integers:
    """Return the first channel cell below each village within 500 m along the flow, -1 where there is none."""
    nearest, far = np.full(villages, -1, dtype=np.int64), np.full(villages, VILLAGE_CHANNEL_M)
    for cell, village in zip(start_cell, start, strict=True):
        path = np.array([cell])
        if not ground.channel.ravel()[cell]:
            path = overflow_path(int(cell), direction=ground.direction, stop=ground.channel)
        length = _distances(path, ground)[-1]
        if ground.channel.ravel()[path[-1]] and length <= far[village]:
            nearest[village], far[village] = path[-1], length
    return nearest


@dataclass(frozen=True, slots=True, eq=False)
class Ledger:
    """Rows of the table of what is lost below, and what each village loses by the set in the dry and the median year, %."""

    table: pd.DataFrame
    village_dry_pct: FloatArray
    village_median_pct: FloatArray


def ledger(case: Case, water: Water, below: Below, forest: PlotForest, chosen: ChosenSet, villages: int) -> Ledger:
    """Tell of each plot alone, and of the set, which share of the water no longer reaches each place below."""
    alone = np.minimum(water.yearly_m3, water.room_m3)
    shares = (case.settings.ranking.dependable, 0.5)
    places = [
        lost_downstream(
            came_m3=below.came_m3,
            reaches=below.reaches,
            taken_alone_m3=alone,
            taken_in_set_m3=chosen.taken_m3,
            probability=share,
        )
        for share in shares
    ]
    next_plots = [
        lost_downstream(
            came_m3=water.yearly_m3,
            reaches=forest.reaches(),
            taken_alone_m3=alone,
            taken_in_set_m3=chosen.taken_m3,
            probability=share,
        )
        for share in shares
    ]
    from_plots = [lost_share(water.yearly_m3, chosen.left_m3, probability=share) for share in shares]
    kind, number = np.array(below.kind, dtype=object), below.number + 1
    reached, next_reaches = below.reaches, forest.reaches()
    fed = np.unique(next_reaches.place)
    plot_id, alone_below = case.sites.plot_id, [one.by_plot for one in next_plots]
    parts = [
        _rows(plot_id[next_reaches.plot], PLOT, plot_id[next_reaches.place], alone_below),
        _rows(plot_id[reached.plot], kind[reached.place], number[reached.place], [one.by_plot for one in places]),
        _rows(None, PLOT, plot_id[fed], [one[fed] for one in from_plots]),
        _rows(None, kind, number, [one.by_set for one in places]),
    ]
    table = pd.concat([part for part in parts if len(part)], ignore_index=True) if any(map(len, parts)) else parts[0]
    lost = [np.full(villages, np.nan) for _ in shares]
    at = below.of(VILLAGE)
    for column, one in zip(lost, places, strict=True):
        column[below.number[at]] = 100.0 * one.by_set[at]
    return Ledger(table, lost[0], lost[1])


def _rows(plot_id: Integers | None, kind: object, number: Integers, lost: list[FloatArray]) -> pd.DataFrame:
    """Make rows of the table; the plot is NULL where the whole set is meant, the number for the property's exits."""
    found = pd.DataFrame({"below": pd.Series(kind, index=range(number.size), dtype=object)})
    found["plot_id"] = pd.Series([None] * number.size if plot_id is None else plot_id, dtype="Int64")
    found["below_id"] = pd.Series(number, dtype="Int64").where(found["below"] != EXIT)
    found["lost_dry_pct"], found["lost_median_pct"] = 100.0 * lost[0], 100.0 * lost[1]
    return found
