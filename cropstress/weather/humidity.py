"""Vapour pressure of the day from whatever tells of humidity, wind at 2 m, and pressure from height.

Plain arithmetic: arrays may be NumPy or lazy dask arrays of any shape that broadcast.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import numpy as np

Array = Any  # a NumPy or dask array

WATER_TO_AIR_MASS = 0.622  # 1; ratio of the molecular weights of water and dry air, FAO-56 Eq. 8 (read)
HEIGHT_OF_WIND = 2.0  # m; FAO-56 Eq. 47
LARGEST_RELATIVE_HUMIDITY = 105.0  # %; above it no instrument error explains the value (chosen here)

#: How each way to the vapour pressure is named in what was found.
WORDS: dict[tuple[str, ...], str] = {
    ("vapour_pressure",): "as it is",
    ("dew_point",): "saturation at the dew point, FAO-56 Eq. 14",
    ("specific_humidity",): "q P / (0.622 + 0.378 q)",
    ("relative_humidity_maximum", "relative_humidity_minimum"): "FAO-56 Eq. 17 with tmax and tmin",
    ("relative_humidity_maximum",): "FAO-56 Eq. 18 with tmin",
    ("relative_humidity",): "FAO-56 Eq. 19 with tmax and tmin",
    ("vapour_pressure_deficit",): "mean saturation of tmax and tmin (FAO-56 Eq. 12) less the deficit",
}


def saturation_vapour_pressure(temperature: Array) -> Array:
    """Compute the saturation vapour pressure [kPa] at a temperature [degC]; FAO-56 Eq. 11 (read).

    >>> round(float(saturation_vapour_pressure(24.5)), 3)
    3.075
    """
    return 0.6108 * np.exp(17.27 * temperature / (temperature + 237.3))


def mean_saturation_vapour_pressure(tmax: Array, tmin: Array) -> Array:
    """Compute the day's mean saturation vapour pressure [kPa], tmax and tmin [degC]; FAO-56 Eq. 12 (read)."""
    return 0.5 * (saturation_vapour_pressure(tmax) + saturation_vapour_pressure(tmin))


def vapour_pressure(way: tuple[str, ...], given: Mapping[str, Array]) -> Array:
    """Compute the day's vapour pressure.

    Parameters
    ----------
    way : tuple of str
        One of `quantities.HUMIDITY_WAYS`.
    given : mapping of str to array
        The quantities the way names, in their canonical units, and `tmax`, `tmin` [degC]; for specific
        humidity also `pressure` [kPa].

    Returns
    -------
    array
        Vapour pressure [kPa]. A highest or lowest relative humidity below 0 or above 105 % gives NaN; what is
        wrong with a vapour pressure itself is left to `mend`.

    References
    ----------
    FAO-56 Eqs. 14, 17, 18, 19 (read); for specific humidity its definition with the molecular weight ratio
    0.622.
    """
    tmax, tmin = given["tmax"], given["tmin"]
    match way:
        case ("vapour_pressure",):
            return given["vapour_pressure"]
        case ("dew_point",):
            return saturation_vapour_pressure(given["dew_point"])
        case ("specific_humidity",):
            share = given["specific_humidity"]
            return share * given["pressure"] / (WATER_TO_AIR_MASS + (1.0 - WATER_TO_AIR_MASS) * share)
        case ("relative_humidity_maximum", "relative_humidity_minimum"):
            night = saturation_vapour_pressure(tmin) * _possible(given["relative_humidity_maximum"])
            noon = saturation_vapour_pressure(tmax) * _possible(given["relative_humidity_minimum"])
            return 0.5 * (night + noon) / 100.0
        case ("relative_humidity_maximum",):
            return saturation_vapour_pressure(tmin) * _possible(given["relative_humidity_maximum"]) / 100.0
        case ("relative_humidity",):
            return mean_saturation_vapour_pressure(tmax, tmin) * given["relative_humidity"] / 100.0
        case ("vapour_pressure_deficit",):
            return mean_saturation_vapour_pressure(tmax, tmin) - given["vapour_pressure_deficit"]
    raise ValueError(f"no way to the vapour pressure: {way}")


def _possible(relative_humidity: Array) -> Array:
    fits = (relative_humidity >= 0.0) & (relative_humidity <= LARGEST_RELATIVE_HUMIDITY)
    return np.where(fits, relative_humidity, np.nan)


def wind_factor(height: float) -> float:
    """Compute what turns a wind speed at a height [m] into the one at 2 m; FAO-56 Eq. 47 (read).

    At 2 m it is exactly 1 (the equation gives 1.0002).

    >>> round(wind_factor(10.0), 3)
    0.748
    """
    return 1.0 if height == HEIGHT_OF_WIND else 4.87 / math.log(67.8 * height - 5.42)


def pressure_from_elevation(elevation: Array) -> Array:
    """Compute the air pressure [kPa] at a height above the sea [m]; FAO-56 Eq. 7 (read).

    >>> round(pressure_from_elevation(1800.0), 1)
    81.8
    """
    return 101.3 * ((293.0 - 0.0065 * elevation) / 293.0) ** 5.26
