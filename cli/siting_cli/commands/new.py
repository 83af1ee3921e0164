"""A project file to fill in, and an empty place for the inputs."""

from pathlib import Path

import click


@click.command()
@click.argument("folder", type=click.Path(path_type=Path))
def new(folder: Path) -> None:
    """
    Start a project: a commented project file.

    It goes into FOLDER, with an empty folder for the inputs beside it.
    """
    path = start_project(folder)
    click.echo(f"Wrote {path}; put the inputs into {folder / 'inputs'}, fill in the open lines, then: siting check {path}")


def start_project(folder: Path) -> Path:
    """Write the project file and the empty folder; raises OutputError where there is a project already."""
    from siting.config import project_template
    from siting.errors import OutputError

    path = folder / "project.toml"
    if path.exists():
        msg = f"{path} is there already and is left as it is; name another folder"
        raise OutputError(msg)
    try:
        (folder / "inputs").mkdir(parents=True, exist_ok=True)
        path.write_text(project_template(), encoding="utf-8", newline="\n")
    except OSError as error:
        msg = f"the folder {folder} cannot be written to ({error.strerror}); name another one"
        raise OutputError(msg) from error
    return path
