"""What the inputs of a project are, told before anything is computed from them."""

from typing import Any

import numpy as np
from pyproj import CRS

from siting.config import Project, default_vertical_error_m, note_defaults
from siting.notes import Notes
from siting.pipeline.crop import CropChoice, choose_crop
from siting.pipeline.forecast import forecast, refuse_what_does_not_fit
from siting.pipeline.read import Place, read_place
from siting.pipeline.weather import Weather, weather_of
from siting.ranking import dependable
from siting.runoff import RunoffClasses, antecedent_bounds_mm, classify, yearly_totals

GIGABYTE = 1e9


def check(project: Project) -> dict[str, Any]:
    """Read everything and tell what it is; see `siting.pipeline.check`."""
    refuse_what_does_not_fit(project.settings.place.dem, project.folder / "results")
    notes = Notes()
    place = read_place(project, notes)
    note_defaults(project, notes)
    crop = choose_crop(project, place.climate, notes)
    weather = weather_of(place, project, crop, float(np.nanmean(place.dem.values)), notes)
    return {
        "Elevation model": _dem(project, place),
        "Outlines": _outlines(place),
        "Data beyond the boundary": _room_around(place, project, notes),
        "Soil": _soil(place),
        "Cover": _cover(place, project),
        "Rain": None if weather is None else _rain(weather, project),
        "Crop": None if crop is None else _crop(crop, weather),
        "Assumed": [f"{one.id} = {one.value} {one.unit}".rstrip() + f" ({one.source})" for one in notes.assumptions],
        "Forecast": _forecast(project),
        "warnings": [{"code": one.code, "text": one.text} for one in notes.warnings],
    }


def _dem(project: Project, place: Place) -> dict[str, Any]:
    grid, heights = place.dem.grid, place.dem.values
    lon, lat = place.middle_lonlat
    error_m = project.settings.place.vertical_error_m
    return {
        "file": project.settings.place.dem.name,
        "rows x columns": f"{grid.rows} x {grid.cols}",
        "CRS": CRS.from_user_input(grid.crs).name,
        "cell, m": f"{grid.cell_width_m[grid.rows // 2]:.4g} x {grid.cell_height_m[grid.rows // 2]:.4g}",
        "area, km2": _area_km2(place, ~np.isnan(heights)),
        "middle, degrees": f"{abs(lat):.4f} {'N' if lat >= 0 else 'S'}, {abs(lon):.4f} {'E' if lon >= 0 else 'W'}",
        "heights, m": f"{np.nanmin(heights):.1f} to {np.nanmax(heights):.1f}",
        "without a height, %": 100.0 * float(np.mean(np.isnan(heights))),
        "vertical error, m": default_vertical_error_m(grid.typical_cell_m) if error_m is None else error_m,
    }


def _area_km2(place: Place, mask: Any) -> float:
    return float((mask.sum(axis=1) * place.dem.grid.cell_area_m2).sum()) / 1e6


def _outlines(place: Place) -> dict[str, Any]:
    found: dict[str, Any] = {}
    if place.inside is not None:
        found["inside the boundary, km2"] = _area_km2(place, place.inside)
    if place.excluded is not None:
        found["excluded, km2"] = _area_km2(place, place.excluded)
    if place.given_label is not None:
        found["given plots"] = len(place.given_names)
    if place.pan_layer is not None:
        found["pans to keep, cells"] = int((place.pan_layer > 0).sum())
        found["pans that are none, cells"] = int((place.pan_layer < 0).sum())
    if place.villages is not None:
        found["villages"] = len(place.villages)
    return found


