"""The entry: commands by name, and errors as one line with an exit code."""

import sys

import click

from siting_cli.commands.tables import covers, crops, soils
from siting_cli.console import exit_code


@click.group(context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name="siting")
def group() -> None:
    """Find small low plots that could be cropped on run-on in dry country. Screening, not design."""


for command in (crops, covers, soils):
    group.add_command(command)


def main() -> None:
    """Run the command line; a user's mistake is a sentence and never a traceback."""
    from siting.errors import SitingError

    try:
        group()
    except SitingError as error:
        click.echo(f"Error: {error}", err=True)
        sys.exit(exit_code(error))
    except BrokenPipeError:
        sys.exit(0)
