"""The commands, as one types them."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import xarray as xr

from cropstress.job import Outcome
from cropstress.place import trace

ROOT = Path(__file__).parents[2]
RUN_FILE = ROOT / "configs" / "season.toml"
PLACE = (41.575, -32.675)


def cropstress(*words: object, timeout: float = 600.0) -> subprocess.CompletedProcess[str]:
    """Run a command."""
    command = [sys.executable, "-m", "cropstress.cli", *map(str, words)]
    return subprocess.run(command, capture_output=True, text=True, timeout=timeout, cwd=ROOT, check=False)


def test_one_crop_alone_is_the_same_as_in_the_whole_run(
    sample_run: Outcome, results: dict[str, xr.Dataset], tmp_path: Path
) -> None:
    done = cropstress("run", RUN_FILE, "--out", tmp_path / "wheat", "--only", "crop=wheat", "--threads", 1, "--quiet")
    assert done.returncode == 0, done.stderr
    assert done.stdout.strip() == ""
    assert [path.name for path in (tmp_path / "wheat" / "grids").iterdir()] == ["wheat-observed.nc"]
    name = Path("grids") / "wheat-observed.nc"
    with xr.open_dataset(tmp_path / "wheat" / name) as alone, xr.open_dataset(sample_run.folder / name) as both:
        xr.testing.assert_equal(alone, both)


def test_check_computes_and_writes_nothing() -> None:
    before = sorted(path.name for path in (ROOT / "configs").rglob("*"))
    done = cropstress("check", RUN_FILE)
    assert done.returncode == 0, done.stderr
    assert sorted(path.name for path in (ROOT / "configs").rglob("*")) == before
    for said in ("tasmax", "3083 cells", "sown", "heat onset", "CO2 421", "soil water", "canopy"):
        assert said in done.stdout
    assert "sown sown" not in done.stdout


def test_crops_prints_every_value_with_its_source() -> None:
    listed = cropstress("crops")
    assert listed.returncode == 0 and "sorghum" in listed.stdout
    one = cropstress("crops", "sorghum")
    assert "heat onset" in one.stdout.replace("_", " ")
    assert "from memory" in one.stdout


def test_leaf_writes_a_table_and_a_figure(tmp_path: Path) -> None:
    done = cropstress("leaf", "barley", "--out", tmp_path)
    assert done.returncode == 0, done.stderr
    table = pd.read_csv(tmp_path / "leaf-barley.csv")
    assert (tmp_path / "leaf-barley.png").stat().st_size > 20_000
    today = table[table["co2"] == 421.0].set_index("air_temperature")
    assert today["assimilation"].idxmax() < 33.0
    assert "photorespiration" in done.stdout


def read_exactly(path: Path) -> pd.DataFrame:
    """Read a table without rounding a number: the quick reading of pandas may be off in the last digit."""
    table = pd.read_csv(path, dtype=str, keep_default_na=False)
    numbers = [name for name in table.columns if name not in ("date", "stage", "notes")]
    return table.assign(**{name: [float(text or "nan") for text in table[name]] for name in numbers})


def test_a_traced_place_is_its_cell_of_the_map(results: dict[str, xr.Dataset], tmp_path: Path) -> None:
    """Exactly: the days of the trace, added up in their order, are the season's sums."""
    written = trace(RUN_FILE, PLACE, tmp_path)
    tables = {path.name.split("-")[0]: read_exactly(path) for path in written if path.suffix == ".csv"}
    assert set(tables) == {"maize", "wheat"}
    for crop, table in tables.items():
        cell = results[crop].sel(lat=PLACE[0], lon=PLACE[1], method="nearest").isel(season=0)
        for measure in ("assimilation", "lost_to_heat", "lost_to_photorespiration", "lost_to_heat_by_enzymes"):
            total = 0.0
            for value in table[measure].fillna(0.0):
                total += value
            assert total == float(cell[measure]), (crop, measure)
        hot = table["tmax"] > float(cell["hot_day_limit"]) + 1e-3
        assert hot.sum() == int(cell["hot_days"])
        assert len(table) == int(cell["season_days"])
        assert np.isfinite(table.loc[table["leaf_area"] > 0.05, "highest_leaf_temperature"]).all()
        assert table["highest_leaf_temperature"].min() > -50.0  # no fill value among the numbers


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("trace", RUN_FILE, "--at", "10,10"), "Give a place within the grid"),
        (("trace", RUN_FILE, "--at", "somewhere"), "latitude and longitude"),
        (("run", RUN_FILE, "--only", "crop=wheet"), "Did you mean 'wheat'?"),
        (("run", RUN_FILE, "--only", "wheat"), "crop=NAME"),
        (("crops", "sorgum"), "sorghum"),
        (("leaf", "maize", "--humidity", "130"), "1 to 100"),
        (("run", "nowhere.toml"), "nowhere.toml"),
    ],
)
def test_a_wrong_word_is_told_and_ends_with_2(words: tuple[object, ...], said: str) -> None:
    done = cropstress(*words)
    assert done.returncode == 2
    assert said in done.stderr
    assert "Traceback" not in done.stderr


@pytest.mark.skipif(os.name == "nt", reason="interrupts are sent otherwise there")
def test_an_interrupted_run_leaves_no_half_file(tmp_path: Path) -> None:
    folder = tmp_path / "out"
    command = [sys.executable, "-m", "cropstress.cli", "run", str(RUN_FILE), "--out", str(folder)]
    process = subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, cwd=ROOT)
    deadline = time.monotonic() + 300.0
    while not (folder / "grids").exists() and time.monotonic() < deadline and process.poll() is None:
        time.sleep(0.05)
    process.send_signal(signal.SIGINT)
    _, errors = process.communicate(timeout=120)
    assert process.returncode == 130, errors
    assert "Traceback" not in errors and "nterrupted" in errors
    for path in folder.rglob("*.nc"):
        with xr.open_dataset(path) as whole:
            assert "assimilation" in whole
    again = cropstress("run", RUN_FILE, "--out", folder, "--only", "crop=wheat", "--quiet")
    assert again.returncode == 0, again.stderr
