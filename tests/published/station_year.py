"""A real station's typical year: its hours, its days as grids of one cell, and hours made again from its days.

The file is the TMY3 of Greensboro, North Carolina (723170), that the pvlib package ships: US National Solar
Radiation Data Base, months of different years put together. Radiation is that of the hour before the stamp;
temperature, dew point, pressure and wind are those at the stamp (Wilcox & Marion 2008, Users Manual for TMY3
Data Sets, from memory). Wind is taken as measured at 10 m (common practice).
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
import pandas as pd
import pvlib
import xarray as xr

from cropstress import open_weather

YEAR = 2001


@dataclass(frozen=True)
class Station:
    """Steps of one year, one a row, and where they were measured.

    The columns of `steps`: `day_of_year`; `middle`, the middle of the step [h, local standard time];
    `temperature` [degC], `vapour_pressure` [kPa], `radiation` [W m-2], `wind` [m s-1] and `pressure` [kPa].
    """

    latitude: float  # [degree]
    longitude: float  # [degree], east positive
    zone: float  # [h] ahead of Greenwich
    elevation: float  # [m]
    hours_a_step: float
    steps: pd.DataFrame


def saturation(temperature: np.ndarray) -> np.ndarray:
    """FAO-56 Eq. 11 [kPa]."""
    return np.asarray(0.6108 * np.exp(17.27 * temperature / (temperature + 237.3)))


def read_station() -> Station:
    """Read the file; an hour is a row of it, as it stands there."""
    path = Path(pvlib.__file__).parent / "data" / "723170TYA.CSV"
    table, about = pvlib.iotools.read_tmy3(path, coerce_year=YEAR, map_variables=True)
    number = np.arange(len(table))
    steps = pd.DataFrame(
        {
            "day_of_year": 1 + number // 24,
            "middle": number % 24 + 0.5,
            "temperature": table["temp_air"].to_numpy(float),
            "vapour_pressure": saturation(table["temp_dew"].to_numpy(float)),
            "radiation": table["ghi"].to_numpy(float),
            "wind": 4.87 / np.log(67.8 * 10.0 - 5.42) * table["wind_speed"].to_numpy(float),  # FAO-56 Eq. 47
            "pressure": 0.1 * table["pressure"].to_numpy(float),
        }
    )
    return Station(about["latitude"], about["longitude"], about["TZ"], about["altitude"], 1.0, steps)


def centred(station: Station) -> Station:
    """Return the station with temperature and humidity of the middle of each hour: the mean of its two stamps."""
    steps = station.steps.copy()
    for name in ("temperature", "vapour_pressure"):
        steps[name] = 0.5 * (steps[name] + steps[name].shift(1).fillna(steps[name].iloc[0]))
    return replace(station, steps=steps)


def reduced(station: Station) -> pd.DataFrame:
    """Reduce the hours of the file to days."""
    return station.steps.groupby("day_of_year").agg(
        tasmax=("temperature", "max"),
        tasmin=("temperature", "min"),
        vapour_pressure=("vapour_pressure", "mean"),
        rsds=("radiation", "mean"),
        wind=("wind", "mean"),
        pressure=("pressure", "mean"),
    )


def daily_weather(station: Station, folder: Path) -> xr.Dataset:
    """Write the days as a grid of one cell and open it."""
    days = reduced(station)
    described = {
        "tasmax": ("air_temperature", "maximum", "degC"),
        "tasmin": ("air_temperature", "minimum", "degC"),
        "vapour_pressure": ("water_vapor_partial_pressure_in_air", "mean", "kPa"),
        "rsds": ("surface_downwelling_shortwave_flux_in_air", "mean", "W m-2"),
        "wind": ("wind_speed", "mean", "m s-1"),
        "pressure": ("surface_air_pressure", "mean", "kPa"),
    }
    dataset = xr.Dataset(
        coords={
            "time": ("time", np.arange(len(days), dtype=float), {"units": f"days since {YEAR}-01-01"}),
            "lat": ("lat", [station.latitude], {"units": "degrees_north", "standard_name": "latitude"}),
            "lon": ("lon", [station.longitude], {"units": "degrees_east", "standard_name": "longitude"}),
            "height": ((), 2.0, {"standard_name": "height", "units": "m"}),
        }
    )
    for name, (standard_name, method, unit) in described.items():
        attributes = {"standard_name": standard_name, "cell_methods": f"time: {method}", "units": unit}
        dataset[name] = (("time", "lat", "lon"), days[name].to_numpy()[:, None, None], attributes)
    altitude = {"standard_name": "surface_altitude", "units": "m"}
    dataset["elevation"] = (("lat", "lon"), [[float(station.elevation)]], altitude)
    path = folder / "station.nc"
    dataset.to_netcdf(path)
    return open_weather(path)


def solar_hours(station: Station, day: np.ndarray, clock: np.ndarray) -> np.ndarray:
    """Solar time [h] of a clock time [h, standard]; FAO-56 Eqs. 31-33."""
    b = 2.0 * np.pi * (day - 81.0) / 364.0
    season = 0.1645 * np.sin(2.0 * b) - 0.1255 * np.cos(b) - 0.025 * np.sin(b)
    return clock + (station.longitude - 15.0 * station.zone) / 15.0 + season


def sun_of_day(station: Station, day: np.ndarray) -> tuple[np.ndarray, ...]:
    """What the sine of the sun's elevation is made of, sunset angle and inverse distance; FAO-56 Eqs. 23-25."""
    latitude = np.radians(station.latitude)
    declination = 0.409 * np.sin(2.0 * np.pi * day / 365.0 - 1.39)
    distance = 1.0 + 0.033 * np.cos(2.0 * np.pi * day / 365.0)
    sunset = np.arccos(-np.tan(latitude) * np.tan(declination))
    return np.sin(latitude) * np.sin(declination), np.cos(latitude) * np.cos(declination), sunset, distance


