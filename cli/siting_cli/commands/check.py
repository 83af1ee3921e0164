"""Read every input, say what it is, and write nothing."""

from collections.abc import Mapping
from importlib import import_module
from pathlib import Path
from typing import Any

import click

from siting_cli.console import DONE, WARNED, show, show_json, text, warn
from siting_cli.options import input_flags, json_option, project_argument, project_from, set_option, strict_option


@click.command()
@project_argument
@input_flags
@set_option
@strict_option
@json_option
@click.pass_context
def check(
    ctx: click.Context,
    /,
    project: Path | None,
    overrides: tuple[str, ...],
    strict: bool,
    as_json: bool,
    **flags: str | None,
) -> None:
    """
    Read every input and tell what it is; write nothing.

    Tells units, coverage, years, and the memory and time that a run would take.
    """
    settings = project_from(project, overrides, flags)
    report = import_module("siting.pipeline").check(settings)
    show_report(report, as_json=as_json)
    ctx.exit(WARNED if strict and report["warnings"] else DONE)


def show_report(report: Mapping[str, Any], *, as_json: bool) -> None:
    """Show a report by section; the warnings go to stderr, too."""
    for warning in report["warnings"]:
        warn(warning["text"])
    if as_json:
        show_json(report)
        return
    for section, content in report.items():
        if section == "warnings" or not content:
            continue
        click.echo(f"{section}:")
        _show_section(content)
        click.echo()


def _show_section(content: object, indent: str = "  ") -> None:
    """Show names and values, a table, or lines."""
    if isinstance(content, Mapping):
        for name, value in content.items():
            if isinstance(value, Mapping) or (isinstance(value, list) and value and isinstance(value[0], Mapping)):
                click.echo(f"{indent}{name}:")
                _show_section(value, indent + "  ")
            else:
                click.echo(f"{indent}{name}: {text(value)}")
    elif isinstance(content, list) and content and isinstance(content[0], Mapping):
        show(content)
    else:
        for line in content if isinstance(content, list | tuple) else [content]:
            click.echo(f"{indent}{text(line)}")
