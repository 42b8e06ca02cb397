"""A small weather grid and what lies on it: 3 rows of half a degree from 40 N, 4 columns from 10 E."""

from __future__ import annotations

import os
from collections.abc import Callable
from pathlib import Path

import geopandas
import numpy as np
import pytest
import shapely
import xarray as xr

from cropstress.weather import open_weather

LATITUDE = np.array([40.0, 40.5, 41.0])
LONGITUDE = np.array([10.0, 10.5, 11.0, 11.5])


def frame(latitude: np.ndarray = LATITUDE, longitude: np.ndarray = LONGITUDE) -> xr.Dataset:
    """Make an empty dataset on the grid."""
    return xr.Dataset(
        coords={
            "lat": ("lat", latitude, {"units": "degrees_north", "standard_name": "latitude"}),
            "lon": ("lon", longitude, {"units": "degrees_east", "standard_name": "longitude"}),
        }
    )


def make_weather(folder: Path, calendar: str = "standard", **grid: np.ndarray) -> xr.Dataset:
    """Write two variables of invented weather and open them as the canonical dataset."""
    dataset = frame(**grid)
    shape = (2, dataset.sizes["lat"], dataset.sizes["lon"])
    dataset = dataset.assign_coords(
        time=("time", [0.0, 1.0], {"units": "days since 2021-06-01", "calendar": calendar})
    )
    for name, method, value in (("tasmax", "maximum", 28.0), ("tasmin", "minimum", 15.0)):
        attributes = {"standard_name": "air_temperature", "units": "degC", "cell_methods": f"time: {method}"}
        dataset[name] = (("time", "lat", "lon"), np.full(shape, value), attributes)
    path = folder / f"weather_{calendar}.nc"
    dataset.to_netcdf(path)
    return open_weather(path)


@pytest.fixture
def weather(tmp_path: Path) -> xr.Dataset:
    """Return the canonical weather."""
    return make_weather(tmp_path)


@pytest.fixture
def weather_of(tmp_path: Path) -> Callable[..., xr.Dataset]:
    """Return what makes canonical weather with a calendar or grid of its own."""

    def make(calendar: str = "standard", **grid: np.ndarray) -> xr.Dataset:
        return make_weather(tmp_path, calendar, **grid)

    return make


@pytest.fixture
def write_grid(tmp_path: Path) -> Callable[..., str]:
    """Return what writes one grid into a file of the test's folder and names it."""

    def write(
        values: np.ndarray | float,
        units: str | None = "1",
        name: str = "grid",
        file: str = "grid.nc",
        latitude: np.ndarray = LATITUDE,
        **attributes: str,
    ) -> str:
        dataset = frame(latitude)
        said = attributes | ({} if units is None else {"units": units})
        dataset[name] = (
            ("lat", "lon"),
            np.broadcast_to(np.asarray(values, dtype=float), (3, 4)).copy(),
            said,
        )
        dataset.to_netcdf(tmp_path / file)
        return file

    return write


@pytest.fixture
def write_districts(tmp_path: Path) -> Callable[..., str]:
    """Return what writes districts: two columns are 0101, the next is 0203, the last is none."""

    def write(
        codes: tuple[object, ...] = ("0101", "0203"),
        crs: str | None = "EPSG:4326",
        file: str = "districts.gpkg",
        shapes: list[shapely.Geometry] | None = None,
    ) -> str:
        outlines = shapes or [shapely.box(9.5, 39.5, 10.75, 41.5), shapely.box(10.75, 39.5, 11.25, 41.5)]
        table = geopandas.GeoDataFrame(
            {"code": list(codes), "title": [f"District {code}" for code in codes]},
            geometry=outlines,
            crs="EPSG:4326",
        )
        table = table.set_crs(None, allow_override=True) if crs is None else table.to_crs(crs)
        table.to_file(tmp_path / file)
        return file

    return write


@pytest.fixture
def real_data() -> Path:
    """Return the folder of real data, or skip."""
    folder = os.environ.get("CROPSTRESS_REAL_DATA")
    if not folder:
        pytest.skip("CROPSTRESS_REAL_DATA is not set")
    return Path(folder)
