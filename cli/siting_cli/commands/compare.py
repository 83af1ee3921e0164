"""Two results side by side."""

from importlib import import_module
from pathlib import Path

import click

from siting_cli.console import listener, show, show_json, text
from siting_cli.options import json_option

SHOWN_PLOTS = 10


@click.command()
@click.argument("before", metavar="RUN", type=click.Path(path_type=Path))
@click.argument("after", metavar="RUN", type=click.Path(path_type=Path))
@click.option("--threads", type=click.IntRange(min=1), help="Threads to use; the results are the same.")
@json_option
def compare(before: Path, after: Path, threads: int | None, as_json: bool) -> None:
    """
    Tell which plots moved between two results, and which input moved them.

    Each RUN is a results folder. Where several groups of inputs differ, the first is run again with one group at a time
    taken from the second; nothing is written.
    """
    with listener() as progress:
        found = import_module("siting.pipeline").compare(before, after, threads=threads, progress=progress)
    if as_json:
        show_json(found)
        return
    if not found["inputs"]:
        click.echo("Both runs rest on the same inputs and settings.")
    show(found["inputs"])
    summed = found["sum"]
    click.echo(
        f"\n{summed['same_ground']} plots on the same ground, {summed['gone']} gone, {summed['new']} new; "
        f"{summed['moved']} moved in rank, by {text(summed['mean_places'])} places in the mean."
    )
    rows = [row for row in found["plots"] if row["places"] or row["status"] != "same ground"][:SHOWN_PLOTS]
    if rows:
        click.echo()
        show(rows)
    if found["effects"]:
        click.echo("\nWhat each group of inputs does alone:")
        show(found["effects"])
    if found["effects_unknown_because"]:
        click.echo(f"\nWhich input did it is not known: {found['effects_unknown_because']}.")
