"""Small weather files made for one test each: 5 days, 3 rows, 4 columns unless said otherwise."""

from __future__ import annotations

import os
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

DAYS, ROWS, COLUMNS = 5, 3, 4
LATITUDE = np.array([40.0, 40.5, 41.0])
LONGITUDE = np.array([10.0, 10.5, 11.0, 11.5])

# name in the file: attributes, value on the first day (rises by 0.1 a day), invented
USUAL = {
    "tasmax": ({"standard_name": "air_temperature", "cell_methods": "time: maximum", "units": "degC"}, 28.0),
    "tasmin": ({"standard_name": "air_temperature", "cell_methods": "time: minimum", "units": "degC"}, 15.0),
    "hurs": ({"standard_name": "relative_humidity", "cell_methods": "time: mean", "units": "%"}, 60.0),
    "rsds": (
        {
            "standard_name": "surface_downwelling_shortwave_flux_in_air",
            "cell_methods": "time: mean",
            "units": "W m-2",
        },
        250.0,
    ),
}

Change = Callable[[xr.Dataset], xr.Dataset | None]


def usual(
    *names: str, days: int = DAYS, start: str = "days since 2021-06-01", calendar: str = "standard"
) -> xr.Dataset:
    """Make a dataset of usual variables; all of them when none is named."""
    dataset = xr.Dataset(
        coords={
            "time": ("time", np.arange(days, dtype=float), {"units": start, "calendar": calendar}),
            "lat": ("lat", LATITUDE, {"units": "degrees_north", "standard_name": "latitude"}),
            "lon": ("lon", LONGITUDE, {"units": "degrees_east", "standard_name": "longitude"}),
        }
    )
    for name in names or USUAL:
        attributes, first = USUAL[name]
        values = np.full((days, ROWS, COLUMNS), first) + 0.1 * np.arange(days)[:, None, None]
        dataset[name] = (("time", "lat", "lon"), values, dict(attributes))
    return dataset


@pytest.fixture(name="usual")
def usual_dataset() -> Callable[..., xr.Dataset]:
    """Return what makes a usual dataset."""
    return usual


@pytest.fixture
def write(tmp_path: Path) -> Callable[..., Path]:
    """Return what writes a dataset into the test's folder."""

    def write_file(dataset: xr.Dataset, name: str = "weather.nc", **options: object) -> Path:
        path = tmp_path / name
        dataset.to_netcdf(path, **{"engine": "netcdf4"} | options)
        return path

    return write_file


@pytest.fixture
def real_data() -> Path:
    """Return the folder of real data, or skip."""
    folder = os.environ.get("CROPSTRESS_REAL_DATA")
    if not folder:
        pytest.skip("CROPSTRESS_REAL_DATA is not set")
    return Path(folder)
