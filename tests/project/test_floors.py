"""Each floor imports only floors below it, and the numerical floors know neither grids nor tasks."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

import cropstress

PACKAGE = Path(cropstress.__file__).parent

#: What each part may import of the package beside itself; `report` reads only the list of measures of `season`.
BELOW = {
    "errors": set(),
    "compiled": set(),
    "weather": {"errors"},
    "places": {"errors", "weather"},
    "crops": {"errors"},
    "leaf": {"compiled", "crops"},
    "day": {"compiled", "leaf"},
    "season": {"compiled", "crops", "leaf", "day"},
    "region": {"errors", "weather", "places", "crops", "leaf", "season"},
    "report": {"errors", "season"},
    "runfile": {"errors", "crops"},
}


def imported_parts(path: Path) -> set[str]:
    """Return the parts of the package that a module imports, wherever in the module."""
    names: set[str] = set()
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            names |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom) and node.level == 0:
            names.add(node.module or "")
            names |= {f"{node.module}.{alias.name}" for alias in node.names}
    return {name.split(".")[1] for name in names if name.startswith("cropstress.")}


def modules_of(part: str) -> list[Path]:
    """Return the modules of a part: a folder or one module."""
    folder = PACKAGE / part
    return sorted(folder.rglob("*.py")) if folder.is_dir() else [folder.with_suffix(".py")]


@pytest.mark.parametrize("part", BELOW)
def test_a_floor_imports_only_floors_below_it(part: str) -> None:
    modules = modules_of(part)
    assert modules
    for path in modules:
        above = imported_parts(path) - BELOW[part] - {part}
        assert not above, f"{path.relative_to(PACKAGE)} imports {above}"


def test_report_takes_only_the_measures_from_season() -> None:
    for path in modules_of("report"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if isinstance(node, ast.ImportFrom) and str(node.module).startswith("cropstress.season"):
                assert node.module == "cropstress.season.measures", path.name


def test_the_numerical_floors_load_neither_xarray_nor_dask() -> None:
    modules = [
        ".".join(("cropstress", *path.relative_to(PACKAGE).with_suffix("").parts)).removesuffix(".__init__")
        for part in ("leaf", "day", "season")
        for path in modules_of(part)
    ]
    code = f"import sys, {', '.join(modules)}\nprint(sorted({{'xarray', 'dask'}} & set(sys.modules)))"
    shown = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert shown.stdout.strip() == "[]"


@pytest.mark.parametrize(("library", "floors"), [("dask", ("weather/", "region/")), ("matplotlib", ("report/",))])
def test_a_library_has_its_floors(library: str, floors: tuple[str, ...]) -> None:
    """Lazy arrays are laid together in `weather`, work is shared out in `region`, and only `report` draws."""
    importing = {
        path.relative_to(PACKAGE).as_posix()
        for path in PACKAGE.rglob("*.py")
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8")))
        if (isinstance(node, ast.Import) and any(alias.name.split(".")[0] == library for alias in node.names))
        or (isinstance(node, ast.ImportFrom) and str(node.module).split(".")[0] == library)
    }
    assert importing
    assert {path for path in importing if not path.startswith(floors)} == set()


def test_the_package_itself_loads_nothing_heavy() -> None:
    code = "import sys, cropstress\ncropstress.__all__\nprint(sorted({'numpy', 'numba', 'xarray'} & set(sys.modules)))"
    shown = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert shown.stdout.strip() == "[]"


def test_help_loads_nothing_heavy() -> None:
    heavy = {"numpy", "numba", "xarray", "dask", "pydantic", "matplotlib", "rasterio"}
    code = (
        "import sys\nimport cropstress.cli as cli\nsys.argv = ['cropstress', '--help']\n"
        f"try:\n    cli.main()\nexcept SystemExit:\n    pass\nprint(sorted({heavy!r} & set(sys.modules)))"
    )
    shown = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert "Usage:" in shown.stdout
    assert shown.stdout.splitlines()[-1] == "[]"
