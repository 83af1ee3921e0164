"""A run, stage by stage."""

from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd

from siting.config import Project, default_vertical_error_m, note_defaults
from siting.notes import Notes
from siting.outputs import StagedFolder
from siting.parallel import usable_threads
from siting.pipeline import frames, shapes, write
from siting.pipeline.case import Case
from siting.pipeline.clock import Clock
from siting.pipeline.crop import choose_crop
from siting.pipeline.doubt import doubt_ranks
from siting.pipeline.downstream import ledger, places_below, village_channels
from siting.pipeline.floods import plot_floods
from siting.pipeline.forecast import refuse_what_does_not_fit
from siting.pipeline.order import Order, order_plots
from siting.pipeline.read import Place, read_place
from siting.pipeline.results import Results, summarise
from siting.pipeline.runoff import runoff_classes
from siting.pipeline.sites import find_sites, mean_curve_number
from siting.pipeline.soil import soil_of_plots
from siting.pipeline.surface import plot_ground
from siting.pipeline.together import Together, choose_together
from siting.pipeline.villages import village_cells, villages_layer
from siting.pipeline.water import Water, plot_water
from siting.pipeline.weather import weather_of
from siting.progress import Progress
from siting.terrain import Terrain, analyse

DAYS_OF_YEAR = 365.25

LEAST_PAN_MM = 10.0
"""A pan that holds less over its catchment is filled by one good storm (our assumption)."""


def run(project: Project, *, out: Path, overwrite: bool, threads: int | None, progress: Progress) -> Results:
    """Carry out every stage; see `siting.pipeline.run`."""
    notes, clock, workers = Notes(), Clock(progress), usable_threads(threads)
    refuse_what_does_not_fit(project.settings.place.dem, out)
    with StagedFolder(out, overwrite=overwrite) as folder:
        case = _case(project, notes, clock, workers)
        with clock.stage("water"):
            water = floods = None
            if case.weather is not None and case.sites.plots.count:
                water, floods = plot_water(case, case.weather), plot_floods(case, case.weather)
        with clock.stage("ranking"):
            order = order_plots(case, water, floods)
            doubt = doubt_ranks(case, water, floods, order)
        with clock.stage("together"):
            together, tables = _together(case, water, order)
        found = frames.Findings(water, floods, order, doubt, together)
        frame = frames.plots_frame(case, found)
        summary = summarise(frame, case, doubt, str(out))
        with clock.stage("layers"):
            tables |= _tables(frame, case, water)
            inputs = write.input_files(project)
            tables |= write.notes_tables(notes, write.run_info(case, together, inputs))
            write.write_layers(folder, tables, case.ground)
        if project.settings.output.rasters:
            with clock.stage("rasters"):
                write.write_rasters(folder / "rasters", case, progress)
        write.write_record(folder, case, clock, summary, inputs)
    return Results(summary | {"seconds": clock.total_seconds}, tuple(notes.warnings))


def _case(project: Project, notes: Notes, clock: Clock, threads: int) -> Case:
    """Read a project, and find its plots and what drains onto them."""
    with clock.stage("inputs"):
        place = read_place(project, notes)
        note_defaults(project, notes)
        crop = choose_crop(project, place.climate, notes)
        weather = weather_of(place, project, crop, float(np.nanmean(place.dem.values)), notes)
    with clock.stage("terrain"):
        ground = analyse_terrain(place, project, threads, clock.progress, notes)
    with clock.stage("runoff classes"):
        classes, cell_number = runoff_classes(place, ground, project, notes)
    with clock.stage("plots"):
        sites = find_sites(place, ground, classes, project, notes)
        own = plot_ground(sites, place, ground)
        soil = soil_of_plots(place.soil, own, project, crop)
        number = mean_curve_number(sites, classes)
    return Case(project, notes, threads, place, weather, ground, classes, sites, own, soil, number, cell_number)


