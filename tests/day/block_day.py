"""Days of 32 cells through the package's kernels, and invented weather for them."""

from __future__ import annotations

import numpy as np

from cropstress.day import block, course
from cropstress.leaf.parameters import leaf_record
from cropstress.leaf.solve import LANES

from plain_day import Crop, Weather, saturation, sun_of, sunset_temperature

ROWS = {
    "assimilation": block.ASSIMILATION,
    "lost_to_heat": block.LOST_TO_HEAT,
    "photorespiration": block.BY_PHOTORESPIRATION,
    "stomata": block.BY_STOMATA,
    "enzymes": block.BY_ENZYMES,
    "respiration": block.BY_RESPIRATION,
    "lost_to_photorespiration": block.LOST_TO_PHOTORESPIRATION,
    "photorespired_co2": block.PHOTORESPIRED_CO2,
    "highest_leaf": block.HIGHEST_LEAF,
    "largest_leaf_excess": block.LARGEST_LEAF_EXCESS,
    "smallest_leaf_excess": block.SMALLEST_LEAF_EXCESS,
    "daytime_deficit": block.DAYTIME_DEFICIT,
}


def block_cells(weather: Weather) -> np.ndarray:
    """The weather as the kernels read it."""
    cells = np.empty((block.DAY_INPUTS, block.CELLS))
    cells[block.HIGHEST] = weather.highest
    cells[block.LOWEST] = weather.lowest
    cells[block.VAPOUR_PRESSURE] = weather.vapour_pressure
    cells[block.RADIATION] = weather.radiation
    cells[block.WIND] = weather.wind
    cells[block.PRESSURE] = weather.pressure
    cells[block.LATITUDE] = np.radians(weather.latitude)
    cells[block.ELEVATION] = weather.elevation
    return cells


def block_sky(weather: Weather) -> np.ndarray:
    """The courses of the day, (6, moments, cells)."""
    sky = np.empty((6, LANES))
    block.sky_of_block(weather.day_of_year, block_cells(weather), sky)
    return sky.reshape(6, block.MOMENTS, block.CELLS)


def block_daylight(weather: Weather) -> np.ndarray:
    """Hours of daylight."""
    declination = course.declination(weather.day_of_year)
    angles = [course.sunset_angle(latitude, declination) for latitude in np.radians(weather.latitude)]
    return np.array([course.daylight_hours(angle) for angle in angles])


def block_day(crop: Crop, weather: Weather) -> dict[str, np.ndarray]:
    """One day of 32 cells, by the name of each answer."""
    crop_cells = np.empty((block.CROP_INPUTS, block.CELLS))
    crop_cells[block.LEAF_AREA] = crop.leaf_area
    crop_cells[block.CO2] = crop.co2
    crop_cells[block.GROWTH_TEMPERATURE] = crop.growth_temperature
    crop_cells[block.SUNSET_BEFORE] = weather.sunset_before
    answers = np.empty((block.DAY_ANSWERS, block.CELLS))
    number = crop.profile.number
    block.crop_day_of_block(
        leaf_record(crop.profile)[0], number("heat_onset"), number("capacity_decline"), crop.single_leaf,
        block_cells(weather), block_sky(weather).reshape(6, LANES), crop_cells, block_daylight(weather), answers,
    )  # fmt: skip
    return {name: answers[row] for name, row in ROWS.items()}


def random_weather(seed: int, day_of_year: float, latitude: np.ndarray | None = None) -> Weather:
    """Invented weather of 32 cells: cold to very hot, dull to clear, dry to saturated, sea level to 4500 m."""
    draw = np.random.default_rng(seed)

    def between(low: float, high: float) -> np.ndarray:
        return draw.uniform(low, high, block.CELLS)

    latitude = between(-65.0, 65.0) if latitude is None else latitude
    highest = between(8.0, 46.0)
    lowest = highest - between(2.0, 22.0)
    above = np.maximum(sun_of(day_of_year, latitude).above_air, 0.0)
    mean_saturation = 0.5 * (saturation(highest) + saturation(lowest))
    return Weather(
        day_of_year, highest, lowest, between(0.1, 1.0) * mean_saturation, between(0.05, 0.9) * above,
        between(0.3, 7.0), between(60.0, 103.0), latitude, between(0.0, 4500.0),
        lowest + between(-0.1, 0.9) * (highest - lowest),
    )  # fmt: skip


def summer_weather(day_of_year: float, cooler: float = 0.0) -> Weather:
    """One day of an invented summer at 32 places from 25 to 50 degrees north: fair to bright, highest 28-40 degC."""
    draw = np.random.default_rng(int(day_of_year))

    def between(low: float, high: float) -> np.ndarray:
        return draw.uniform(low, high, block.CELLS)

    latitude = np.linspace(25.0, 50.0, block.CELLS)
    highest = between(28.0, 40.0) - cooler
    lowest = highest - between(8.0, 18.0)
    sun = sun_of(day_of_year, latitude)
    return Weather(
        day_of_year, highest, lowest, between(0.6, 1.0) * saturation(lowest), between(0.35, 0.75) * sun.above_air,
        between(0.8, 4.0), between(90.0, 102.0), latitude, between(0.0, 900.0),
        sunset_temperature(highest, lowest, sun.daylight) + between(-2.0, 2.0),
    )  # fmt: skip
