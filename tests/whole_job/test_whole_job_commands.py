"""Every command at the command line: what it writes, what it refuses, and with which exit code."""

import csv
import io
import json
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
import xarray as xr
from finished_run import CROPS, Command, Run, environment
from PIL import Image

from cropstress.report.netcdf import as_stored
from cropstress.season.measures import CELL_STATUS


def snapshot(folder: Path) -> dict[str, tuple[int, int]]:
    """Every file and folder below a folder, with size and time of its last change."""
    return {
        path.relative_to(folder).as_posix(): (path.stat().st_size, path.stat().st_mtime_ns)
        for path in folder.rglob("*")
    }


@pytest.fixture
def inputs(thinned_inputs: Path, tmp_path: Path) -> Path:
    """A copy of the inputs without any result, to be changed at will."""
    shutil.copytree(thinned_inputs, tmp_path / "job", ignore=shutil.ignore_patterns("results"))
    return tmp_path / "job"


def refused(process: subprocess.CompletedProcess[str], *words: str) -> None:
    """The input is at fault: exit code 2, the words, and no traceback."""
    assert process.returncode == 2, process.stdout + process.stderr
    assert "Traceback" not in process.stderr
    for word in words:
        assert word in process.stderr


def test_check_says_all_and_writes_nothing(inputs: Path, command: Command) -> None:
    before = snapshot(inputs)
    process = command("check", inputs / "season.toml", cwd=inputs)
    assert process.returncode == 0, process.stderr
    assert snapshot(inputs) == before
    for words in (
        "tmax: tasmax in grids/airtemperature_2021.nc",
        "from 10 m to 2 m",
        "15 x 10 cells, 193 days from 2021-04-01 to 2021-10-10",
        "wheat (Wheat of the districts, C3)",
        "sown by district, 2 April to 16 April",
        "hot day above 32 degC, at flowering above 30 degC",
        "no flowering window",
        "CO2 416.4 umol/mol",
        "Results go to results/season",
        "seasons.allowed_missing = 0.1",
        "model.canopy = sunlit_shaded",
    ):
        assert words in process.stdout, words


def test_one_crop_with_one_thread_gives_the_same_file(inputs: Path, command: Command, thinned_run: Run) -> None:
    process = command("run", "season.toml", "--only", "crop=wheat", "--threads", "1", "--quiet", cwd=inputs)
    assert process.returncode == 0, process.stderr
    assert process.stdout == process.stderr == ""
    folder = inputs / "results" / "season"
    assert [path.name for path in (folder / "grids").iterdir()] == ["wheat-observed.nc"]
    assert {path.name.partition("-")[0] for path in (folder / "maps").iterdir()} == {"wheat"}
    with (
        xr.open_dataset(folder / "grids" / "wheat-observed.nc") as one,
        xr.open_dataset(thinned_run.grid("wheat")) as all_,
    ):
        xr.testing.assert_equal(one, all_)
    used = {entry["name"] for entry in json.loads((folder / "run.json").read_text("utf-8"))["inputs"]}
    assert "sowing_day.nc" not in used and "sowing_by_district.csv" in used


@pytest.mark.parametrize(
    ("only", "words"),
    [("crop=whaet", "Did you mean 'wheat'?"), ("wheat", "--only crop=NAME"), ("crop=", "--only crop=NAME")],
)
def test_only_what_there_is(inputs: Path, command: Command, only: str, words: str) -> None:
    refused(command("run", inputs / "season.toml", "--only", only), words)
    assert not (inputs / "results").exists()


@pytest.mark.slow
def test_folder_of_this_run_is_replaced_and_of_another_refused(inputs: Path, command: Command) -> None:
    out = inputs / "out"
    arguments = ("run", inputs / "season.toml", "--out", out, "--quiet")
    assert command(*arguments, "--only", "crop=potato").returncode == 0
    # Another crop of the same run: what the earlier run wrote and this one does not is removed
    assert command(*arguments, "--only", "crop=wheat").returncode == 0
    assert {path.name.partition("-")[0] for path in (out / "maps").iterdir()} == {"wheat"}
    text = (inputs / "season.toml").read_text("utf-8")
    (inputs / "other.toml").write_text(text.replace("Thinned", "Other"), encoding="utf-8")
    before = snapshot(out)
    refused(command("run", inputs / "other.toml", "--out", out), "another run", "Thinned sample grids", "--out")
    assert snapshot(out) == before
    foreign = inputs / "foreign"
    foreign.mkdir()
    (foreign / "letter.txt").write_text("not ours")
    refused(command("run", inputs / "season.toml", "--out", foreign), "holds something else", "letter.txt")
    assert [path.name for path in foreign.iterdir()] == ["letter.txt"]


