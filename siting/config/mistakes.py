"""Mistakes in settings as sentences: the thing, its value, the way out."""

from collections.abc import Mapping
from difflib import get_close_matches
from typing import Any

from siting.config.defaults import Default, defaults, sections

UNUSABLE: tuple[Any, ...] = ("", [])
"""Values that stand for nothing: a line that was left open."""

KINDS = {
    "float_type": "a number",
    "int_type": "a whole number",
    "int_from_float": "a whole number",
    "bool_type": "true or false",
    "string_type": "text in quotes",
    "path_type": "a path in quotes",
    "is_instance_of": "a path in quotes",
    "finite_number": "a finite number",
    "tuple_type": "a list in brackets",
    "string_too_short": "text that is not empty",
}
"""What a value of the wrong kind should have been, by pydantic's name of the error."""


def unknown_setting(key: str) -> str:
    """Say that a setting is unknown, with the nearest known one, or else the known ones of its section."""
    section, _, name = key.partition(".")
    known = list(defaults())
    at_home = [default.name for default in defaults().values() if default.section == section]
    # the same name elsewhere is nearer than a like name at home: a key under the wrong heading
    same_name = [other for other in known if other.partition(".")[2] == name]
    like = [f"{section}.{other}" for other in get_close_matches(name, at_home, n=1, cutoff=0.6)]
    begins = [f"{section}.{other}" for other in at_home if name and other.startswith(name)]
    found = same_name + begins + like + get_close_matches(key, known, n=1, cutoff=0.7)
    if found:
        return f"unknown setting {key}; did you mean {found[0]}?"
    if at_home:
        return f"unknown setting {key}; [{section}] knows {', '.join(at_home)}"
    return f"unknown setting {key}; the sections are {', '.join(sections())}"


def wrong_section(section: str, entries: Any) -> str | None:
    """Say what is wrong with a top-level entry of the project file; None where it is a known section."""
    if not isinstance(entries, Mapping):
        if section in sections():
            return f"{section} is {shown(entries)}; write it as a section: [{section}] on a line, its settings below"
        places = [key for key in defaults() if key.partition(".")[2] == section]
        way_out = f"did you mean {places[0]}?" if places else f"the sections are {', '.join(sections())}"
        return f"the setting {section} stands outside any section; {way_out}"
    if section in sections():
        return None
    near = get_close_matches(section, sections(), n=1, cutoff=0.5)
    way_out = f"did you mean [{near[0]}]?" if near else f"the sections are {', '.join(sections())}"
    return f"unknown section [{section}]; {way_out}"


def empty_value(default: Default) -> str:
    """Say that a line was left open."""
    example = f"give a value, like {default.example}, or " if default.example else ""
    return f"{default.key} is empty; {example}take the line out"


def wrong_value(error: Mapping[str, Any], given: Mapping[str, Any]) -> str:
    """Turn one error of pydantic into a sentence; `given` holds the values by key as they were written."""
    key = ".".join(str(part) for part in error["loc"][:2])
    default = defaults()[key]
    if error["type"] == "missing" and len(error["loc"]) == 2:
        return f"{key} is missing; give {default.text[0].lower()}{default.text[1:].rstrip('.')}, like {default.example}"
    unit = f" ({default.unit})" if default.unit and not default.may_be_path else ""
    place = [part for part in error["loc"][2:] if isinstance(part, int)]
    which = f"value {place[0] + 1} of {key}" if place else key
    value = given.get(key)
    if place and isinstance(value, list | tuple) and place[0] < len(value):
        value = value[place[0]]
    example = f", like {default.example}" if default.example else ""
    if error["type"] == "missing" or error["type"] in ("too_long", "too_short"):
        return f"{key} is {shown(given.get(key))}; it must hold {_count(default)} values{unit}{example}"
    return f"{which} is {shown(value)}; {_wanted(error, default)}{unit}{_default_text(default)}"


def _count(default: Default) -> int:
    return default.example.count(",") + 1


def _wanted(error: Mapping[str, Any], default: Default) -> str:
    limits = error.get("ctx", {})
    for name, words in (("gt", "above"), ("ge", "at least"), ("lt", "below"), ("le", "at most")):
        if name in limits:
            return f"it must be {words} {limits[name]:g}"
    if error["type"] == "literal_error":
        return f"it must be {limits['expected']}"
    if error["type"] == "value_error":
        return str(limits["error"])
    kind = KINDS.get(error["type"])
    if default.unit == "path or number":
        kind = "a number above 0 and at most 100, or a path in quotes"
    return f"it must be {kind}" if kind else f"it cannot be used ({error['msg']}), give one like {default.example}"


def _default_text(default: Default) -> str:
    if default.value is None or default.value == "":
        return ""
    return f"; the default is {shown(default.value)}"


def shown(value: Any) -> str:
    """Return a value as a user would write it."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, float):
        return f"{value:g}"
    return f'"{value}"' if isinstance(value, str) else str(value)
