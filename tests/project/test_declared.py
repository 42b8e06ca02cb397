"""What pyproject.toml, .ci/lowest.txt and README.md say agrees with each other and with the code."""

from __future__ import annotations

import ast
import importlib
import re
import subprocess
import sys
import tomllib
from importlib.metadata import packages_distributions
from pathlib import Path

import pytest

from cropstress.cli import app
from cropstress.season.measures import MEASURES, SERIES

ROOT = Path(__file__).parents[2]
PROJECT = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
README = (ROOT / "README.md").read_text(encoding="utf-8")
# Modules of the repository itself, imported by those that lie beside them.
OWN = {path.stem for folder in ("tests", "sample_grids", ".ci") for path in (ROOT / folder).rglob("*.py")}
OWN |= {"cropstress", "tests"}


def bounds(*requirements: str) -> dict[str, str]:
    """Return the lower bound of every requirement by its name."""
    found = {}
    for requirement in requirements:
        if not requirement.startswith("cropstress["):
            name, _, bound = requirement.partition(">=")
            found[name.lower()] = bound
    return found


RUNTIME = bounds(*PROJECT["dependencies"])
TESTS = bounds(*PROJECT["optional-dependencies"]["tests"])


def imported_packages(folder: Path) -> set[str]:
    """Return the top-level packages that the modules of a folder import, without Python's own."""
    names = set()
    for path in folder.rglob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if isinstance(node, ast.Import):
                names |= {alias.name.partition(".")[0] for alias in node.names}
            elif isinstance(node, ast.ImportFrom) and node.level == 0 and node.module:
                names.add(node.module.partition(".")[0])
    return names - set(sys.stdlib_module_names) - OWN


@pytest.mark.parametrize(
    ("folder", "declared"), [("cropstress", RUNTIME), ("sample_grids", RUNTIME), ("tests", RUNTIME | TESTS)]
)
def test_every_imported_package_is_declared(folder: str, declared: dict[str, str]) -> None:
    distributions = packages_distributions()
    for package in imported_packages(ROOT / folder):
        names = {name.lower().replace("_", "-") for name in distributions.get(package, [package])}
        assert names & set(declared), f"{package} of {sorted(names)} is not declared"


def test_every_requirement_has_a_lower_bound() -> None:
    dev = bounds(*PROJECT["optional-dependencies"]["dev"])
    for name, bound in (RUNTIME | TESTS | dev).items():
        assert re.fullmatch(r"\d+(\.\d+)+", bound), name


def test_the_lowest_releases_that_are_tested_are_the_bounds() -> None:
    lines = (ROOT / ".ci/lowest.txt").read_text(encoding="utf-8").splitlines()
    pinned = dict(line.lower().split("==") for line in lines if line and not line.startswith("#"))
    assert pinned == RUNTIME | TESTS


def test_readme_shows_the_run_file_as_it_is() -> None:
    assert (ROOT / "configs/season.toml").read_text(encoding="utf-8") in README


def test_readme_names_every_measure_and_which_are_series() -> None:
    table = README[README.index("| measures |") : README.index("`cell_status`")]
    named = dict(re.findall(r"`(\w+)`( \+)?", table))
    assert set(named) == set(MEASURES)
    assert {name for name, series in named.items() if series} == set(SERIES)


def test_readme_names_every_command() -> None:
    commands = {command.name or command.callback.__name__ for command in app.registered_commands}
    section = README[README.index("## Commands") : README.index("Exit codes:")]
    assert set(re.findall(r"^    cropstress (\w+) ", section, re.MULTILINE)) == commands


def test_readme_has_two_commands() -> None:
    program = ROOT / ".ci/readme_commands.py"
    shown = subprocess.run([sys.executable, str(program)], capture_output=True, text=True, check=True)
    first, second = shown.stdout.splitlines()
    assert first.endswith("cropstress run configs/season.toml")
    assert second.endswith("pytest")


def test_every_public_name_can_be_had() -> None:
    package = importlib.import_module("cropstress")
    for name in package.__all__:
        assert callable(getattr(package, name))
    with pytest.raises(AttributeError, match="no attribute 'nothing'"):
        package.nothing  # noqa: B018
