"""The invented weather of Tessavar in 2021: passing systems, two heat waves, a dry basin and sea air.

Numbers are chosen by hand so that the season looks like one of the middle latitudes; none is measured.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from invented_land import COLUMNS, LATITUDE, ROWS, Land, gaussian, places, smooth_step

SEED = 20210401
FIRST_DAY_OF_YEAR = 91  # 1 April 2021
DAYS = 198  # to 15 October 2021


@dataclass(frozen=True)
class HeatWave:
    """A spell of hot air: first and last day of the year, footprint as shares of the region, strength [K]."""

    first: int
    last: int
    centre_at_start: tuple[float, float]
    centre_at_end: tuple[float, float]
    radii: tuple[float, float]
    strength: float


# 25 June to 4 July over the dry basin and the south; 30 July to 9 August over the plain and the hills
HEAT_WAVES = (
    HeatWave(176, 185, (0.98, 0.14), (0.72, 0.24), (0.36, 0.36), 7.0),
    HeatWave(211, 221, (0.42, 0.46), (0.68, 0.82), (0.36, 0.34), 9.5),
)


class RandomFields:
    """Smooth random fields of unit variance from one seeded stream.

    Only the raw output of PCG64 is used, which numpy keeps the same in every version; the normal
    distribution comes from smoothing and from adding uniform numbers.
    """

    def __init__(self, seed: int) -> None:
        """Start the stream from a seed."""
        self.stream = np.random.PCG64(seed)

    def noise(self, rows: int, columns: int) -> np.ndarray:
        """Independent values of mean 0 and variance 1; (rows, columns) [1]."""
        raw = self.stream.random_raw(4 * rows * columns) >> np.uint64(11)
        uniform = (raw.astype(np.float64) * 2.0**-53).reshape(4, rows, columns)
        return (uniform.sum(axis=0) - 2.0) * np.sqrt(3.0)

    @staticmethod
    def weights(targets: np.ndarray, sources: np.ndarray, reach: float) -> np.ndarray:
        """Gaussian weights from sources to targets whose squares add up to 1; (targets, sources) [1]."""
        weights = np.exp(-0.5 * ((targets[:, None] - sources[None, :]) / reach) ** 2)
        return weights / np.sqrt((weights**2).sum(axis=1, keepdims=True))

    def passing(self, reach: float, cells_per_day: float) -> np.ndarray:
        """Pattern that moves eastward over the region, a fixed number of cells a day.

        Parameters
        ----------
        reach : float [cells]
            Smoothing length; the correlation of two places falls to 1/e at twice this distance.
        cells_per_day : float [cells d-1]
            How far it moves each day.

        Returns
        -------
        numpy.ndarray (DAYS, ROWS, COLUMNS) [1]
        """
        step = max(reach / 4.0, 1.0)
        margin = 4.0 * reach
        source_rows = np.arange(-margin, ROWS + margin, step)
        source_columns = np.arange(-margin - cells_per_day * DAYS, COLUMNS + margin, step)
        noise = self.noise(source_rows.size, source_columns.size)
        by_row = self.weights(np.arange(ROWS, dtype=float), source_rows, reach) @ noise
        field = np.empty((DAYS, ROWS, COLUMNS))
        for day in range(DAYS):
            columns = np.arange(COLUMNS) - cells_per_day * day
            near = (source_columns >= columns[0] - margin) & (source_columns <= columns[-1] + margin)
            field[day] = by_row[:, near] @ self.weights(columns, source_columns[near], reach).T
        return field

    def still(self, reach: float) -> np.ndarray:
        """Pattern that stays; (ROWS, COLUMNS) [1]."""
        margin = int(np.ceil(4 * reach))
        source_rows, source_columns = np.arange(-margin, ROWS + margin), np.arange(-margin, COLUMNS + margin)
        rows = self.weights(np.arange(ROWS, dtype=float), source_rows, reach)
        columns = self.weights(np.arange(COLUMNS, dtype=float), source_columns, reach)
        return rows @ self.noise(source_rows.size, source_columns.size) @ columns.T


def heat(day_of_year: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """How far each day and cell is inside a heat wave, and by how much it warms the day.

    Returns
    -------
    presence : numpy.ndarray (DAYS, ROWS, COLUMNS) [1]
        0 outside, 1 in the middle at its height.
    warming : numpy.ndarray (DAYS, ROWS, COLUMNS) [K]
    """
    east, north = places()
    presence = np.zeros((day_of_year.size, ROWS, COLUMNS))
    warming = np.zeros_like(presence)
    for wave in HEAT_WAVES:
        # the air warms over four days, goes on warming slowly and is swept away in two
        rise = smooth_step(day_of_year, wave.first - 1, wave.first + 3)
        fall = 1.0 - smooth_step(day_of_year, wave.last - 1, wave.last + 1)
        through = np.clip((day_of_year - wave.first) / (wave.last - wave.first), 0.0, 1.0)
        height = rise * fall * (0.82 + 0.18 * through)
        for day in np.flatnonzero(height > 0):
            share = through[day]
            centre = tuple(
                (1 - share) * start + share * end
                for start, end in zip(wave.centre_at_start, wave.centre_at_end, strict=True)
            )
            now = height[day] * gaussian(east, north, centre, wave.radii)
            presence[day] = np.maximum(presence[day], now)
            warming[day] += wave.strength * now
    return presence, warming


def extraterrestrial_radiation(day_of_year: np.ndarray, latitude: np.ndarray) -> np.ndarray:
    """Radiation on top of the air, FAO-56 Eqs. 21 and 23-25; (DAYS, ROWS, 1) [W m-2]."""
    angle = (2 * np.pi * day_of_year / 365.0)[:, None]
    nearness = 1 + 0.033 * np.cos(angle)
    declination = 0.409 * np.sin(angle - 1.39)
    latitude = np.deg2rad(latitude)[None, :]
    sunset = np.arccos(-np.tan(latitude) * np.tan(declination))
    height = sunset * np.sin(latitude) * np.sin(declination)
    height = height + np.cos(latitude) * np.cos(declination) * np.sin(sunset)
    megajoule_per_day = 24 * 60 / np.pi * 0.0820 * nearness * height
    return megajoule_per_day[:, :, None] * 1e6 / 86400.0


def saturation_pressure(temperature: np.ndarray) -> np.ndarray:
    """FAO-56 Eq. 11; [degC] to [kPa]."""
    return 0.6108 * np.exp(17.27 * temperature / (temperature + 237.3))


def make_weather(land: Land, fields: RandomFields) -> dict[str, np.ndarray]:
    """Daily weather over land and sea, each (DAYS, ROWS, COLUMNS).

    Returns
    -------
    dict of str to numpy.ndarray
        `tasmax`, `tasmin` [degC, whole tenths], `hurs` [%], `rsds` [W m-2], `sfcWind` [m s-1].
    """
    day_of_year = FIRST_DAY_OF_YEAR + np.arange(DAYS, dtype=float)
    _, north = places()
    inland, dryness, elevation = land.inland, land.dryness, land.elevation
    hilliness = smooth_step(elevation, 250.0, 800.0)

    systems = fields.passing(reach=38.0, cells_per_day=30.0)
    systems = 1.6 * np.tanh(systems / 1.6)  # so that no third heat wave comes by chance
    fronts = fields.passing(reach=11.0, cells_per_day=22.0)
    clouds = fields.passing(reach=28.0, cells_per_day=34.0)
    showers = fields.passing(reach=5.0, cells_per_day=17.0)
    puffs = fields.passing(reach=1.6, cells_per_day=13.0)
    winds = fields.passing(reach=24.0, cells_per_day=36.0)
    soils = fields.still(reach=1.8)
    presence, warming = heat(day_of_year)
    warming = warming * (0.35 + 0.65 * inland) * (1 - 0.12 * hilliness)
    calm = 1.0 - 0.65 * presence  # passing systems weaken under a standing high

    season = np.cos(2 * np.pi * (day_of_year - 204.0) / 365.0)[:, None, None]
    sea_season = np.cos(2 * np.pi * (day_of_year - 220.0) / 365.0)[:, None, None]
    summer = 0.5 + 0.5 * season

    darkness = (
        calm * (0.85 * clouds + 0.55 * showers + 0.30 * fronts - 0.30 * systems) + 0.22 * puffs
        + 0.45 * hilliness - 0.80 * dryness - 0.55 * summer - 2.4 * presence - 0.05
    )  # fmt: skip
    cloudiness = 1.0 / (1.0 + np.exp(-1.35 * darkness))
    clear_sky = (0.75 + 2e-5 * elevation) * extraterrestrial_radiation(day_of_year, LATITUDE)  # FAO-56 Eq. 37
    clearness = 0.97 - 0.72 * cloudiness**1.35
    radiation = np.rint(clearness * clear_sky)

    climate = (
        13.6 + 0.5 * inland + 1.2 * dryness - 2.2 * (north - 0.5) - 0.0058 * elevation + 0.22 * soils
        + (1 - inland) * 6.6 * sea_season + inland * (9.9 + 0.7 * dryness) * season
    )  # fmt: skip
    mean = climate + warming + calm * ((1.5 + 0.9 * inland) * systems + 0.9 * fronts)
    mean = mean - 1.6 * (cloudiness - 0.4) * inland * summer
    widest = 4.6 + 7.6 * inland + 2.0 * dryness - 1.6 * hilliness + 0.8 * presence + 0.2 * soils
    daily_range = np.maximum(widest * (0.42 + 0.68 * (clearness - 0.25) / 0.72), 1.5)
    tmax = np.rint(10.0 * (mean + 0.54 * daily_range)) / 10.0
    tmin = np.rint(10.0 * (mean - 0.46 * daily_range)) / 10.0

    # the dew point lies near the night's lowest temperature, further below it where and when it is dry
    depression = (
        0.4 + 1.1 * inland + 4.2 * dryness * (0.4 + 0.6 * summer) + 2.2 * presence * inland
        - 1.6 * (cloudiness - 0.4) + 0.5 * calm * winds + 0.35 * fronts
    )  # fmt: skip
    vapour_pressure = saturation_pressure(tmin - np.maximum(depression, 0.0))
    saturation = 0.5 * (saturation_pressure(tmax) + saturation_pressure(tmin))  # FAO-56 Eqs. 12 and 19
    humidity = np.rint(2.0 * 100.0 * vapour_pressure / saturation) / 2.0

    wind = (4.3 - 1.3 * inland + 1.3 * hilliness + 0.12 * soils) * np.exp(0.27 * calm * winds + 0.08 * fronts)
    wind = np.maximum(wind * (1 - 0.25 * presence), 0.6)
    wind = np.rint(10.0 * wind) / 10.0
    return {"tasmax": tmax, "tasmin": tmin, "hurs": humidity, "rsds": radiation, "sfcWind": wind}
