"""The commented project file that a newcomer fills in."""

import json
import textwrap
from typing import Any

from siting.config.defaults import Default, defaults, sections

_HEAD = """\
# A project of siting. Paths are relative to this file. Fill in the open lines; the rest has defaults and stays
# commented out: take the # off a line to set it. `siting check` reads it all and writes nothing.
"""


def project_template() -> str:
    """Return the text of a project file: the lines a first run needs left open, all others commented out."""
    parts = [_HEAD]
    for section in sections():
        parts.append(f"\n[{section}]\n")
        parts.extend(_entry(default) for default in defaults().values() if default.section == section)
    return "".join(parts)


def _entry(default: Default) -> str:
    words = [default.text]
    if default.value is not None:
        unit = f" {default.unit}" if default.unit else ""
        source = "" if default.quiet else f", from: {default.source}"
        words.append(f"Default {_toml(default.value)}{unit}{source}.")
    else:
        unit = f"Unit {default.unit}. " if default.unit and not default.may_be_path else ""
        words.append(f"{unit}If left out: {default.otherwise}.")
    if default.open:
        words.append(f"Example: {default.example}.")
    comment = textwrap.fill(" ".join(words), 112, initial_indent="# ", subsequent_indent="# ")
    return f"{comment}\n{_line(default)}\n"


def _line(default: Default) -> str:
    if default.open:
        # paths point at the empty folder; all else stays empty, which is refused, so nothing slips through unread
        value = default.example if default.may_be_path else '""'
        return f"{default.name} = {value}"
    shown = default.example if default.value is None or default.example else _toml(default.value)
    return f"#{default.name} = {shown}"


def _toml(value: Any) -> str:
    if isinstance(value, float) and value.is_integer():
        return f"{value:.0f}"
    return json.dumps(value)
