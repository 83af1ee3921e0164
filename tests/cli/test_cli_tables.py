"""The commands that print tables, as a user calls them."""

import json
import subprocess
import sys

import pytest
from click.testing import CliRunner

from siting.errors import CapacityError, ConfigError, InputError, OutputError
from siting_cli.console import exit_code
from siting_cli.main import group


def test_covers_shows_the_printed_curve_numbers_of_each_group() -> None:
    rows = json.loads(CliRunner().invoke(group, ["covers", "--json"]).output)
    shrub = next(row for row in rows if row["cover"] == "desert shrub" and row["condition"] == "poor")
    assert [shrub[letter] for letter in "ABCD"] == [63, 77, 85, 88]  # TR-55 Table 2-2d
    range_poor = next(row for row in rows if row["cover"].startswith("herbaceous"))
    assert range_poor["A"] is None  # none in print: unknown, not 0


def test_tables_print_with_sources_for_people() -> None:
    for command, word in (("crops", "FAO-56"), ("covers", "TR-55"), ("soils", "FAO AGL/MISC/17/91")):
        result = CliRunner().invoke(group, [command])
        assert result.exit_code == 0
        assert word in result.output


def test_an_unknown_command_is_a_usage_error() -> None:
    result = CliRunner().invoke(group, ["guess"])
    assert result.exit_code == 2


@pytest.mark.parametrize(
    ("error", "code"),
    [(ValueError("x"), 1), (InputError("x"), 3), (ConfigError("x"), 3), (CapacityError("x"), 5), (OutputError("x"), 3)],
)
def test_errors_have_their_exit_codes(error: Exception, code: int) -> None:
    assert exit_code(error) == code


def test_help_imports_no_heavy_library() -> None:
    code = (
        "import sys; from siting_cli.main import group; group(['--help'], standalone_mode=False); "
        "heavy = {'numpy', 'numba', 'pandas', 'pydantic', 'rasterio', 'rich'} & set(sys.modules); "
        "sys.exit(repr(heavy) if heavy else 0)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
