"""A real station's typical year, as daily grids of one cell and as the hours themselves.

The file is the TMY3 of Greensboro, North Carolina (723170), that the pvlib package ships: US National Solar
Radiation Data Base, months of different years put together. Radiation is that of the hour before the stamp,
temperature, dew point, pressure and wind are those at the stamp (Wilcox & Marion 2008, Users Manual for TMY3
Data Sets, from memory). Wind is taken as measured at 10 m (common practice).

`hourly_season` is the same model driven by the hours: canopy, sun and growth are written again here in NumPy;
only the leaves are solved by the package.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd
import xarray as xr

from cropstress import open_weather
from cropstress.crops import CropProfile
from cropstress.leaf import solve
from cropstress.leaf.parameters import leaf_record
from cropstress.leaf.single import solve_lanes

YEAR = 2001
CO2 = 400.0  # umol mol-1
MOLES = 3600.0e-6  # mol m-2 in an hour of 1 umol m-2 s-1


@dataclass(frozen=True)
class Station:
    """Hours of one year, an hour a row, and where they were measured."""

    latitude: float  # [degree]
    longitude: float  # [degree], east positive
    zone: float  # [h] ahead of Greenwich
    elevation: float  # [m]
    hours: pd.DataFrame


def saturation(temperature: np.ndarray) -> np.ndarray:
    """FAO-56 Eq. 11 [kPa]."""
    return np.asarray(0.6108 * np.exp(17.27 * temperature / (temperature + 237.3)))


def read_station() -> Station:
    """Read the file; an hour gets the mean of its two ends of what the file has at the stamps."""
    import pvlib

    path = Path(pvlib.__file__).parent / "data" / "723170TYA.CSV"
    table, about = pvlib.iotools.read_tmy3(path, coerce_year=YEAR, map_variables=True)
    at_stamp = pd.DataFrame(
        {
            "temperature": table["temp_air"].to_numpy(float),
            "vapour_pressure": saturation(table["temp_dew"].to_numpy(float)),
            "pressure": 0.1 * table["pressure"].to_numpy(float),
            "wind": 4.87 / np.log(67.8 * 10.0 - 5.42) * table["wind_speed"].to_numpy(float),  # FAO-56 Eq. 47
        }
    )
    hours = 0.5 * (at_stamp + at_stamp.shift(1).fillna(at_stamp.iloc[0]))
    hours["temperature_at_end"] = at_stamp["temperature"]
    hours["radiation"] = table["ghi"].to_numpy(float)  # W m-2
    hours["day_of_year"] = 1 + np.arange(len(hours)) // 24
    hours["middle"] = np.arange(len(hours)) % 24 + 0.5  # h, local standard time
    return Station(about["latitude"], about["longitude"], about["TZ"], about["altitude"], hours)


def daily_weather(station: Station, folder: Path) -> xr.Dataset:
    """Reduce the hours to days, write them as a grid of one cell and open it."""
    days = station.hours.groupby("day_of_year").agg(
        tasmax=("temperature_at_end", "max"),
        tasmin=("temperature_at_end", "min"),
        vapour_pressure=("vapour_pressure", "mean"),
        rsds=("radiation", "mean"),
        wind=("wind", "mean"),
        pressure=("pressure", "mean"),
    )
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


def leaf_area(profile: CropProfile, days_since_sowing: np.ndarray) -> np.ndarray:
    """Leaf area at noon: 0 at sowing, 10 % of the largest when the initial stage ends, then as FAO-56 stages go."""
    ends = np.cumsum(profile.days)
    shares = [0.0, 0.1, 1.0, 1.0, profile.number("leaf_area_end_share")]
    share = np.interp(days_since_sowing + 0.5, [0.0, *ends], shares)
    return np.asarray(share * profile.number("leaf_area_maximum"))


@dataclass(frozen=True)
class Sky:
    """Sun and radiation of hours."""

    sine: np.ndarray  # of the sun's elevation in the middle of the hour
    beam: np.ndarray  # [W m-2 of ground]
    diffuse: np.ndarray
    longwave: np.ndarray  # net, negative when lost

    def part(self, which: np.ndarray) -> Sky:
        """Return some of the hours."""
        return Sky(self.sine[which], self.beam[which], self.diffuse[which], self.longwave[which])


def sky_of(station: Station, hours: pd.DataFrame) -> Sky:
    """FAO-56 Eqs. 21-33 for the sun, Erbs et al. 1982 for the diffuse share, FAO-56 Eq. 39 for net longwave."""
    day = hours["day_of_year"].to_numpy(float)
    latitude = np.radians(station.latitude)
    declination = 0.409 * np.sin(2.0 * np.pi * day / 365.0 - 1.39)
    distance = 1.0 + 0.033 * np.cos(2.0 * np.pi * day / 365.0)
    b = 2.0 * np.pi * (day - 81.0) / 364.0
    season = 0.1645 * np.sin(2.0 * b) - 0.1255 * np.cos(b) - 0.025 * np.sin(b)
    solar = hours["middle"].to_numpy() + (station.longitude - 15.0 * station.zone) / 15.0 + season
    upward, across = np.sin(latitude) * np.sin(declination), np.cos(latitude) * np.cos(declination)
    sine = upward + across * np.cos(np.pi / 12.0 * (solar - 12.0))
    radiation = hours["radiation"].to_numpy()
    kt = np.clip(radiation / np.maximum(1367.0 * distance * sine, 1e-9), 0.0, 1.0)
    middle = 0.9511 - 0.1604 * kt + 4.388 * kt**2 - 16.638 * kt**3 + 12.336 * kt**4
    diffuse = np.where(kt <= 0.22, 1.0 - 0.09 * kt, np.where(kt <= 0.80, middle, 0.165)) * radiation
    sunset = np.arccos(-np.tan(latitude) * np.tan(declination))
    above = 24.0 * 60.0 / np.pi * 0.0820 * distance * (sunset * upward + across * np.sin(sunset))
    of_day = hours.groupby("day_of_year")["radiation"].transform("mean").to_numpy() * 0.0864
    relative = np.clip(of_day / ((0.75 + 2e-5 * station.elevation) * above), 0.3, 1.0)
    air = hours["temperature"].to_numpy()
    humidity = np.minimum(hours["vapour_pressure"].to_numpy(), saturation(air))
    emitted = 5.67e-8 * (air + 273.15) ** 4
    longwave = -emitted * (0.34 - 0.14 * np.sqrt(humidity)) * (1.35 * relative - 0.35)
    return Sky(sine, radiation - diffuse, diffuse, longwave)


def absorbed(beam, diffuse, kb, area, scattering):
    """Radiation that all leaves and that sunlit leaves absorb, per ground; de Pury & Farquhar 1997."""
    kd, root = 0.78, np.sqrt(1.0 - scattering)
    horizontal = (1.0 - root) / (1.0 + root)
    rb = 1.0 - np.exp(-2.0 * horizontal * kb / (1.0 + kb))
    rd = 1.0 - np.exp(-2.0 * horizontal * kd / (1.0 + kd))
    kbs, kds = kb * root, kd * root
    everywhere = (1.0 - rb) * beam * (1.0 - np.exp(-kbs * area)) + (1.0 - rd) * diffuse * (1.0 - np.exp(-kds * area))
    scattered = (1.0 - rb) * (1.0 - np.exp(-(kbs + kb) * area)) * kbs / (kbs + kb)
    sunlit = (
        beam * (1.0 - scattering) * (1.0 - np.exp(-kb * area))
        + (1.0 - rd) * diffuse * (1.0 - np.exp(-(kds + kb) * area)) * kds / (kds + kb)
        + beam * (scattered - (1.0 - scattering) * (1.0 - np.exp(-2.0 * kb * area)) / 2.0)
    )
    return everywhere, sunlit


def leaf_classes(profile: CropProfile, sky: Sky, area: np.ndarray) -> Iterator[tuple[np.ndarray, ...]]:
    """Give leaf area and, per leaf area, absorbed PAR, net radiation and capacity, of sunlit and of shaded leaves."""
    kn, kd = profile.number("capacity_decline"), 0.78
    kb = 0.5 / sky.sine
    par, par_sun = absorbed(0.5 * sky.beam, 0.5 * sky.diffuse, kb, area, 0.15)
    nir, nir_sun = absorbed(0.5 * sky.beam, 0.5 * sky.diffuse, kb, area, 0.80)
    far, far_sun = 1.0 - np.exp(-kd * area), kd / (kd + kb) * (1.0 - np.exp(-(kd + kb) * area))
    capacity = area * (1.0 - np.exp(-kn)) / kn
    capacity_sun = (1.0 - np.exp(-(kn + kb * area))) / (kn / area + kb)
    sunlit = (1.0 - np.exp(-kb * area)) / kb
    shaded = area - sunlit
    net_sun = par_sun + nir_sun + far_sun * sky.longwave
    yield sunlit, par_sun / sunlit, net_sun / sunlit, capacity_sun / sunlit
    net = par + nir + far * sky.longwave - net_sun
    yield shaded, (par - par_sun) / shaded, net / shaded, (capacity - capacity_sun) / shaded


def dark_respiration(profile: CropProfile, temperature: np.ndarray, area: np.ndarray) -> np.ndarray:
    """Respiration of the canopy in the dark, leaves at air temperature [umol m-2 s-1]; Heskel et al. 2016."""
    kn = profile.number("capacity_decline")
    at_25 = profile.number("carboxylation_capacity") * profile.number("respiration_ratio")
    shape = np.exp(0.1012 * (temperature - 25.0) - 0.0005 * (temperature**2 - 625.0))
    return np.asarray(at_25 * shape * area * (1.0 - np.exp(-kn)) / kn)


def hours_above(temperature: np.ndarray, limit: float) -> float:
    """Hours above a limit, with straight lines between the values at the stamps."""
    first, last = temperature[:-1], temperature[1:]
    highest, lowest = np.maximum(first, last), np.minimum(first, last)
    part = (highest - limit) / np.maximum(highest - lowest, 1e-12)
    return float(np.where(lowest >= limit, 1.0, np.clip(part, 0.0, 1.0)).sum())


def cooled(lanes: np.ndarray, onset: float) -> np.ndarray:
    """Return the same leaves with air at the onset at most."""
    cool = lanes.copy()
    cool[solve.AIR_TEMPERATURE] = np.minimum(lanes[solve.AIR_TEMPERATURE], onset)
    cool[solve.VAPOUR_PRESSURE] = np.minimum(
        lanes[solve.VAPOUR_PRESSURE], saturation(cool[solve.AIR_TEMPERATURE])
    )
    return with_dew_point(cool)


def with_dew_point(lanes: np.ndarray) -> np.ndarray:
    """Fill in the dew point; FAO-56 Eq. 11 turned round."""
    logarithm = np.log(lanes[solve.VAPOUR_PRESSURE] / 0.6108)
    dew_point = 237.3 * logarithm / (17.27 - logarithm)
    lanes[solve.DEW_POINT] = np.minimum(dew_point, lanes[solve.AIR_TEMPERATURE])
    return lanes


def hourly_season(station: Station, profile: CropProfile, sowing_day: int) -> dict[str, float]:
    """Season sums [mol m-2], share, hours [h] and days of a crop, from the hours of the file.

    What the daily run holds through the day, wind and pressure, is held here too, so that only the courses of
    temperature, humidity and radiation differ.
    """
    last_day = sowing_day + sum(profile.days) - 1
    hours = station.hours[station.hours["day_of_year"].between(sowing_day, last_day)].copy()
    for name in ("wind", "pressure"):
        hours[name] = hours.groupby("day_of_year")[name].transform("mean")
    area = leaf_area(profile, hours["day_of_year"].to_numpy() - sowing_day)
    sky = sky_of(station, hours)
    air = hours["temperature"].to_numpy()
    humidity = np.minimum(hours["vapour_pressure"].to_numpy(), saturation(air))
    onset, limit = profile.number("heat_onset"), profile.number("hot_day_limit")
    bright = (sky.sine > 0.01) & (hours["radiation"].to_numpy() > 0.0) & (area >= 0.01)
    hot = air[bright] > onset
    record = leaf_record(profile)
    sums = dict.fromkeys(("assimilation", "lost_to_heat", "lost_to_photorespiration", "photorespired_co2"), 0.0)
    for leaves, par, net, capacity in leaf_classes(profile, sky.part(bright), area[bright]):
        lanes = np.empty((solve.LEAF_INPUTS, leaves.size))
        lanes[solve.AIR_TEMPERATURE] = air[bright]
        lanes[solve.VAPOUR_PRESSURE] = humidity[bright]
        lanes[solve.NET_RADIATION] = net
        lanes[solve.PHOTONS] = par * 4.57
        lanes[solve.CAPACITY] = capacity
        lanes[solve.WIND] = hours["wind"].to_numpy()[bright]
        lanes[solve.PRESSURE] = hours["pressure"].to_numpy()[bright]
        lanes[solve.CO2] = CO2
        lanes[solve.GROWTH_TEMPERATURE] = profile.number("growth_temperature") if profile.pathway == "C3" else 25.0
        actual, without = solve_lanes(record, with_dew_point(lanes)), solve_lanes(record, lanes, 0.0)
        cool = solve_lanes(record, cooled(lanes, onset))
        rate = actual[solve.ASSIMILATION]
        sums["assimilation"] += MOLES * float(leaves @ rate)
        sums["lost_to_photorespiration"] += MOLES * float(leaves @ (without[solve.ASSIMILATION] - rate))
        sums["photorespired_co2"] += MOLES * float(leaves @ (0.5 * actual[solve.OXYGENATION]))
        sums["lost_to_heat"] += MOLES * float(leaves[hot] @ (cool[solve.ASSIMILATION] - rate)[hot])
    dark = ~bright & (area >= 0.01)
    respired = dark_respiration(profile, air[dark], area[dark])
    cool_respired = dark_respiration(profile, np.minimum(air[dark], onset), area[dark])
    sums["assimilation"] -= MOLES * float(respired.sum())
    sums["lost_to_heat"] += MOLES * float((respired - cool_respired).sum())
    potential = sums["assimilation"] + sums["lost_to_photorespiration"]
    highest = hours.groupby("day_of_year")["temperature_at_end"].max()
    return sums | {
        "lost_to_photorespiration_share": sums["lost_to_photorespiration"] / potential,
        "hot_hours": hours_above(hours["temperature_at_end"].to_numpy(), limit),
        "hot_days": float((highest > limit + 1e-3).sum()),
    }
