"""Whole runs on real grids: they end well, count as one counts by hand, and no leaf does what no leaf can.

stehekin_1949: mountains in the north-west of the USA, test data of the University of Washington Hydro group's
MetSim; daily, used as it is. walnut_gulch_2008: south-east Arizona, Livneh et al. 2015, Scientific Data 2:150042,
disaggregated to 3 hours, reduced to days here.
"""

from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from cropstress.day import block
from cropstress.job import Job, Outcome, prepare, run
from cropstress.region import make_plan
from cropstress.region.compute import compute
from cropstress.season.measures import CAUSES, CELL_STATUS

#: A leaf that is kept cool or heated by more than this is a fault of the model [K]; common practice for well
#: watered leaves in moving air.
LARGEST_EXCESS = 8.0

# The files name no height; both products take their wind from a reanalysis at 10 m (from memory).
STEHEKIN = """\
title = "Stehekin 1949"
seasons.years = 1949
weather.files = "{grids}/stehekin_1949/passthrough.nc"
weather.variables.wind.height = 10.0
places.elevation = {{ file = "{grids}/stehekin_1949/stehekin.nc", name = "elev" }}
air.co2 = 310.0                  # ice cores for the middle of the century, from memory
[[crops]]
name = "wheat"
sowing = "5 May"                 # spring wheat when the snow has gone: common practice
"""
WALNUT_GULCH = """\
title = "Walnut Gulch 2008"
seasons.years = 2008
weather.files = "daily.nc"
weather.variables.wind.height = 10.0
places.elevation = {{ file = "{grids}/walnut_gulch_2008/domain.WalnutGulch.0.0625_deg.nc", name = "elev" }}
air.co2 = 385.6                  # annual mean of 2008 at Mauna Loa, NOAA, from memory
[[crops]]
name = "sorghum"
sowing = "15 May"                # common practice
[[crops]]
name = "cotton"
sowing = "20 April"              # common practice
"""


@dataclass
class Real:
    """A run on real grids, and the highest temperatures of its days [degC], read without this package."""

    job: Job
    outcome: Outcome
    tmax: xr.DataArray

    def result(self, crop: str) -> xr.Dataset:
        return next(result for result in self.outcome.results if result.attrs["crop"] == crop)


def as_posix(path: Path) -> str:
    return path.as_posix()


@pytest.fixture(scope="session")
def stehekin(real_grids: Path, tmp_path_factory: pytest.TempPathFactory) -> Real:
    """The mountain grid as it is, with spring wheat."""
    path = tmp_path_factory.mktemp("stehekin") / "run.toml"
    path.write_text(STEHEKIN.format(grids=as_posix(real_grids)), encoding="utf-8")
    with xr.open_dataset(real_grids / "stehekin_1949" / "passthrough.nc") as dataset:
        tmax = dataset["t_max"].load()
    return Real(prepare(path), run(path), tmax)


@pytest.fixture(scope="session")
def walnut_gulch(real_grids: Path, tmp_path_factory: pytest.TempPathFactory) -> Real:
    """The hot grid reduced from 3 hours to days, with sorghum and cotton."""
    folder = tmp_path_factory.mktemp("walnut")
    (source,) = (real_grids / "walnut_gulch_2008").glob("livneh_*.nc")
    with xr.open_dataset(source) as dataset:
        # The stamp is the start of a step, in local time, so a day's eight steps bear its date
        days = dataset.resample(time="1D")
        daily = xr.Dataset(
            {
                "tmax": days.max()["temp"].assign_attrs(cell_methods="time: maximum"),
                "tmin": days.min()["temp"].assign_attrs(cell_methods="time: minimum"),
                "vapor_pressure": days.mean()["vapor_pressure"].assign_attrs(
                    standard_name="water_vapor_partial_pressure_in_air", cell_methods="time: mean"
                ),
                "shortwave": days.mean()["shortwave"].assign_attrs(
                    standard_name="surface_downwelling_shortwave_flux_in_air", cell_methods="time: mean"
                ),
                # Labelled mm s-1, which would be no wind at all
                "wind": days.mean()["wind"].assign_attrs(
                    standard_name="wind_speed", units="m s-1", cell_methods="time: mean"
                ),
                "pressure": days.mean()["air_pressure"].assign_attrs(
                    standard_name="surface_air_pressure", cell_methods="time: mean"
                ),
            }
        ).load()
        for axis, unit in (("lat", "degrees_north"), ("lon", "degrees_east")):
            daily[axis].attrs["units"] = unit
    assert daily.sizes["time"] == 366
    daily.to_netcdf(folder / "daily.nc")
    path = folder / "run.toml"
    path.write_text(WALNUT_GULCH.format(grids=as_posix(real_grids)), encoding="utf-8")
    return Real(prepare(path), run(path), daily["tmax"])


