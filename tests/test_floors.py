"""Which module may import what: the floors of the package, read from its sources and seen in fresh processes."""

from __future__ import annotations

import ast
import json
import os
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

import cropstress

PACKAGE = Path(cropstress.__file__).parent
FLOORS = ("weather", "places", "crops", "leaf", "day", "season", "region", "report")
FREE = {"cropstress.errors", "cropstress.compiled"}  # every floor may use them; they stand on none
NUMERICAL = ("leaf", "day", "season")
SOURCES = sorted(path.relative_to(PACKAGE).as_posix() for path in PACKAGE.rglob("*.py"))


def imports_of(source: str) -> Iterator[str]:
    """Every module that a source imports, also inside functions; `from package import name` gives both."""
    for node in ast.walk(ast.parse((PACKAGE / source).read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{source}: relative import"
            yield node.module or ""
            if node.module == "cropstress":
                yield from (f"cropstress.{alias.name}" for alias in node.names)


def roots_of(source: str) -> set[str]:
    """The outermost packages that a source imports."""
    return {name.partition(".")[0] for name in imports_of(source)}


def modules_after(code: str) -> set[str]:
    """The outermost packages that are loaded once a fresh process has run some code."""
    after = "import atexit, json, sys; atexit.register(lambda: print('\\n' + json.dumps(sorted(sys.modules))))\n"
    where = os.pathsep.join([str(PACKAGE.parent), os.environ.get("PYTHONPATH", "")])
    answer = subprocess.run(
        [sys.executable, "-c", after + code], capture_output=True, text=True, env=os.environ | {"PYTHONPATH": where},
        check=False,
    )  # fmt: skip
    assert answer.returncode == 0, answer.stderr
    return {name.partition(".")[0] for name in json.loads(answer.stdout.splitlines()[-1])}


def test_the_sources_are_found() -> None:
    assert {source.partition("/")[0] for source in SOURCES} >= set(FLOORS)
    assert "numba" in roots_of("compiled.py") and "cropstress.day" in set(imports_of("season/advance.py"))


@pytest.mark.parametrize("floor", FLOORS)
def test_floors_import_only_floors_before_them(floor: str) -> None:
    """A floor may use itself and those before it, and nothing that stands above them all (commands, jobs)."""
    allowed = FLOORS[: FLOORS.index(floor) + 1]
    for source in (name for name in SOURCES if name.startswith(f"{floor}/")):
        for name in imports_of(source):
            if name.startswith("cropstress.") and name not in FREE:
                assert name.split(".")[1] in allowed, f"{source} imports {name}"
            assert name != "cropstress" or {n for n in imports_of(source) if n.startswith("cropstress.")}, source


def test_what_every_floor_may_use_stands_on_none() -> None:
    for name in FREE:
        source = name.removeprefix("cropstress.") + ".py"
        assert "cropstress" not in roots_of(source), source


@pytest.mark.parametrize("floor", NUMERICAL)
def test_numerical_floors_import_neither_xarray_nor_dask(floor: str) -> None:
    for source in (name for name in SOURCES if name.startswith(f"{floor}/")):
        assert not roots_of(source) & {"xarray", "dask", "pandas", "matplotlib"}, source


@pytest.mark.parametrize(
    "module",
    ["leaf.solve", "leaf.single", "leaf.parameters", "day.block", "season.advance", "season.parameters"],
)
def test_numerical_floors_load_neither_xarray_nor_dask(module: str) -> None:
    """Nor do the floors they stand on, crop profiles among them."""
    loaded = modules_after(f"import cropstress.{module}")
    assert {"numpy", "cropstress"} <= loaded
    assert not loaded & {"xarray", "dask", "pandas", "matplotlib"}


def test_only_region_imports_dask() -> None:
    assert {source.partition("/")[0] for source in SOURCES if "dask" in roots_of(source)} == {"region"}


def test_only_report_imports_matplotlib() -> None:
    assert {source.partition("/")[0] for source in SOURCES if "matplotlib" in roots_of(source)} == {"report"}


@pytest.mark.parametrize(
    "code",
    ["import cropstress", "import sys\nsys.argv = ['cropstress', '--help']\nfrom cropstress.cli import main\nmain()"],
    ids=["import", "help"],
)
def test_heavy_libraries_wait_until_they_are_needed(code: str) -> None:
    loaded = modules_after(code)
    assert "cropstress" in loaded
    assert not loaded & {"numba", "xarray", "matplotlib", "pydantic", "dask", "pandas", "numpy"}