def _room_around(place: Place, project: Project, notes: Notes) -> dict[str, Any]:
    """
    Tell how far the data go beyond the boundary on each side, and warn where catchments will be open.

    A catchment as large as a plot may have reaches about the root of its area beyond it (our assumption).
    """
    if place.inside is None:
        return {}
    grid, valid = place.dem.grid, ~np.isnan(place.dem.values)
    found: dict[str, float] = {}
    for axis, sides in ((1, ("N", "S")), (0, ("W", "E"))):
        within, known = (np.flatnonzero(mask.any(axis=axis)) for mask in (place.inside, valid))
        size = grid.cell_height_m if axis else np.full(grid.cols, grid.cell_width_m[grid.rows // 2])
        found[sides[0]] = float(size[known[0] : within[0]].sum())
        found[sides[1]] = float(size[within[-1] + 1 : known[-1] + 1].sum())
    needed = float(np.sqrt(project.settings.plots.max_catchment_m2))
    short = {side: room for side, room in found.items() if room < needed}
    if short:
        told = ", ".join(f"{side} {room:.0f} m" for side, room in sorted(short.items()))
        notes.warn(
            "dem_cut_at_boundary",
            f"The elevation model ends close to the boundary ({told} beyond it): catchments there will be open, their areas "
            f"lower bounds; extend it to {needed:.0f} m beyond the boundary on these sides, if ground above lies there.",
        )
    return {f"{side}, m": found[side] for side in ("N", "E", "S", "W")}


def _soil(place: Place) -> dict[str, Any]:
    known, soil = ~np.isnan(place.dem.values), place.soil
    kinds = _shares(soil.code[known] + 1, ("unknown soil", *(kind.name for kind in soil.kinds)))
    groups = _shares(soil.soil_group[known], ("unknown soil group", *(f"soil group {letter}" for letter in "ABCD")))
    depth = soil.depth_m[known]
    if np.isnan(depth).all():
        return kinds | groups
    return kinds | groups | {"depth, m": f"{np.nanmin(depth):.2g} to {np.nanmax(depth):.2g}"}


def _shares(codes: Any, names: tuple[str, ...]) -> dict[str, Any]:
    """Return the share of each code that occurs, in percent, by name."""
    counts = np.bincount(codes, minlength=len(names))
    return {f"{name}, %": 100.0 * int(counts[code]) / codes.size for code, name in enumerate(names) if counts[code]}


def _cover(place: Place, project: Project) -> list[dict[str, Any]]:
    """Tell of each class of ground how much there is, and the rain after which it runs: ask whether that is so."""
    valid = ~np.isnan(place.dem.values)
    classes: RunoffClasses = classify(curve_number=place.curve_number, runs_after_mm=place.runs_after_mm, valid=valid)
    ratio = project.settings.runoff.abstraction_ratio
    storm = project.settings.rain.design_storm_mm
    bounds = antecedent_bounds_mm(storm, classes, abstraction_ratio=ratio)
    runoff = [np.append(depths, np.nan) for depths in (bounds.dry_mm, bounds.average_mm, bounds.wet_mm)]
    counts = np.bincount(np.minimum(classes.class_of_cell[valid], classes.count), minlength=classes.count + 1)
    starts = [*classes.starts_at_mm(abstraction_ratio=ratio), np.nan]
    return [
        {
            "ground": label,
            "share_pct": 100.0 * int(number) / int(valid.sum()),
            "runs_after_mm": start,
            f"runoff_of_{storm:g}_mm_when_dry": dry,
            "average": average,
            "wet": wet,
        }
        for label, number, start, dry, average, wet in zip(
            [*classes.label, "no curve number"], counts, starts, *runoff, strict=True
        )
        if number
    ]


def _rain(weather: Weather, project: Project) -> dict[str, Any]:
    record, years = weather.record, weather.years
    rain = record.of(0)
    totals = yearly_totals(rain.as_dry_mm, rain.days, years)
    share = project.settings.ranking.dependable
    et0 = weather.et0_mm
    return {
        "stations": ", ".join(record.station) + ("; the figures below are of the first" if len(record.station) > 1 else ""),
        "days": f"{rain.days[0]} to {rain.days[-1]}",
        "days without a reading": int(np.isnan(rain.rain_mm).sum()),
        "complete years": int(years.labels.size),
        "years begin in month": years.starts_month,
        "mean year, mm": float(totals.mean()),
        f"reached in {100 * share:.0f} % of years, mm": float(dependable(totals, probability=share)),
        "greatest day, mm": float(np.nanmax(rain.rain_mm)),
        "reference ET, mean, mm/d": float(np.nanmean(et0)) if not np.isnan(et0).all() else None,
    }


def _crop(crop: CropChoice, weather: Weather | None) -> dict[str, Any]:
    (month, day), last = crop.planting.opens, crop.planting.closes
    found: dict[str, Any] = {
        "name": crop.name,
        "sown on" if last is None else "sown from": f"{month:02d}-{day:02d}",
        "season, days": crop.water.length_days,
        "coefficients": crop.water.kc,
        "root depth, m": crop.water.root_depth_m,
    }
    if last is not None:
        found["sown until"] = f"{last[0]:02d}-{last[1]:02d}"
    if weather is not None and weather.crops:
        coefficients, seasons = crop.water.coefficients(), weather.seasons
        demand = [float(np.dot(coefficients, weather.et0_mm[day : day + coefficients.size])) for day in seasons.sowing]
        found |= {"seasons": int(seasons.label.size), "demand, mean of seasons, mm": float(np.mean(demand))}
    return found


def _forecast(project: Project) -> dict[str, Any]:
    found = forecast(project.settings.place.dem, project.folder / "results")
    if found is None:
        return {}
    return {
        "cells": found.cells,
        "memory, GB": found.memory_bytes / GIGABYTE,
        "memory free, GB": None if found.free_memory_bytes is None else found.free_memory_bytes / GIGABYTE,
        "disk at most, GB": found.disk_bytes / GIGABYTE,
        "disk free, GB": None if found.free_disk_bytes is None else found.free_disk_bytes / GIGABYTE,
        "time, about, s": found.seconds,
    }
