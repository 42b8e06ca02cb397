"""Everything that can be wrong with weather files: what, where, what to do, and all in one list."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from cropstress.errors import Fault, InputError
from cropstress.weather import read_weather

Make = Callable[..., xr.Dataset]
Write = Callable[..., Path]


def faults(*arguments: object, **options: object) -> list[Fault]:
    """Return the faults of a reading that must fail."""
    with pytest.raises(InputError) as caught:
        read_weather(*arguments, **options)  # type: ignore[arg-type]
    return caught.value.faults


def only(found: list[Fault], what: str, where: str, remedy: str) -> None:
    """Check that there is one fault that says all three."""
    assert len(found) == 1, [str(each) for each in found]
    assert what in found[0].what
    assert where in found[0].where
    assert remedy in found[0].remedy


def test_missing_file(usual: Make, write: Write, tmp_path: Path) -> None:
    write(usual(), "weather_2021.nc")
    only(faults("wether_2021.nc", base=tmp_path), "no such file", "wether_2021.nc", "'weather_2021.nc'")


def test_pattern_without_files(tmp_path: Path) -> None:
    only(faults("*.nc", base=tmp_path), "no file fits", "*.nc", "0 files that end in .nc")


def test_folder_instead_of_file(tmp_path: Path) -> None:
    (tmp_path / "grids").mkdir()
    only(faults("grids", base=tmp_path), "a folder", "grids", "grids/*.nc")


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"PK\x03\x04 something", "a ZIP archive"),
        (b"GRIB something", "a GRIB file"),
        (b"", "empty"),
        (b"time,tmax\n", "not a NetCDF file"),
        (b"\x89HDF\r\n\x1a\n and then nothing", "cannot be opened"),
    ],
)
def test_not_netcdf(tmp_path: Path, content: bytes, words: str) -> None:
    (tmp_path / "odd.nc").write_bytes(content)
    only(faults("odd.nc", base=tmp_path), words, "odd.nc", "")


def test_no_permission(usual: Make, write: Write, monkeypatch: pytest.MonkeyPatch) -> None:
    path = write(usual())

    def refuse(*arguments: object, **options: object) -> None:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "open", refuse)
    only(faults(path), "no permission", "weather.nc", "owner")


def test_needed_quantity_not_found(usual: Make, write: Write) -> None:
    dataset = usual("tasmax", "tasmin", "rsds")
    dataset["tasmax"].attrs["cell_methods"] = "time: mean"
    found = faults(write(dataset))
    only(
        found,
        "looked for the standard name 'air_temperature' with the cell method 'time: maximum'",
        "tmax",
        "name =",
    )
    assert "not taken: 'tasmax' in weather.nc (cell method 'mean')" in found[0].what
    assert "rsds (surface_downwelling_shortwave_flux_in_air)" in found[0].what


def test_named_variable_not_found(usual: Make, write: Write) -> None:
    found = faults(write(usual()), {"tmax": {"name": "tasmx"}})
    only(found, "no file holds a variable 'tasmx'", "weather.variables.tmax.name", "'tasmax'")


def test_two_candidates(usual: Make, write: Write) -> None:
    dataset = usual()
    dataset["tasmax_corrected"] = dataset["tasmax"]
    found = faults(write(dataset))
    only(
        found,
        "'tasmax' in weather.nc",
        "tmax",
        '[weather.variables.tmax] name = "tasmax" or "tasmax_corrected"',
    )
    assert "'tasmax_corrected'" in found[0].what
    assert read_weather(write(dataset, "again.nc"), {"tmax": {"name": "tasmax"}}).found[0].name == "tasmax"


@pytest.mark.parametrize(
    ("unit", "words"), [("", "no unit"), ("mm", "does not fit"), ("bananas", "cannot be read")]
)
def test_unit_missing_or_wrong(usual: Make, write: Write, unit: str, words: str) -> None:
    dataset = usual()
    dataset["tasmax"].attrs["units"] = unit
    only(faults(write(dataset)), words, "weather.nc: tasmax", '[weather.variables.tmax] unit = "degC"')


def test_celsius_at_300(usual: Make, write: Write) -> None:
    dataset = usual()
    for name in ("tasmax", "tasmin"):
        dataset[name] = (dataset[name] + 273.15).assign_attrs(dataset[name].attrs)
    found = faults(write(dataset))
    assert [fault.where for fault in found] == ["weather.nc: tasmax", "weather.nc: tasmin"]
    assert "look like kelvin" in found[0].what
    assert found[0].remedy == 'If so, say it in the run file: [weather.variables.tmax] unit = "K".'


@pytest.mark.parametrize(
    ("name", "factor", "unit", "words"),
    [
        ("hurs", 0.01, "%", "look like a fraction"),
        ("hurs", 1.0, "1", "look like percent"),
        ("hurs", 2.0, "%", "outside the possible 0 to 105 %"),
        ("rsds", 1.0, "MJ m-2 d-1", "more radiation than reaches the top of the air"),
        ("rsds", 1e-4, "W m-2", "too small to be true"),
        ("rsds", -1.0, "W m-2", "radiation is negative"),
        ("tasmax", 9.0, "degC", "kelvin"),
        ("tasmax", 2.5, "degC", "outside the possible -90 to 60 degC"),
    ],
)
def test_impossible_values(
    usual: Make, write: Write, name: str, factor: float, unit: str, words: str
) -> None:
    dataset = usual()
    dataset[name] = (dataset[name] * factor).assign_attrs(dataset[name].attrs | {"units": unit})
    found = faults(write(dataset))
    only(found, words, f"weather.nc: {name}", "unit" if factor > 0 else "downward")


def test_swapped_temperatures(usual: Make, write: Write) -> None:
    dataset = usual()
    swapped = {"tasmax": dataset["tasmin"].attrs, "tasmin": dataset["tasmax"].attrs}
    for name, attributes in swapped.items():
        dataset[name].attrs = dict(attributes)
    found = faults(write(dataset))
    only(found, "tmax is below tmin", "weather.nc: tasmin", "swapped")
    assert "in 48 of 48 values looked at, for example tmax 15" in found[0].what
    assert "at lat 40, lon 10" in found[0].what


def test_few_crossing_cells_do_not_stop_the_run(usual: Make, write: Write) -> None:
    dataset = usual()
    dataset["tasmin"][0, 0, 0] = 40.0
    assert read_weather(write(dataset)).found


def test_humidity_above_saturation(usual: Make, write: Write) -> None:
    dataset = usual()
    dataset["dew"] = xr.full_like(dataset["tasmax"], 27.0)
    dataset["dew"].attrs = {"standard_name": "dew_point_temperature", "units": "degC"}
    only(faults(write(dataset)), "above saturation", "weather.nc: dew", "unit")


def test_all_missing(usual: Make, write: Write) -> None:
    dataset = usual()
    dataset["rsds"][:] = np.nan
    only(faults(write(dataset)), "all values are missing", "weather.nc: rsds", "fill value")


def test_grids_that_differ(usual: Make, write: Write) -> None:
    other = usual("rsds")
    other["lat"] = other["lat"] + 0.1
    paths = [write(usual("tasmax", "tasmin"), "one.nc"), write(other, "other.nc")]
    found = faults(paths)
    only(found, "one.nc has 3 x 4 cells, lat 40 to 41", "other.nc: rsds", "one grid")
    assert "other.nc has 3 x 4 cells, lat 40.1 to 41.1" in found[0].what


def test_coordinates_in_float32_are_the_same_grid(usual: Make, write: Write) -> None:
    one, other = usual("tasmax", "tasmin"), usual("rsds")
    for dataset, kind in ((one, "float64"), (other, "float32")):
        values = (dataset["lat"].values / 3.0).astype(kind)
        dataset["lat"] = ("lat", values, dataset["lat"].attrs)
    assert read_weather([write(one, "one.nc"), write(other, "other.nc")]).found


def test_no_crs(usual: Make, write: Write) -> None:
    dataset = usual("tasmax", "tasmin").rename(lat="y", lon="x")
    for name in ("y", "x"):
        dataset[name].attrs = {"units": "m"}
    only(faults(write(dataset)), "no coordinate reference system", "weather.nc: y, x", "grid mapping")


def test_crs_in_kilometres(usual: Make, write: Write) -> None:
    dataset = usual("tasmax", "tasmin").rename(lat="y", lon="x").rio.write_crs("EPSG:3035")
    for name in ("y", "x"):
        dataset[name].attrs = {"units": "km"}
    for name in ("tasmax", "tasmin"):
        dataset[name].encoding["grid_mapping"] = "spatial_ref"
    found = faults(write(dataset))
    assert "is in 'km', but its CRS counts in metres" in found[0].what


@pytest.mark.parametrize(
    ("steps", "words", "remedy"),
    [
        ([0.0, 1.0, 1.0, 2.0, 3.0], "the time step at 2021-06-02 is there twice", "one of each"),
        ([0.0, 2.0, 1.0, 3.0, 4.0], "out of order at 1 place: 2021-06-02 comes after 2021-06-03", "Sort"),
        ([0.0, 0.125, 0.25, 0.375, 0.5], "not daily: a step every 3 hours", "reduce the data to days"),
        ([0.0, 30.0, 61.0, 91.0, 122.0], "not daily: a step every 30 days", "a value for each day"),
        ([0.0, 1.0, 2.3, 3.3, 4.3], "not daily: 31.2 hours after 2021-06-02", "reduce the data to days"),
        ([0.0, 1.0, np.nan, 3.0, 4.0], "time step 3 has no time", "its date"),
    ],
)
def test_times(usual: Make, write: Write, steps: list[float], words: str, remedy: str) -> None:
    dataset = usual("tasmax", "tasmin")
    dataset["time"] = ("time", steps, dataset["time"].attrs)
    found = faults(write(dataset))
    # once: both variables share the axis, except where their files are joined
    assert words in found[0].what
    assert "weather.nc" in found[0].where
    assert remedy in found[0].remedy


def test_step_longer_than_a_day_by_its_bounds(usual: Make, write: Write) -> None:
    dataset = usual("tasmax", "tasmin")
    dataset["time"].attrs["bounds"] = "edges"
    dataset["edges"] = (("time", "two"), dataset["time"].values[:, None] + np.array([0.0, 8.0]))
    assert "8 days long, not a day" in faults(write(dataset))[0].what


def test_time_unit_that_cannot_be_read(usual: Make, write: Write) -> None:
    dataset = usual("tasmax", "tasmin")
    dataset["time"].attrs["units"] = "day as %Y%m%d.%f"
    assert "no time coordinate that can be read" in faults(write(dataset))[0].what
    dataset["time"].attrs["units"] = "moons since 2021-06-01"
    assert "cannot be read" in faults(write(dataset, "b.nc"))[0].what


def test_day_in_two_files(usual: Make, write: Write, tmp_path: Path) -> None:
    write(usual(), "a.nc")
    write(usual(start="days since 2021-06-04"), "b.nc")
    found = faults("*.nc", base=tmp_path)
    only(found, "2021-06-04 is in both a.nc and b.nc", "a.nc and 1 more file: time", "one file only")


def test_calendars_that_differ(usual: Make, write: Write) -> None:
    one = write(usual("tasmax", "tasmin"), "one.nc")
    other = write(usual("rsds", calendar="360_day"), "other.nc")
    only(faults([one, other]), "that of one.nc: tasmax is 'standard'", "other.nc: rsds", "one calendar")


def test_no_day_in_common(usual: Make, write: Write) -> None:
    one = write(usual("tasmax", "tasmin"), "one.nc")
    other = write(usual("rsds", start="days since 2020-06-01"), "other.nc")
    found = faults([one, other])
    only(found, "no day in common", "weather", "same period")
    assert "other.nc: rsds 2020-06-01 to 2020-06-05" in found[0].what


def test_wind_without_height(usual: Make, write: Write) -> None:
    dataset = usual()
    dataset["wind"] = xr.full_like(dataset["tasmax"], 3.0)
    dataset["wind"].attrs = {"standard_name": "wind_speed", "units": "m s-1"}
    only(faults(write(dataset)), "height of the wind", "weather.nc: wind", "height = 10.0")


def test_specific_humidity_without_pressure(usual: Make, write: Write) -> None:
    dataset = usual("tasmax", "tasmin")
    dataset["huss"] = xr.full_like(dataset["tasmax"], 0.01)
    dataset["huss"].attrs = {"standard_name": "specific_humidity", "units": "1"}
    only(faults(write(dataset)), "without air pressure or elevation", "weather.nc: huss", "surface_altitude")


def test_sum_with_the_unit_of_a_mean(usual: Make, write: Write) -> None:
    """The mean of hourly sums is a common slip: 24 times too small."""
    dataset = usual()
    dataset["rsds"].attrs["units"] = "J m-2"
    only(faults(write(dataset)), "that of a sum", "weather.nc: rsds", "Say which is right")


def test_more_dimensions(usual: Make, write: Write) -> None:
    dataset = usual()
    dataset["tasmax"] = dataset["tasmax"].expand_dims(member=2).assign_attrs(dataset["tasmax"].attrs)
    only(faults(write(dataset)), "more dimensions", "weather.nc: tasmax", "one level or member")


@pytest.mark.parametrize(
    ("variables", "words", "remedy"),
    [
        ({"tmx": {"name": "tasmax"}}, "no weather variable 'tmx'", "'tmax'"),
        ({"tmax": {"units": "K"}}, "unknown key 'units'", "unit"),
        ({"tmax": {"unit": "mm"}}, "does not fit", "degC"),
        ({"tmax": {"name": "tasmax", "cell_method": "minimum"}}, "'minimum' does not fit", "maximum"),
        ({"relative_humidity": {"cell_method": "maximum"}}, "'maximum'", "'relative_humidity_maximum'"),
        ({"tmax": {"name": "none"}}, "nothing can be computed without", "Name it"),
        ({"tmax": {"height": 2.0}}, "only used for wind", "out"),
    ],
)
def test_overrides_at_fault(
    usual: Make, write: Write, variables: dict[str, dict[str, object]], words: str, remedy: str
) -> None:
    found = faults(write(usual()), variables)
    assert words in found[0].what
    assert "weather.variables" in found[0].where
    assert remedy in found[0].remedy


def test_all_faults_in_one_list(usual: Make, write: Write, tmp_path: Path) -> None:
    cold = usual("tasmin")
    cold["tasmin"].attrs["units"] = "mm"
    write(cold, "cold.nc")
    sun = usual("rsds")
    sun["rsds"] = (sun["rsds"] * 100.0).assign_attrs(sun["rsds"].attrs)
    write(sun, "sun.nc")
    write(usual("tasmax"), "hot.nc")
    (tmp_path / "zip.nc").write_bytes(b"PK\x03\x04")
    found = faults(["hot.nc", "cold.nc", "sun.nc", "zip.nc", "gone.nc"], {"tmx": {}}, base=tmp_path)
    text = str(InputError(found))
    assert len(found) == 5
    for words in ("ZIP", "no such file", "'mm' does not fit", "top of the air", "no weather variable 'tmx'"):
        assert words in text


def test_hostile_files(real_data: Path) -> None:
    """Real files with traps: each gives faults, none an error of another kind."""
    for path in sorted((real_data / "hostile").glob("*.nc")):
        assert faults(path), path.name
