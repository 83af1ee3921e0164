"""Two results side by side: which plots moved, and which group of inputs did it."""

import tempfile
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pandas as pd

from siting.config import Project, defaults, load_project
from siting.errors import SitingError
from siting.inputs.results import EarlierRun, read_results
from siting.outputs import sha256 as sha256_of
from siting.pipeline.stages import run
from siting.progress import Progress

LEAST_OVERLAP = 0.5
"""Plots of two runs are one and the same where what they share is this part of what they cover together (our choice)."""

NO_EFFECT = ("output", "villages")
"""Sections that move no plot."""


def compare(first: Path, second: Path, *, threads: int | None, progress: Progress) -> dict[str, Any]:
    """Set two results side by side; see `siting.pipeline.compare`."""
    before, after = read_results(first), read_results(second)
    changed = _changed(before, after)
    groups = sorted({key.partition(".")[0] for key in changed} - set(NO_EFFECT))
    moved = _moved(before.plots, after.plots)
    effects, reason = _effects(before, after, groups, moved, threads, progress)
    return {
        "inputs": [{"key": key, "before": old, "after": new} for key, (old, new) in sorted(changed.items())],
        "plots": moved,
        "sum": _summed(moved),
        "effects": effects,
        "effects_unknown_because": reason,
    }


def _changed(before: EarlierRun, after: EarlierRun) -> dict[str, tuple[Any, Any]]:
    """Return what differs: settings by value, files by content, and the program itself."""
    found: dict[str, tuple[Any, Any]] = {}
    old, new = ({key: one["value"] for key, one in run.record["settings"].items()} for run in (before, after))
    files = {key.partition(" ")[0] for run in (before, after) for key in run.record.get("inputs", {})}
    for key in sorted(set(old) | set(new)):
        values = tuple(one.get(key, _default(key)) for one in (old, new))
        if key not in files and values[0] != values[1]:
            found[key] = (values[0], values[1])
    old_files, new_files = (run.record.get("inputs", {}) for run in (before, after))
    for key in sorted(set(old_files) | set(new_files)):
        if _content(old_files.get(key)) != _content(new_files.get(key)):
            found[key] = (_told(old_files.get(key)), _told(new_files.get(key)))
    versions = [run.record.get("versions", {}).get("siting") for run in (before, after)]
    if versions[0] != versions[1]:
        found["program"] = (versions[0], versions[1])
    return found


def _default(key: str) -> Any:
    """Return what a setting stands at where a record does not name it."""
    return defaults()[key].value if key in defaults() else None


def _content(file: Any) -> Any:
    return file and file.get("sha256")


def _told(file: Any) -> str | None:
    return f"{file['file']} ({str(file['sha256'])[:8]})" if file else None


def _moved(before: gpd.GeoDataFrame, after: gpd.GeoDataFrame) -> list[dict[str, Any]]:
    """Pair plots that cover the same ground; one without a partner is gone or new. Most moved first."""
    pairs = _pairs(before, after)
    rows = [_row(before.iloc[old], after.iloc[new]) for old, new in pairs]
    rows += [_row(before.iloc[old], None) for old in sorted(set(range(len(before))) - {old for old, _ in pairs})]
    rows += [_row(None, after.iloc[new]) for new in sorted(set(range(len(after))) - {new for _, new in pairs})]
    return sorted(rows, key=lambda row: (row["places"] is None, -abs(row["places"] or 0), row["rank_before"] or 0))


def _pairs(before: gpd.GeoDataFrame, after: gpd.GeoDataFrame) -> list[tuple[int, int]]:
    """Return places of plots that share most of their ground, each plot in one pair at most, best overlap first."""
    if before.empty or after.empty:
        return []
    there = after.geometry.to_crs(before.crs)
    old, new = before.sindex.query(there, predicate="intersects")[::-1]
    one, other = before.geometry.to_numpy()[old], there.to_numpy()[new]
    shared = gpd.GeoSeries(one).intersection(gpd.GeoSeries(other)).area.to_numpy()
    together = gpd.GeoSeries(one).area.to_numpy() + gpd.GeoSeries(other).area.to_numpy() - shared
    overlap = shared / together
    pairs: dict[int, int] = {}
    taken: set[int] = set()
    for at in np.lexsort((new, old, -overlap)):
        if overlap[at] >= LEAST_OVERLAP and int(old[at]) not in pairs and int(new[at]) not in taken:
            pairs[int(old[at])] = int(new[at])
            taken.add(int(new[at]))
    return sorted(pairs.items())


