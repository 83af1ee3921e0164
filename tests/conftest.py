"""Real inputs that arrive inside ordinary packages."""

import os
from collections.abc import Callable
from importlib.util import find_spec
from pathlib import Path

import pytest


def package_file(package: str, name: str) -> Path:
    """Find a file in a package without importing it; absent, a developer's test skips and CI fails."""
    spec = find_spec(package)
    if spec is None or not spec.submodule_search_locations:
        if os.environ.get("CI") == "true":
            pytest.fail(f"the package {package} with the real input {name} is not installed")
        pytest.skip(f"the package {package} is not installed")
    return Path(spec.submodule_search_locations[0]) / name


@pytest.fixture(name="package_file")
def package_file_fixture() -> Callable[[str, str], Path]:
    return package_file
