"""A day of some cells over again in plain NumPy: an oracle for `cropstress.day`.

Written from the published equations, not from the package. Only whole leaf solutions (leaf temperature, stomata
and assimilation together) are the package's own: they have an oracle of their own. Light in the canopy is summed
over 256 depths here where the package uses the integrals in closed form, and mixed leaf states are found by
bisection. Arrays are (points, cells) through the day and (cells,) for the day.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
from plain_leaf import gross_without_oxygenation, respiration_response

from cropstress.crops import CropProfile
from cropstress.leaf import solve
from cropstress.leaf.parameters import leaf_record
from cropstress.leaf.single import solve_lanes

MOLES_PER_HOUR = 3600.0e-6  # mol m-2 h-1 in 1 umol m-2 s-1
DIFFUSE_EXTINCTION = 0.78  # de Pury & Farquhar 1997 (from memory)
VISIBLE, NEAR_INFRARED = 0.15, 0.80  # scattering; de Pury & Farquhar 1997, Campbell & Norman 1998 (from memory)
PHOTONS_PER_JOULE = 4.57  # McCree 1972 (from memory)
CAUSES = ("photorespiration", "stomata", "enzymes", "respiration")


@dataclass(frozen=True)
class Weather:
    """One day's weather of some cells, arrays (cells,); latitude in degrees, the rest in the package's units."""

    day_of_year: float
    highest: np.ndarray
    lowest: np.ndarray
    vapour_pressure: np.ndarray
    radiation: np.ndarray
    wind: np.ndarray
    pressure: np.ndarray
    latitude: np.ndarray
    elevation: np.ndarray
    sunset_before: np.ndarray


@dataclass(frozen=True)
class Crop:
    """What a crop adds: leaf area and growth temperature are (cells,)."""

    profile: CropProfile
    leaf_area: np.ndarray
    growth_temperature: np.ndarray
    co2: float = 421.0
    single_leaf: bool = False


def saturation(temperature: np.ndarray) -> np.ndarray:
    """Saturation vapour pressure [kPa]; FAO-56 Eq. 11."""
    return 0.6108 * np.exp(17.27 * temperature / (temperature + 237.3))


def dew_point(vapour_pressure: np.ndarray) -> np.ndarray:
    """Temperature at which a vapour pressure is saturated [degC], the inverse of FAO-56 Eq. 11."""
    exponent = np.log(vapour_pressure / 0.6108)
    return 237.3 / (17.27 / exponent - 1.0)


@dataclass(frozen=True)
class Sun:
    """The sun of a day, from FAO-56 Eqs. 21-25 and 34; angles [rad], daylight [h], radiation [MJ m-2 d-1]."""

    declination: float
    distance: float
    sunset: np.ndarray
    daylight: np.ndarray
    above_air: np.ndarray


def sun_of(day_of_year: float, latitude: np.ndarray) -> Sun:
    """Where the sun stands on a day, latitude in degrees."""
    declination = 0.409 * math.sin(2.0 * math.pi / 365.0 * day_of_year - 1.39)
    distance = 1.0 + 0.033 * math.cos(2.0 * math.pi / 365.0 * day_of_year)
    phi = np.radians(latitude)
    sunset = np.arccos(np.clip(-np.tan(phi) * math.tan(declination), -1.0, 1.0))
    above = (
        1440.0 / np.pi * 0.0820 * distance
        * (sunset * np.sin(phi) * math.sin(declination) + np.cos(phi) * math.cos(declination) * np.sin(sunset))
    )  # fmt: skip
    return Sun(declination, distance, sunset, 24.0 / np.pi * sunset, above)


def sine_of_elevation(sun: Sun, latitude: np.ndarray, hour: np.ndarray) -> np.ndarray:
    """Sine of the sun's elevation at a solar hour."""
    phi, angle = np.radians(latitude), np.pi * (hour - 12.0) / 12.0
    return np.sin(phi) * math.sin(sun.declination) + np.cos(phi) * math.cos(sun.declination) * np.cos(angle)


def air_by_day(highest: np.ndarray, lowest: np.ndarray, daylight: np.ndarray, hour: np.ndarray) -> np.ndarray:
    """Air temperature at a solar hour between sunrise and sunset [degC]; Parton & Logan 1981.

    The minimum comes 0.17 h before sunrise, the maximum 1.86 h after the middle between that and the evening. Where
    the sun does not set, a cosine about the mean with its top at 13.69 h; where it does not rise, the mean.
    """
    middle, half = (highest + lowest) / 2.0, (highest - lowest) / 2.0
    since_minimum = hour - (12.0 - daylight / 2.0 - 0.17)
    course = lowest + 2.0 * half * np.sin(np.pi * since_minimum / (daylight + 2.0 * 1.86))
    whole_day = middle + half * np.cos(2.0 * np.pi * (hour - 13.69) / 24.0)
    return np.select([daylight <= 0.1, daylight >= 23.9], [middle + 0.0 * hour, whole_day], course)