def _together(case: Case, water: Water | None, order: Order) -> tuple[Together | None, dict[str, Any]]:
    """Choose the set, and tell what it means to villages and to all below; the tables of both come with it."""
    cells = village_cells(case.place, case.ground)
    below = None
    if case.weather is not None and water is not None:
        channels = village_channels(cells.cell, cells.village, cells.count, case.ground)
        below = places_below(case, case.weather, channels)
    together = choose_together(case, water, order, below)
    if together is None or below is None or water is None:
        return None, {"villages": villages_layer(case, cells, water, order, None, None)}
    lost = ledger(case, water, below, together.forest, together.chosen, cells.count)
    villages = villages_layer(case, cells, water, order, together.chosen, lost)
    return together, {"villages": villages, "downstream": lost.table}


def _years_of_seasons(case: Case) -> float:
    """Return the length of all seasons together, from harvest to harvest, in years; there is a crop."""
    assert case.weather is not None
    seasons = case.weather.seasons
    return float((seasons.end - seasons.first).sum()) / DAYS_OF_YEAR


def analyse_terrain(place: Place, project: Project, threads: int, progress: Progress, notes: Notes) -> Terrain:
    """Derive the terrain of a place; the vertical error that stands in is noted, and so is what is odd about the ground."""
    settings, cell_m = project.settings, place.dem.grid.typical_cell_m
    error_m = settings.place.vertical_error_m
    if error_m is None:
        error_m = default_vertical_error_m(cell_m)
        default = project.defaults["place.vertical_error_m"]
        source = f"{default.source}, for cells of {cell_m:.3g} m"
        notes.assume(default.key, f"{error_m:g}", default.unit, source, default.effect)
    ground = analyse(
        place.dem,
        vertical_error_m=error_m,
        channel_area_m2=settings.terrain.channel_area_m2,
        pan_min_area_m2=settings.terrain.pan_min_area_m2,
        pan_layer=place.pan_layer,
        flow_direction=place.flow_direction,
        threads=threads,
        progress=lambda stage, done, total: progress.stage(f"terrain: {stage}", 1, 1),
    )
    if ground.enclosed_voids:
        text = f"The elevation model has holes inside ({ground.enclosed_voids}); catchments beside them are open: fill them."
        notes.warn("enclosed_voids", text)
    _tell_pans(ground, notes)
    return ground


def _tell_pans(ground: Terrain, notes: Notes) -> None:
    """Say which pans one flood would fill: a bank, a bridge or coarse cells may dam a drainage line there."""
    pans = ground.pans
    kept = np.flatnonzero([status == "kept" for status in pans.status])
    if kept.size == 0:
        return
    above_m2 = ground.contributing_area_m2.ravel()[pans.bottom_cell[kept]]
    holds_mm = 1000.0 * pans.volume_m3[kept] / above_m2
    full = kept[holds_mm < LEAST_PAN_MM]
    if full.size:
        worst = int(kept[np.argmin(holds_mm)])
        x, y = ground.grid.xy(*divmod(int(pans.bottom_cell[worst]), ground.grid.cols))
        notes.warn(
            "pan_on_drainage",
            f"Flow ends in {full.size} depressions that hold less than {LEAST_PAN_MM:g} mm of what drains there, the least "
            f"at {x:.6f}, {y:.6f}: banks, bridges or coarse cells may dam a channel; look, and say so in terrain.pans.",
        )


def _tables(frame: pd.DataFrame, case: Case, water: Water | None) -> dict[str, Any]:
    """Return every layer and table of plots and ground that holds rows; the writer adds those that hold none."""
    tables: dict[str, Any] = {
        "plots": shapes.plots_layer(frame, case.sites, case.ground),
        "catchments": shapes.catchments_layer(frame, case.sites, case.ground),
        "intakes": shapes.intakes_layer(case.sites, case.ground),
        "overflow_paths": shapes.overflow_layer(case.sites, case.ground, case.place),
        "channels": shapes.channels_layer(case.ground),
        "pans": shapes.pans_layer(case.ground),
    }
    if water is not None and water.crop is not None:
        tables["seasons"] = frames.seasons_frame(case.sites, water.crop)
        tables["area_curves"] = frames.area_curves_frame(case.sites, water.crop)
        tables["months"] = frames.months_frame(case.sites, water.crop, _years_of_seasons(case))
    return tables
