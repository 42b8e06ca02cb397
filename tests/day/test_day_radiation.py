"""The radiation of a day: its sum is kept, and split as Erbs et al. 1982 do."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pvlib
import pytest

from cropstress.day import block, course

from block_day import block_sky, random_weather
from plain_day import erbs_diffuse_share, sine_of_elevation, sky_of, sun_of

BEAM, DIFFUSE, LONGWAVE, EXTINCTION = 2, 3, 4, 5
LATITUDES = np.linspace(-65.0, 65.0, block.CELLS)
MEGAJOULES = 3600.0e-6  # MJ m-2 h-1 in 1 W m-2


def test_radiation_of_every_day_is_conserved() -> None:
    for day in range(1, 367):
        weather = random_weather(day, float(day), LATITUDES)
        sky = block_sky(weather)
        hours = block.DAY_WEIGHTS[:, None] * sun_of(float(day), LATITUDES).daylight
        total = (hours * (sky[BEAM] + sky[DIFFUSE])).sum(axis=0) * MEGAJOULES
        np.testing.assert_allclose(total, weather.radiation, rtol=1e-9)


def test_beam_and_diffuse_are_the_course_of_the_global_radiation() -> None:
    """Collares-Pereira & Rabl 1979 for the course, Erbs et al. 1982 for the split, both written again here."""
    for day in range(1, 366, 13):
        weather = random_weather(day, float(day), LATITUDES)
        sky, plain = block_sky(weather), sky_of(weather)
        assert sky[[BEAM, DIFFUSE]].min() >= 0.0
        np.testing.assert_allclose(sky[BEAM], plain.beam, rtol=1e-9, atol=1e-9)
        np.testing.assert_allclose(sky[DIFFUSE], plain.diffuse, rtol=1e-9, atol=1e-9)
        np.testing.assert_allclose(sky[LONGWAVE], plain.longwave, atol=1e-7)
        np.testing.assert_allclose(sky[EXTINCTION], plain.extinction, rtol=1e-9)


def test_clearness_is_limited_to_what_reaches_the_top_of_the_air() -> None:
    """A day with all the radiation there is has moments above it; their diffuse share is that of a clearness of 1."""
    weather = random_weather(1, 172.0, LATITUDES)
    above = sun_of(172.0, LATITUDES).above_air
    sky = block_sky(replace(weather, radiation=above))
    glob = sky[BEAM] + sky[DIFFUSE]
    sun = sun_of(172.0, LATITUDES)
    hour = 12.0 - 0.5 * sun.daylight + sun.daylight * block.DAY_POINTS[:, None]
    top = 1367.0 * sun.distance * sine_of_elevation(sun, LATITUDES, hour)
    beyond = glob > top
    assert beyond.any()
    np.testing.assert_allclose(sky[DIFFUSE][beyond], 0.165 * glob[beyond], rtol=1e-9)


@pytest.mark.parametrize("clearness", [0.0, 0.1, 0.22, 0.2200001, 0.4, 0.6, 0.8, 0.8000001, 0.95, 1.0])
def test_diffuse_share_is_that_of_pvlib(clearness: float) -> None:
    """The independent library is pvlib (pvlib.irradiance.erbs); its sun is put overhead, so that only Erbs counts."""
    top = pvlib.irradiance.get_extra_radiation(100)
    answer = pvlib.irradiance.erbs(clearness * top, zenith=0.0, datetime_or_doy=100)
    assert answer["kt"] == pytest.approx(clearness, abs=1e-12)
    if clearness > 0.0:
        share = answer["dhi"] / (clearness * top)
        assert course.diffuse_share(answer["kt"]) == pytest.approx(share, abs=1e-12)
    assert course.diffuse_share(clearness) == pytest.approx(float(erbs_diffuse_share(np.array(clearness))), abs=1e-12)


@pytest.mark.parametrize("breakpoint", [0.22, 0.80])
def test_diffuse_share_is_continuous(breakpoint: float) -> None:
    """The published coefficients have four digits: the three pieces of Erbs et al. 1982 meet to 3e-4."""
    below, above = (course.diffuse_share(breakpoint + step) for step in (-1e-9, 1e-9))
    assert below == pytest.approx(above, abs=3e-4)


def test_no_radiation_is_a_dark_day() -> None:
    weather = random_weather(5, 172.0, LATITUDES)
    sky = block_sky(replace(weather, radiation=np.zeros(block.CELLS)))
    assert not sky[[BEAM, DIFFUSE, EXTINCTION]].any()
    assert np.isfinite(sky).all()


def test_the_sun_low_or_below_the_horizon_is_dark() -> None:
    """Around the polar circle in winter; a day's radiation goes to the moments with the sun above 0.01."""
    latitude = np.linspace(60.0, 75.0, block.CELLS)
    weather = random_weather(2, 355.0, latitude)
    sky = block_sky(replace(weather, radiation=np.full(block.CELLS, 0.05)))
    sun = sun_of(355.0, latitude)
    hour = 12.0 - 0.5 * sun.daylight + sun.daylight * block.DAY_POINTS[:, None]
    light = (sine_of_elevation(sun, latitude, hour) > 0.01) & (sun.daylight > 0.1)
    assert light.any() and not light.all()
    assert ((sky[EXTINCTION] > 0.0) == light).all()
    assert not sky[BEAM][~light].any() and not sky[DIFFUSE][~light].any()
    lit_days = light.any(axis=0)
    hours = block.DAY_WEIGHTS[:, None] * sun.daylight
    total = (hours * (sky[BEAM] + sky[DIFFUSE])).sum(axis=0) * MEGAJOULES
    np.testing.assert_allclose(total[lit_days], 0.05, rtol=1e-9)
