"""Weather files at fault, from the file to what the command line says: what is wrong, where, and what to do."""

from __future__ import annotations

import os
from collections.abc import Callable

import numpy as np
import pytest
import xarray as xr
from spoilt_season import (
    AIR,
    AREA,
    ELEVATION,
    HUMIDITY,
    RADIATION,
    SOWING,
    Command,
    Season,
    Stops,
    set_attributes,
    set_values,
)


def test_the_season_has_no_fault(season: Season, command: Command) -> None:
    said = command("check", season.run_file)
    assert (said.code, said.err) == (0, "")
    assert "37 cells; sown by the grid 'maize_sowing_day'" in said.out


def test_missing_file(season: Season, stops: Stops) -> None:
    season.rewrite('"grids/*_2021.nc"', '["grids/*_2021.nc", "grids/airtemp_2021.nc"]')
    stops("grids/airtemp_2021.nc: there is no such file", "Did you mean 'airtemperature_2021.nc'?")


def test_backslashes_where_they_do_not_separate_folders(season: Season, stops: Stops, command: Command) -> None:
    season.rewrite('"grids/*_2021.nc"', r"'grids\*_2021.nc'")
    if os.sep == "\\":
        assert command("check", season.run_file).code == 0
        return
    stops("no file fits this pattern", 'Write it with forward slashes: "grids/*_2021.nc".')


def test_a_name_no_disk_can_hold(season: Season, stops: Stops) -> None:
    season.rewrite('"grids/*_2021.nc"', f'["grids/*_2021.nc", "{"x" * 300}.nc"]')
    stops("x.nc: ", "Check the name")


@pytest.mark.parametrize(
    ("content", "what", "remedy"),
    [
        (b"<html>404 Not Found</html>", "a web page", "Download it again."),
        (b"PK\x03\x04", "a ZIP archive", "Unpack it"),
        (b"", "the file is empty", "Copy or download it again."),
    ],
)
def test_not_netcdf(season: Season, stops: Stops, content: bytes, what: str, remedy: str) -> None:
    (season.folder / HUMIDITY).write_bytes(content)
    stops(f"{HUMIDITY}: ", what, remedy)


def test_cut_short(season: Season, stops: Stops) -> None:
    path = season.folder / HUMIDITY
    path.write_bytes(path.read_bytes()[:-5000])
    stops(f"{HUMIDITY}: the file cannot be opened as NetCDF", "copy or download it again")


def test_damaged_inside(season: Season, command: Command) -> None:
    """A block of values that fails its checksum, on a day that `check` does not look at."""
    path = season.folder / HUMIDITY
    with xr.open_dataset(path, decode_times=False, decode_coords=False) as dataset:
        loaded = dataset.load()
    sizes = loaded["hurs"].shape
    path.unlink()
    loaded.to_netcdf(path, encoding={"hurs": {"fletcher32": True, "chunksizes": (11, *sizes[1:])}})
    content = path.read_bytes()
    day = loaded["hurs"].values[100].tobytes()
    assert content.count(day) == 1
    path.write_bytes(content.replace(day, day[:-4] + b"\x00\x00\x00\x01"))
    said = command("run", season.run_file)
    assert said.code == 2
    assert f"{HUMIDITY}: hurs: its values cannot be read from step 100 of its dimension 'time' on" in said.err
    assert "copy or download it again" in said.err
    assert season.final_files() == {"run.json"}


def test_damaged_inside_a_grid_of_the_places(season: Season, stops: Stops) -> None:
    path = season.folder / SOWING
    with xr.open_dataset(path, decode_coords=False) as dataset:
        loaded = dataset.load()
    path.unlink()
    loaded.to_netcdf(path, encoding={"maize_sowing_day": {"fletcher32": True, "chunksizes": (7, 8)}})
    values = loaded["maize_sowing_day"].values.tobytes()
    content = path.read_bytes()
    assert content.count(values) == 1
    path.write_bytes(content.replace(values, values[:-4] + b"\x00\x00\x00\x01"))
    stops("places/sowing_day.nc: maize_sowing_day: its values cannot be read", "copy or download it again")


def test_no_variable_for_a_needed_quantity(season: Season, stops: Stops) -> None:
    season.change(AIR, set_attributes("tasmax", cell_methods=None))
    stops(
        "season.toml: weather.files: tmax: no variable for daily highest air temperature was found",
        "looked for the standard name 'air_temperature' with the cell method 'time: maximum'",
        "not taken: 'tasmax' in grids/airtemperature_2021.nc (no cell method over time; 'maximum' is needed)",
        f"the files hold: {AIR}: tasmax (air_temperature), tasmin (air_temperature); {HUMIDITY}: hurs (",
        '[weather.variables.tmax] name = "...".',
    )


