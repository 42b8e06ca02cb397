"""A crop's season from hours: canopy, sun and growth written again in NumPy; only leaves are solved by the package."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import pandas as pd

from cropstress.crops import CropProfile
from cropstress.leaf import solve
from cropstress.leaf.parameters import leaf_record
from cropstress.leaf.single import solve_lanes

from station_year import Station, saturation, solar_hours, sun_of_day

CO2 = 400.0  # umol mol-1


@dataclass(frozen=True)
class Sky:
    """Sun and radiation of steps."""

    sine: np.ndarray  # of the sun's elevation in the middle of the step
    beam: np.ndarray  # [W m-2 of ground]
    diffuse: np.ndarray
    longwave: np.ndarray  # net, negative when lost

    def part(self, which: np.ndarray) -> Sky:
        """Return some of the steps."""
        return Sky(self.sine[which], self.beam[which], self.diffuse[which], self.longwave[which])


def sky_of(station: Station, steps: pd.DataFrame) -> Sky:
    """FAO-56 Eqs. 21-33 for the sun, Erbs et al. 1982 for the diffuse share, FAO-56 Eq. 39 for net longwave."""
    day = steps["day_of_year"].to_numpy(float)
    upward, across, sunset, distance = sun_of_day(station, day)
    solar = solar_hours(station, day, steps["middle"].to_numpy())
    sine = upward + across * np.cos(np.pi / 12.0 * (solar - 12.0))
    radiation = steps["radiation"].to_numpy()
    kt = np.clip(radiation / np.maximum(1367.0 * distance * sine, 1e-9), 0.0, 1.0)
    middle = 0.9511 - 0.1604 * kt + 4.388 * kt**2 - 16.638 * kt**3 + 12.336 * kt**4
    diffuse = np.where(kt <= 0.22, 1.0 - 0.09 * kt, np.where(kt <= 0.80, middle, 0.165)) * radiation
    above = 24.0 * 60.0 / np.pi * 0.0820 * distance * (sunset * upward + across * np.sin(sunset))
    of_day = steps.groupby("day_of_year")["radiation"].transform("mean").to_numpy() * 0.0864
    relative = np.clip(of_day / ((0.75 + 2e-5 * station.elevation) * above), 0.3, 1.0)
    air = steps["temperature"].to_numpy()
    humidity = np.minimum(steps["vapour_pressure"].to_numpy(), saturation(air))
    emitted = 5.67e-8 * (air + 273.15) ** 4
    longwave = -emitted * (0.34 - 0.14 * np.sqrt(humidity)) * (1.35 * relative - 0.35)
    return Sky(sine, radiation - diffuse, diffuse, longwave)


def leaf_area(profile: CropProfile, days_since_sowing: np.ndarray) -> np.ndarray:
    """Leaf area at noon: 0 at sowing, 10 % of the largest when the initial stage ends, then as FAO-56 stages go."""
    ends = np.cumsum(profile.days)
    shares = [0.0, 0.1, 1.0, 1.0, profile.number("leaf_area_end_share")]
    share = np.interp(days_since_sowing + 0.5, [0.0, *ends], shares)
    return np.asarray(share * profile.number("leaf_area_maximum"))


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


def with_dew_point(lanes: np.ndarray) -> np.ndarray:
    """Fill in the dew point; FAO-56 Eq. 11 turned round."""
    logarithm = np.log(lanes[solve.VAPOUR_PRESSURE] / 0.6108)
    dew_point = 237.3 * logarithm / (17.27 - logarithm)
    lanes[solve.DEW_POINT] = np.minimum(dew_point, lanes[solve.AIR_TEMPERATURE])
    return lanes


def cooled(lanes: np.ndarray, onset: float) -> np.ndarray:
    """Return the same leaves in air at the onset at most."""
    cool = lanes.copy()
    cool[solve.AIR_TEMPERATURE] = np.minimum(lanes[solve.AIR_TEMPERATURE], onset)
    cool[solve.VAPOUR_PRESSURE] = np.minimum(lanes[solve.VAPOUR_PRESSURE], saturation(cool[solve.AIR_TEMPERATURE]))
    return with_dew_point(cool)


def dark_respiration(profile: CropProfile, temperature: np.ndarray, area: np.ndarray) -> np.ndarray:
    """Respiration of the canopy in the dark, leaves at air temperature [umol m-2 s-1]; Heskel et al. 2016."""
    kn = profile.number("capacity_decline")
    at_25 = profile.number("carboxylation_capacity") * profile.number("respiration_ratio")
    shape = np.exp(0.1012 * (temperature - 25.0) - 0.0005 * (temperature**2 - 625.0))
    return np.asarray(at_25 * shape * area * (1.0 - np.exp(-kn)) / kn)


def season(station: Station, profile: CropProfile, sowing_day: int) -> dict[str, float]:
    """Season sums [mol m-2], share, hours [h] and days of a crop, from the steps of a station.

    What a daily run holds through the day, wind and pressure, is held here too, so that only the courses of
    temperature, humidity and radiation differ.
    """
    last_day = sowing_day + sum(profile.days) - 1
    steps = station.steps[station.steps["day_of_year"].between(sowing_day, last_day)].copy()
    for name in ("wind", "pressure"):
        steps[name] = steps.groupby("day_of_year")[name].transform("mean")
    area = leaf_area(profile, steps["day_of_year"].to_numpy() - sowing_day)
    sky = sky_of(station, steps)
    air = steps["temperature"].to_numpy()
    humidity = np.minimum(steps["vapour_pressure"].to_numpy(), saturation(air))
    onset, limit = profile.number("heat_onset"), profile.number("hot_day_limit")
    bright = (sky.sine > 0.01) & (steps["radiation"].to_numpy() > 0.0) & (area >= 0.01)
    hot = air[bright] > onset
    record = leaf_record(profile)
    moles = station.hours_a_step * 3600.0e-6
    sums = dict.fromkeys(("assimilation", "lost_to_heat", "lost_to_photorespiration", "photorespired_co2"), 0.0)
    for leaves, par, net, capacity in leaf_classes(profile, sky.part(bright), area[bright]):
        lanes = np.empty((solve.LEAF_INPUTS, leaves.size))
        lanes[solve.AIR_TEMPERATURE] = air[bright]
        lanes[solve.VAPOUR_PRESSURE] = humidity[bright]
        lanes[solve.NET_RADIATION] = net
        lanes[solve.PHOTONS] = par * 4.57
        lanes[solve.CAPACITY] = capacity
        lanes[solve.WIND] = steps["wind"].to_numpy()[bright]
        lanes[solve.PRESSURE] = steps["pressure"].to_numpy()[bright]
        lanes[solve.CO2] = CO2
        lanes[solve.GROWTH_TEMPERATURE] = profile.number("growth_temperature") if profile.pathway == "C3" else 25.0
        actual, without = solve_lanes(record, with_dew_point(lanes)), solve_lanes(record, lanes, 0.0)
        cool = solve_lanes(record, cooled(lanes, onset))
        rate = actual[solve.ASSIMILATION]
        sums["assimilation"] += moles * float(leaves @ rate)
        sums["lost_to_photorespiration"] += moles * float(leaves @ (without[solve.ASSIMILATION] - rate))
        sums["photorespired_co2"] += moles * float(leaves @ (0.5 * actual[solve.OXYGENATION]))
        sums["lost_to_heat"] += moles * float(leaves[hot] @ (cool[solve.ASSIMILATION] - rate)[hot])
    dark = ~bright & (area >= 0.01)
    respired = dark_respiration(profile, air[dark], area[dark])
    cool_respired = dark_respiration(profile, np.minimum(air[dark], onset), area[dark])
    sums["assimilation"] -= moles * float(respired.sum())
    sums["lost_to_heat"] += moles * float((respired - cool_respired).sum())
    potential = sums["assimilation"] + sums["lost_to_photorespiration"]
    highest = steps.groupby("day_of_year")["temperature"].max()
    return sums | {
        "lost_to_photorespiration_share": sums["lost_to_photorespiration"] / potential,
        "hot_hours": hours_above(air, limit) * station.hours_a_step,
        "hot_days": float((highest > limit + 1e-3).sum()),
    }


def hours_above(temperature: np.ndarray, limit: float) -> float:
    """Steps above a limit, with straight lines between one and the next."""
    first, last = temperature[:-1], temperature[1:]
    highest, lowest = np.maximum(first, last), np.minimum(first, last)
    part = (highest - limit) / np.maximum(highest - lowest, 1e-12)
    return float(np.where(lowest >= limit, 1.0, np.clip(part, 0.0, 1.0)).sum())
