"""Conversions against FAO-56 and MetPy, and units."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cropstress.weather import extraterrestrial_radiation, pressure_from_elevation
from cropstress.weather.humidity import (
    mean_saturation_vapour_pressure,
    saturation_vapour_pressure,
    vapour_pressure,
    wind_factor,
)
from cropstress.weather.quantities import HUMIDITY_WAYS, QUANTITIES
from cropstress.weather.units import UnitError, conversion, linear, read_unit


@pytest.mark.parametrize(
    ("temperature", "expected"),
    [(1, 0.657), (5, 0.872), (10, 1.228), (15, 1.705), (20, 2.338), (24.5, 3.075), (30, 4.243), (40, 7.376)],
)
def test_saturation_pressure_table(temperature: float, expected: float) -> None:
    """FAO-56 Table 2.3, published."""
    assert saturation_vapour_pressure(temperature) == pytest.approx(expected, abs=6e-4)


def test_saturation_pressure_against_metpy() -> None:
    """Another formula (MetPy, from memory: Ambaum 2020 or Bolton 1980): within 0.5 % from 0 to 50 degC."""
    calc = pytest.importorskip("metpy.calc")
    units = pytest.importorskip("metpy.units").units
    temperature = np.linspace(0.0, 50.0, 101)
    other = calc.saturation_vapor_pressure(units.Quantity(temperature, "degC")).to("kPa").magnitude
    np.testing.assert_allclose(saturation_vapour_pressure(temperature), other, rtol=5e-3)


def test_example_2_and_pressure_table() -> None:
    """FAO-56 Example 2 and Table 2.1, published."""
    assert pressure_from_elevation(1800.0) == pytest.approx(81.8, abs=0.05)
    heights = np.array([0.0, 100.0, 500.0, 1000.0, 2000.0, 3000.0, 4000.0])
    expected = [101.3, 100.1, 95.5, 90.0, 79.8, 70.5, 62.1]
    np.testing.assert_allclose(pressure_from_elevation(heights), expected, atol=0.06)


def test_example_3() -> None:
    """FAO-56 Example 3, published."""
    assert saturation_vapour_pressure(24.5) == pytest.approx(3.075, abs=5e-4)
    assert saturation_vapour_pressure(15.0) == pytest.approx(1.705, abs=5e-4)
    assert mean_saturation_vapour_pressure(24.5, 15.0) == pytest.approx(2.39, abs=5e-3)


def test_example_5() -> None:
    """FAO-56 Example 5, published: 1.70 kPa by Eq. 17, 1.78 kPa by Eq. 19."""
    given_values = {
        "tmax": np.array(25.0),
        "tmin": np.array(18.0),
        "relative_humidity_maximum": np.array(82.0),
        "relative_humidity_minimum": np.array(54.0),
        "relative_humidity": np.array(68.0),
    }
    by_both = vapour_pressure(("relative_humidity_maximum", "relative_humidity_minimum"), given_values)
    assert by_both == pytest.approx(1.70, abs=5e-3)
    assert vapour_pressure(("relative_humidity",), given_values) == pytest.approx(1.78, abs=5e-3)
    # Eq. 18, derived here from Example 5's e(18) = 2.064 kPa
    assert vapour_pressure(("relative_humidity_maximum",), given_values) == pytest.approx(
        2.064 * 0.82, abs=1e-3
    )


@pytest.mark.parametrize("way", HUMIDITY_WAYS)
def test_every_way_gives_the_same_vapour_pressure(way: tuple[str, ...]) -> None:
    """Derived here: from one state of the air, each kind of humidity leads back to its vapour pressure."""
    tmax, tmin, pressure, air = np.array(30.0), np.array(18.0), np.array(95.0), 1.6
    log = np.log(air)
    given_values = {
        "tmax": tmax,
        "tmin": tmin,
        "pressure": pressure,
        "vapour_pressure": np.array(air),
        "dew_point": (116.91 + 237.3 * log) / (16.78 - log),  # FAO-56 Eq. 3-11, published
        "specific_humidity": 0.622 * air / (pressure - 0.378 * air),  # definition
        "relative_humidity_maximum": 100.0 * air / saturation_vapour_pressure(tmin),
        "relative_humidity_minimum": 100.0 * air / saturation_vapour_pressure(tmax),
        "relative_humidity": 100.0 * air / mean_saturation_vapour_pressure(tmax, tmin),
        "vapour_pressure_deficit": mean_saturation_vapour_pressure(tmax, tmin) - air,
    }
    assert vapour_pressure(way, given_values) == pytest.approx(air, rel=1e-3)


def test_example_8_and_table_of_radiation() -> None:
    """FAO-56 Example 8, published; the rows of Table 2.6 as its own equations give them."""
    assert extraterrestrial_radiation(246, -20.0) == pytest.approx(32.2, abs=0.05)
    middle = np.array([15, 46, 74, 105, 135, 166, 196, 227, 258, 288, 319, 349])
    north = [15.0, 20.4, 27.2, 34.7, 39.7, 41.8, 40.8, 36.7, 29.9, 22.5, 16.3, 13.6]
    south = [43.3, 38.1, 30.9, 22.2, 15.8, 12.8, 13.9, 19.1, 27.1, 35.3, 41.8, 44.6]
    np.testing.assert_allclose(extraterrestrial_radiation(middle, 40.0), north, atol=0.06)
    np.testing.assert_allclose(extraterrestrial_radiation(middle, -40.0), south, atol=0.06)


def test_radiation_in_polar_night_and_day() -> None:
    """Common knowledge: no sun at 80 degrees north at midwinter, sun all day at midsummer."""
    assert extraterrestrial_radiation(355, 80.0) == 0.0
    assert extraterrestrial_radiation(172, 80.0) > 40.0


def test_example_14_and_wind_table() -> None:
    """FAO-56 Example 14 and Table 2.9, published."""
    assert 3.2 * wind_factor(10.0) == pytest.approx(2.4, abs=0.05)
    for height, factor in ((1.0, 1.178), (2.0, 1.000), (3.0, 0.921), (5.0, 0.838), (10.0, 0.748)):
        assert wind_factor(height) == pytest.approx(factor, abs=6e-4)


@pytest.mark.parametrize(
    ("quantity", "unit", "value", "expected", "is_sum"),
    [
        ("tmax", "K", 308.15, 35.0, False),
        ("tmax", "°C", 35.0, 35.0, False),
        ("tmax", "degF", 95.0, 35.0, False),
        ("radiation", "W m-2", 250.0, 21.6, False),  # FAO-56 Table 3: 1 W m-2 is 0.0864 MJ m-2 d-1
        ("radiation", "J m**-2", 21.6e6, 21.6, True),
        ("radiation", "MJ m-2 day-1", 21.6, 21.6, False),
        ("radiation", "MJ m-2", 21.6, 21.6, True),
        ("relative_humidity", "1", 0.6, 60.0, False),
        ("relative_humidity", "%", 60.0, 60.0, False),
        ("specific_humidity", "g kg-1", 10.0, 0.010, False),
        ("vapour_pressure", "hPa", 16.0, 1.6, False),
        ("wind", "km/h", 10.0, 2.77778, False),
        ("pressure", "Pa", 95000.0, 95.0, False),
        ("rain", "kg m-2 s-1", 1e-4, 8.64, False),
        ("rain", "mm", 8.64, 8.64, True),
        ("rain", "m s-1", 1e-7, 8.64, False),
    ],
)
def test_units(quantity: str, unit: str, value: float, expected: float, is_sum: bool) -> None:
    """Definitions of the units."""
    found = conversion(unit, QUANTITIES[quantity])
    assert found.apply(np.array([value]))[0] == pytest.approx(expected, rel=1e-5)
    assert found.is_sum is is_sum


@pytest.mark.parametrize("unit", ["mm", "bananas", "mm timestep-1"])
def test_unit_that_does_not_fit(unit: str) -> None:
    with pytest.raises(UnitError, match="unit"):
        conversion(unit, QUANTITIES["tmax"])


@given(
    st.sampled_from(
        [("K", "degC"), ("degF", "degC"), ("W m-2", "MJ m-2 day-1"), ("hPa", "kPa"), ("%", "1"), ("ha", "m2")]
    ),
    st.floats(-500.0, 500.0),
)
def test_unit_round_trip(pair: tuple[str, str], value: float) -> None:
    """There and back is where it started, to rounding."""
    one, other = (read_unit(text) for text in pair)
    there, back = linear(one, other), linear(other, one)
    returned = (value * there[0] + there[1]) * back[0] + back[1]
    assert returned == pytest.approx(value, abs=1e-9)
