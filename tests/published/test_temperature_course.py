"""The temperature course against a plain evaluation of Parton & Logan 1981, Agric Meteorol 23:205-216.

Their a, b and c for air at 1.5 m, 1.86 h, 2.20 and -0.17 h, are known from a secondary source. What the day
floor adds of its own, the polar day and night, is left to its own tests.
"""

from __future__ import annotations

from math import exp, pi, sin

import numpy as np
import pytest

from cropstress.day import course

DAYS = [  # tmax, tmin, daylight, invented
    (30.0, 15.0, 14.0),
    (41.0, 24.0, 13.2),
    (8.0, -3.0, 9.0),
    (22.0, 20.0, 17.5),
]


def by_day(tmax: float, tmin: float, daylight: float, hours: float) -> float:
    """Air temperature some hours after sunrise; a sine from the minimum c hours after sunrise."""
    return tmin + (tmax - tmin) * sin(pi * (hours - -0.17) / (daylight + 2.0 * 1.86))


def by_night(tmin: float, at_sunset: float, daylight: float, hours: float) -> float:
    """Air temperature some hours after sunset; an exponential decay."""
    return tmin + (at_sunset - tmin) * exp(-2.20 * hours / (24.0 - daylight))


@pytest.mark.parametrize("day", DAYS)
def test_day_and_night(day: tuple[float, float, float]) -> None:
    """Derived here, from the equations as the paper has them."""
    tmax, tmin, daylight = day
    for hours in np.linspace(0.0, daylight, 25):
        expected = by_day(tmax, tmin, daylight, hours)
        assert course.day_temperature(tmax, tmin, daylight, hours) == pytest.approx(expected, abs=1e-9)
    at_sunset = by_day(tmax, tmin, daylight, daylight)
    for share in np.linspace(0.0, 1.0, 25):
        expected = by_night(tmin, at_sunset, daylight, share * (24.0 - daylight))
        assert course.night_temperature(tmin, at_sunset, share) == pytest.approx(expected, abs=1e-9)


@pytest.mark.parametrize("day", DAYS)
def test_when_the_extremes_come(day: tuple[float, float, float]) -> None:
    """The minimum comes 0.17 h before sunrise, the maximum 1.86 h after noon less that lag (meaning of a and c)."""
    tmax, tmin, daylight = day
    assert course.day_temperature(tmax, tmin, daylight, -0.17) == pytest.approx(tmin, abs=1e-9)
    assert course.day_temperature(tmax, tmin, daylight, 0.5 * daylight + 1.86 - 0.17) == pytest.approx(tmax, abs=1e-9)


@pytest.mark.parametrize("limit", [4.0, 14.0, 15.0, 21.0, 26.0, 29.9, 35.0, 40.0])
@pytest.mark.parametrize("day", DAYS)
def test_hours_and_degree_days_above_a_limit(day: tuple[float, float, float], limit: float) -> None:
    """The closed form against counting a million moments of the plain evaluation; derived here."""
    tmax, tmin, daylight = day
    evening_before = tmin + 4.0
    steps = 500_000
    middle = (np.arange(steps) + 0.5) / steps
    light = tmin + (tmax - tmin) * np.sin(pi * (daylight * middle + 0.17) / (daylight + 2.0 * 1.86))
    dark = tmin + (evening_before - tmin) * np.exp(-2.20 * middle)
    hours = daylight * np.mean(light > limit) + (24.0 - daylight) * np.mean(dark > limit)
    excess = daylight * np.mean(np.maximum(light - limit, 0.0)) + (24.0 - daylight) * np.mean(
        np.maximum(dark - limit, 0.0)
    )
    found, degree_days = course.time_above(limit, tmax, tmin, daylight, evening_before)
    assert found == pytest.approx(hours, abs=1e-3)
    assert degree_days == pytest.approx(excess / 24.0, abs=1e-4)
