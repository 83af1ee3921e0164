"""A user's project file and command line, laid over the defaults; all mistakes are told at once."""

import os
import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from siting.config.checks import missing_files, mistakes_across, mistakes_against_tables
from siting.config.defaults import Default, defaults
from siting.config.mistakes import UNUSABLE, empty_value, unknown_setting, wrong_section, wrong_value
from siting.errors import ConfigError
from siting.notes import Notes

if TYPE_CHECKING:  # pydantic takes a quarter of a second, which `--help` need not wait for
    from siting.config.model import Settings

DEFAULT, FILE, COMMAND_LINE = "default", "project file", "command line"


@dataclass(frozen=True, slots=True)
class Project:
    """
    What a run is to do.

    `origin` tells for each key of a set or defaulted setting whether it is the "default" or comes from the
    "project file" or the "command line"; settings that stay unset are not in it. `folder` holds the project
    file, or is the current one. `given` holds the values as the user wrote them.
    """

    settings: "Settings"
    origin: Mapping[str, str]
    folder: Path
    defaults: Mapping[str, Default]
    given: Mapping[str, Any]

    def value(self, key: str) -> Any:
        """Return the value of one setting by its key; None where unset."""
        section, _, name = key.partition(".")
        return getattr(getattr(self.settings, section), name)

    def record(self) -> dict[str, dict[str, Any]]:
        """Return value and origin of every setting in effect, for the run record: no absolute path is in it."""
        found: dict[str, dict[str, Any]] = {}
        for key, origin in self.origin.items():
            value = self.given.get(key, self.defaults[key].value)
            shown = _without_folders(value) if self.defaults[key].may_be_path else value
            found[key] = {"value": shown, "origin": origin}
        return found


@dataclass(slots=True)
class _Given:
    """Values as written, by key, with where each came from and the folder its paths start at."""

    values: dict[str, Any]
    origin: dict[str, str]
    base: dict[str, Path]
    mistakes: list[str]

    def put(self, key: str, value: Any, origin: str, base: Path) -> None:
        """Take a value over an earlier one; an unknown key is a mistake."""
        if key not in defaults():
            self.mistakes.append(unknown_setting(key))
            return
        if value in UNUSABLE and defaults()[key].value != "":
            self.mistakes.append(empty_value(defaults()[key]))
            return
        self.values[key], self.origin[key], self.base[key] = value, origin, base

    def drop(self, key: str) -> None:
        """Forget what was given, so that the default holds again."""
        if key not in defaults():
            self.mistakes.append(unknown_setting(key))
        for held in (self.values, self.origin, self.base):
            held.pop(key, None)


def load_project(path: Path | None, overrides: Sequence[str] = (), flags: Mapping[str, object] | None = None) -> Project:
    """
    Read the settings of a run.

    Parameters
    ----------
    path
        The project file; None for a run on flags alone.
    overrides
        Texts like "rain.unit=inch"; "rain.unit=" puts a setting back to its default. They win over the file.
    flags
        Values by key; None is passed over. They win over both. Paths of `overrides` and `flags` start at the
        current folder, those of the file at the file's.

    Raises
    ------
    ConfigError
        Naming every mistake: unknown keys with the nearest known one, values of the wrong kind or out of range,
        settings that do not go together, names that are in no table, files that do not exist.
    """
    given = _Given({}, {}, {}, [])
    folder = Path.cwd() if path is None else path.resolve().parent
    if path is not None:
        _take_file(given, _parse(path), folder)
    for override in overrides:
        _take_override(given, override)
    for key, value in (flags or {}).items():
        if value is not None:
            given.put(key, value, COMMAND_LINE, Path.cwd())
    settings = _validated(given)
    _refuse(given.mistakes, path)
    return Project(settings, _origins(given), folder, defaults(), dict(given.values))


def note_defaults(project: Project, notes: Notes) -> None:
    """Note each default that plays a part in the run as an assumption, with its source and what it moves."""
    for key, default in project.defaults.items():
        if project.origin.get(key) != DEFAULT or default.quiet:
            continue
        if default.only_with and project.value(default.only_with) in (None, ()):
            continue
        notes.assume(key, _shown(default.value), default.unit, default.source, default.effect)


def _shown(value: Any) -> str:
    if isinstance(value, bool):
        return "yes" if value else "no"
    return f"{value:.12g}" if isinstance(value, float) else str(value)


def _parse(path: Path) -> dict[str, Any]:
    try:
        return tomllib.loads(path.read_text(encoding="utf-8-sig"))
    except FileNotFoundError as error:
        msg = f"the project file {path} does not exist; `siting new FOLDER` writes one"
        raise ConfigError(msg) from error
    except UnicodeDecodeError as error:
        msg = f"the project file {path.name} is not text in UTF-8 (byte {error.start}); save it as UTF-8"
        raise ConfigError(msg) from error
    except tomllib.TOMLDecodeError as error:
        msg = f'the project file {path.name} is not valid TOML: {error}; texts and days go in quotes, like "11-15"'
        raise ConfigError(msg) from error
    except OSError as error:
        msg = f"the project file {path} cannot be read ({error.strerror}); give the path of a TOML file"
        raise ConfigError(msg) from error


