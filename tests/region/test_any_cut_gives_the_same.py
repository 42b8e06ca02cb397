"""Results do not depend on how a run is cut up or shared out: bit for bit."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

import cropstress as cs
from cropstress.region import Options

CUTS = [
    {"tile": (1, 1)},
    {"tile": (7, 5)},
    {"tile": (7, 5), "block_days": 1},
    {"block_days": 1},
    {"block_days": 10},
    {"block_days": 150},
    {"tile": (7, 5), "block_days": 10, "threads": 2},
]
# A C3 crop by days with acclimation, whose mean of 30 days reaches over blocks, and a C4 crop by thermal time, whose
# flowering window is counted from what was remembered.
CROPS = {
    "wheat": {"options": Options(acclimation=True), "stages": "days"},
    "maize": {"options": Options(), "stages": "thermal_time"},
}


def season(weather: xr.Dataset, crop: str, cut: dict[str, object]) -> xr.Dataset:
    """Return a crop's season, computed in a given cut."""
    return cs.assess(weather, crop, sowing="5 April", **CROPS[crop], **({"threads": 1} | cut)).load()


@pytest.fixture(scope="module")
def whole(weather: xr.Dataset) -> dict[str, xr.Dataset]:
    """Return each crop's season with the map in one piece, on one thread."""
    return {crop: season(weather, crop, {}) for crop in CROPS}


def test_there_is_something_to_compare(whole: dict[str, xr.Dataset]) -> None:
    for result in whole.values():
        assert (result["assimilation"] > 0.0).sum() > 50
        assert (result["lost_to_heat"] > 0.0).any()
        assert (result["hot_days"] > 0).any()
        assert np.isnan(result["assimilation"]).any()  # the sea


@pytest.mark.parametrize("crop", CROPS)
@pytest.mark.parametrize("cut", CUTS, ids=str)
def test_same_bits_in_every_cut(
    whole: dict[str, xr.Dataset], weather: xr.Dataset, crop: str, cut: dict[str, object]
) -> None:
    result = season(weather, crop, cut)
    assert set(result.data_vars) == set(whole[crop].data_vars)
    for name, values in whole[crop].data_vars.items():
        np.testing.assert_array_equal(result[name].values, values.values, err_msg=str(name))


@pytest.mark.parametrize("crop", CROPS)
def test_a_cell_does_not_see_its_neighbours(whole: dict[str, xr.Dataset], weather: xr.Dataset, crop: str) -> None:
    rows, columns = weather["tmax"].dims[1:]
    for row, column in ((0, 8), (4, 5), (9, 3)):
        place = {rows: slice(row, row + 1), columns: slice(column, column + 1)}
        alone = season(weather.isel(place), crop, {})
        for name, values in whole[crop].isel(place).data_vars.items():
            np.testing.assert_array_equal(alone[name].values, values.values, err_msg=str(name))
