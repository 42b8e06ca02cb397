"""The numbers of the sample run, cell by cell, against what they must add up to and against plain counts."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr

from cropstress.season.measures import CAUSES, SERIES

CROPS = ("maize", "wheat")


def computed(result: xr.Dataset) -> np.ndarray:
    """Return where a result was computed (season, lat, lon)."""
    return result["cell_status"].values == 0


@pytest.mark.parametrize("crop", CROPS)
def test_most_of_the_crop_is_computed(results: dict[str, xr.Dataset], crop: str) -> None:
    assert computed(results[crop]).sum() > 3000


@pytest.mark.parametrize("crop", CROPS)
def test_causes_add_up_to_the_loss_in_every_cell(results: dict[str, xr.Dataset], crop: str) -> None:
    result = results[crop]
    where = computed(result)
    parts = np.stack([result[f"lost_to_heat_by_{cause}"].values[where] for cause in CAUSES])
    lost = result["lost_to_heat"].values[where]
    assert lost.dtype == np.float64
    apart = np.abs(parts.sum(axis=0) - lost)
    assert (apart <= 1e-9 * np.abs(parts).sum(axis=0)).all()
    assert (np.abs(parts).sum(axis=0) > 0.0).sum() > 100


@pytest.mark.parametrize("crop", CROPS)
def test_a_cell_never_above_the_onset_has_lost_exactly_nothing(results: dict[str, xr.Dataset], crop: str) -> None:
    result = results[crop]
    never = computed(result) & (result["hottest_temperature"].values <= float(result["heat_onset"]))
    assert (result["lost_to_heat"].values[never] == 0.0).all()
    for cause in CAUSES:
        assert (result[f"lost_to_heat_by_{cause}"].values[never] == 0.0).all()
    ever = computed(result) & ~never
    assert (result["lost_to_heat"].values[ever] != 0.0).mean() > 0.9
    if crop == "maize":
        assert never.sum() > 50


def days_of_the_season(result: xr.Dataset, weather: xr.Dataset) -> xr.DataArray:
    """Return which days lie between sowing and maturity, both included (time, lat, lon)."""
    day = weather["time"].dt.dayofyear
    sown, ripe = result["sowing_day"].isel(season=0), result["maturity_day"].isel(season=0)
    inside = (day >= sown) & (day <= ripe)
    return inside.transpose("time", "lat", "lon")


@pytest.mark.parametrize("crop", CROPS)
def test_hot_days_are_a_plain_count_of_the_input(
    results: dict[str, xr.Dataset], sample_weather: xr.Dataset, crop: str
) -> None:
    result = results[crop]
    where = computed(result)[0]
    limit = float(result["hot_day_limit"])
    highest = sample_weather["tasmax"]
    if sample_weather["tasmax"].attrs["units"] == "K":
        highest = highest - 273.15
    for shift, name in ((0.0, "hot_days"), (-1.0, "hot_days_if_cooler"), (1.0, "hot_days_if_warmer")):
        hot = highest + shift > limit + 1e-3
        plain = (hot & days_of_the_season(result, sample_weather)).sum("time").values
        np.testing.assert_array_equal(result[name].values[0][where], plain[where], err_msg=name)
    assert result["hot_days"].values[0][where].max() > 10


@pytest.mark.parametrize("crop", CROPS)
def test_season_length_is_that_of_its_days(
    results: dict[str, xr.Dataset], sample_weather: xr.Dataset, crop: str
) -> None:
    result = results[crop]
    where = computed(result)[0]
    plain = days_of_the_season(result, sample_weather).sum("time").values
    np.testing.assert_array_equal(result["season_days"].values[0][where], plain[where])


@pytest.mark.parametrize("crop", CROPS)
@pytest.mark.parametrize("measure", SERIES)
def test_stages_and_ten_days_add_up_to_the_season(results: dict[str, xr.Dataset], crop: str, measure: str) -> None:
    result = results[crop]
    where = computed(result)[0]
    whole = result[measure].values[0][where]
    scale = 1e-9 * (1.0 + np.abs(whole).max())
    for parts in ("by_stage", "by_ten_days"):
        series = result[f"{measure}_{parts}"]
        dimension = next(name for name in ("stage", "ten_days") if name in series.dims)
        summed = series.sum(dimension).isel(season=0).values[where]
        np.testing.assert_allclose(summed, whole, rtol=0.0, atol=scale)


@pytest.mark.parametrize("crop", CROPS)
def test_shares_are_of_uptake_and_loss_together(results: dict[str, xr.Dataset], crop: str) -> None:
    result = results[crop]
    where = computed(result)
    for lost in ("lost_to_heat", "lost_to_photorespiration"):
        share = result[lost] / (result[lost] + result["assimilation"])
        np.testing.assert_allclose(result[f"{lost}_share"].values[where], share.values[where], rtol=1e-12)
