"""Stages, leaf area and the flowering window."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr
from small_season import (
    COOL,
    HOT,
    assess,
    daily,
    day_of_year,
    first,
    make_weather,
    result_or_refusal,
    short_crop,
    thermal_crop,
)

from cropstress.crops import available_crops, load_crop
from cropstress.season import layout as at
from cropstress.season.measures import STAGES

MAY_FIRST = day_of_year("2021-05-01")

# Allen, Pereira, Raes & Smith 1998, FAO Irrigation and Drainage Paper 56, Table 11 (published; the row of
# potato from memory): rows that shipped profiles take.
FAO56_TABLE_11 = {
    "maize": (30, 40, 50, 30),  # maize (grain), April, Spain and California
    "wheat": (20, 25, 60, 30),  # barley, oats, wheat, March/April, 35-45 degrees
    "potato": (25, 30, 45, 30),  # potato, continental climate
    "sunflower": (25, 35, 45, 25),  # sunflower, April/May, Mediterranean and California
    "rice": (30, 30, 60, 30),  # rice, December or May, tropics and Mediterranean
}


def stage_days(result, name: str = "hot_days") -> list[float]:
    """A count per stage, of the first cell."""
    return result[f"{name}_by_stage"].values[0, :, 0, 0].tolist()


@pytest.mark.parametrize("name", available_crops())
def test_stages_have_the_lengths_of_the_profile(name: str) -> None:
    """Every day is hot, so hot days per stage are the stages' lengths; sowing day and last day both count."""
    crop = load_crop(name)
    if name in FAO56_TABLE_11:
        assert crop.days == FAO56_TABLE_11[name]
    length = sum(crop.days)
    result = assess(make_weather(np.full(length + 20, 46.0), start="2020-12-25"), crop, "01-05")
    assert stage_days(result) == list(crop.days)
    assert first(result, "season_days") == first(result, "hot_days") == length
    assert first(result, "sowing_day") == 5
    last = np.datetime64("2021-01-05") + length - 1
    assert first(result, "maturity_day") == day_of_year(str(last))
    assert str(result["season_end"].values[0])[:10] == str(last)
    if crop.flowering_window is None:
        return
    assert first(result, "flowering_day") == 5 + crop.days[0] + crop.days[1] + crop.flowering_offset
    start, end = (crop.days[0] + crop.days[1] + crop.flowering_offset + edge for edge in crop.flowering_window)
    assert first(result, "hot_days_flowering") == min(end, length - 1) - max(start, 0) + 1


def test_stages_by_thermal_time() -> None:
    """A mean of 20 degC gives 12 K d a day above 8: 24, 36, 48 and 24 K d last 2, 3, 4 and 2 days."""
    result = assess(make_weather(np.full(30, 26.0), np.full(30, 14.0)), thermal_crop(hot_day_limit=25.0),
                    stages="thermal_time")  # fmt: skip
    assert stage_days(result) == [2, 3, 4, 2]
    assert first(result, "maturity_day") == MAY_FIRST + 10
    assert first(result, "flowering_day") == MAY_FIRST + 5  # the first day of mid-season
    assert first(result, "growing_degree_days") == pytest.approx(132.0)


@pytest.mark.parametrize(
    ("mean", "gain"), [(7.0, 0.0), (8.0, 0.0), (20.0, 12.0), (34.0, 26.0), (45.0, 26.0)]
)  # base 8, ceiling 34 degC
def test_degree_days_between_base_and_ceiling(mean: float, gain: float) -> None:
    result = assess(make_weather(np.full(15, mean + 3.0), np.full(15, mean - 3.0)), short_crop())
    assert first(result, "growing_degree_days") == pytest.approx(15 * gain)


def test_a_crop_that_gains_nothing_does_not_ripen() -> None:
    """Too cold for any growing degree day, and through a missing day: the season ends with the data."""
    result = assess(make_weather(np.full(40, 10.0)), thermal_crop(), stages="thermal_time")
    assert first(result, "season_days") == 40
    assert np.isnan(first(result, "maturity_day")) and np.isnan(first(result, "flowering_day"))
    assert np.isnan(first(result, "hot_days_flowering"))
    missing = assess(make_weather(np.full(30, 26.0), np.full(30, 14.0), missing=[3]), thermal_crop(),
                     stages="thermal_time")  # fmt: skip
    assert first(missing, "maturity_day") == MAY_FIRST + 11


def leaf_areas(stages: str) -> np.ndarray:
    """Leaf area of 15 days with stages of 3, 4, 5 and 3 days, or of as many times 12 K d."""
    weather = make_weather(np.full(15, 26.0), np.full(15, 14.0), light=True)
    crop = thermal_crop(sums=(36, 48, 60, 36), leaf_area_maximum=4.0, leaf_area_end_share=0.25)
    return daily(weather, crop, stages=stages)[at.DAILY_LEAF_AREA, :, 0]


