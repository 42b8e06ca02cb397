"""The sun of the day course against FAO-56 (Allen, Pereira, Raes & Smith 1998) and pvlib.

The worked examples were read in FAO-56. Its Tables 2.6 and 2.7 were not seen: their values here are derived
from Eqs. 21-25 and 34, with the tolerance that rounding to a printed table asks for.
"""

from __future__ import annotations

import math

import numpy as np
import pandas as pd
import pytest
from pvlib import solarposition

from cropstress.day import course
from cropstress.weather import extraterrestrial_radiation

MIDDLE_OF_MONTH = [15, 46, 74, 105, 135, 166, 196, 227, 258, 288, 319, 349]  # FAO-56 Table 2.5, published

# FAO-56 Table 2.6 as its equations give it [MJ m-2 d-1], January to December; derived here.
TOP_OF_AIR = {
    60: [3.3, 8.3, 16.6, 27.5, 36.7, 41.2, 39.1, 31.3, 20.5, 10.8, 4.4, 2.2],
    50: [8.9, 14.4, 22.2, 31.5, 38.5, 41.7, 40.2, 34.3, 25.6, 16.8, 10.2, 7.5],
    40: [15.0, 20.4, 27.2, 34.7, 39.7, 41.8, 40.8, 36.7, 29.9, 22.5, 16.3, 13.6],
    20: [26.8, 30.6, 34.7, 37.9, 39.3, 39.5, 39.3, 38.3, 35.7, 31.7, 27.6, 25.6],
    0: [36.2, 37.4, 37.9, 36.8, 34.8, 33.4, 33.9, 35.6, 37.2, 37.3, 36.3, 35.6],
    -20: [41.9, 40.0, 36.6, 31.3, 26.6, 24.1, 25.0, 29.0, 34.2, 38.6, 41.2, 42.1],
    -40: [43.3, 38.1, 30.9, 22.2, 15.8, 12.8, 13.9, 19.1, 27.1, 35.3, 41.8, 44.6],
}
# FAO-56 Table 2.7 as its equations give it [h]; derived here.
DAYLIGHT = {
    50: [8.3, 9.8, 11.6, 13.5, 15.2, 16.1, 15.7, 14.3, 12.3, 10.4, 8.7, 7.9],
    40: [9.5, 10.5, 11.7, 13.1, 14.2, 14.8, 14.6, 13.6, 12.2, 10.9, 9.7, 9.2],
    -20: [13.1, 12.7, 12.1, 11.5, 11.0, 10.8, 10.9, 11.3, 11.9, 12.5, 13.0, 13.2],
}


def sunset(latitude: float, day: float) -> float:
    """Sunset angle [rad] at a latitude [degree]."""
    return float(course.sunset_angle(math.radians(latitude), course.declination(float(day))))


def above(latitude: float, day: float) -> float:
    """Radiation at the top of the air [MJ m-2 d-1], by the day course."""
    return float(
        course.extraterrestrial_radiation(
            math.radians(latitude),
            course.declination(float(day)),
            course.relative_distance(float(day)),
            sunset(latitude, day),
        )
    )


def test_example_8_with_what_it_prints_on_the_way() -> None:
    """FAO-56 Example 8, published: 20 degrees south, 3 September."""
    assert course.relative_distance(246.0) == pytest.approx(0.985, abs=5e-4)
    assert course.declination(246.0) == pytest.approx(0.120, abs=5e-4)
    assert sunset(-20.0, 246) == pytest.approx(1.527, abs=5e-4)
    assert math.sin(math.radians(-20.0)) * math.sin(course.declination(246.0)) == pytest.approx(-0.041, abs=5e-4)
    assert above(-20.0, 246) == pytest.approx(32.2, abs=0.05)


def test_example_9() -> None:
    """FAO-56 Example 9, published: 11.7 h of daylight where Example 8 is."""
    assert course.daylight_hours(sunset(-20.0, 246)) == pytest.approx(11.7, abs=0.05)


@pytest.mark.parametrize(
    ("example", "latitude", "day", "radiation", "daylight"),
    [
        (10, -(22 + 54 / 60), 135, 25.1, 10.9),
        (15, 45 + 43 / 60, 196, 40.6, None),
        (17, 13 + 44 / 60, 105, 38.06, 12.31),
        (18, 50 + 48 / 60, 187, 41.09, 16.1),
        (20, 45 + 43 / 60, 196, 40.55, None),
    ],
)
def test_sun_of_further_examples(
    example: int, latitude: float, day: int, radiation: float, daylight: float | None
) -> None:
    """FAO-56 Examples 10, 15, 17, 18 and 20, published; latitudes of Example 7 are among them."""
    assert above(latitude, day) == pytest.approx(radiation, abs=0.055)
    if daylight is not None:
        assert course.daylight_hours(sunset(latitude, day)) == pytest.approx(daylight, abs=0.05)


@pytest.mark.parametrize("latitude", TOP_OF_AIR)
def test_radiation_at_the_top_of_the_air_through_the_year(latitude: int) -> None:
    """FAO-56 Table 2.6 from its equations, derived here."""
    found = [above(latitude, day) for day in MIDDLE_OF_MONTH]
    np.testing.assert_allclose(found, TOP_OF_AIR[latitude], atol=0.2)


@pytest.mark.parametrize("latitude", DAYLIGHT)
def test_daylight_through_the_year(latitude: int) -> None:
    """FAO-56 Table 2.7 from its equations, derived here."""
    found = [course.daylight_hours(sunset(latitude, day)) for day in MIDDLE_OF_MONTH]
    np.testing.assert_allclose(found, DAYLIGHT[latitude], atol=0.1)


@pytest.mark.parametrize("latitude", [-75.0, -35.0, 0.0, 52.0, 66.0, 80.0])
def test_both_floors_have_the_same_sun(latitude: float) -> None:
    """What bounds the radiation that is read, and what the day course divides by, is one number; derived here."""
    days = np.arange(1, 367)
    np.testing.assert_allclose(
        [above(latitude, day) for day in days], extraterrestrial_radiation(days, latitude), atol=1e-9
    )


@pytest.mark.parametrize("latitude", [-60.0, -40.0, 0.0, 20.0, 40.0, 60.0])
def test_sun_loosely_against_pvlib(latitude: float) -> None:
    """An exact ephemeris (pvlib): noon elevation within 1 degree, daylight within 0.5 h.

    The declination of FAO-56 is up to 1 degree off in October, and its daylight knows no refraction.
    """
    days = np.arange(1, 366)
    midnights = pd.date_range("2021-01-01", periods=365, freq="D", tz="UTC")
    events = solarposition.sun_rise_set_transit_spa(midnights, latitude, 0.0)
    length = (events["sunset"] - events["sunrise"]).dt.total_seconds().to_numpy() / 3600.0 % 24.0
    noon = solarposition.get_solarposition(pd.DatetimeIndex(events["transit"]), latitude, 0.0)["elevation"].to_numpy()
    ours = [course.daylight_hours(sunset(latitude, day)) for day in days]
    sines = [course.sine_of_elevation(math.radians(latitude), course.declination(float(day)), 12.0) for day in days]
    assert np.abs(ours - length).max() <= 0.5
    assert np.abs(np.degrees(np.arcsin(sines)) - noon).max() <= 1.0