def _row(old: Any, new: Any) -> dict[str, Any]:
    ranks = [None if one is None or pd.isna(one["rank"]) else int(one["rank"]) for one in (old, new)]
    return {
        "plot_id_before": None if old is None else int(old["plot_id"]),
        "plot_id_after": None if new is None else int(new["plot_id"]),
        "rank_before": ranks[0],
        "rank_after": ranks[1],
        "places": None if ranks[0] is None or ranks[1] is None else ranks[0] - ranks[1],
        "status": "gone" if new is None else "new" if old is None else "same ground",
    }


def _summed(rows: list[dict[str, Any]]) -> dict[str, Any]:
    places = np.array([row["places"] for row in rows if row["places"] is not None], dtype=np.float64)
    return {
        "same_ground": sum(row["status"] == "same ground" for row in rows),
        "gone": sum(row["status"] == "gone" for row in rows),
        "new": sum(row["status"] == "new" for row in rows),
        "moved": int(np.count_nonzero(places)),
        "mean_places": float(np.abs(places).mean()) if places.size else None,
    }


def _effects(
    before: EarlierRun,
    after: EarlierRun,
    groups: list[str],
    moved: list[dict[str, Any]],
    threads: int | None,
    progress: Progress,
) -> tuple[list[dict[str, Any]], str | None]:
    """Take one group of inputs at a time from the later run into the earlier one, and run that."""
    if not groups:
        return [], None
    if len(groups) == 1:
        return [{"group": groups[0]} | _summed(moved)], None
    try:
        old, new = _values(before), _values(after)
        effects = [_effect(before, old, new, group, threads, progress) for group in groups]
    except SitingError as error:
        return [], str(error)
    return sorted(effects, key=lambda one: -(one["mean_places"] or 0.0)), None


def _values(earlier: EarlierRun) -> dict[str, Any]:
    """Return the settings of a run as flags, files by their path: those that lie where the results do, unchanged."""
    found: dict[str, Any] = {}
    home = earlier.folder.absolute().parent
    hashes = earlier.record.get("inputs", {})
    for key, one in earlier.record["settings"].items():
        if one["origin"] == "default":
            continue
        value = one["value"]
        names = value if isinstance(value, list) else [value]
        if defaults()[key].may_be_path and isinstance(names[0], str):
            keys = [f"{key} {place}" for place in range(1, len(names) + 1)] if isinstance(value, list) else [key]
            paths = [_unchanged(home / name, hashes.get(of, {}).get("sha256")) for name, of in zip(names, keys, strict=True)]
            value = paths if isinstance(value, list) else paths[0]
        found[key] = value
    return found


def _unchanged(path: Path, sha256: str | None) -> str:
    if not path.exists() or sha256_of(path) != sha256:
        msg = f"{path.name} is not beside the results as it was; run with one group of inputs changed at a time"
        raise _Gone(msg)
    return str(path)


class _Gone(SitingError):
    """An input of an earlier run is no longer there as it was."""


def _effect(
    before: EarlierRun, old: dict[str, Any], new: dict[str, Any], group: str, threads: int | None, progress: Progress
) -> dict[str, Any]:
    """Run the earlier settings with one group from the later ones, and sum up what moves."""
    mixed = {key: value for key, value in old.items() if not key.startswith(f"{group}.")}
    mixed |= {key: value for key, value in new.items() if key.startswith(f"{group}.")}
    mixed |= {"output.rasters": False, "ranking.draws": 0}
    project: Project = load_project(None, flags=mixed)
    with tempfile.TemporaryDirectory(prefix="siting-compare-") as folder:
        out = Path(folder) / "results"
        run(project, out=out, overwrite=False, threads=threads, progress=progress)
        return {"group": group} | _summed(_moved(before.plots, read_results(out).plots))