@pytest.mark.parametrize("stages", ["days", "thermal_time"])
def test_leaf_area_by_stage(stages: str) -> None:
    """At the middle of each day: 0 at sowing, a tenth of 4 after the initial stage, 4 in mid-season, 1 at the end."""
    ends = [0.0, 3.0, 7.0, 12.0, 15.0]
    expected = np.interp(np.arange(15) + 0.5, ends, [0.0, 0.4, 4.0, 4.0, 1.0])
    np.testing.assert_allclose(leaf_areas(stages), expected, rtol=1e-12)


@pytest.mark.parametrize("block_days", [None, 1])
def test_stages_day_by_day(block_days: int | None) -> None:
    weather = make_weather(np.full(20, 26.0), light=True)
    stages = daily(weather, short_crop(), sowing=2, block_days=block_days)[at.DAILY_STAGE, :, 0]
    np.testing.assert_array_equal(stages[2:17], np.repeat(np.arange(4.0), (3, 4, 5, 3)))
    assert np.isnan(stages[:2]).all() and np.isnan(stages[17:]).all()


@pytest.mark.parametrize("thermal", [False, True], ids=["days", "thermal time"])
@pytest.mark.parametrize(("offset", "start", "end"), [(0, -1, 1), (3, -2, 0), (-4, 0, 6), (2, 1, 20), (-7, -3, -1)])
def test_the_flowering_window_moves_with_its_offset(offset: int, start: int, end: int, thermal: bool) -> None:
    """One hot day at a time: it counts if it lies in the window, whether that opened before flowering was known."""
    crop = thermal_crop(
        sums=(36, 48, 60, 36), base_temperature=7.0, ceiling_temperature=19.0, flowering_offset=offset,
        flowering_window_start=start, flowering_window_end=end,
    )  # fmt: skip
    # Every day gains 12 K d: the mean of a hot day is above the ceiling, that of a cool one is at it.
    highest = np.where(np.eye(15, dtype=bool), HOT, COOL)
    result = assess(make_weather(highest, np.where(highest == HOT, 28.0, 13.0)), crop,
                    stages="thermal_time" if thermal else "days")  # fmt: skip
    window = [day for day in range(15) if 7 + offset + start <= day <= 7 + offset + end]
    found = result["hot_days_flowering"].values[0, 0]
    nights = result["warm_nights_flowering"].values[0, 0]
    if window:
        expected = [float(day in window) for day in range(15)]
        assert found.tolist() == expected
        assert nights.tolist() == expected
    else:
        assert np.nan_to_num(found).tolist() == [0.0] * 15
    if 0 <= 7 + offset < 15:
        assert (result["flowering_day"].values[0, 0] == MAY_FIRST + 7 + offset).all()


@pytest.mark.parametrize("block_days", [None, 10])
def test_windows_reach_64_days_back(block_days: int | None) -> None:
    """Thermal time tells on day 70 that the window opened 64 days before; hot days before that do not count."""
    crop = thermal_crop(
        sums=(360, 480, 120, 120), days=(30, 40, 10, 10), base_temperature=7.0, ceiling_temperature=19.0,
        flowering_offset=-14, flowering_window_start=-50, flowering_window_end=2,
    )  # fmt: skip
    highest = np.where(np.eye(100, dtype=bool), HOT, COOL)
    result = assess(make_weather(highest, np.where(highest == HOT, 28.0, 13.0)), crop, stages="thermal_time",
                    block_days=block_days)  # fmt: skip
    expected = [float(6 <= day <= 58) for day in range(100)]
    assert result["hot_days_flowering"].values[0, 0].tolist() == expected
    assert result["warm_nights_flowering"].values[0, 0].tolist() == expected


def test_windows_that_open_still_earlier_are_whole_or_refused() -> None:
    """A window from 80 days before mid-season to its start: 81 hot days are 81, or the profile is refused."""

    def compute_result() -> xr.Dataset:
        crop = thermal_crop(
            sums=(480, 600, 120, 120), days=(40, 50, 10, 10), base_temperature=7.0, ceiling_temperature=19.0,
            flowering_offset=-60, flowering_window_start=-20, flowering_window_end=60,
        )  # fmt: skip
        return assess(make_weather(np.full(120, HOT)), crop, stages="thermal_time")

    result = result_or_refusal(compute_result)
    if isinstance(result, str):
        assert "window" in result
    else:
        assert first(result, "flowering_day") == MAY_FIRST + 30
        assert first(result, "hot_days_flowering") == 81


@pytest.mark.parametrize("name", ["potato", "sugarcane"])
def test_crops_without_flowering_have_missing_not_zero(name: str) -> None:
    result = assess(make_weather(np.full(330, HOT), start="2021-01-01"), name, "01-01")
    assert first(result, "hot_days") > 100
    for measure in (
        "flowering_day", "hot_days_flowering", "hot_days_flowering_if_cooler", "hot_days_flowering_if_warmer",
        "warm_nights_flowering",
    ):  # fmt: skip
        assert np.isnan(first(result, measure)), measure
    assert "flowering_limit" not in result.coords
    assert list(result["stage"].values) == list(STAGES)
