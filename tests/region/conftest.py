"""A corner of the sample grids, small enough to be walked many times."""

from __future__ import annotations

from pathlib import Path

import pytest
import xarray as xr

import cropstress as cs

SAMPLE_GRIDS = Path(__file__).parents[2] / "sample_grids"


@pytest.fixture(scope="session")
def weather() -> xr.Dataset:
    """Return 10 x 9 cells with coast and hot interior, 150 days, lazy."""
    whole = cs.open_weather([str(SAMPLE_GRIDS / "*_2021.nc"), str(SAMPLE_GRIDS / "elevation.nc")])
    rows, columns = whole["tmax"].dims[1:]
    return whole.isel({rows: slice(20, 50, 3), columns: slice(14, 77, 7), "time": slice(0, 150)})