def air_by_night(lowest: np.ndarray, at_sunset: np.ndarray, share: np.ndarray) -> np.ndarray:
    """Air temperature at a share of the night [degC]; Parton & Logan 1981."""
    return lowest + (at_sunset - lowest) * np.exp(-2.20 * share)


def sunset_temperature(highest: np.ndarray, lowest: np.ndarray, daylight: np.ndarray) -> np.ndarray:
    """Air temperature in the evening [degC]."""
    return air_by_day(highest, lowest, daylight, 12.0 + daylight / 2.0)


def erbs_diffuse_share(clearness: np.ndarray) -> np.ndarray:
    """Diffuse share of global radiation; Erbs, Klein & Duffie 1982."""
    middle = 0.9511 - 0.1604 * clearness + 4.388 * clearness**2 - 16.638 * clearness**3 + 12.336 * clearness**4
    return np.select([clearness <= 0.22, clearness <= 0.80], [1.0 - 0.09 * clearness, middle], 0.165)


@dataclass(frozen=True)
class Sky:
    """The courses of a day, arrays (points, cells): air [degC], vapour pressure [kPa], light and longwave [W m-2]."""

    hours: np.ndarray
    air: np.ndarray
    vapour_pressure: np.ndarray
    beam: np.ndarray
    diffuse: np.ndarray
    longwave: np.ndarray
    extinction: np.ndarray


def sky_of(weather: Weather, points: int = 8) -> Sky:
    """Work out the courses at the Gauss-Legendre points of the day; `hours` are their weights [h]."""
    nodes, weights = np.polynomial.legendre.leggauss(points)
    sun = sun_of(weather.day_of_year, weather.latitude)
    hour = 12.0 + sun.daylight / 2.0 * nodes[:, None]
    hours = weights[:, None] / 2.0 * sun.daylight
    sine = sine_of_elevation(sun, weather.latitude, hour)
    light = (sun.daylight > 0.1) & (sine > 0.01)
    a = 0.409 + 0.5016 * np.sin(sun.sunset - np.pi / 3.0)  # Collares-Pereira & Rabl 1979
    b = 0.6609 - 0.4767 * np.sin(sun.sunset - np.pi / 3.0)
    shape = np.where(light, np.maximum(a + b * np.cos(np.pi * (hour - 12.0) / 12.0), 0.0) * sine, 0.0)
    total = (shape * hours).sum(axis=0)
    flux = np.where(total > 0.0, weather.radiation * 1e6 / 3600.0 * shape / np.where(total > 0.0, total, 1.0), 0.0)
    clearness = np.minimum(flux / np.where(light, 1367.0 * sun.distance * sine, 1.0), 1.0)
    diffuse = erbs_diffuse_share(clearness) * flux
    air = air_by_day(weather.highest, weather.lowest, sun.daylight, hour)
    humidity = np.minimum(weather.vapour_pressure, saturation(air))
    clear_sky = (0.75 + 2e-5 * weather.elevation) * sun.above_air  # FAO-56 Eq. 37
    relative = np.where(sun.above_air > 0.0, weather.radiation / np.maximum(clear_sky, 1e-9), 0.0)
    cloud = 1.35 * np.clip(relative, 0.3, 1.0) - 0.35  # FAO-56 Eq. 39
    longwave = -5.67e-8 * (air + 273.15) ** 4 * (0.34 - 0.14 * np.sqrt(humidity)) * cloud
    extinction = np.where(light & (flux > 0.0), 0.5 / np.where(light, sine, 1.0), 0.0)
    return Sky(hours, air, humidity, flux - diffuse, diffuse, longwave, extinction)


@dataclass(frozen=True)
class Leaves:
    """A class of leaves, arrays (points, cells): area per ground, the rest per leaf area."""

    area: np.ndarray
    visible: np.ndarray
    net_radiation: np.ndarray
    capacity: np.ndarray


DEPTH_POINTS, DEPTH_WEIGHTS = np.polynomial.legendre.leggauss(256)


