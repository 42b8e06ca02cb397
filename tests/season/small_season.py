"""Small invented weather and crops whose seasons can be counted by hand, and the way through the package."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
import rioxarray  # noqa: F401  (adds the accessor that writes the CRS)
import xarray as xr
from numpy.typing import ArrayLike

import cropstress as cs
from cropstress.crops import CropProfile, load_crop
from cropstress.errors import InputError
from cropstress.region import Options, co2_of, make_entry, make_plan, time_axis
from cropstress.region.compute import compute
from cropstress.season import layout as at
from cropstress.season.measures import STAGES

COOL, HOT = 25.0, 40.0  # below and above every limit of `short_crop`


def saturation(temperature: ArrayLike) -> np.ndarray:
    """Saturation vapour pressure [kPa]; FAO-56 Eq. 11."""
    celsius = np.asarray(temperature, dtype=float)
    return 0.6108 * np.exp(17.27 * celsius / (celsius + 237.3))


def make_weather(
    highest: ArrayLike,
    lowest: ArrayLike | None = None,
    start: str = "2021-05-01",
    *,
    latitude: float = 40.0,
    missing: Sequence[int] = (),
    light: bool = False,
    radiation: float = 20.0,
    dryness: float = 0.7,
) -> xr.Dataset:
    """Canonical weather of one row of cells.

    Parameters
    ----------
    highest, lowest : (days,) or (days, cells)
        [degC]; the lowest is 12 K below the highest by default.
    start : str
        First day.
    latitude : float
        [degrees]
    missing : sequence of int
        Days without data.
    light : bool
        Whether there are humidity and radiation [MJ m-2 d-1]; the vapour pressure is `dryness` of that at saturation
        at the lowest temperature.
    """
    highest = np.array(highest, dtype=float)
    highest = highest[:, None] if highest.ndim == 1 else highest
    days, cells = highest.shape
    tmin = highest - 12.0 if lowest is None else np.array(lowest, dtype=float).reshape(days, -1) + np.zeros(cells)
    highest[list(missing)] = np.nan
    variables = {"tmax": highest, "tmin": tmin}
    if light:
        variables["vapour_pressure"] = dryness * saturation(tmin)
        variables["radiation"] = np.full((days, cells), radiation)
    time = np.datetime64(start, "ns") + np.arange(days) * np.timedelta64(1, "D")
    dataset = xr.Dataset(
        {name: (("time", "lat", "lon"), values[:, None, :]) for name, values in variables.items()},
        coords={
            "time": time,
            "lat": ("lat", [latitude], {"units": "degrees_north", "standard_name": "latitude"}),
            "lon": ("lon", 10.0 + np.arange(cells), {"units": "degrees_east", "standard_name": "longitude"}),
        },
    )
    return dataset.rio.write_crs("EPSG:4326")


def short_crop(name: str = "maize", stages: Sequence[float] = (3, 4, 5, 3), **values: float) -> CropProfile:
    """A crop of 15 days that flowers as mid-season starts, its window one day to either side, all limits 35 degC.

    The warm-night limit is 20 degC, the limit of dry air 2 kPa. `values` change further values by their names.
    """
    usual = {f"{stage}_days": float(length) for stage, length in zip(STAGES, stages, strict=True)}
    usual |= {"flowering_offset": 0, "flowering_window_start": -1, "flowering_window_end": 1}
    usual |= {"hot_day_limit": 35.0, "flowering_limit": 35.0, "warm_night_limit": 20.0, "dry_air_limit": 2.0}
    return load_crop(name, {key: {"value": value, "source": "invented"} for key, value in (usual | values).items()})


def thermal_crop(
    name: str = "maize", sums: Sequence[float] = (24, 36, 48, 24), days: Sequence[float] = (3, 4, 5, 3), **values: float
) -> CropProfile:
    """A crop whose stages end by growing degree days [K d]; its stages in days are there too."""
    thermal = {f"{stage}_thermal_sum": float(each) for stage, each in zip(STAGES, sums, strict=True)}
    return short_crop(name, days, **thermal, **values)


def assess(weather: xr.Dataset, crop: CropProfile | str, sowing: str = "05-01", **options: object) -> xr.Dataset:
    """The result with all its values."""
    return cs.assess(weather, crop, sowing, **options).load()


def result_or_refusal(compute_result: Callable[[], xr.Dataset]) -> xr.Dataset | str:
    """The result, or the words with which it was refused."""
    try:
        return compute_result()
    except InputError as error:
        return str(error)


def first(result: xr.Dataset, name: str) -> float:
    """A measure of the first season in the first cell."""
    return float(result[name].values[0, 0, 0])


def day_of_year(date: str) -> int:
    """The day of the year, 1 to 366."""
    day = np.datetime64(date, "D")
    return int((day - day.astype("datetime64[Y]").astype("datetime64[D]")).astype(int)) + 1


def daily(
    weather: xr.Dataset,
    crop: CropProfile,
    sowing: int = 0,
    *,
    stages: str = "days",
    acclimation: bool = False,
    block_days: int | None = None,
) -> np.ndarray:
    """What every day gave, (rows of `layout`, days, cells); sown on a day of the time axis, NaN outside the season."""
    axis = time_axis(weather)
    cells = weather.sizes["lat"] * weather.sizes["lon"]
    first_year = int(str(axis.values[0])[:4])
    sown = np.full(cells, float(axis.day_of_year[sowing]))

    def dates(year: int) -> np.ndarray:
        return sown if year == first_year else np.full(cells, np.nan)

    entry, faults = make_entry(
        crop.name, crop.label, crop, dates, axis, co2=co2_of(421.0), stages=stages,
        options=Options(acclimation=acclimation),
    )  # fmt: skip
    assert entry is not None, faults
    plan = make_plan(weather, block_days=block_days)
    computed = compute(weather, [entry], plan, axis, keep_daily=True)
    answer = np.full((at.DAILY, axis.length, cells), np.nan)
    for tile in computed.tiles[entry.name]:
        answer[:, :, tile.cells] = np.concatenate([part[0] for part in tile.daily], axis=0).swapaxes(0, 1)
    return answer