def test_only_temperatures_still_give_hot_days(inputs: Path, command: Command, thinned_run: Run) -> None:
    for name in ("humidity_2021", "radiation_2021", "wind_2021"):
        (inputs / "grids" / f"{name}.nc").unlink()
    process = command("run", "season.toml", "--only", "crop=wheat", cwd=inputs)
    assert process.returncode == 0, process.stderr
    assert "share lost to heat: not computed" in process.stdout
    folder = inputs / "results" / "season"
    measures = {path.stem.rpartition("-")[2] for path in (folder / "maps").iterdir()}
    assert measures == {"hot_days", "hot_days_flowering", "hottest_temperature"}
    with xr.open_dataset(folder / "grids" / "wheat-observed.nc") as part:
        assert "radiation" in part.attrs["not_computed"]
        assert np.isnan(part["lost_to_heat"]).all()
        with xr.open_dataset(thinned_run.grid("wheat")) as whole:
            for name in ("hot_days", "hot_days_flowering", "hot_hours", "warm_nights", "longest_hot_spell"):
                xr.testing.assert_equal(part[name].drop_vars("time"), whole[name].drop_vars("time"))


def place_of(run: Run, crop: str) -> tuple[int, int, str]:
    """The computed cell of a crop that lost most: row, column, and latitude and longitude as `--at` takes them."""
    result = run.unwritten(crop)
    lost = result["lost_to_heat"].values[0]
    row, column = np.unravel_index(np.nanargmax(lost), lost.shape)
    return int(row), int(column), f"{result['lat'].values[row]:.3f},{result['lon'].values[column]:.3f}"


def read_exactly(path: Path) -> pd.DataFrame:
    """Read a table without rounding a number: the quick reading of pandas may be off in the last digit."""
    table = pd.read_csv(path, dtype=str, keep_default_na=False)
    numbers = [name for name in table.columns if name not in ("date", "stage", "notes")]
    return table.assign(**{name: [float(text or "nan") for text in table[name]] for name in numbers})


def test_trace_equals_the_map_cell_exactly(thinned_run: Run, command: Command, tmp_path: Path) -> None:
    """Its table has all digits: added up in order it is the cell of the result, bit for bit."""
    row, column, at = place_of(thinned_run, "wheat")
    process = command("trace", thinned_run.run_file, "--at", at, "--out", tmp_path)
    assert process.returncode == 0, process.stderr
    written = [Path(line) for line in process.stdout.split()]
    grown = [crop for crop in CROPS if thinned_run.unwritten(crop)["cell_status"].values[0, row, column] == 0]
    assert "wheat" in grown
    assert [path.name.partition("-")[0] for path in written if path.suffix == ".csv"] == grown
    for path in written:
        assert path.is_file()
        if path.suffix != ".csv":
            continue
        crop = path.name.partition("-")[0]
        cell = thinned_run.unwritten(crop).isel(season=0, lat=row, lon=column)
        table = read_exactly(path)
        assert len(table) == cell["season_days"] and set(table["season"]) == {2021}
        with xr.open_dataset(thinned_run.grid(crop), decode_times=False, mask_and_scale=False) as grid:
            for name in (
                "assimilation", "lost_to_heat", "lost_to_heat_by_photorespiration", "lost_to_heat_by_stomata",
                "lost_to_heat_by_enzymes", "lost_to_heat_by_respiration", "lost_to_photorespiration",
                "photorespired_co2", "hot_hours",
            ):  # fmt: skip
                total = np.cumsum(table[name].to_numpy())[-1]
                assert total == cell[name].item(), (crop, name)
                assert as_stored(np.array(total), "float32") == grid[name].values[0, row, column]
        assert (table["tmax"] > cell["hot_day_limit"].item() + 1e-3).sum() == cell["hot_days"]
        assert table["tmax"].max() == cell["hottest_temperature"]
        leaf = table["highest_leaf_temperature"].dropna()
        assert leaf.between(-40, 75).all() and len(leaf) >= len(table) - 1
        assert (leaf > cell["hot_leaf_limit"].item() + 1e-3).sum() == cell["hot_leaf_days"]
        assert "CO₂ 416.4 ppm" in table["notes"][0] and "not yield" in table["notes"][0]
        assert ("growth_temperature" in table) == (crop != "maize")
        with Image.open(path.with_suffix(".png")) as image:
            assert "CO₂ 416.4 ppm" in image.text["Description"]  # type: ignore[attr-defined]


