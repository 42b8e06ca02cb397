"""The main job through the command line: once on a thinned copy of the sample grids, once on all of them."""

from __future__ import annotations

import shutil
import subprocess
import sys
from pathlib import Path

import pytest
import xarray as xr
from finished_run import CROPS, ROOT, RUN_FILE, SAMPLE, USER, Command, Run, environment


@pytest.fixture(scope="session")
def command(tmp_path_factory: pytest.TempPathFactory) -> Command:
    """Run `cropstress` with arguments in a folder of its own, as a user of a telling name."""
    home = tmp_path_factory.mktemp("home") / USER
    home.mkdir()

    def run(*arguments: str | Path, cwd: Path | None = None) -> subprocess.CompletedProcess[str]:
        return subprocess.run(
            [sys.executable, "-m", "cropstress.cli", *map(str, arguments)],
            cwd=cwd or home,
            env=environment(home),
            capture_output=True,
            text=True,
            encoding="utf-8",
            timeout=1200,
            check=False,
        )

    return run


def thin(source: Path, target: Path) -> None:
    """Copy every fourth row and eighth column of a grid file, values and attributes as they are stored."""
    with xr.open_dataset(source, decode_cf=False) as dataset:
        thinned = dataset.isel(lat=slice(None, None, 4), lon=slice(None, None, 8)).load()
    thinned = thinned.drop_vars([name for name in ("lat_bnds", "lon_bnds") if name in thinned])
    for name in thinned.variables:
        thinned[name].encoding = {}
    for axis in ("lat", "lon"):
        thinned[axis].attrs.pop("bounds", None)
    thinned.to_netcdf(target)


@pytest.fixture(scope="session")
def thinned_inputs(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with a run file and 15 x 10 cells of the sample grids; not to be written to."""
    base = tmp_path_factory.mktemp("thinned") / USER
    grids = base / "grids"
    grids.mkdir(parents=True)
    for source in SAMPLE.glob("*.nc"):
        thin(source, grids / source.name)
    for name in ("districts.geojson", "sowing_by_district.csv"):
        shutil.copy(SAMPLE / name, grids / name)
    (base / "season.toml").write_text(RUN_FILE, encoding="utf-8")
    return base


@pytest.fixture(scope="session")
def thinned_run(thinned_inputs: Path, command: Command) -> Run:
    """The run of the thinned grids, into the folder that is the default."""
    run_file = thinned_inputs / "season.toml"
    process = command("run", run_file)
    return Run(run_file, thinned_inputs / "results" / "season", CROPS, process)


@pytest.fixture(scope="session")
def sample_run(tmp_path_factory: pytest.TempPathFactory, command: Command) -> Run:
    """The run of the full run file on all sample grids."""
    run_file = ROOT / "configs" / "full.toml"
    folder = tmp_path_factory.mktemp("sample") / "full"
    process = command("run", run_file, "--out", folder, "--threads", "2")
    crops = ("maize", "maize-late", "wheat", "soybean", "cotton", "potato")
    return Run(run_file, folder, crops, process)


@pytest.fixture(scope="session", params=["thinned", pytest.param("sample", marks=pytest.mark.slow)])
def finished(request: pytest.FixtureRequest) -> Run:
    """Either run; it ended well."""
    run: Run = request.getfixturevalue(f"{request.param}_run")
    assert run.process.returncode == 0, run.process.stdout + run.process.stderr
    return run
