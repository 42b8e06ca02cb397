"""Radiation through the day against the papers' own formulas and pvlib."""

from __future__ import annotations

import math

import numpy as np
import pvlib
import pytest

from cropstress.day import block, course


def test_diffuse_share_against_pvlib() -> None:
    """Erbs, Klein & Duffie 1982, Solar Energy 28:293-302, Eq. 1, as pvlib has it."""
    radiation = np.linspace(5.0, 1200.0, 400)
    found = pvlib.irradiance.erbs(radiation, 30.0, 172)
    ours = [course.diffuse_share(float(clearness)) for clearness in found["kt"]]
    np.testing.assert_allclose(ours, found["dhi"] / radiation, atol=1e-9)
    assert found["kt"].min() < 0.1 and found["kt"].max() > 0.9


@pytest.mark.parametrize(
    ("clearness", "share"), [(0.1, 0.9910), (0.3, 0.9486), (0.5, 0.6591), (0.7, 0.2440), (0.75, 0.1831)]
)
def test_diffuse_share(clearness: float, share: float) -> None:
    """Erbs, Klein & Duffie 1982, Eq. 1; derived here."""
    assert course.diffuse_share(clearness) == pytest.approx(share, abs=6e-5)


def share_of_day(daylight: float, hour_angle: float) -> float:
    """Share of the day's radiation an hour has, as Collares-Pereira & Rabl 1979 write it."""
    sunset = math.pi * daylight / 24.0
    offset = math.sin(sunset - math.radians(60.0))
    a, b = 0.409 + 0.5016 * offset, 0.6609 - 0.4767 * offset
    return (
        math.pi / 24.0 * (a + b * math.cos(hour_angle)) * (math.cos(hour_angle) - math.cos(sunset))
        / (math.sin(sunset) - sunset * math.cos(sunset))
    )  # fmt: skip


@pytest.mark.parametrize(("daylight", "noon"), [(10.0, 0.1665), (12.0, 0.1417), (14.0, 0.1244)])
def test_shape_of_radiation(daylight: float, noon: float) -> None:
    """Collares-Pereira & Rabl 1979, Solar Energy 22:155-164 (from memory); the values at noon are derived here.

    The shape here has the sine of elevation, cos(latitude) cos(declination) (cos w - cos ws), for their last factor.
    """
    assert share_of_day(daylight, 0.0) == pytest.approx(noon, abs=6e-5)
    sunset = math.pi * daylight / 24.0
    latitude = math.radians(40.0)
    declination = -math.atan(math.cos(sunset) / math.tan(latitude))  # FAO-56 Eq. 25 turned round
    assert course.sunset_angle(latitude, declination) == pytest.approx(sunset, abs=1e-12)
    scale = math.cos(latitude) * math.cos(declination) * (math.sin(sunset) - sunset * math.cos(sunset))
    for hour in np.linspace(12.0 - 0.499 * daylight, 12.0 + 0.499 * daylight, 15):
        sine = course.sine_of_elevation(latitude, declination, float(hour))
        found = math.pi / 24.0 * course.radiation_shape(sunset, float(hour), sine) / scale
        assert found == pytest.approx(share_of_day(daylight, math.pi / 12.0 * (hour - 12.0)), abs=1e-12)


def test_points_of_the_night() -> None:
    """Five Gauss-Legendre points on 0 ... 1; Goudriaan 1986, Agric For Meteorol 38:249-255 (from memory)."""
    np.testing.assert_allclose(block.NIGHT_POINTS, [0.04691, 0.23077, 0.5, 0.76923, 0.95309], atol=6e-6)
    np.testing.assert_allclose(block.NIGHT_WEIGHTS, [0.11846, 0.23931, 0.28444, 0.23931, 0.11846], atol=6e-6)


def test_points_of_the_day() -> None:
    """Gauss-Legendre points are exact for polynomials of degree 15 (definition)."""
    for degree in range(16):
        assert np.sum(block.DAY_WEIGHTS * block.DAY_POINTS**degree) == pytest.approx(1.0 / (degree + 1), rel=1e-12)
