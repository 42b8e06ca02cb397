"""Sun, temperature and radiation through one day."""

from __future__ import annotations

import math

from cropstress.compiled import exponential, inlined

LAG_OF_MAXIMUM = 1.86  # h after solar noon; Parton & Logan 1981, air at 1.5 m (read in a secondary source)
NIGHT_DECAY = 2.20  # 1; Parton & Logan 1981
LAG_OF_MINIMUM = -0.17  # h after sunrise; Parton & Logan 1981
HOUR_OF_MAXIMUM = 13.69  # h, solar; 12 + 1.86 - 0.17
POLAR_DAY = 23.9  # h of daylight, chosen here
POLAR_NIGHT = 0.1  # h of daylight, chosen here
SOLAR_CONSTANT = 1367.0  # W m-2; FAO-56: 0.0820 MJ m-2 min-1
LOWEST_SUN = 0.01  # sine of elevation, chosen here: lower sun counts as dark


@inlined
def declination(day_of_year: float) -> float:
    """Return the declination of the sun [rad]; FAO-56 Eq. 24."""
    return 0.409 * math.sin(2.0 * math.pi * day_of_year / 365.0 - 1.39)


@inlined
def relative_distance(day_of_year: float) -> float:
    """Return the inverse relative distance of the earth from the sun [1]; FAO-56 Eq. 23."""
    return 1.0 + 0.033 * math.cos(2.0 * math.pi * day_of_year / 365.0)


@inlined
def sunset_angle(latitude: float, declination_angle: float) -> float:
    """Return the hour angle of sunset [rad], 0 to pi; FAO-56 Eq. 25."""
    cosine = -math.tan(latitude) * math.tan(declination_angle)
    return math.acos(min(max(cosine, -1.0), 1.0))


@inlined
def daylight_hours(sunset: float) -> float:
    """Return the hours of daylight; FAO-56 Eq. 34."""
    return 24.0 * sunset / math.pi


@inlined
def extraterrestrial_radiation(latitude: float, declination_angle: float, distance: float, sunset: float) -> float:
    """Return the day's radiation above the air [MJ m-2 d-1]; FAO-56 Eq. 21."""
    return (
        24.0 * 60.0 / math.pi * 0.0820 * distance
        * (
            sunset * math.sin(latitude) * math.sin(declination_angle)
            + math.cos(latitude) * math.cos(declination_angle) * math.sin(sunset)
        )
    )  # fmt: skip


@inlined
def sine_of_elevation(latitude: float, declination_angle: float, hour: float) -> float:
    """Return the sine of the sun's elevation at a solar hour."""
    return math.sin(latitude) * math.sin(declination_angle) + math.cos(latitude) * math.cos(
        declination_angle
    ) * math.cos(math.pi / 12.0 * (hour - 12.0))


@inlined
def day_temperature(highest: float, lowest: float, daylight: float, hours_since_sunrise: float) -> float:
    """Return air temperature between sunrise and sunset [degC]; Parton & Logan 1981."""
    if daylight >= POLAR_DAY:
        hour = 12.0 - 0.5 * daylight + hours_since_sunrise
        wave = math.cos(2.0 * math.pi * (hour - HOUR_OF_MAXIMUM) / 24.0)
        return 0.5 * (highest + lowest) + 0.5 * (highest - lowest) * wave
    since_lowest = hours_since_sunrise - LAG_OF_MINIMUM
    return lowest + (highest - lowest) * math.sin(math.pi * since_lowest / (daylight + 2.0 * LAG_OF_MAXIMUM))


@inlined
def night_temperature(lowest: float, at_sunset: float, share_of_night: float) -> float:
    """Return air temperature at a share of the night [degC]; Parton & Logan 1981."""
    return lowest + (at_sunset - lowest) * math.exp(-NIGHT_DECAY * share_of_night)


