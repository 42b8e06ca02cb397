"""Impossible weather: systematic faults stop the run, a handful of cells is mended or masked, counted and told."""

from __future__ import annotations

import json

import numpy as np
import pytest
import xarray as xr
from spoilt_season import AIR, HUMIDITY, RADIATION, Command, Season, Stops, set_values


def _swap(dataset: xr.Dataset) -> None:
    dataset["tasmax"].attrs, dataset["tasmin"].attrs = dataset["tasmin"].attrs, dataset["tasmax"].attrs


def test_highest_below_lowest_everywhere(season: Season, stops: Stops) -> None:
    season.change(AIR, _swap)
    stops(
        "tmax is below tmin in 184 of 184 values looked at, for example tmax ",
        " on 2021-0",
        " at lat 4",
        "If they are swapped, name each",
    )


def test_what_a_message_tells_to_do_helps(season: Season, command: Command) -> None:
    """Swapped temperatures, a fraction called percent, and two candidates, each cured as its message says."""
    season.change(AIR, _swap)
    season.change(AIR, lambda dataset: dataset.assign(corrected=dataset["tasmin"]))
    season.change(HUMIDITY, set_values("hurs", lambda values: values / 100.0))
    assert command("check", season.run_file).code == 2
    cure = """\
[weather.variables.tmax]
name = "tasmax"
cell_method = "maximum"
[weather.variables.tmin]
name = "tasmin"
cell_method = "minimum"
[weather.variables.relative_humidity]
unit = "1"
[places]"""
    season.rewrite("[places]", cure)
    said = command("check", season.run_file)
    assert (said.code, said.err) == (0, "")


def test_humidity_above_100(season: Season, stops: Stops) -> None:
    season.change(HUMIDITY, set_values("hurs", lambda values: 2.0 * values))
    stops(
        f"{HUMIDITY}: hurs: values outside the possible 0 to 105 %",
        "values looked at (unit %: as it is), for example relative_humidity ",
        "[weather.variables.relative_humidity] unit",
    )


def test_fraction_called_percent(season: Season, stops: Stops) -> None:
    season.change(HUMIDITY, set_values("hurs", lambda values: values / 100.0))
    stops(
        f"{HUMIDITY}: hurs: the unit is said to be '%', but the values look like a fraction",
        '[weather.variables.relative_humidity] unit = "1".',
    )


def test_negative_radiation(season: Season, stops: Stops) -> None:
    season.change(RADIATION, set_values("rsds", lambda values: -values))
    stops(f"{RADIATION}: rsds: radiation is negative in 184 of 184 values looked at", "Name the downward radiation")


def test_more_radiation_than_reaches_the_top_of_the_air(season: Season, stops: Stops) -> None:
    season.change(RADIATION, set_values("rsds", lambda values: 3.0 * values))
    stops(
        f"{RADIATION}: rsds: more radiation than reaches the top of the air",
        "(unit W m-2 to MJ m-2 d-1: × 0.0864)",
        "The unit or the cell method is wrong",
    )


def test_fill_values_that_are_not_declared(season: Season, stops: Stops) -> None:
    season.change(AIR, set_values("tasmax", lambda values: np.where(np.isnan(values), -9999.0, values)))
    stops(f"{AIR}: tasmax: values outside the possible -90 to 60 degC", "fill value", "(unit K to degC: -273.15)")


def test_a_handful_of_cells_is_mended_counted_and_told(season: Season, command: Command) -> None:
    def cross(values: np.ndarray) -> np.ndarray:
        # two cells of land a day: by 20 K, which is masked; and by 0.2 K, which is mended
        land = np.argwhere(np.isfinite(values[100]))
        for number, excess in ((0, 20.0), (1, 0.2)):
            row, column = land[number]
            values[100, row, column] = highest[100, row, column] + excess
        return values

    with xr.open_dataset(season.folder / AIR, decode_times=False) as dataset:
        highest = dataset["tasmax"].values.copy()
    season.change(AIR, set_values("tasmin", cross))
    day = np.arange(198)[:, None, None] == 20
    season.change(RADIATION, set_values("rsds", lambda values: np.where(day & np.isfinite(values), -1e-11, values)))
    said = command("run", season.run_file)
    assert (said.code, said.err) == (0, "")
    record = json.loads((season.results / "run.json").read_text(encoding="utf-8"))
    counts = record["counts"]
    assert counts["tmin_above_tmax_masked"] == 1
    assert counts["tmin_above_tmax_mended"] == 1
    assert counts["radiation_below_zero_mended"] == int(np.isfinite(highest[20]).sum())
    for words in (
        "the day's lowest temperature above its highest: 1 cell-day masked",
        "the day's lowest temperature above its highest: 1 cell-day mended",
        f"radiation below zero: {counts['radiation_below_zero_mended']} cell-days mended",
    ):
        assert f"- {words}" in said.out
        assert words in record["remarks"]


@pytest.mark.parametrize("finished_before", [False, True])
def test_a_month_of_faults_that_a_look_at_few_days_misses(
    season: Season, command: Command, finished_before: bool
) -> None:
    """Found while computing, so `check` cannot; the files of an earlier run stay as they were."""
    if finished_before:
        assert command("run", season.run_file).code == 0
    before = {name: (season.results / name).read_bytes() for name in season.final_files() - {"run.json"}}
    days = np.isin(np.arange(198), np.arange(6, 30))[:, None, None]
    season.change(AIR, set_values("tasmin", lambda values: np.where(days, values + 40.0, values)))
    assert command("check", season.run_file).code == 0
    said = command("run", season.run_file)
    assert said.code == 2
    assert said.err.startswith("1 fault found:\n  1. grids/airtemperature_2021.nc: tasmax, tasmin: ")
    assert "the day's lowest temperature above its highest in 1104 of 11088 cell-days (10.0 %)" in said.err
    assert "the worst: tmin " in said.err
    assert "2021-04-" in said.err and "latitude" in said.err
    assert "Check the variable, its unit and its cell method, or mend the files." in said.err
    assert {name: (season.results / name).read_bytes() for name in season.final_files() - {"run.json"}} == before
    assert json.loads((season.results / "run.json").read_text(encoding="utf-8"))["finished"] is False
