"""The entry: commands by name, and errors as one line with an exit code."""

import signal
from typing import Any

import click

from siting_cli.commands.check import check
from siting_cli.commands.compare import compare
from siting_cli.commands.demo import demo
from siting_cli.commands.new import new
from siting_cli.commands.run import run
from siting_cli.commands.tables import covers, crops, soils
from siting_cli.commands.why import why
from siting_cli.console import fail


class Commands(click.Group):
    """A group in whose commands a user's mistake is a sentence and never a traceback."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """List the commands in the order of registration, a newcomer's first."""
        return list(self.commands)

    def invoke(self, ctx: click.Context) -> Any:
        """Run a command; turn an error into a sentence and an exit code."""
        try:
            return super().invoke(ctx)
        except (click.ClickException, click.exceptions.Exit, click.Abort, BrokenPipeError):
            raise  # click shows these itself
        except (Exception, KeyboardInterrupt) as error:
            ctx.exit(fail(error))


@click.group(cls=Commands, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name="siting")
def group() -> None:
    """Find small low plots that could be cropped on run-on in dry country. Screening, not design."""


for command in (demo, run, check, new, why, compare, crops, covers, soils):
    group.add_command(command)


def _interrupt(*_: object) -> None:
    raise KeyboardInterrupt


def main() -> None:
    """Run the command line; a request to end is answered like Ctrl-C: nothing half written is left."""
    for name in ("SIGTERM", "SIGHUP"):
        if hasattr(signal, name):
            signal.signal(getattr(signal, name), _interrupt)
    group()
