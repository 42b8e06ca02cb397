"""The temperature of a day: Parton & Logan 1981, polar days, and the hours above a limit in closed form.

Parton, W.J. & Logan, J.A. 1981, A model for diurnal variation in soil and air temperature, Agricultural Meteorology
23:205-216; the constants for air at 1.5 m (a 1.86 h, b 2.20, c -0.17 h) as read in a secondary source.
"""

from __future__ import annotations

import numpy as np
import pytest

from cropstress.day import block, course

from block_day import block_daylight, block_sky, random_weather
from plain_day import air_by_day, air_by_night, sun_of, sunset_temperature

DENSE = 100_000  # moments in which a night or a day is counted


def dense_course(
    highest: float, lowest: float, daylight: float, sunset_before: float
) -> list[tuple[float, np.ndarray]]:
    """The night and the day as lengths [h] with the air temperature in the middle of many equal steps."""
    share = (np.arange(DENSE) + 0.5) / DENSE
    if daylight <= 0.1:
        return [(24.0, np.full(DENSE, 0.5 * (highest + lowest)))]
    if daylight >= 23.9:
        return [(24.0, air_by_day(highest, lowest, np.full(DENSE, 24.0), 24.0 * share))]
    by_day = air_by_day(highest, lowest, np.full(DENSE, daylight), 12.0 + daylight * (share - 0.5))
    return [(24.0 - daylight, air_by_night(lowest, sunset_before, share)), (daylight, by_day)]


def counted_above(limit: float, *day: float) -> tuple[float, float]:
    """Hours above a limit [h] and degree-days above it [K d], counted."""
    parts = dense_course(*day)
    hours = sum(length * np.mean(air > limit) for length, air in parts)
    excess = sum(length * np.maximum(air - limit, 0.0).mean() for length, air in parts)
    return float(hours), float(excess) / 24.0


def random_days(count: int, seed: int = 7) -> list[tuple[float, float, float, float, float]]:
    """Limit, highest, lowest, daylight and the temperature of the evening before; a fifth are polar."""
    draw = np.random.default_rng(seed)
    days = []
    for number in range(count):
        lowest = draw.uniform(-5.0, 30.0)
        highest = lowest + draw.choice([0.0, 0.3, 5.0, 12.0, 22.0])
        daylight = [0.0, 0.05, 23.95, 24.0, 23.89][number % 25] if number % 25 < 5 else draw.uniform(0.2, 23.8)
        limit = draw.uniform(lowest - 3.0, highest + 3.0)
        days.append((limit, highest, lowest, daylight, draw.uniform(lowest - 4.0, highest + 4.0)))
    return days


def test_hours_and_degree_days_above_a_limit_are_those_counted() -> None:
    for limit, *day in random_days(300):
        hours, excess = course.time_above(limit, *day)
        counted_hours, counted_excess = counted_above(limit, *day)
        assert hours == pytest.approx(counted_hours, abs=1e-3), (limit, day)
        assert excess == pytest.approx(counted_excess, abs=1e-6), (limit, day)


@pytest.mark.parametrize(
    ("limit", "hours", "excess"),
    [(35.0, 0.0, 0.0), (35.1, 0.0, 0.0), (-60.0, 24.0, None)],
)
@pytest.mark.parametrize("daylight", [0.0, 9.0, 12.0, 15.0, 24.0])
def test_limits_outside_the_day(limit: float, hours: float, excess: float | None, daylight: float) -> None:
    """A limit at the highest temperature is never passed; one far below is passed all day."""
    above, sum_above = course.time_above(limit, 35.0, 20.0, daylight, 34.0)
    assert above == pytest.approx(hours, abs=1e-9)
    if excess is not None:
        assert sum_above == pytest.approx(excess, abs=1e-12)


def test_evening_hotter_than_today_counts_as_night() -> None:
    """After a 40 degC day comes one of at most 25 degC: only the night before is above 30 degC.

    From 38 degC in the evening towards 20 degC the air passes 30 degC at the share ln(18/10)/2.2 of the night.
    """
    hours, _ = course.time_above(30.0, 25.0, 20.0, 14.0, 38.0)
    assert hours == pytest.approx(10.0 * np.log(1.8) / 2.2, rel=1e-12)


def test_the_day_follows_parton_and_logan() -> None:
    for day in range(1, 366, 26):
        weather = random_weather(day, float(day))
        daylight = sun_of(float(day), weather.latitude).daylight
        hour = 12.0 - 0.5 * daylight + daylight * block.DAY_POINTS[:, None]
        expected = air_by_day(weather.highest, weather.lowest, daylight, hour)
        np.testing.assert_allclose(block_sky(weather)[0], expected, rtol=1e-12)
        np.testing.assert_allclose(block_daylight(weather), daylight, rtol=1e-12)


@pytest.mark.parametrize("daylight", [4.0, 8.0, 12.0, 16.0, 20.0, 23.89, 24.0])
def test_the_highest_temperature_is_reached(daylight: float) -> None:
    """At 13.69 h solar time, 1.86 - 0.17 h after noon, and never passed."""
    moments = np.linspace(0.0, daylight, 20_001)
    air = [course.day_temperature(35.0, 20.0, daylight, moment) for moment in moments]
    assert max(air) == pytest.approx(35.0, abs=1e-6)
    assert 12.0 - daylight / 2.0 + moments[int(np.argmax(air))] == pytest.approx(13.69, abs=0.01)


def test_the_evening_hands_over_to_the_night() -> None:
    for daylight in (6.0, 12.0, 18.0):
        evening = block.sunset_temperature(35.0, 20.0, daylight)
        assert evening == pytest.approx(float(sunset_temperature(35.0, 20.0, np.array(daylight))), rel=1e-12)
        assert evening == course.day_temperature(35.0, 20.0, daylight, daylight)
        assert course.night_temperature(20.0, evening, 0.0) == evening
        # Parton & Logan: at the end of the night e^-2.2 of the evening's excess is left.
        assert course.night_temperature(20.0, evening, 1.0) - 20.0 == pytest.approx((evening - 20.0) * np.exp(-2.2))


def test_polar_day_and_polar_night() -> None:
    """Day 172 at 70 to 80 degrees: to the north the sun does not set, to the south it does not rise."""
    north, south = np.linspace(70.0, 80.0, block.CELLS), np.linspace(-80.0, -70.0, block.CELLS)
    summer, winter = random_weather(1, 172.0, north), random_weather(1, 172.0, south)
    np.testing.assert_allclose(block_daylight(summer), 24.0)
    np.testing.assert_allclose(block_daylight(winter), 0.0, atol=1e-12)
    hour = 24.0 * block.DAY_POINTS[:, None]
    middle, half = (summer.highest + summer.lowest) / 2.0, (summer.highest - summer.lowest) / 2.0
    wave = middle + half * np.cos(2.0 * np.pi * (hour - 13.69) / 24.0)
    np.testing.assert_allclose(block_sky(summer)[0], wave, rtol=1e-12)
    np.testing.assert_allclose(block_sky(winter)[0], np.tile((winter.highest + winter.lowest) / 2.0, (8, 1)))
    assert not block_sky(winter)[[2, 3, 5]].any()


def test_humidity_is_limited_to_saturation_at_each_moment() -> None:
    weather = random_weather(3, 200.0)
    sky = block_sky(weather)
    saturated = 0.6108 * np.exp(17.27 * sky[0] / (sky[0] + 237.3))  # FAO-56 Eq. 11
    limited = saturated < weather.vapour_pressure
    assert limited.any()
    np.testing.assert_allclose(sky[1], np.where(limited, saturated, weather.vapour_pressure), rtol=1e-8)