CROPS = [("stehekin", "wheat"), ("walnut_gulch", "sorghum"), ("walnut_gulch", "cotton")]


@pytest.fixture(params=CROPS, ids=[crop for _, crop in CROPS])
def grown(request: pytest.FixtureRequest) -> tuple[Real, str]:
    """A real run and one of its crops."""
    grid, crop = request.param
    return request.getfixturevalue(grid), crop


def where_computed(result: xr.Dataset) -> np.ndarray:
    return result["cell_status"].values[0] == CELL_STATUS["computed"]


def test_run_ends_well_and_leaves_out_what_is_masked(grown: tuple[Real, str]) -> None:
    real, crop = grown
    there = np.isfinite(real.tmax.values).all(axis=0)
    assert np.array_equal(where_computed(real.result(crop)), there)
    assert (real.outcome.folder / "grids" / f"{crop}-observed.nc").is_file()
    assert (real.outcome.folder / "maps" / f"{crop}-{real.result(crop).season.item()}-observed-hot_days.tif").is_file()
    assert f"cells: {there.sum()} computed" in real.outcome.summary


def test_hot_days_equal_a_plain_count(grown: tuple[Real, str]) -> None:
    real, crop = grown
    result = real.result(crop).isel(season=0)
    days = real.tmax["time"].dt.dayofyear
    within = (days >= result["sowing_day"]) & (days <= result["maturity_day"])
    hot = real.tmax.astype(float) > float(result["hot_day_limit"]) + 1e-3
    plain = (hot & within).sum("time")
    where = where_computed(real.result(crop))
    assert np.array_equal(result["hot_days"].values[where], plain.values[where])
    assert (result["hot_days"].values[where] <= result["hot_days_if_warmer"].values[where]).all()


def test_no_season_assimilates_less_than_nothing(grown: tuple[Real, str]) -> None:
    real, crop = grown
    result = real.result(crop)
    where = where_computed(result)
    assert (result["assimilation"].values[0][where] > 0.0).all()
    assert (result["lost_to_photorespiration"].values[0][where] > 0.0).all()
    parts = np.stack([result[f"lost_to_heat_by_{cause}"].values[0][where] for cause in CAUSES])
    lost = result["lost_to_heat"].values[0][where]
    assert (np.abs(parts.sum(axis=0) - lost) <= 1e-9 * np.abs(parts).sum(axis=0)).all()


def test_sunlit_leaf_stays_near_the_air(grown: tuple[Real, str]) -> None:
    """On every moment of every day on which there are leaves."""
    real, crop = grown
    (entry,) = [each for each in real.job.entries if each.name == crop]
    plan = make_plan(real.job.dataset)
    states = compute(real.job.dataset, [entry], plan, real.job.axis, keep_daily=True).tiles[crop]
    daily = np.concatenate([np.concatenate(state.daily, axis=1)[0] for state in states], axis=-1)
    warmest, coolest = daily[:, block.LARGEST_LEAF_EXCESS], daily[:, block.SMALLEST_LEAF_EXCESS]
    leaves = np.isfinite(warmest) & (warmest > -1e29)
    assert leaves.sum() > 100 * where_computed(real.result(crop)).sum()
    assert warmest[leaves].max() <= LARGEST_EXCESS
    assert coolest[leaves].min() >= -LARGEST_EXCESS


def test_hot_grid_has_hot_days_and_the_cool_one_few(stehekin: Real, walnut_gulch: Real) -> None:
    """As the temperatures themselves say: at most 30.2 and 39.4 degC."""
    assert np.nanmax(stehekin.result("wheat")["hot_days"]) == 0
    assert np.nanmax(stehekin.result("wheat")["hottest_temperature"]) < 30.2
    assert np.nanmax(walnut_gulch.result("cotton")["hot_days"]) > 20
    assert np.nanmax(walnut_gulch.result("cotton")["lost_to_heat_share"]) > np.nanmax(
        stehekin.result("wheat")["lost_to_heat_share"]
    )
