"""A whole run on a few cells of the sample grids, spoilt in one way by each test, and the command line."""

from __future__ import annotations

import os
import shutil
import sys
from collections.abc import Callable
from pathlib import Path

import pytest
import xarray as xr
from spoilt_season import AIR, AREA, DISTRICTS, ELEVATION, HUMIDITY, RADIATION, SOWING, TABLE, WIND, Said, Season

from cropstress.cli import main

SAMPLE = Path(__file__).parents[2] / "sample_grids"
EVERY_ROW, EVERY_COLUMN = 8, 10  # every so many rows and columns of the sample are kept: 8 x 8 cells

RUN_FILE = """\
title = "Bad input"
[seasons]
years = [2021]
[weather]
files = "grids/*_2021.nc"
[places]
districts = "places/districts.geojson"
id_field = "code"
name_field = "name"
elevation = "places/elevation.nc"
[[crops]]
name = "maize"
sowing = { grid = "places/sowing_day.nc" }
area = { file = "places/crop_area.nc", name = "maize" }
[[crops]]
name = "wheat"
sowing = { table = "places/sowing_by_district.csv" }
[output]
folder = "results"
"""


def _cut(dataset: xr.Dataset) -> xr.Dataset:
    """Return a few cells of a sample file, unpacked, without the bounds of cells."""
    kept = dataset.drop_vars(["lat_bnds", "lon_bnds"], errors="ignore")
    kept = kept.isel(lat=slice(4, None, EVERY_ROW), lon=slice(4, None, EVERY_COLUMN)).load()
    for name in ("lat", "lon"):
        kept[name].attrs.pop("bounds", None)
    return kept.drop_encoding()


@pytest.fixture(scope="session")
def pristine(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a folder with a run that has no fault."""
    folder = tmp_path_factory.mktemp("pristine")
    for part in ("grids", "places"):
        (folder / part).mkdir()
    for name in (AIR, HUMIDITY, RADIATION, WIND, ELEVATION, AREA, SOWING):
        with xr.open_dataset(SAMPLE / Path(name).name, decode_times=False, decode_coords=False) as dataset:
            _cut(dataset).to_netcdf(folder / name)
    for name in (DISTRICTS, TABLE):
        shutil.copy(SAMPLE / Path(name).name, folder / name)
    (folder / "season.toml").write_text(RUN_FILE, encoding="utf-8")
    return folder


@pytest.fixture
def season(pristine: Path, tmp_path: Path) -> Season:
    """Return a run of the test's own that has no fault yet."""
    shutil.copytree(pristine, tmp_path / "run")
    return Season(tmp_path / "run")


@pytest.fixture
def command(monkeypatch: pytest.MonkeyPatch, capfd: pytest.CaptureFixture[str]) -> Callable[..., Said]:
    """Return what runs the command line in this process, as the shell would."""

    def call(*arguments: object) -> Said:
        monkeypatch.setattr(sys, "argv", ["cropstress", *map(str, arguments)])
        capfd.readouterr()
        with pytest.raises(SystemExit) as ended:
            main()
        out, err = capfd.readouterr()
        return Said(int(ended.value.code or 0), out, err)

    return call


@pytest.fixture
def stops(season: Season, command: Callable[..., Said]) -> Callable[..., str]:
    """Return what checks that `check` and `run` both stop at the season's faults and say the same."""

    def stop(*words: str, count: int = 1) -> str:
        before = season.final_files()
        said = [command(name, season.run_file) for name in ("check", "run")]
        for each in said:
            assert each.code == 2, each
            assert "Traceback" not in each.err + each.out
        text = said[0].err
        assert text == said[1].err
        assert text.startswith("1 fault found:\n" if count == 1 else f"{count} faults found:\n"), text
        assert len(text.splitlines()) == 1 + 2 * count, text  # what and where in one line, what to do in the next
        for word in words:
            assert word in text
        assert season.final_files() == before
        return text

    return stop


@pytest.fixture(autouse=True)
def no_kernel(monkeypatch: pytest.MonkeyPatch) -> None:
    """Leave the model out, which takes a minute to compile: weather is read and mended, every result is blank."""

    def nothing(*_: object) -> None:
        return None

    monkeypatch.setattr("cropstress.region.compute.advance", nothing)


@pytest.fixture
def real_data() -> Path:
    """Return the folder of real data, or skip."""
    folder = os.environ.get("CROPSTRESS_REAL_DATA")
    if not folder:
        pytest.skip("CROPSTRESS_REAL_DATA is not set")
    return Path(folder)
