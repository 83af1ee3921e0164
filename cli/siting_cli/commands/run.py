"""Every stage, and the screen that a run ends with."""

from collections.abc import Mapping
from importlib import import_module
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from siting_cli.console import DONE, WARNED, listener, plain, show, show_json, text, warn
from siting_cli.options import input_flags, json_option, project_argument, project_from, set_option, strict_option

if TYPE_CHECKING:
    from siting.config import Project

SHOWN_PLOTS = 5
SHOWN_ASSUMPTIONS = 3

threads_option = click.option("--threads", type=click.IntRange(min=1), help="Threads to use; the results are the same.")
overwrite_option = click.option("--overwrite", is_flag=True, help="Replace an earlier result of siting in that folder.")
out_option = click.option(
    "--out", type=click.Path(path_type=Path), help="Folder for the results; default: results, beside the project file."
)


@click.command()
@project_argument
@input_flags
@set_option
@out_option
@overwrite_option
@threads_option
@strict_option
@json_option
@click.pass_context
def run(
    ctx: click.Context,
    /,
    project: Path | None,
    overrides: tuple[str, ...],
    out: Path | None,
    overwrite: bool,
    threads: int | None,
    strict: bool,
    as_json: bool,
    **flags: str | None,
) -> None:
    """
    Find, size and rank plots.

    PROJECT is a project file, or a folder that holds project.toml. Without it, project.toml of the current folder is taken,
    or, where --dem is given, the flags say it all.
    """
    settings = project_from(project, overrides, flags)
    ctx.exit(carry_out(settings, out=out, overwrite=overwrite, threads=threads, strict=strict, as_json=as_json))


def carry_out(
    project: "Project", *, out: Path | None, overwrite: bool, threads: int | None, strict: bool, as_json: bool
) -> int:
    """Run every stage, show what came out, and return the exit code."""
    pipeline = import_module("siting.pipeline")  # heavy: not for --help
    folder = out or project.folder / "results"
    with listener() as progress:
        results = pipeline.run(project, out=folder, overwrite=overwrite, threads=threads, progress=progress)
    show_results(results.summary, as_json=as_json)
    return WARNED if strict and results.warnings else DONE


def show_results(summary: Mapping[str, Any], *, as_json: bool) -> None:
    """Show the summary of a run: the results on stdout, the warnings on stderr."""
    for warning in summary["warnings"]:
        warn(warning["text"])
    if as_json:
        show_json(summary)
        return
    click.echo(_heading(summary))
    show([_plot_row(row) for row in summary["plots"][:SHOWN_PLOTS]])
    click.echo("\n" + _cells(summary["cells"]))
    click.echo("\n" + _assumptions(summary["assumptions"]))
    click.echo("\nBefore anything is built:")
    for sentence in summary["cautions_text"]:
        click.echo(f"- {sentence}")
    click.echo(f"\nResults in {summary['folder']} after {summary['seconds']:.1f} s; open first: {summary['first_file']}")


def _heading(summary: Mapping[str, Any]) -> str:
    number = summary["n_plots"]
    if number == 0:
        return "No plot was found; the reasons below tell what stopped the ground."
    shown = min(number, SHOWN_PLOTS, len(summary["plots"]))
    if summary["plots"][0]["rank"] is None:
        return f"{number} plot{'s' if number != 1 else ''}, not ranked (see the warnings); the first {shown}:"
    return f"{number} plot{'s' if number != 1 else ''}, the best {shown} first:"


def _plot_row(row: Mapping[str, Any]) -> dict[str, object]:
    """Return one plot as a reader wants it: hectares, and ratios as printed, unknown as a dash."""
    in_degrees = abs(row["x"]) <= 360 and abs(row["y"]) <= 90
    return {
        "rank": row["rank"],
        "likely": _interval(row["rank_low"], row["rank_high"]),
        "plot": row["plot_id"],
        "x": _coordinate(row["x"], in_degrees),
        "y": _coordinate(row["y"], in_degrees),
        "hectares": row["area_m2"] / 10_000,
        "supported_ha": None if row["supported_area_m2"] is None else row["supported_area_m2"] / 10_000,
        **_volume(row),
        "need_m3": row["crop_demand_m3"],
        "supply_dry": row["supply_ratio_dry"],
        "good_years_in_10": _in_ten(row["reliability_pct"]),
        "on_rain_alone": _in_ten(row["rain_only_reliability_pct"]),
        "cautions": (row["cautions"] or "").replace(";", "; ") or None,
    }


def _volume(row: Mapping[str, Any]) -> dict[str, object]:
    """Return the run-on of a dry year, or, where no year is known, that of one storm."""
    if row["yield_dry_m3"] is None and row["storm_yield_m3"] is not None:
        return {"storm_m3": row["storm_yield_m3"]}
    return {"dry_year_m3": row["yield_dry_m3"]}


def _interval(low: int | None, high: int | None) -> str | None:
    """Write the ranks that the doubt leaves."""
    return None if low is None or high is None else f"{low} to {high}"


def _coordinate(value: float, in_degrees: bool) -> str:
    """Write a map coordinate to about a metre."""
    return f"{value:.5f}" if in_degrees else f"{value:.0f}"


def _in_ten(percent: float | None) -> float | None:
    """Turn a share of seasons in percent into years in ten, to a tenth."""
    return None if percent is None else round(percent / 10, 1)


def _cells(cells: Mapping[str, int]) -> str:
    total = sum(cells.values())
    parts = [f"  {share(number, total):>7}  {reason} ({number})" for reason, number in cells.items() if number]
    return "\n".join([f"Of {total} cells:", *parts])


def share(number: int, total: int) -> str:
    """Return a share in percent; one that is small but not none stays above 0."""
    percent = 100 * number / total
    return "< 0.1 %" if 0 < percent < 0.1 else f"{percent:.1f} %"


def _assumptions(noted: list[Any]) -> str:
    assumptions = plain(noted)
    if not assumptions:
        return "Nothing was assumed."
    lines = [f"Assumed, {min(SHOWN_ASSUMPTIONS, len(assumptions))} of {len(assumptions)} (all are in the results):"]
    for one in assumptions[:SHOWN_ASSUMPTIONS]:
        unit = f" {one['unit']}" if one["unit"] else ""
        lines.append(f"- {one['id']} = {text(one['value'])}{unit} ({one['source']}); it moves: {one['effect']}")
    return "\n".join(lines)