def light_at_depth(
    depth: np.ndarray, beam: np.ndarray, diffuse: np.ndarray, kb: np.ndarray, scattering: float
) -> tuple[np.ndarray, np.ndarray]:
    """What a sunlit leaf and a shaded leaf absorb below a leaf area [W m-2]; de Pury & Farquhar 1997."""
    root = math.sqrt(1.0 - scattering)
    horizontal = (1.0 - root) / (1.0 + root)
    kd = DIFFUSE_EXTINCTION
    reflected_beam = 1.0 - np.exp(-2.0 * horizontal * kb / (1.0 + kb))
    reflected_diffuse = 1.0 - math.exp(-2.0 * horizontal * kd / (1.0 + kd))
    from_sky = diffuse * (1.0 - reflected_diffuse) * kd * root * np.exp(-kd * root * depth)
    all_beam = beam * (1.0 - reflected_beam) * kb * root * np.exp(-kb * root * depth)
    unscattered = beam * (1.0 - scattering) * kb * np.exp(-kb * depth)
    shaded = from_sky + all_beam - unscattered
    return shaded + beam * (1.0 - scattering) * kb, shaded


def leaves_of(sky: Sky, crop: Crop) -> list[Leaves]:
    """Sum up the light, longwave and capacity of sunlit and of shaded leaves over the depth of the canopy."""
    kb, kd = sky.extinction, DIFFUSE_EXTINCTION
    decline = crop.profile.number("capacity_decline")
    halves = [(0.5 * sky.beam, 0.5 * sky.diffuse, scattering) for scattering in (VISIBLE, NEAR_INFRARED)]
    if crop.single_leaf:
        visible, infrared = (light_at_depth(np.zeros_like(kb), *half[:2], kb, half[2])[0] for half in halves)
        one = np.where(crop.leaf_area >= 0.01, 1.0, 0.0) * np.ones_like(kb)
        return [Leaves(one, visible, visible + infrared + kd * sky.longwave, np.ones_like(kb))]
    sums = np.zeros((2, 4, *kb.shape))  # sunlit, shaded; area, visible, all radiation, capacity
    for node, weight in zip(DEPTH_POINTS, DEPTH_WEIGHTS, strict=True):
        depth = crop.leaf_area * (node + 1.0) / 2.0
        step = weight / 2.0 * crop.leaf_area
        sunlit_share = np.exp(-kb * depth)  # 1 in the dark: all leaves are one class
        visible_here, infrared_here = (light_at_depth(depth, *half[:2], kb, half[2]) for half in halves)
        longwave = kd * np.exp(-kd * depth) * sky.longwave
        capacity = np.exp(-decline * (node + 1.0) / 2.0)
        for number, share in enumerate((sunlit_share, 1.0 - sunlit_share)):
            every = visible_here[number] + infrared_here[number] + longwave
            parts = (1.0, visible_here[number], every, capacity)
            for row, part in enumerate(parts):
                sums[number, row] += step * share * part
    leaves = []
    for area, *parts in sums:
        there = (area > 1e-9) & (crop.leaf_area >= 0.01)
        visible, net, capacity = (part / np.where(there, area, 1.0) for part in parts)
        # Where there are no leaves, any leaf will do.
        leaves.append(Leaves(np.where(there, area, 0.0), visible * there, net * there, np.where(there, capacity, 1.0)))
    return leaves


def lanes_of(crop: Crop, weather: Weather, leaves: Leaves, air: np.ndarray, humidity: np.ndarray) -> np.ndarray:
    """Lay a class of leaves out as the leaf solver reads it."""
    lanes = np.empty((solve.LEAF_INPUTS, air.size))
    rows = {
        solve.AIR_TEMPERATURE: air,
        solve.VAPOUR_PRESSURE: humidity,
        solve.DEW_POINT: np.minimum(dew_point(humidity), air),
        solve.NET_RADIATION: leaves.net_radiation,
        solve.PHOTONS: PHOTONS_PER_JOULE * leaves.visible,
        solve.CAPACITY: leaves.capacity,
        solve.WIND: weather.wind,
        solve.PRESSURE: weather.pressure,
        solve.CO2: np.full_like(weather.wind, crop.co2),
        solve.GROWTH_TEMPERATURE: crop.growth_temperature,
    }
    for row, values in rows.items():
        lanes[row] = np.broadcast_to(values, air.shape).ravel()
    return lanes


def night_respiration(crop: Crop, weather: Weather, cap: float, points: int = 5) -> np.ndarray:
    """Respiration of all leaves through the night before [mol m-2], the air capped at a temperature."""
    nodes, weights = np.polynomial.legendre.leggauss(points)
    daylight = sun_of(weather.day_of_year, weather.latitude).daylight
    air = air_by_night(weather.lowest, weather.sunset_before, (nodes[:, None] + 1.0) / 2.0)
    air = np.where(daylight <= 0.1, weather.sunset_before, air)
    relative = (weights[:, None] / 2.0 * respiration_response(crop.profile, np.minimum(air, cap))).sum(axis=0)
    hours = np.where(daylight >= 23.9, 0.0, 24.0 - daylight)
    decline = crop.profile.number("capacity_decline")
    whole = 1.0 if crop.single_leaf else crop.leaf_area * (1.0 - math.exp(-decline)) / decline
    at_25 = crop.profile.number("carboxylation_capacity") * crop.profile.number("respiration_ratio")
    return np.where(crop.leaf_area >= 0.01, whole * relative * hours * at_25 * MOLES_PER_HOUR, 0.0)


