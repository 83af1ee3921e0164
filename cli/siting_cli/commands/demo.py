"""The demo place, carried in the package: written out, then run."""

import shutil
from importlib.resources import as_file, files
from pathlib import Path

import click

from siting_cli.commands.run import carry_out, overwrite_option, threads_option
from siting_cli.options import json_option, strict_option

LEFT_OUT = ("make_demo.py", "results", "__pycache__")
"""What lies beside the demo place in the source tree and is no part of it for a user."""


@click.command()
@click.argument("folder", type=click.Path(path_type=Path), default=Path("siting-demo"))
@overwrite_option
@threads_option
@strict_option
@json_option
@click.pass_context
def demo(ctx: click.Context, /, folder: Path, overwrite: bool, threads: int | None, strict: bool, as_json: bool) -> None:
    """
    Write the invented demo place and run it.

    It goes into FOLDER, siting-demo where none is named.
    """
    from siting.config import load_project

    project = load_project(write_demo(folder))
    click.echo(f"The demo place lies in {folder}; it is invented: ground, rain, villages and people.", err=True)
    ctx.exit(carry_out(project, out=None, overwrite=overwrite, threads=threads, strict=strict, as_json=as_json))


def write_demo(folder: Path) -> Path:
    """
    Write the demo place into a folder and return its project file.

    Files that are there already stay when they are the demo's own; a different one is an OutputError.
    """
    from siting.errors import OutputError

    packaged = files("siting_cli").joinpath("demo_dem")
    # in the source tree the demo place lies at the top, beside cli/
    source = packaged if packaged.is_dir() else Path(__file__).parents[3] / "demo_dem"
    with as_file(source) as place:
        names = sorted(path.name for path in place.iterdir() if path.name not in LEFT_OUT and path.is_file())
        for name in names:
            if (folder / name).exists() and (folder / name).read_bytes() != (place / name).read_bytes():
                msg = f"{folder / name} is there already and is not the demo's own; name another folder"
                raise OutputError(msg)
        try:
            folder.mkdir(parents=True, exist_ok=True)
            for name in names:
                shutil.copyfile(place / name, folder / name)
        except OSError as error:
            msg = f"the folder {folder} cannot be written to ({error.strerror}); name another one"
            raise OutputError(msg) from error
    return folder / "project.toml"
