"""Options that several commands share, and the project that they make."""

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

if TYPE_CHECKING:
    from siting.config import Project

FLAG_KEYS = {
    "dem": "place.dem",
    "boundary": "place.boundary",
    "rain": "rain.daily",
    "climate": "climate.daily",
    "crop": "crop.name",
    "planting": "crop.planting",
    "cover": "cover.cover",
    "condition": "cover.condition",
    "texture": "soil.texture",
}
"""Flags that stand for a setting, and the key they set."""

HELP = {
    "dem": "Elevation model, any raster format.",
    "boundary": "Polygons to stay inside.",
    "rain": "Daily rain, CSV.",
    "climate": "Daily climate, CSV.",
    "crop": "Crop by name; see `siting crops`.",
    "planting": "Day of sowing, MM-DD.",
    "cover": "Cover of the ground that sheds water; see `siting covers`.",
    "condition": "Condition of the cover: poor, fair or good.",
    "texture": "Soil texture; see `siting soils`.",
}

json_option = click.option("--json", "as_json", is_flag=True, help="Print JSON with every value.")
strict_option = click.option("--strict", is_flag=True, help="Exit with 4 where a warning was given.")
set_option = click.option(
    "--set",
    "overrides",
    multiple=True,
    metavar="SECTION.NAME=VALUE",
    help="Set one setting; may be repeated. Paths start at the current folder; an empty value goes back to the default.",
)
project_argument = click.argument("project", required=False, type=click.Path(path_type=Path))


def input_flags(command: Callable[..., Any]) -> Callable[..., Any]:
    """Add the flags that stand for a setting."""
    for flag in reversed(FLAG_KEYS):
        metavar = "FILE" if flag in ("dem", "boundary", "rain", "climate") else None
        command = click.option(f"--{flag}", metavar=metavar, help=HELP[flag])(command)
    return command


def project_from(project: Path | None, overrides: tuple[str, ...], flags: dict[str, str | None]) -> "Project":
    """
    Make the project of a command line.

    Without a file named and without `--dem`, `project.toml` of the current folder is taken.
    """
    from siting.config import load_project
    from siting.errors import ConfigError

    here = Path("project.toml")
    has_dem = flags.get("dem") is not None or any(one.partition("=")[0].strip() == "place.dem" for one in overrides)
    if project is None and not has_dem:
        if not here.exists():
            msg = (
                "no project file is named and there is no project.toml here; "
                "name one, give --dem FILE, or write one with `siting new FOLDER`"
            )
            raise ConfigError(msg)
        project = here
    if project is not None and project.is_dir():
        project = project / here
    return load_project(project, overrides, {FLAG_KEYS[flag]: value for flag, value in flags.items()})
