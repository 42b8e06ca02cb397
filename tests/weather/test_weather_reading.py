"""Good files: what is recognised, converted, joined and kept."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import dask
import numpy as np
import pytest
import xarray as xr

from cropstress.weather import cell_latitude_longitude, open_weather, read_weather
from cropstress.weather.humidity import saturation_vapour_pressure

Make = Callable[..., xr.Dataset]
Write = Callable[..., Path]


class CountingScheduler:
    """Counts how often dask computes."""

    def __init__(self) -> None:
        self.computes = 0

    def __call__(self, dsk: object, keys: object, **options: object) -> object:
        self.computes += 1
        return dask.get(dsk, keys, **options)


def test_canonical_variables(usual: Make, write: Write) -> None:
    weather = read_weather(write(usual()))
    dataset = weather.dataset
    assert list(dataset) == ["tmax", "tmin", "vapour_pressure", "radiation"]
    assert dataset["tmax"].dims == ("time", "lat", "lon")
    assert float(dataset["tmax"][0, 0, 0]) == 28.0
    assert float(dataset["radiation"][0, 0, 0]) == pytest.approx(21.6)
    expected = 0.6 * 0.5 * (saturation_vapour_pressure(28.0) + saturation_vapour_pressure(15.0))
    assert float(dataset["vapour_pressure"][0, 0, 0]) == pytest.approx(expected)
    assert dataset.rio.crs.to_epsg() == 4326
    assert weather.not_computed == []
    assert any("WGS 84" in remark for remark in weather.remarks)
    found = {each.canonical: each for each in weather.found}
    assert found["vapour_pressure"].name == "hurs"
    assert "Eq. 19" in found["vapour_pressure"].conversion
    assert found["tmax"].sample_range == (28.0, pytest.approx(28.4))
    assert found["tmax"].files == ("weather.nc",)


def test_temperatures_alone(usual: Make, write: Write) -> None:
    weather = read_weather(write(usual("tasmax", "tasmin")))
    assert list(weather.dataset) == ["tmax", "tmin"]
    assert len(weather.not_computed) == 2
    assert "surface_downwelling_shortwave_flux_in_air" in weather.not_computed[0]
    assert "dry-air days" in weather.not_computed[1]


def test_names_order_and_crs_are_kept(usual: Make, write: Write) -> None:
    projected = usual("tasmax", "tasmin").rename(lat="northing", lon="easting")
    projected = projected.assign_coords(
        northing=(
            "northing",
            [3000.0, 2000.0, 1000.0],
            {"standard_name": "projection_y_coordinate", "units": "m"},
        ),
        easting=(
            "easting",
            [1e5, 1.01e5, 1.02e5, 1.03e5],
            {"standard_name": "projection_x_coordinate", "units": "m"},
        ),
    ).rio.write_crs("EPSG:27700")
    for name in ("tasmax", "tasmin"):
        projected[name] = projected[name].transpose("northing", "easting", "time")
        projected[name].encoding["grid_mapping"] = "spatial_ref"
    dataset = open_weather(write(projected))
    assert dataset["tmax"].dims == ("time", "northing", "easting")
    assert list(dataset["northing"].values) == [3000.0, 2000.0, 1000.0]
    assert dataset.rio.crs.to_epsg() == 27700
    latitude, longitude = cell_latitude_longitude(dataset)
    assert latitude.shape == (3, 4)
    # Easting 100 km, northing 3 km on the British grid lies in the sea west of Cornwall (common knowledge)
    assert 49.5 < latitude[0, 0] < 50.2
    assert -6.5 < longitude[0, 0] < -5.9


def test_one_file_for_each_month(usual: Make, write: Write, tmp_path: Path) -> None:
    write(usual(days=30, start="days since 2021-06-01"), "b.nc")
    write(usual(days=31, start="days since 2021-07-01"), "a.nc")  # the order of names is not that of time
    dataset = open_weather(tmp_path / "*.nc")
    assert dataset.sizes["time"] == 61
    assert str(dataset["time"].values[[0, -1]].astype("datetime64[D]")) == "['2021-06-01' '2021-07-31']"


def test_one_file_for_each_day(usual: Make, write: Write, tmp_path: Path) -> None:
    for day in range(3):
        write(usual("tasmax", "tasmin").isel(time=[day]), f"{day}.nc")
    assert open_weather(tmp_path / "*.nc").sizes["time"] == 3


def test_one_file_for_each_variable(usual: Make, write: Write, tmp_path: Path) -> None:
    for name in ("tasmax", "tasmin", "hurs", "rsds"):
        write(usual(name), f"{name}.nc")
    weather = read_weather("*.nc", base=tmp_path)
    assert {path.name for path in weather.paths} == {"tasmax.nc", "tasmin.nc", "hurs.nc", "rsds.nc"}


def test_rows_the_other_way(usual: Make, write: Write) -> None:
    one = usual("tasmax")
    one["tasmax"] = one["tasmax"] + one["lat"] - 40.0
    one["tasmax"].attrs = usual("tasmax")["tasmax"].attrs
    other = usual("tasmin", "rsds").isel(lat=slice(None, None, -1))
    weather = read_weather([write(one, "one.nc"), write(other, "other.nc")])
    assert list(weather.dataset["lat"].values) == [40.0, 40.5, 41.0]
    assert any("opposite order" in remark for remark in weather.remarks)


def test_gaps_are_missing_days(usual: Make, write: Write) -> None:
    dataset = usual("tasmax", "tasmin", days=10).isel(time=[0, 1, 4, 5, 6, 9])
    path = write(dataset, encoding={name: {"chunksizes": (3, 3, 4)} for name in ("tasmax", "tasmin")})
    weather = read_weather(path)
    assert weather.dataset.sizes["time"] == 10
    assert weather.dataset["tmax"].chunks[0] == (5, 5)  # two chunks in the file, two here
    missing = weather.dataset["tmax"].isnull().all(("lat", "lon")).values
    assert list(np.flatnonzero(missing)) == [2, 3, 7, 8]
    np.testing.assert_allclose(weather.dataset["tmax"][[0, 1, 4, 5, 6, 9], 0, 0], dataset["tasmax"][:, 0, 0])
    assert any("4 days are missing: 2021-06-03 to 2021-06-04" in remark for remark in weather.remarks)


def test_days_all_variables_have(usual: Make, write: Write) -> None:
    long, short = usual("tasmax", "tasmin", days=10), usual("rsds", start="days since 2021-06-04")
    weather = read_weather([write(long, "long.nc"), write(short, "short.nc")])
    assert weather.dataset.sizes["time"] == 5
    assert any(
        "used is what all variables have, 2021-06-04 to 2021-06-08" in remark for remark in weather.remarks
    )


@pytest.mark.parametrize(("calendar", "days"), [("360_day", 360), ("noleap", 365)])
def test_calendar_is_kept(usual: Make, write: Write, calendar: str, days: int) -> None:
    year = usual("tasmax", "tasmin", days=days, start="days since 2020-01-01", calendar=calendar)
    for name in ("tasmax", "tasmin"):
        year[name] = xr.full_like(year[name], float(year[name][0, 0, 0]))
    dataset = open_weather(write(year))
    assert dataset["time"].dt.calendar == calendar
    assert dataset.sizes["time"] == days
    last = dataset["time"].values[-1]
    assert (last.year, last.month) == (2020, 12)


def test_stamp_belongs_to_the_day_of_its_bounds(usual: Make, write: Write) -> None:
    dataset = usual("tasmax", "tasmin")
    dataset["time"] = dataset["time"] + 1.0  # stamped at the end of the day
    dataset["time"].attrs = {"units": "days since 2021-06-01", "calendar": "standard", "bounds": "edges"}
    dataset["edges"] = (("time", "two"), dataset["time"].values[:, None] + np.array([-1.0, 0.0]))
    assert str(open_weather(write(dataset))["time"].values[0])[:10] == "2021-06-01"


def test_overrides(usual: Make, write: Write) -> None:
    dataset = usual("tasmax", "tasmin").rename(tasmax="hot", tasmin="cold")
    for name in ("hot", "cold"):
        dataset[name].attrs = {"units": "strange"}
    dataset["hot"] = dataset["hot"] + 273.15
    said = {"tmax": {"name": "hot", "unit": "K"}, "tmin": {"name": "cold", "unit": "degC"}}
    weather = read_weather(write(dataset), said)
    assert float(weather.dataset["tmax"][0, 0, 0]) == pytest.approx(28.0)
    assert weather.found[0].reason == "named in the run file"


def test_wind_is_brought_to_two_metres(usual: Make, write: Write) -> None:
    """FAO-56 Example 14, published: 3.2 m s-1 at 10 m is 2.4 m s-1 at 2 m."""
    dataset = usual()
    wind = xr.full_like(dataset["tasmax"], 3.2)
    wind.attrs = {"standard_name": "wind_speed", "units": "m s-1", "cell_methods": "time: mean"}
    dataset["wind"] = wind
    at_ten = dataset.assign_coords(height=((), 10.0, {"standard_name": "height", "units": "m"}))
    assert float(open_weather(write(at_ten, "a.nc"))["wind"][0, 0, 0]) == pytest.approx(2.4, abs=0.05)
    path = write(dataset, "b.nc")
    assert float(open_weather(path, {"wind": {"height": 2.0}})["wind"][0, 0, 0]) == 3.2
    assert "wind" not in open_weather(path, {"wind": {"name": "none"}})


def test_specific_humidity_with_elevation(usual: Make, write: Write) -> None:
    dataset = usual("tasmax", "tasmin")
    dataset["huss"] = xr.full_like(dataset["tasmax"], 0.01)
    dataset["huss"].attrs = {"standard_name": "specific_humidity", "units": "1", "cell_methods": "time: mean"}
    dataset["orog"] = (
        ("lat", "lon"),
        np.full((3, 4), 1800.0),
        {"standard_name": "surface_altitude", "units": "m"},
    )
    weather = read_weather(write(dataset))
    # derived here: e = q P / (0.622 + 0.378 q) with P 81.8 kPa of FAO-56 Example 2
    expected = 0.01 * 81.8 / (0.622 + 0.378 * 0.01)
    assert float(weather.dataset["vapour_pressure"][0, 0, 0]) == pytest.approx(expected, rel=1e-3)
    assert weather.dataset["elevation"].dims == ("lat", "lon")


def test_better_humidity_is_taken_and_told(usual: Make, write: Write) -> None:
    dataset = usual()
    dataset["dew"] = xr.full_like(dataset["tasmax"], 12.0)
    dataset["dew"].attrs = {
        "standard_name": "dew_point_temperature",
        "units": "degC",
        "cell_methods": "time: mean",
    }
    weather = read_weather(write(dataset))
    assert float(weather.dataset["vapour_pressure"][0, 0, 0]) == pytest.approx(
        saturation_vapour_pressure(12.0)
    )
    assert any("not used: 'hurs'" in remark for remark in weather.remarks)
    # what the run file names goes first
    named = read_weather(weather.paths, {"relative_humidity": {"name": "hurs"}})
    assert [each.name for each in named.found if each.canonical == "vapour_pressure"] == ["hurs"]


def test_only_a_few_days_are_read(usual: Make, write: Write) -> None:
    path = write(usual(days=60), encoding={"tasmax": {"chunksizes": (10, 3, 4)}})
    scheduler = CountingScheduler()
    with dask.config.set(scheduler=scheduler):
        dataset = open_weather(path)
        assert scheduler.computes == 4  # four days are looked at
    assert all(dask.is_dask_collection(variable.data) for variable in dataset.data_vars.values())
    assert dataset["tmax"].chunks == ((10,) * 6, (3,), (4,))  # the file's own


def test_file_without_chunks_is_read_in_pieces(
    usual: Make, write: Write, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = write(usual(days=60), format="NETCDF3_64BIT")
    assert open_weather(path)["tmax"].chunks == ((60,), (3,), (4,))
    monkeypatch.setattr("cropstress.weather.open.UNCHUNKED_BYTES", 25 * 3 * 4 * 8)
    assert open_weather(path)["tmax"].chunks == ((25, 25, 10), (3,), (4,))


def test_days_in_one_chunk_are_looked_at_together(usual: Make, write: Write) -> None:
    path = write(usual(days=60))
    scheduler = CountingScheduler()
    with dask.config.set(scheduler=scheduler):
        open_weather(path)
    assert scheduler.computes == 1


def test_single_cell(usual: Make, write: Write) -> None:
    weather = read_weather(write(usual().isel(lat=[1], lon=[2])))
    assert weather.dataset["tmax"].shape == (5, 1, 1)


def test_stehekin(real_data: Path) -> None:
    """Real daily grid, values read from the file itself."""
    path = real_data / "grids" / "stehekin_1949" / "passthrough.nc"
    said = {
        "tmax": {"name": "t_max", "unit": "degC"},
        "tmin": {"name": "t_min", "unit": "degC"},
        "vapour_pressure": {"name": "vapor_pressure"},
        "radiation": {"name": "shortwave"},
        "wind": {"name": "wind", "height": 10.0},
    }
    weather = read_weather(path, said, elevation={"file": str(path.parent / "stehekin.nc"), "name": "elev"})
    dataset = weather.dataset
    assert dataset.sizes == {"time": 365, "lat": 4, "lon": 5}
    with xr.open_dataset(path, decode_times=False) as raw:
        np.testing.assert_array_equal(dataset["tmax"].values, raw["t_max"].values)
        np.testing.assert_allclose(dataset["vapour_pressure"], raw["vapor_pressure"].astype(float) / 1000.0)
        np.testing.assert_allclose(dataset["radiation"], raw["shortwave"].astype(float) * 0.0864)
    assert str(dataset["time"].values[0])[:10] == "1949-01-01"
    assert dataset["elevation"].notnull().sum() > 0


@pytest.mark.parametrize("calendar", ["proleptic_gregorian", "360_day"])
def test_rotated_pole(real_data: Path, write: Write, calendar: str) -> None:
    """A real rotated grid; its own two-dimensional latitudes agree with the CRS."""
    name = {"proleptic_gregorian": "cclm_tasmin_rotpole_1950", "360_day": "hadgem_tasmin_rotpole_360day"}[
        calendar
    ]
    path = real_data / "hostile" / f"cordex_eur11_{name}.nc"
    with xr.open_dataset(path, decode_times=False, decode_coords="all") as raw:
        both = raw.load()
    both["tasmax"] = both["tasmin"] + 5.0
    both["tasmax"].attrs = both["tasmin"].attrs | {"cell_methods": "time: maximum"}
    both["tasmax"].encoding["grid_mapping"] = both["tasmin"].encoding["grid_mapping"]
    dataset = open_weather(write(both))
    assert dataset["time"].dt.calendar == calendar
    latitude, _ = cell_latitude_longitude(dataset)
    computed, _ = cell_latitude_longitude(dataset.drop_vars(["lat", "lon"]))
    np.testing.assert_allclose(latitude, computed, atol=1e-4)