def plain_day(crop: Crop, weather: Weather, points: int = 8) -> dict[str, np.ndarray]:
    """Assimilation, both losses and the four causes of one day [mol m-2 d-1], leaf temperatures [degC]."""
    onset = crop.profile.number("heat_onset")
    leaf = leaf_record(crop.profile)
    sky = sky_of(weather, points)
    shape = sky.air.shape
    sums: dict[str, Any] = dict.fromkeys(
        ("assimilation", "lost_to_heat", "lost_to_photorespiration", "photorespired_co2", *CAUSES), 0.0
    )
    excess = []
    for leaves in leaves_of(sky, crop):
        cool_air = np.minimum(sky.air, onset)
        cool_humidity = np.minimum(sky.vapour_pressure, saturation(cool_air))
        actual_lanes = lanes_of(crop, weather, leaves, sky.air, sky.vapour_pressure)
        cool_lanes = lanes_of(crop, weather, leaves, cool_air, cool_humidity)
        actual, actual_open, cool, cool_open = (
            solve_lanes(leaf, lanes, oxygenation) for lanes in (actual_lanes, cool_lanes) for oxygenation in (1.0, 0.0)
        )
        excess.append((actual[solve.LEAF_TEMPERATURE].reshape(shape) - sky.air, leaves.area))
        gross_dry = gross_without_oxygenation(
            crop.profile, cool_open[solve.LEAF_TEMPERATURE], actual_open[solve.DEFICIT], actual_lanes
        )
        gross_warm = gross_without_oxygenation(
            crop.profile, actual_open[solve.LEAF_TEMPERATURE], cool_open[solve.DEFICIT], actual_lanes
        )
        g, g_cool, g_open, g_cool_open = (
            world[solve.ASSIMILATION] + world[solve.RESPIRATION] for world in (actual, cool, actual_open, cool_open)
        )
        lit = (actual_lanes[solve.PHOTONS] > 0.0) & (g_open > 1e-9) & (g_cool_open > 1e-9)
        kept = np.where(lit, g / np.where(lit, g_open, 1.0), 1.0)
        kept_cool = np.where(lit, g_cool / np.where(lit, g_cool_open, 1.0), 1.0)
        of_moment = {
            "assimilation": actual[solve.ASSIMILATION],
            "lost_to_photorespiration": actual_open[solve.ASSIMILATION] - actual[solve.ASSIMILATION],
            "photorespired_co2": 0.5 * actual[solve.OXYGENATION],
        }
        of_heat = {
            "lost_to_heat": cool[solve.ASSIMILATION] - actual[solve.ASSIMILATION],
            "photorespiration": (g_cool_open + g_open) / 2.0 * (kept_cool - kept),
            "stomata": (kept_cool + kept) / 2.0 * ((g_cool_open - gross_dry) + (gross_warm - g_open)) / 2.0,
            "enzymes": (kept_cool + kept) / 2.0 * ((g_cool_open - gross_warm) + (gross_dry - g_open)) / 2.0,
            "respiration": actual[solve.RESPIRATION] - cool[solve.RESPIRATION],
        }
        hot = (sky.air > onset).ravel()
        moles = sky.hours * leaves.area * MOLES_PER_HOUR
        for name, rates in of_moment.items():
            sums[name] = sums[name] + (moles * rates.reshape(shape)).sum(axis=0)
        for name, rates in of_heat.items():
            sums[name] = sums[name] + (moles * np.where(hot, rates, 0.0).reshape(shape)).sum(axis=0)
    respired = night_respiration(crop, weather, np.inf)
    respired_more = respired - night_respiration(crop, weather, onset)
    sums["assimilation"] = sums["assimilation"] - respired
    for name in ("lost_to_heat", "respiration"):
        sums[name] = sums[name] + respired_more
    sunlit_excess, area = excess[0]
    there = area > 0.0
    sums["largest_leaf_excess"] = np.where(there, sunlit_excess, -np.inf).max(axis=0)
    sums["smallest_leaf_excess"] = np.where(there, sunlit_excess, np.inf).min(axis=0)
    sums["highest_leaf"] = np.where(there, sunlit_excess + sky.air, -np.inf).max(axis=0)
    weights = np.polynomial.legendre.leggauss(points)[1][:, None] / 2.0
    sums["daytime_deficit"] = (weights * (saturation(sky.air) - sky.vapour_pressure)).sum(axis=0)
    return sums
