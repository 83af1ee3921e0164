"""From a project to its results: the only room that knows all others."""

from collections.abc import Callable
from importlib import import_module
from pathlib import Path
from typing import TYPE_CHECKING, Any

from siting.progress import Progress, Silent

if TYPE_CHECKING:
    from siting.config import Project
    from siting.pipeline.results import Results

__all__ = ["check", "compare", "run", "why"]


def run(
    project: "Project",
    *,
    out: Path,
    overwrite: bool = False,
    threads: int | None = None,
    progress: Progress | None = None,
) -> "Results":
    """
    Find, size and rank the plots of a place and write the results folder.

    Parameters
    ----------
    project
        As `siting.config.load_project` gives it.
    out
        Folder to write; it appears whole at the end, or not at all.
    overwrite
        Replace an earlier result of ours in that folder.
    threads
        How many to use; None for all that there are. The results are the same.
    progress
        Hears of each stage.

    Raises
    ------
    SitingError
        In one sentence: what is wrong with an input, a setting or the folder, and the way out.
    """
    carry_out: Callable[..., Results] = import_module("siting.pipeline.stages").run  # compiles kernels: not for `check`
    return carry_out(project, out=out, overwrite=overwrite, threads=threads, progress=progress or Silent())


def check(project: "Project") -> dict[str, Any]:
    """
    Read every input of a project and tell what it is; write nothing.

    Returns
    -------
    dict
        Sections by title, each a mapping of names to values; and "warnings", a list of code and text.

    Raises
    ------
    SitingError
        For the first input that cannot be used.
    """
    report: Callable[..., dict[str, Any]] = import_module("siting.pipeline.report").check
    return report(project)


def why(
    project: "Project",
    x: float,
    y: float,
    *,
    lonlat: bool = False,
    threads: int | None = None,
    progress: Progress | None = None,
) -> dict[str, Any]:
    """
    Judge one place by every test that a run makes; write nothing.

    Parameters
    ----------
    x, y
        Coordinates of the elevation model's CRS; with `lonlat` longitude and latitude, degrees, WGS 84.

    Returns
    -------
    dict
        "place" (cell and coordinates), "tests" (a list with value, limit, unit, margin, result and what would change
        it), "reason", "plot_id" (None outside plots) and "answer", a sentence.

    Raises
    ------
    SitingError
        For an input that cannot be used, or a point outside the elevation model.
    """
    judge: Callable[..., dict[str, Any]] = import_module("siting.pipeline.why").why
    return judge(project, x, y, lonlat=lonlat, threads=threads, progress=progress or Silent())


def compare(before: Path, after: Path, *, threads: int | None = None, progress: Progress | None = None) -> dict[str, Any]:
    """
    Set two results folders side by side.

    Returns
    -------
    dict
        "inputs" (settings and files that differ), "plots" (pairs on the same ground with their ranks, those gone and
        new, most moved first), "sum", "effects" (what each group of inputs, taken alone from the later run into the
        earlier one, does) and "effects_unknown_because" (None, or why they could not be found).

    Raises
    ------
    InputError
        Where a folder holds no results of a run.
    """
    side_by_side: Callable[..., dict[str, Any]] = import_module("siting.pipeline.compare").compare
    return side_by_side(before, after, threads=threads, progress=progress or Silent())
