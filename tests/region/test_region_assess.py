"""`assess` promises everything and reads nothing before it is asked; then one walk gives all measures."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import dask
import numpy as np
import pytest
import xarray as xr

import cropstress as cs
from cropstress.crops import CropProfile
from cropstress.errors import InputError
from cropstress.places import read_sowing
from cropstress.region import Entry, Options, co2_of, compute, compute_results, make_entry, make_plan, time_axis

ShortCrop = Callable[..., CropProfile]


def forbidden(*_arguments: Any, **_keywords: Any) -> None:
    raise AssertionError("something was read or computed")


def test_nothing_is_read_or_computed_before_it_is_asked_for(
    weather: xr.Dataset, short_crop: ShortCrop, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(compute, "load_block", forbidden)
    lazy = weather.chunk(time=20)
    with dask.config.set(scheduler=forbidden):
        result = cs.assess(lazy, short_crop("wheat"), "3 June")
        chosen = result[["hot_days", "lost_to_heat"]].isel(lat=slice(2, 5)).mean("lon")
        assert all(result[name].chunks is not None for name in result.data_vars)
        assert result["lost_to_heat_by_ten_days"].dims == ("season", "ten_days", "lat", "lon")
        assert "hot_days" in repr(result)
        with pytest.raises(AssertionError, match="read or computed"):
            chosen.compute()


def test_one_walk_gives_all_measures(
    weather: xr.Dataset, short_crop: ShortCrop, monkeypatch: pytest.MonkeyPatch
) -> None:
    loads: list[int] = []
    load = compute.load_block

    def loading(dataset: Any, axis: Any, ground: Any, first: int, after: int) -> Any:
        loads.append(first)
        return load(dataset, axis, ground, first, after)

    monkeypatch.setattr(compute, "load_block", loading)
    lazy = weather.chunk(time=35)
    result = cs.assess(lazy, short_crop("wheat"), "3 June")
    assert loads == []
    result.compute()
    assert sorted(loads) == [0, 35]


@pytest.mark.parametrize(
    ("crop", "stages", "canopy", "acclimation"),
    [
        ("wheat", "days", "sunlit_shaded", True),
        ("maize", "thermal_time", "sunlit_shaded", False),
        ("soybean", "days", "leaf", False),
    ],
)
def test_lazy_result_is_the_computed_one(
    weather: xr.Dataset,
    area: np.ndarray,
    short_crop: ShortCrop,
    crop: str,
    stages: str,
    canopy: str,
    acclimation: bool,
) -> None:
    """Also the coordinates that are only known at the end, as the last day of a season by thermal time."""
    profile = short_crop(crop, stages)
    options = Options(canopy=canopy, acclimation=acclimation)
    result = cs.assess(
        weather, profile, "3 June", 416.4, years=[2021], area=area, stages=stages, options=options,
        tile=(5, 4), block_days=9, threads=2,
    )  # fmt: skip
    outline = {str(name): (result[name].dims, result[name].shape, result[name].dtype) for name in result.variables}
    found = result.compute()
    assert outline == {str(name): (found[name].dims, found[name].shape, found[name].dtype) for name in found.variables}
    entry = entry_of(weather, profile, area, stages, options)
    expected = compute_results(weather, [entry], options, {}, plan=make_plan(weather))[0][0]
    xr.testing.assert_identical(found, expected)
    last = (found["season_end"].values[0] - np.datetime64("2021-06-03")) / np.timedelta64(1, "D") + 1
    assert last == np.nanmax(found["season_days"])


def entry_of(weather: xr.Dataset, profile: CropProfile, area: np.ndarray, stages: str, options: Options) -> Entry:
    """The crop as a run file would lay it on the weather."""
    entry, faults = make_entry(
        profile.name, profile.label, profile, read_sowing("3 June", weather).dates, time_axis(weather), [2021],
        area=area, co2=co2_of(416.4), stages=stages, options=options,
    )  # fmt: skip
    assert entry is not None and not faults
    return entry


def test_unknown_crop_and_season_outside_the_data_are_told_at_once(weather: xr.Dataset) -> None:
    with pytest.raises(InputError, match="maize"):
        cs.assess(weather, "maise", "3 June")
    with pytest.raises(InputError, match="2021-06-01 to 2021-08-09"):
        cs.assess(weather, "wheat", "1 March")