def test_what_is_not_needed_is_left_out_and_told(season: Season, command: Command) -> None:
    (season.folder / RADIATION).unlink()
    said = command("check", season.run_file)
    assert said.code == 0
    assert "Not computed\n  assimilation, both losses and their causes" in said.out
    assert "looked for the standard name 'surface_downwelling_shortwave_flux_in_air'" in said.out


def test_elevation_is_never_silently_left_out(season: Season, stops: Stops) -> None:
    season.change(ELEVATION, set_attributes("orog", standard_name=None, long_name=None))
    stops(
        f"{ELEVATION}: this file has no height of the ground above the sea",
        f"found {ELEVATION}: orog (no standard name)",
        '[places] elevation = { file = "...", name = "..." }',
    )


def test_two_candidates(season: Season, stops: Stops) -> None:
    season.change(AIR, lambda dataset: dataset.assign(corrected=dataset["tasmax"]))
    stops(
        "season.toml: weather.files: tmax: 2 variables fit daily highest air temperature equally well",
        "'tasmax' in grids/airtemperature_2021.nc",
        "'corrected' in grids/airtemperature_2021.nc",
        '[weather.variables.tmax] name = "tasmax" or "corrected".',
    )


@pytest.mark.parametrize(
    ("unit", "what"),
    [
        (None, "it has no unit"),
        ("K", "the unit 'K' does not fit shortwave radiation reaching the ground"),
        ("bananas", "the unit 'bananas' cannot be read"),
    ],
)
def test_unit_missing_or_wrong(season: Season, stops: Stops, unit: str | None, what: str) -> None:
    season.change(RADIATION, set_attributes("rsds", units=unit))
    stops(f"{RADIATION}: rsds: {what}", '[weather.variables.radiation] unit = "W m-2" or "MJ m-2 d-1" or "J m-2".')


def test_celsius_field_at_300(season: Season, stops: Stops) -> None:
    season.change(AIR, set_attributes("tasmax", units="degC"))
    stops(
        f"{AIR}: tasmax: the unit is said to be 'degC', but the values look like kelvin",
        'If so, say it in the run file: [weather.variables.tmax] unit = "K".',
    )


@pytest.mark.parametrize("file", [RADIATION, AREA, SOWING, ELEVATION])
def test_grids_that_differ(season: Season, stops: Stops, file: str) -> None:
    season.change(file, lambda dataset: dataset.assign_coords(lat=dataset["lat"].copy(data=dataset["lat"] + 0.2)))
    stops(f"{file}: ", "the grids differ", "lat 41.225 to 43.625", "lat 41.425 to 43.825", "Bring both to one grid")


def _steps(*steps: int) -> Callable[[xr.Dataset], xr.Dataset]:
    return lambda dataset: dataset.isel(time=list(steps))


@pytest.mark.parametrize(
    ("steps", "what", "remedy"),
    [
        ([*range(50), 49, *range(50, 198)], "the time step at 2021-05-20 is there twice", "Keep one of each."),
        ([1, 0, *range(2, 198)], "times are out of order at 1 place: 2021-04-01 comes after 2021-04-02", "Sort"),
        (range(0, 198, 10), "the data are not daily: a step every 10 days", "This program reads daily grids"),
    ],
)
def test_time_steps(season: Season, stops: Stops, steps: list[int], what: str, remedy: str) -> None:
    season.change(AIR, _steps(*steps))
    stops(f"{AIR}: time: {what}", remedy)


def test_missing_days_are_counted_and_told(season: Season, command: Command) -> None:
    season.change(AIR, _steps(*range(50), *range(60, 198)))
    said = command("check", season.run_file)
    assert said.code == 0
    assert f"{AIR}: tasmax: 10 days are missing: 2021-05-21 to 2021-05-30; counted as missing, not filled" in said.out


def test_all_missing(season: Season, stops: Stops) -> None:
    season.change(RADIATION, set_values("rsds", lambda values: np.full_like(values, np.nan)))
    stops(f"{RADIATION}: rsds: all values are missing", "Check the file and its fill value")


def test_attributes_no_library_reads(season: Season, stops: Stops) -> None:
    season.change(RADIATION, set_attributes("rsds", scale_factor="ten"))
    stops(f"{RADIATION}: rsds: its scale_factor is no number: 'ten'", "Write scale_factor as a number.")


@pytest.mark.parametrize(
    ("name", "where"),
    [("lat", AIR), ("height", AIR), ("crs", AIR)],
)
def test_a_named_variable_that_is_no_grid(season: Season, command: Command, name: str, where: str) -> None:
    season.rewrite("[places]", f'[weather.variables.tmax]\nname = "{name}"\n[places]')
    said = command("check", season.run_file)
    assert said.code == 2
    assert f"{where}: {name}: it is no grid of numbers" in said.err