@pytest.mark.parametrize(
    ("at", "words"),
    [
        ("10,10", "Give a place within the grid: latitude 41.02 to 43.8"),
        ("41.5", "--at 42.5,-33.1"),
        ("north,west", "--at 42.5,-33.1"),
        ("41.525,-35.975", "no crop entry grows in this cell"),
    ],
)
def test_trace_refuses_a_place_it_cannot_follow(
    thinned_run: Run, command: Command, tmp_path: Path, at: str, words: str
) -> None:
    assert (
        thinned_run.unwritten("wheat")["cell_status"].sel(lat=41.525, lon=-35.975, method="nearest").item()
        != (CELL_STATUS["computed"])
    )
    refused(command("trace", thinned_run.run_file, "--at", at, "--out", tmp_path / "out"), words)
    assert not (tmp_path / "out").exists()


def test_crops_lists_all_or_one_with_every_source(command: Command) -> None:
    listed = command("crops")
    assert listed.returncode == 0
    for name in ("maize", "sorghum", "pearl-millet", "sugarcane", "wheat", "barley", "rice", "soybean", "cotton",
                 "sunflower", "potato", "groundnut", "canola", "common-bean"):  # fmt: skip
        assert name in listed.stdout
    one = command("crops", "wheat")
    assert one.returncode == 0
    assert "heat_onset = 26 degC  (24 to 28)" in one.stdout and "Source:" in one.stdout
    refused(command("crops", "whaet"), "Did you mean 'wheat'?")


def test_leaf_draws_the_curves_of_one_leaf(command: Command, tmp_path: Path) -> None:
    process = command("leaf", "wheat", "--out", tmp_path, "--humidity", "40")
    assert process.returncode == 0, process.stderr
    rows = list(csv.DictReader(io.StringIO((tmp_path / "leaf-wheat.csv").read_text("utf-8"))))
    assert {row["co2"] for row in rows} == {"280.0", "421.0", "600.0"}
    assert "relative humidity 40 %" in rows[0]["notes"] and "Leaves used to 15 °C" in rows[0]["notes"]
    for row in rows:
        # Net assimilation is carboxylation less half of oxygenation less respiration; four decimals are written
        net = float(row["carboxylation"]) - 0.5 * float(row["oxygenation"]) - float(row["respiration"])
        assert abs(net - float(row["assimilation"])) < 2e-4
    with Image.open(tmp_path / "leaf-wheat.png") as image:
        assert min(image.size) > 1000
    refused(command("leaf", "wheat", "--out", tmp_path, "--humidity", "140"), "140", "--humidity")


def test_missing_run_file_and_unknown_option_are_no_crash(command: Command, tmp_path: Path) -> None:
    refused(command("run", tmp_path / "none.toml"), "none.toml")
    refused(command("check", tmp_path / "none.toml"), "none.toml")
    refused(command("run", tmp_path / "none.toml", "--fast"), "--fast")


@pytest.mark.parametrize("stage", ["computing", "writing"])
def test_interrupt_leaves_nothing_half_written(inputs: Path, command: Command, tmp_path: Path, stage: str) -> None:
    """Ctrl-C while it computes, and while it writes: exit code 130, and every file there is whole."""
    out = inputs / "out"
    windows = sys.platform == "win32"
    process = subprocess.Popen(
        [sys.executable, "-m", "cropstress.cli", "run", str(inputs / "season.toml"), "--out", str(out)],
        env=environment(tmp_path),
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        encoding="utf-8",
        creationflags=getattr(subprocess, "CREATE_NEW_PROCESS_GROUP", 0),
    )
    awaited = out / "run.json" if stage == "computing" else out / "maps" / "maize-2021-observed-hot_days.png"
    started = time.monotonic()
    while not awaited.exists() and process.poll() is None and time.monotonic() - started < 600:
        time.sleep(0.01)
    process.send_signal(signal.CTRL_BREAK_EVENT if windows else signal.SIGINT)  # type: ignore[attr-defined,unused-ignore]
    _, stderr = process.communicate(timeout=600)
    assert process.returncode == 130, stderr
    assert "Traceback" not in stderr and "Interrupted" in stderr
    record = json.loads((out / "run.json").read_text("utf-8"))
    assert record["finished"] is False and record["outputs"] == []
    files = [path for path in out.rglob("*") if path.is_file()]
    assert [path.name for path in files if path.name.startswith(".")] == []
    if stage == "computing":
        assert [path.name for path in files] == ["run.json"]
    for path in files:
        if path.suffix == ".nc":
            with xr.open_dataset(path) as dataset:
                dataset.load()
        elif path.suffix == ".png":
            with Image.open(path) as image:
                image.load()
    # The same run starts again in the same folder and ends well
    again = command("run", inputs / "season.toml", "--out", out, "--only", "crop=potato", "--quiet")
    assert again.returncode == 0, again.stderr
    assert json.loads((out / "run.json").read_text("utf-8"))["finished"] is True
