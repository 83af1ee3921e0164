"""Every test at one place: its value, its limit, how near they are, and what would have to change."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from pyproj import Transformer

from siting.config import Project
from siting.errors import InputError
from siting.layers.codes import POSITIONS, WHY_NOT
from siting.notes import Notes
from siting.parallel import usable_threads
from siting.pipeline.read import Place, read_place
from siting.pipeline.runoff import runoff_classes
from siting.pipeline.sites import find_sites, screening_of
from siting.pipeline.stages import analyse_terrain
from siting.plots import Limits, judge
from siting.plots.screening import (
    CHANNEL_STRIP,
    EXCLUDED,
    LEAST_SHARE,
    LEFT_OVER,
    NO_DATA,
    NOT_LOW,
    OUTSIDE_BOUNDARY,
    PAN,
    PATCH_TOO_SMALL,
    SOIL_TOO_SHALLOW,
    TOO_LITTLE_ABOVE,
    TOO_MUCH_ABOVE,
    TOO_STEEP,
)
from siting.progress import Progress
from siting.terrain import Terrain


@dataclass(frozen=True, slots=True)
class _Told:
    """How one test is told: its name, what would change it, and its limit with unit and side, if it has one."""

    name: str
    change: str
    unit: str = ""
    limit: Callable[[Limits], float] | None = None
    at_most: bool = True


_TOLD = {
    NO_DATA: _Told("a height is known", "an elevation model that covers this place"),
    OUTSIDE_BOUNDARY: _Told("inside the boundary", "a boundary that takes it in"),
    EXCLUDED: _Told("clear of what is excluded", "another exclusion or set-back"),
    CHANNEL_STRIP: _Told(
        "clear of channels", "a place farther from the channel", "of the cell left", lambda _: LEAST_SHARE, at_most=False
    ),
    PAN: _Told("not in a pan's deepest part", "terrain.pans, if this is no pan"),
    TOO_STEEP: _Told("not too steep", "less slope, or another plots.max_slope_pct", "%", lambda of: of.max_slope_pct),
    NOT_LOW: _Told(
        "low",
        "the foot of a slope (here: {position}), or less height above the channel",
        "m above the channel, or the foot of a slope",
        lambda of: of.max_height_above_channel_m,
    ),
    SOIL_TOO_SHALLOW: _Told(
        "soil deep enough", "deeper soil: dig and see", "m", lambda of: of.min_soil_depth_m, at_most=False
    ),
    TOO_LITTLE_ABOVE: _Told(
        "enough ground above",
        "more ground above, or a smaller plots.min_catchment_ratio",
        "m2 for each m of contour",
        lambda of: of.least_fed_m,
        at_most=False,
    ),
    TOO_MUCH_ABOVE: _Told(
        "not too much water above", "less ground above: floods are to be feared", "m2", lambda of: of.max_catchment_m2
    ),
}


def why(project: Project, x: float, y: float, *, lonlat: bool, threads: int | None, progress: Progress) -> dict[str, Any]:
    """Judge one place by every test; see `siting.pipeline.why`."""
    notes, workers = Notes(), usable_threads(threads)
    place = read_place(project, notes)
    row, col = _cell(place, x, y, lonlat)
    ground = analyse_terrain(place, project, workers, progress, notes)
    sites = find_sites(place, ground, runoff_classes(place, ground, project, notes)[0], project, notes)
    looked_at, limits = screening_of(place, ground, project)
    judged = judge(looked_at, limits, row=row, col=col)
    reason, plot = int(sites.plots.reason[row, col]), int(sites.plots.label[row, col])
    tests = [_test(code, *judged[code], limits, ground, row, col) for code in judged]
    at = ground.grid.xy(row, col)
    return {
        "place": {"x": at[0], "y": at[1], "row": row, "column": col, "height_m": float(ground.elevation[row, col])},
        "tests": [*tests, _patch_test(reason)],
        "reason": _label(reason),
        "plot_id": plot or None,
        "answer": _answer(reason, plot, [one for one in tests if one["result"] == "fails"]),
    }


def _cell(place: Place, x: float, y: float, lonlat: bool) -> tuple[int, int]:
    grid = place.dem.grid
    if lonlat:
        x, y = Transformer.from_crs("EPSG:4326", grid.crs, always_xy=True).transform(x, y)
    row, col = grid.cell(x, y) if np.isfinite([x, y]).all() else (-1, -1)
    if not (0 <= row < grid.rows and 0 <= col < grid.cols):
        west, north = grid.xy(0, 0)
        east, south = grid.xy(grid.rows - 1, grid.cols - 1)
        msg = (
            f"the point {x:.7g}, {y:.7g} lies outside the elevation model, which runs from {west:.7g} to {east:.7g} and "
            f"from {south:.7g} to {north:.7g}; give coordinates of its CRS, or longitude and latitude with --lonlat"
        )
        raise InputError(msg)
    return row, col


def _label(code: int) -> str:
    return next(item.label for item in WHY_NOT.items if int(item.value) == code)


def _test(code: int, fails: bool, margin: float, limits: Limits, ground: Terrain, row: int, col: int) -> dict[str, Any]:
    """Tell of one test its value, limit and margin in its own unit, and what would change its answer."""
    told = _TOLD[code]
    limit = None if told.limit is None else float(told.limit(limits))
    known = None if np.isnan(margin) else margin
    value: Any = "no" if fails else "yes"
    if limit is not None:
        value = None if known is None else limit - known if told.at_most else limit + known
    term = ("unknown", *(item.label for item in POSITIONS.items))[int(ground.position[row, col])]
    return {
        "test": told.name,
        "value": value,
        "limit": limit,
        "unit": told.unit,
        "margin": known,
        "result": "fails" if fails else "passes, not known" if limit is not None and known is None else "passes",
        "what_would_change_it": told.change.format(position=term) if fails else None,
    }


def _patch_test(reason: int) -> dict[str, Any]:
    fails = reason in (PATCH_TOO_SMALL, LEFT_OVER)
    change = "more fit ground around it, or a smaller plots.min_area_m2" if fails else None
    result = "fails" if fails else "passes" if reason == 0 else "not reached"
    found: dict[str, Any] = dict.fromkeys(("test", "value", "limit", "unit", "margin", "result", "what_would_change_it"))
    return found | {"test": "part of a large enough patch", "unit": "", "result": result, "what_would_change_it": change}


def _answer(reason: int, plot: int, failed: list[dict[str, Any]]) -> str:
    """Put the judgement into one sentence."""
    if reason == 0:
        return f"This place can be cropped: it lies in plot {plot}."
    if plot:
        return f"This place lies in plot {plot}, which was drawn; by the rules it fails: {_label(reason)}."
    if not failed:
        return f"This place passes every test of its own, but: {_label(reason)}."
    more = f", and fails {len(failed) - 1} more" if len(failed) > 1 else ""
    return f"This place cannot be cropped by the rules: {_label(reason)}{more}."