def _take_file(given: _Given, content: Mapping[str, Any], folder: Path) -> None:
    for section, entries in content.items():
        complaint = wrong_section(section, entries)
        if complaint:
            given.mistakes.append(complaint)
            continue
        for name, value in entries.items():
            given.put(f"{section}.{name}", value, FILE, folder)


def _take_override(given: _Given, override: str) -> None:
    key, equals, text = (part.strip() for part in override.partition("="))
    if not equals or "." not in key:
        given.mistakes.append(
            f"the setting {override!r} cannot be read; write it as section.name=value, like rain.unit=inch"
        )
    elif text:
        given.put(key, _from_text(text), COMMAND_LINE, Path.cwd())
    else:
        given.drop(key)


def _from_text(text: str) -> Any:
    """Read a value as TOML where it is one, so that 5, true and [1, 2] are what they look like; else as text."""
    try:
        found = tomllib.loads(f"v = {text}")
    except tomllib.TOMLDecodeError:
        found = {}
    if list(found) == ["v"]:
        return found["v"]
    try:
        return float(text)  # ".3" is a number to people, though not to TOML
    except ValueError:
        return text


def _validated(given: _Given) -> "Settings":
    """Return the settings, adding every mistake to `given`; with mistakes the settings are of no use."""
    from siting.config.model import Settings

    merged: dict[str, dict[str, Any]] = {default.section: {} for default in defaults().values()}
    for key, default in defaults().items():
        if key in given.values:
            merged[default.section][default.name] = _resolved(given, key, default)
        elif default.value is not None:
            merged[default.section][default.name] = default.value
    given.mistakes.extend(missing_files(merged, given.values))
    wrong = _wrong_values(merged, given)
    settings = Settings.model_validate(merged)
    further = [*mistakes_across(settings, frozenset(given.values)), *mistakes_against_tables(settings, frozenset(wrong))]
    # a value that was refused counts as unset from here on: what that entails is no mistake of its own
    given.mistakes.extend(mistake for mistake in further if not any(key in mistake for key in wrong))
    return settings


def _wrong_values(merged: dict[str, dict[str, Any]], given: _Given) -> list[str]:
    """Note each value that the model refuses, and put its default back so that the other checks can go on."""
    from pydantic import ValidationError

    from siting.config.model import Settings

    try:
        Settings.model_validate(merged)
    except ValidationError as error:
        errors = _one_a_setting(error.errors())
    else:
        return []
    given.mistakes.extend(wrong_value(one, given.values) for one in errors)
    for section, name in (one["loc"][:2] for one in errors):
        merged[section].pop(name, None)
        value = Path() if (section, name) == ("place", "dem") else defaults()[f"{section}.{name}"].value
        if value is not None:
            merged[section][name] = value
    return [f"{section}.{name}" for section, name in (one["loc"][:2] for one in errors)]


def _one_a_setting(errors: Sequence[Any]) -> list[Any]:
    """Keep the first complaint on each setting: a value that may be of two kinds draws one for each."""
    return list({tuple(error["loc"][:2]): error for error in reversed(errors)}.values())[::-1]


def _resolved(given: _Given, key: str, default: Default) -> Any:
    value = given.values[key]
    if not default.may_be_path:
        return value
    if key == "place.exclude" and isinstance(value, str | Path):
        value = [value]
    if isinstance(value, list | tuple):
        return tuple(_path(one, given.base[key]) for one in value)
    return _path(value, given.base[key])


def _path(value: Any, base: Path) -> Any:
    """Return the absolute path; what is no text stays as it is, for the model to refuse."""
    return Path(os.path.normpath(base / value)) if isinstance(value, str | Path) else value


def _origins(given: _Given) -> dict[str, str]:
    return {
        key: given.origin.get(key, DEFAULT)
        for key, default in defaults().items()
        if key in given.values or default.value is not None
    }


def _without_folders(value: Any) -> Any:
    if isinstance(value, list | tuple):
        return [_without_folders(one) for one in value]
    if isinstance(value, str | Path):
        return Path(value).name if Path(value).is_absolute() else Path(value).as_posix()
    return value


def _refuse(mistakes: Sequence[str], path: Path | None) -> None:
    told = list(dict.fromkeys(mistakes))
    if len(told) == 1:
        raise ConfigError(told[0])
    if told:
        where = "the settings" if path is None else path.name
        msg = f"{len(told)} mistakes in {where}:\n" + "\n".join(f"- {mistake}" for mistake in told)
        raise ConfigError(msg)
