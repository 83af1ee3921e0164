"""Every test at one place."""

from importlib import import_module
from pathlib import Path

import click

from siting_cli.console import listener, show, show_json
from siting_cli.options import json_option, project_from, set_option


@click.command(context_settings={"ignore_unknown_options": True})
@click.argument("project", type=click.Path(path_type=Path))
@click.argument("x", type=float)
@click.argument("y", type=float)
@click.option("--lonlat", is_flag=True, help="X and Y are longitude and latitude in degrees.")
@set_option
@json_option
def why(project: Path, x: float, y: float, lonlat: bool, overrides: tuple[str, ...], as_json: bool) -> None:
    """
    Tell why a place can be cropped, or why not.

    PROJECT is a project file or its folder; X and Y are map coordinates of the elevation model.
    """
    settings = project_from(project, overrides, {})
    with listener() as progress:
        found = import_module("siting.pipeline").why(settings, x, y, lonlat=lonlat, progress=progress)
    if as_json:
        show_json(found)
        return
    click.echo(found["answer"])
    click.echo()
    show(found["tests"])
