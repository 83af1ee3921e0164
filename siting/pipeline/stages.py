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
from siting.pipeline.clock import Clock
from siting.pipeline.crop import choose_crop
from siting.pipeline.doubt import doubt_ranks
from siting.pipeline.downstream import ledger, places_below, village_channels
from siting.pipeline.floods import plot_floods
from siting.pipeline.forecast import refuse_what_does_not_fit
from siting.pipeline.order import order_plots
from siting.pipeline.read import Place, read_place
from siting.pipeline.results import Results, summarise
from siting.pipeline.sites import Sites, find_sites
from siting.pipeline.soil import soil_of_plots
from siting.pipeline.surface import plot_ground
from siting.pipeline.together import choose_together
from siting.pipeline.villages import village_cells, villages_layer
from siting.pipeline.water import Water, plot_water, weather_of
from siting.progress import Progress
from siting.runoff import RunoffClasses, classify
from siting.terrain import Terrain, analyse

LEAST_PAN_MM = 10.0
"""A pan that holds less over its catchment is filled by one good storm (our assumption)."""


def run(project: Project, *, out: Path, overwrite: bool, threads: int | None, progress: Progress) -> Results:
    """Carry out every stage; see `siting.pipeline.run`."""
    notes, clock, workers = Notes(), Clock(progress), usable_threads(threads)
    refuse_what_does_not_fit(project.settings.place.dem, out)
    with StagedFolder(out, overwrite=overwrite) as folder:
        with clock.stage("inputs"):
            place = read_place(project, notes)
            note_defaults(project, notes)
            crop = choose_crop(project, place.climate, notes)
            weather = weather_of(place, project, crop, float(np.nanmean(place.dem.values)), notes)
        with clock.stage("terrain"):
            ground = analyse_terrain(place, project, workers, progress, notes)
        with clock.stage("runoff classes"):
            classes = runoff_classes(place, ground, project, notes)
        with clock.stage("plots"):
            sites = find_sites(place, ground, classes, project, notes)
        with clock.stage("water"):
            own = plot_ground(sites, place, ground)
            soil = soil_of_plots(own.texture, own.drop_m, project, crop, notes)
            number = frames.mean_curve_number(sites, classes)
            water = floods = None
            if weather is not None and sites.plots.count:
                water = plot_water(sites, classes, weather, soil, project, workers, notes)
                floods = plot_floods(sites, classes, number, weather, project, notes)
        with clock.stage("ranking"):
            order = order_plots(sites, own, soil, water, floods, weather, ground, project, notes)
            doubt = doubt_ranks(sites, own, soil, classes, water, floods, weather, order, project, workers, notes)
        with clock.stage("together"):
            cells = village_cells(place, ground)
            below = None
            if weather is not None and water is not None:
                channels = village_channels(cells.cell, cells.village, cells.count, ground)
                below = places_below(sites, place, channels, ground, classes, weather, project)
            together = choose_together(sites, water, order, below, project)
            lost = None
            if together is not None and below is not None and water is not None:
                lost = ledger(below, together.forest, together.chosen, water, sites, cells.count, project)
            chosen = None if together is None else together.chosen
            villages = villages_layer(place, cells, sites, ground, water, order, chosen, lost, project, workers, notes)
            frame = frames.plots_frame(
                sites, own, soil, water, floods, weather, ground, place, number, order, doubt, together, project
            )
        summary = summarise(frame, sites, place, doubt, notes, str(out))
        with clock.stage("layers"):
            tables = _tables(frame, sites, ground, place, water)
            tables |= {"villages": villages, "downstream": None if lost is None else lost.table}
            tables |= write.notes_tables(notes, write.run_info(project, place, sites, weather, together))
            write.write_layers(folder, tables, ground.grid.crs, ground)
        if project.settings.output.rasters:
            with clock.stage("rasters"):
                write.write_rasters(
                    folder / "rasters", ground, sites, classes, weather, place.curve_number, project, workers, progress
                )
        write.write_record(folder, project, notes, clock, workers, summary)
    return Results(summary | {"seconds": clock.total_seconds}, tuple(notes.warnings))


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


def runoff_classes(place: Place, ground: Terrain, project: Project, notes: Notes) -> RunoffClasses:
    """Sort the ground by how it runs off; the rain after which each class runs is noted, for people can confirm it."""
    ratio = project.settings.runoff.abstraction_ratio
    classes = classify(curve_number=place.curve_number, runs_after_mm=place.runs_after_mm, valid=ground.direction != 255)
    starts = zip(classes.label, classes.starts_at_mm(abstraction_ratio=ratio), strict=True)
    if classes.count and np.isnan(classes.runs_after_mm).any():
        told = ", ".join(f"{label} after {rain_mm:.0f}" for label, rain_mm in starts)
        source = "the abstraction ratio; ask people whether it is so, and else set cover.runs_after_mm"
        notes.assume("runoff.starts", told, "mm of rain in a day", source, "all run-on, most of all in dry years")
    return classes


def _tables(frame: pd.DataFrame, sites: Sites, ground: Terrain, place: Place, water: Water | None) -> dict[str, Any]:
    """Return every layer and table that holds rows; the writer adds those that hold none."""
    tables: dict[str, Any] = {
        "plots": shapes.plots_layer(frame, sites, ground),
        "catchments": shapes.catchments_layer(frame, sites, ground),
        "intakes": shapes.intakes_layer(sites, ground),
        "overflow_paths": shapes.overflow_layer(sites, ground, place),
        "channels": shapes.channels_layer(ground),
        "pans": shapes.pans_layer(ground),
    }
    if water is not None and water.crop is not None:
        tables["seasons"] = frames.seasons_frame(sites, water.crop)
    return tables