def made_again(station: Station, steps_a_day: int) -> Station:
    """Return short steps made from the days: the courses that a daily run takes for granted.

    Temperature by Parton & Logan 1981, radiation by Collares-Pereira & Rabl 1979, one vapour pressure a day; all
    by plain NumPy. The night after a sunset falls towards the minimum of the morning that follows.
    """
    days = reduced(station)
    hours = 24.0 / steps_a_day
    parts = []
    lowest_of_tomorrow = days["tasmin"].shift(-1).fillna(days["tasmin"].iloc[-1]).to_numpy()
    evening = np.nan
    for index, day in enumerate(days.index):
        today = days.loc[day]
        highest, lowest = today["tasmax"], today["tasmin"]
        upward, across, sunset, _ = sun_of_day(station, np.array(float(day)))
        daylight = 24.0 * float(sunset) / np.pi
        clock = (np.arange(steps_a_day) + 0.5) * hours
        solar = solar_hours(station, np.array(float(day)), clock)
        rises, sets = 12.0 - 0.5 * daylight, 12.0 + 0.5 * daylight
        swing, period = highest - lowest, daylight + 2.0 * 1.86
        by_day = lowest + swing * np.sin(np.pi * (solar - rises + 0.17) / period)
        at_sunset = lowest + swing * np.sin(np.pi * (daylight + 0.17) / period)
        before = at_sunset if np.isnan(evening) else evening
        night = 24.0 - daylight
        until = lowest + (before - lowest) * np.exp(-2.20 * (solar + 24.0 - sets) / night)
        next_lowest = lowest_of_tomorrow[index]
        after = next_lowest + (at_sunset - next_lowest) * np.exp(-2.20 * (solar - sets) / night)
        angle = np.pi / 12.0 * (solar - 12.0)
        sine = np.maximum(upward + across * np.cos(angle), 0.0)
        offset = np.sin(sunset - np.pi / 3.0)
        shape = np.maximum(0.409 + 0.5016 * offset + (0.6609 - 0.4767 * offset) * np.cos(angle), 0.0) * sine
        table = {
            "day_of_year": day,
            "middle": clock,
            "temperature": np.where(solar < rises, until, np.where(solar > sets, after, by_day)),
            "vapour_pressure": today["vapour_pressure"],
            "radiation": today["rsds"] * steps_a_day * shape / shape.sum(),
            "wind": today["wind"],
            "pressure": today["pressure"],
        }
        parts.append(pd.DataFrame(table))
        evening = at_sunset
    return replace(station, hours_a_step=hours, steps=pd.concat(parts, ignore_index=True))
