"""Shortwave radiation at the top of the air."""

from __future__ import annotations

import numpy as np

SOLAR_CONSTANT = 0.0820  # MJ m-2 min-1; FAO-56, after Eq. 21
MINUTES_PER_DAY = 24.0 * 60.0


def extraterrestrial_radiation(day_of_year: np.ndarray, latitude_degrees: np.ndarray) -> np.ndarray:
    """Compute a day's radiation on a horizontal surface at the top of the air.

    Parameters
    ----------
    day_of_year : array_like
        1 for 1 January [d]; broadcast against the latitude.
    latitude_degrees : array_like
        Latitude, north positive [degree].

    Returns
    -------
    numpy.ndarray of float64
        Radiation [MJ m-2 d-1], never below 0; 0 in the polar night.

    References
    ----------
    FAO-56 (Allen, Pereira, Raes & Smith 1998) Eqs. 21 and 23-25, read. Where the sun does not set or rise,
    the sunset angle is limited to pi or 0.

    Examples
    --------
    FAO-56 Example 8, 3 September at 20 degrees south: 32.2 MJ m-2 d-1.

    >>> round(float(extraterrestrial_radiation(246, -20.0)), 1)
    32.2
    """
    year_angle = 2.0 * np.pi / 365.0 * np.asarray(day_of_year, dtype=np.float64)
    latitude = np.deg2rad(np.asarray(latitude_degrees, dtype=np.float64))
    inverse_distance = 1.0 + 0.033 * np.cos(year_angle)
    declination = 0.409 * np.sin(year_angle - 1.39)
    sunset = np.arccos(np.clip(-np.tan(latitude) * np.tan(declination), -1.0, 1.0))
    height = sunset * np.sin(latitude) * np.sin(declination) + np.cos(latitude) * np.cos(
        declination
    ) * np.sin(sunset)
    return np.maximum(MINUTES_PER_DAY / np.pi * SOLAR_CONSTANT * inverse_distance * height, 0.0)
