"""Air of the leaf and day floors against FAO-56 (Allen, Pereira, Raes & Smith 1998), read, and MetPy.

What the weather floor makes of files is held in the tests of that floor.
"""

from __future__ import annotations

import math

import metpy.calc
import numpy as np
import pytest
import xarray as xr
from metpy.units import units

from cropstress.day import course
from cropstress.leaf import air, responses
from cropstress.region.compute import ground_of
from cropstress.weather import open_weather, pressure_from_elevation
from cropstress.weather.humidity import saturation_vapour_pressure, vapour_pressure, wind_factor

# FAO-56 Table 2.3 [degC, kPa], published.
SATURATION = {
    1.0: 0.657, 5.0: 0.872, 10.0: 1.228, 15.0: 1.705, 18.0: 2.064, 20.0: 2.338, 21.5: 2.564, 24.5: 3.075,
    25.0: 3.168, 30.0: 4.243, 35.0: 5.623, 40.0: 7.376, 45.0: 9.582, 48.5: 11.447,
}  # fmt: skip


@pytest.mark.parametrize("floor", [responses.saturation_pressure, course.saturation], ids=["leaf", "day"])
def test_saturation_pressure_table(floor) -> None:
    """FAO-56 Table 2.3, published, for the compiled copies of Eq. 11."""
    for temperature, expected in SATURATION.items():
        assert floor(temperature) == pytest.approx(expected, abs=6e-4)


@pytest.mark.parametrize("floor", [responses.saturation_pressure, course.saturation], ids=["leaf", "day"])
def test_saturation_pressure_against_metpy(floor) -> None:
    """Another formula (MetPy): within 0.5 % from 0 to 50 degC."""
    temperature = np.linspace(0.0, 50.0, 101)
    other = metpy.calc.saturation_vapor_pressure(units.Quantity(temperature, "degC")).to("kPa").magnitude
    np.testing.assert_allclose([floor(each) for each in temperature], other, rtol=5e-3)


@pytest.mark.parametrize("pressure", [0.5, 1.0, 1.705, 2.85, 4.0])
def test_dew_point(pressure: float) -> None:
    """FAO-56 Eq. 3-11, published: Tdew = (116.91 + 237.3 ln ea) / (16.78 - ln ea)."""
    logarithm = math.log(pressure)
    assert air.dew_point(pressure) == pytest.approx((116.91 + 237.3 * logarithm) / (16.78 - logarithm), abs=0.02)
    assert saturation_vapour_pressure(air.dew_point(pressure)) == pytest.approx(pressure, rel=1e-9)


def test_latitudes_of_example_7(tmp_path) -> None:
    """FAO-56 Example 7, published: 13 deg 44 min N is 0.240 rad, 22 deg 54 min S is -0.400 rad."""
    coords = {
        "time": ("time", [0.0, 1.0], {"units": "days since 2021-06-01"}),
        "lat": ("lat", [-(22 + 54 / 60), 13 + 44 / 60], {"units": "degrees_north", "standard_name": "latitude"}),
        "lon": ("lon", [10.0, 11.0], {"units": "degrees_east", "standard_name": "longitude"}),
    }
    dataset = xr.Dataset(coords=coords)
    for name, method, value in (("tasmax", "maximum", 28.0), ("tasmin", "minimum", 15.0)):
        attributes = {"standard_name": "air_temperature", "units": "degC", "cell_methods": f"time: {method}"}
        dataset[name] = (("time", "lat", "lon"), np.full((2, 2, 2), value), attributes)
    dataset.to_netcdf(tmp_path / "weather.nc")
    latitude = ground_of(open_weather(tmp_path / "weather.nc")).latitude
    np.testing.assert_allclose(latitude, [-0.400, -0.400, 0.240, 0.240], atol=5e-4)


def test_air_of_example_17() -> None:
    """FAO-56 Example 17, published: Bangkok at 2 m, 34.8 and 25.6 degC."""
    assert pressure_from_elevation(2.0) == pytest.approx(101.3, abs=0.05)
    assert course.saturation(34.8) == pytest.approx(5.56, abs=5e-3)
    assert course.saturation(25.6) == pytest.approx(3.28, abs=5e-3)


def test_air_of_example_18() -> None:
    """FAO-56 Example 18, published: Uccle at 100 m; 21.5 and 12.3 degC, 84 and 63 %, 10 km/h at 10 m."""
    assert pressure_from_elevation(100.0) == pytest.approx(100.1, abs=0.05)
    given = {
        "tmax": np.array(21.5),
        "tmin": np.array(12.3),
        "relative_humidity_maximum": np.array(84.0),
        "relative_humidity_minimum": np.array(63.0),
    }
    humidity = vapour_pressure(("relative_humidity_maximum", "relative_humidity_minimum"), given)
    assert humidity == pytest.approx(1.409, abs=5e-4)
    assert 10.0 / 3.6 * wind_factor(10.0) == pytest.approx(2.078, abs=5e-4)


def test_air_of_example_20() -> None:
    """FAO-56 Example 20, published: Lyon; the dew point taken as tmin, 14.8 degC, gives 1.68 kPa."""
    given = {"tmax": np.array(26.6), "tmin": np.array(14.8), "dew_point": np.array(14.8)}
    assert vapour_pressure(("dew_point",), given) == pytest.approx(1.68, abs=5e-3)


@pytest.mark.parametrize(
    ("example", "tmax", "tmin", "humidity", "relative", "expected"),
    [
        (11, 25.1, 19.1, 2.1, 14.5 / 18.8, 3.5),
        (17, 34.8, 25.6, 2.85, 22.65 / 28.54, 3.11),
        (18, 21.5, 12.3, 1.409, 22.07 / 30.90, 3.71),
        (20, 26.6, 14.8, 1.68, 22.29 / 30.58, 3.68),
    ],
)
def test_net_longwave_of_a_day(
    example: int, tmax: float, tmin: float, humidity: float, relative: float, expected: float
) -> None:
    """FAO-56 Examples 11, 17, 18 and 20, published [MJ m-2 d-1], positive there when lost.

    Eq. 39 takes the mean of the fourth powers at tmax and tmin, so the mean of two moments is its day. FAO-56
    has 273.16 for 273.15 and a rounded sigma: together under 0.2 %.
    """
    moments = [course.net_longwave(temperature, humidity, relative) for temperature in (tmax, tmin)]
    assert -0.0864 * np.mean(moments) == pytest.approx(expected, abs=0.05)


@pytest.mark.parametrize(
    ("temperature", "humidity", "relative", "expected"),
    [(28.0, 3.402, 0.8, 0.100), (38.0, 3.445, 0.922, 0.137)],
)
def test_net_longwave_of_an_hour(temperature: float, humidity: float, relative: float, expected: float) -> None:
    """FAO-56 Example 19, published: N'Diaye, an hour of the night and one of the day [MJ m-2 h-1]."""
    assert -0.0036 * course.net_longwave(temperature, humidity, relative) == pytest.approx(expected, abs=6e-4)


def test_net_longwave_keeps_within_the_skies_it_was_made_for() -> None:
    """Rs/Rso above 1 counts as a clear sky (FAO-56 Eq. 39, published); below 0.3 as 0.3 (chosen here)."""
    assert course.net_longwave(20.0, 1.5, 1.2) == course.net_longwave(20.0, 1.5, 1.0)
    assert course.net_longwave(20.0, 1.5, 0.0) == course.net_longwave(20.0, 1.5, 0.3)