@inlined
def time_above(
    limit: float, highest: float, lowest: float, daylight: float, sunset_before: float
) -> tuple[float, float]:
    """Return how long and by how much the air is above a limit, from the temperature course in closed form.

    Returns
    -------
    tuple
        Hours above [h] and the integral of the excess over the day [K d].
    """
    middle = 0.5 * (highest + lowest)
    if daylight <= POLAR_NIGHT:
        return (24.0, middle - limit) if middle > limit else (0.0, 0.0)
    if daylight >= POLAR_DAY:
        reach = min(max((limit - middle) / max(0.5 * (highest - lowest), 1e-9), -1.0), 1.0)
        angle = math.acos(reach)
        excess = (middle - limit) * angle / math.pi + 0.5 * (highest - lowest) * math.sin(angle) / math.pi
        return 24.0 / math.pi * angle, max(excess, 0.0)
    hours, excess = _day_above(limit, highest, lowest, daylight)
    dark_hours, dark_excess = _night_above(limit, lowest, 24.0 - daylight, sunset_before)
    return hours + dark_hours, (excess + dark_excess) / 24.0


@inlined
def _day_above(limit: float, highest: float, lowest: float, daylight: float) -> tuple[float, float]:
    """Return hours [h] and integral of the excess [K h] between sunrise and sunset."""
    if highest <= limit:
        return 0.0, 0.0
    period = daylight + 2.0 * LAG_OF_MAXIMUM
    first = -LAG_OF_MINIMUM
    last = daylight - LAG_OF_MINIMUM
    swing = highest - lowest
    if lowest < limit:
        rises = period / math.pi * math.asin(min((limit - lowest) / swing, 1.0))
        first = max(first, rises)
        last = max(min(last, period - rises), first)
    wave = math.cos(math.pi * first / period) - math.cos(math.pi * last / period)
    return last - first, (lowest - limit) * (last - first) + swing * period / math.pi * wave


@inlined
def _night_above(limit: float, lowest: float, night: float, at_sunset: float) -> tuple[float, float]:
    """Return hours [h] and integral of the excess [K h] of a night that nears tmin exponentially."""
    if at_sunset > limit and lowest >= limit:
        first, last = 0.0, 1.0
    elif at_sunset > limit:
        first, last = 0.0, min(math.log((at_sunset - lowest) / (limit - lowest)) / NIGHT_DECAY, 1.0)
    elif lowest > limit:
        first, last = min(math.log((lowest - at_sunset) / (lowest - limit)) / NIGHT_DECAY, 1.0), 1.0
    else:
        return 0.0, 0.0
    faded = math.exp(-NIGHT_DECAY * first) - math.exp(-NIGHT_DECAY * last)
    return night * (last - first), night * (
        (lowest - limit) * (last - first) + (at_sunset - lowest) / NIGHT_DECAY * faded
    )


@inlined
def radiation_shape(sunset: float, hour: float, sine: float) -> float:
    """Return radiation relative to the day's sum, not normalised; Collares-Pereira & Rabl 1979."""
    offset = math.sin(sunset - math.pi / 3.0)
    a = 0.409 + 0.5016 * offset
    b = 0.6609 - 0.4767 * offset
    return max(a + b * math.cos(math.pi / 12.0 * (hour - 12.0)), 0.0) * max(sine, 0.0)


@inlined
def diffuse_share(clearness: float) -> float:
    """Return the diffuse share of radiation from the clearness index; Erbs, Klein & Duffie 1982, Eq. 1."""
    k = clearness
    middle = 0.9511 + k * (-0.1604 + k * (4.388 + k * (-16.638 + k * 12.336)))
    return 1.0 - 0.09 * k if k <= 0.22 else (middle if k <= 0.80 else 0.165)


@inlined
def net_longwave(air_temperature: float, vapour_pressure: float, relative_shortwave: float) -> float:
    """Return net longwave of a surface at air temperature [W m-2], negative: lost; FAO-56 Eq. 39."""
    kelvin = air_temperature + 273.15
    emitted = 5.67e-8 * kelvin * kelvin * kelvin * kelvin
    cloud = 1.35 * min(max(relative_shortwave, 0.3), 1.0) - 0.35
    return -emitted * (0.34 - 0.14 * math.sqrt(vapour_pressure)) * cloud


@inlined
def saturation(temperature: float) -> float:
    """Return the saturation vapour pressure [kPa]; FAO-56 Eq. 11."""
    return 0.6108 * exponential(17.27 * temperature / (temperature + 237.3))
