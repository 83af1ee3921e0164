"""The run record: what was run, on what, with which result."""

import dataclasses
import datetime
import hashlib
import json
import math
from collections.abc import Mapping
from pathlib import Path, PurePath, PurePosixPath, PureWindowsPath
from typing import Any

import numpy as np

from siting.errors import OutputError

RUN_RECORD = "run.json"
MARK = "siting_run_record"
FORMAT = 1


def sha256(path: Path) -> str:
    """Return the SHA-256 of a file in hexadecimal."""
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


def file_hashes(folder: Path) -> dict[str, str]:
    """Return the SHA-256 of every file below a folder by relative name, in order; the run record itself is left out."""
    files = sorted(path for path in folder.rglob("*") if path.is_file())
    names = {path.relative_to(folder).as_posix(): path for path in files}
    return {name: sha256(path) for name, path in sorted(names.items()) if name != RUN_RECORD}


def write_run_record(path: Path, record: Mapping[str, Any]) -> None:
    """
    Write a run record as JSON with sorted keys: the same record gives the same bytes.

    Holds text, numbers, booleans, None, dates, arrays, dataclasses, and lists and mappings of them. NaN becomes null.
    Paths, and texts that are an absolute path and nothing else, are cut to the name of the file, so that no folder
    and no user is named. Raises OutputError for an infinite number or a value of another kind, with its place.
    """
    plain = _plain(dict(record), "record")
    plain[MARK] = FORMAT
    text = json.dumps(plain, indent=2, sort_keys=True, ensure_ascii=False, allow_nan=False)
    path.write_text(text + "\n", encoding="utf-8", newline="\n")


def _plain(value: Any, place: str) -> Any:
    """Turn a value into what JSON can hold."""
    if value is None or (isinstance(value, bool | int) and not isinstance(value, np.generic)):
        return value
    if isinstance(value, str):
        return _without_folders(value)
    if isinstance(value, float | np.generic):
        return _plain_number(value, place)
    if isinstance(value, PurePath):
        return value.name if value.is_absolute() else value.as_posix()
    if isinstance(value, datetime.date):
        return value.isoformat()
    return _plain_group(value, place)


def _plain_group(value: Any, place: str) -> Any:
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {
            field.name: _plain(getattr(value, field.name), f"{place}.{field.name}") for field in dataclasses.fields(value)
        }
    if isinstance(value, Mapping):
        return {str(key): _plain(item, f"{place}.{key}") for key, item in value.items()}
    if isinstance(value, list | tuple | np.ndarray):
        return [_plain(item, f"{place}[{index}]") for index, item in enumerate(value)]
    msg = f"{place} is a {type(value).__name__}; a run record holds text, numbers, dates, lists and mappings of them"
    raise OutputError(msg)


def _plain_number(value: Any, place: str) -> Any:
    if isinstance(value, np.datetime64):
        return None if np.isnat(value) else str(value)
    number = value.item() if isinstance(value, np.generic) else value
    if not isinstance(number, float):
        return _plain(number, place)
    if math.isinf(number):
        msg = f"{place} is {number}; a run record holds finite numbers, and null for unknown ones"
        raise OutputError(msg)
    return None if math.isnan(number) else number


def _without_folders(text: str) -> str:
    """Cut a text that is an absolute path and nothing else to its last part."""
    if "\n" in text or len(text) > 4096:
        return text
    for kind in (PurePosixPath, PureWindowsPath):
        path = kind(text)
        if path.is_absolute() and len(path.parts) > 2:
            return path.name
    return text
