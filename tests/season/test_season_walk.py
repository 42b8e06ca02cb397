"""Seasons in time: cut short, with gaps, several of them, over New Year, and their sums."""

from __future__ import annotations

import numpy as np
import pytest
import xarray as xr
from numpy.typing import ArrayLike
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

from cropstress.crops import load_crop
from cropstress.leaf.parameters import leaf_record
from cropstress.region import Options, co2_of, make_entry, time_axis
from cropstress.region.compute import begin_tile
from cropstress.season import layout as at
from cropstress.season.advance import advance
from cropstress.season.measures import CELL_STATUS, MEASURES, SERIES
from cropstress.season.parameters import season_record
from cropstress.weather import read_weather

MAY_FIRST = day_of_year("2021-05-01")
SERIES_OF_GAS = [name for name in SERIES if MEASURES[name].gas_exchange]


def random_weather(days: int = 60, cells: int = 5, warmer: ArrayLike = 0.0) -> xr.Dataset:
    """Warm and hot days, each tenth missing; `warmer` is added to them [K], for each cell."""
    draw = np.random.default_rng(days)
    highest = draw.uniform(22.0, 44.0, (days, cells))
    highest[draw.random(highest.shape) < 0.1] = np.nan
    highest += np.asarray(warmer)
    return make_weather(highest, highest - draw.uniform(5.0, 18.0, highest.shape), light=True)


def test_a_season_cut_short_by_the_end_of_the_data() -> None:
    """Nine of 15 days: valid, counted to the last day of the data in mid-season, without maturity."""
    result = assess(make_weather(np.full(11, HOT)), short_crop(), "05-03")
    assert first(result, "cell_status") == CELL_STATUS["computed"]
    assert first(result, "season_days") == first(result, "hot_days") == 9
    assert np.isnan(first(result, "maturity_day"))
    assert result["hot_days_by_stage"].values[0, :, 0, 0].tolist() == [3, 4, 2, 0]
    assert str(result["season_end"].values[0])[:10] == "2021-05-11"
    assert result.attrs["last_day_of_data"] == "2021-05-11"
    assert first(result, "flowering_day") == MAY_FIRST + 2 + 7
    assert first(result, "hot_days_flowering") == 3


def test_flowering_not_reached_is_missing() -> None:
    """Cut on the last day before the window opens it is missing; with its first day it is a count."""
    before, opened = (assess(make_weather(np.full(days, HOT)), short_crop()) for days in (6, 7))
    assert np.isnan(first(before, "hot_days_flowering"))
    assert first(opened, "hot_days_flowering") == 1


def test_the_stage_of_a_season_cut_short_can_be_read() -> None:
    """Cut on its ninth day it is in mid-season: a variable, a coordinate or an attribute of the result says so."""
    result = assess(make_weather(np.full(11, HOT)), short_crop(), "05-03")
    said = {**result.data_vars, **result.coords, **result.attrs}
    stages = {name: value for name, value in said.items() if "stage" in name and "by_stage" not in name}
    del stages["stage"]
    assert stages, "nothing tells the stage that a season cut short has reached"
    assert {np.asarray(value).ravel()[0] for value in stages.values()} <= {2, "mid"}


def test_missing_days_are_counted_and_skipped() -> None:
    """Two days in fifteen; every sum is that of the days there are, and the stages go on."""
    options = Options(allowed_missing=0.2)
    result = assess(make_weather(np.full(15, HOT), missing=[1, 9]), short_crop(), options=options)
    assert first(result, "missing_days") == 2
    assert result["missing_days_by_stage"].values[0, :, 0, 0].tolist() == [1, 0, 1, 0]
    assert result["missing_days_by_ten_days"].values[0, :, 0, 0].tolist() == [2, 0]
    assert first(result, "hot_days") == 13
    assert first(result, "season_days") == 15
    assert first(result, "growing_degree_days") == pytest.approx(13 * (34.0 - 8.0))
    assert first(result, "maturity_day") == MAY_FIRST + 14


@pytest.mark.parametrize("name", ["maize", "wheat"])
def test_a_missing_day_takes_away_only_its_own(name: str) -> None:
    """The sums with a gap are the sums of the days without it, but for the night after, which starts afresh."""
    temperature = np.full(15, 33.0)
    whole = daily(make_weather(temperature, temperature, light=True), short_crop(name))
    gap = daily(make_weather(temperature, temperature, light=True, missing=[6]), short_crop(name))
    there = np.arange(15) != 6
    np.testing.assert_array_equal(gap[:, there], whole[:, there])
    assert np.isnan(gap[: at.DAILY_STAGE, 6]).all()


@pytest.mark.parametrize(
    ("missing", "status"), [(1, "computed"), (3, "computed"), (4, "too_many_missing_days"), (15, "no_weather_data")]
)
def test_a_cell_with_too_many_missing_days_is_blank(missing: int, status: str) -> None:
    """A fifth of 15 days may be missing: 3 are allowed, 4 are too many. Its neighbour is not touched."""
    highest = np.full((15, 2), HOT)
    highest[:missing, 0] = np.nan
    result = assess(make_weather(highest), short_crop(), options=Options(allowed_missing=0.2))
    left, right = result["cell_status"].values[0, 0]
    assert (left, right) == (CELL_STATUS[status], CELL_STATUS["computed"])
    assert np.isnan(first(result, "hot_days")) == (status != "computed")
    assert np.isnan(result["hot_days_by_ten_days"].values[0, :, 0, 0]).all() == (status != "computed")
    assert result["hot_days"].values[0, 0, 1] == 15


def test_several_seasons_in_one_run() -> None:
    """Three years, the second without a hot day; each season is that of its year alone, also the CO2."""
    start = np.datetime64("2020-04-20")
    days = int((np.datetime64("2022-06-30") - start).astype(int))
    dates = start + np.arange(days)
    years = dates.astype("datetime64[Y]").astype(int) + 1970
    highest = np.where(years == 2021, COOL, np.where(years == 2020, HOT, HOT - 1.0))
    weather = make_weather(highest, start=str(start), light=True, radiation=9.0)
    co2 = {2020: 400.0, 2021: 410.0, 2022: 420.0}
    result = assess(weather, short_crop(), "05-01", co2=co2)
    assert result["season"].values.tolist() == [2020, 2021, 2022]
    assert result["hot_days"].values[:, 0, 0].tolist() == [15, 0, 15]
    assert result["hottest_temperature"].values[:, 0, 0].tolist() == [HOT, COOL, HOT - 1.0]
    assert result["sowing_day"].values[:, 0, 0].tolist() == [122, 121, 121]  # 2020 is a leap year
    starts = result["season_start"].values.astype("datetime64[D]").astype(str).tolist()
    assert starts == ["2020-05-01", "2021-05-01", "2022-05-01"]
    for number, year in enumerate((2020, 2021, 2022)):
        alone = assess(weather.sel(time=str(year)), short_crop(), "05-01", co2=co2[year], years=[year])
        for name in MEASURES:
            np.testing.assert_allclose(result[name].values[number], alone[name].values[0], rtol=1e-12, err_msg=name)


def test_a_season_over_new_year_has_the_year_of_its_harvest() -> None:
    """Sown on 25 December: seven days of the old year and eight of the new one; ten days of both."""
    highest = np.where(np.arange(40) < 12, HOT, COOL)  # from 20 December, hot to 31 December
    result = assess(make_weather(highest, start="2021-12-20"), short_crop(), "12-25")
    assert result["season"].values.tolist() == [2022]
    assert first(result, "season_days") == 15
    assert first(result, "hot_days") == 7
    assert first(result, "sowing_day") == day_of_year("2021-12-25")
    assert first(result, "maturity_day") == 8
    assert first(result, "first_hot_day") == day_of_year("2021-12-25")
    assert first(result, "last_hot_day") == day_of_year("2021-12-31")
    starts = result["ten_days_start"].values[0].astype("datetime64[D]").astype(str).tolist()
    assert starts == ["2021-12-21", "2022-01-01"]
    assert result["hot_days_by_ten_days"].values[0, :, 0, 0].tolist() == [7, 0]


def test_a_year_long_run_of_winter_crops_counts_each_season_once() -> None:
    """Two harvests of a crop sown in December, from one series of hot days."""
    days = int((np.datetime64("2023-02-01") - np.datetime64("2021-12-01")).astype(int))
    result = assess(make_weather(np.full(days, HOT), start="2021-12-01"), short_crop(), "12-25")
    assert result["season"].values.tolist() == [2022, 2023]
    assert result["hot_days"].values[:, 0, 0].tolist() == [15, 15]


@pytest.mark.parametrize("name", ["maize", "wheat"])
@pytest.mark.parametrize("stages", ["days", "thermal_time"])
def test_sums_by_day_ten_days_stage_and_season_agree(name: str, stages: str) -> None:
    crop = thermal_crop(name, sums=(150, 200, 300, 150), base_temperature=5.0, ceiling_temperature=30.0)
    crop = crop if stages == "thermal_time" else short_crop(name, (8, 12, 17, 9))
    weather = random_weather()
    result = assess(weather, crop, "05-06", stages=stages, block_days=7, options=Options(allowed_missing=1.0))
    by_day = daily(weather, crop, sowing=5, stages=stages)
    assert (result["lost_to_heat"] > 0.01).all()
    for row, measure in enumerate(SERIES):
        season = result[measure].values[0, 0]
        size = np.abs(season) + 1e-30
        for kind in ("by_stage", "by_ten_days"):
            steps = result[f"{measure}_{kind}"].values[0, :, 0]
            assert (np.abs(steps.sum(axis=0) - season) <= 1e-9 * size).all(), (measure, kind)
            assert len(steps) > 1
        if measure in SERIES_OF_GAS:
            assert (np.abs(np.nansum(by_day[row], axis=0) - season) <= 1e-9 * size).all(), measure


@pytest.mark.parametrize("name", ["maize", "wheat"])
def test_the_causes_of_a_season_add_up(name: str) -> None:
    """To 1e-12 of their size, in every cell, in every ten days; a cell below the onset has lost exactly 0."""
    weather = random_weather()
    weather["tmax"][:, 0, 2] = np.minimum(weather["tmax"][:, 0, 2], 25.0)
    weather["tmin"][:, 0, 2] = np.minimum(weather["tmin"][:, 0, 2], weather["tmax"][:, 0, 2] - 4.0)
    saturated = 0.6108 * np.exp(17.27 * weather["tmin"] / (weather["tmin"] + 237.3))
    weather["vapour_pressure"] = np.minimum(weather["vapour_pressure"], saturated)
    result = assess(weather, short_crop(name, (8, 12, 17, 9)), options=Options(allowed_missing=1.0))
    for ending in ("", "_by_stage", "_by_ten_days"):
        causes = [result[f"lost_to_heat_by_{cause}{ending}"].values for cause in
                  ("photorespiration", "stomata", "enzymes", "respiration")]  # fmt: skip
        lost = result[f"lost_to_heat{ending}"].values
        assert (np.abs(sum(causes) - lost) <= 1e-12 * sum(np.abs(cause) for cause in causes)).all()
        assert (lost[..., 2] == 0.0).all() and all((cause[..., 2] == 0.0).all() for cause in causes)
        assert (np.delete(lost, 2, axis=-1).sum(axis=tuple(range(1, lost.ndim - 1))) > 0.0).all()
    assert result["leading_cause"].values[0, 0, 2] == 0
    assert first(result, "lost_to_heat_share") == pytest.approx(
        first(result, "lost_to_heat") / (first(result, "assimilation") + first(result, "lost_to_heat"))
    )


def test_hot_leaf_days_are_days_of_the_hottest_sunlit_leaf() -> None:
    crop = short_crop("wheat", (8, 12, 17, 9), hot_leaf_limit=34.0)
    weather = random_weather()
    result = assess(weather, crop, options=Options(allowed_missing=1.0))
    leaf = daily(weather, crop)[at.block.HIGHEST_LEAF]
    expected = (leaf > 34.0 + 1e-3).sum(axis=0)
    np.testing.assert_array_equal(result["hot_leaf_days"].values[0, 0], expected)
    assert expected.min() > 3 and expected.max() < 40


def means(weather: xr.Dataset) -> np.ndarray:
    """Mean of highest and lowest temperature, (days, cells)."""
    return 0.5 * (weather["tmax"] + weather["tmin"]).values[:, 0]


@pytest.mark.parametrize("block_days", [None, 7])
def test_acclimation_follows_the_last_thirty_days(block_days: int | None) -> None:
    """The mean of those there are, today the last of them, between 11 and 35 degC; fewer at the start of the data.

    Kattge & Knorr 2007: growth temperature is that of the month before, their data 11 to 35 degC.
    """
    weather = random_weather(80, 3, [0.0, -30.0, 12.0])
    crop = short_crop("wheat", (15, 20, 25, 15))
    found = daily(weather, crop, sowing=3, acclimation=True, block_days=block_days)[at.DAILY_GROWTH_TEMPERATURE]
    day_means = means(weather)
    for day in range(3, 78):
        with np.errstate(all="ignore"):
            expected = np.clip(np.nanmean(day_means[max(day - 29, 0) : day + 1], axis=0), 11.0, 35.0)
        np.testing.assert_allclose(found[day], expected, rtol=1e-12)
    assert (found[3:78, 1] == 11.0).all() and (found[40:78, 2] > 34.0).all()


def test_acclimation_is_off_by_default_and_matters() -> None:
    weather = random_weather(80, 3)
    crop = short_crop("wheat", (15, 20, 25, 15))
    fixed = daily(weather, crop, sowing=3)[at.DAILY_GROWTH_TEMPERATURE, 3:78]
    assert (fixed == crop.number("growth_temperature")).all()
    usual, used_to = (
        assess(weather, crop, options=Options(acclimation=on, allowed_missing=1.0)) for on in (False, True)
    )
    assert (used_to["lost_to_heat"] < usual["lost_to_heat"]).all()
    np.testing.assert_array_equal(usual["hot_days"], used_to["hot_days"])


def test_temperatures_alone_give_all_that_needs_only_them(tmp_path) -> None:
    """The same numbers as with humidity and radiation; the rest is missing everywhere, and named."""
    whole = random_weather()
    options = Options(allowed_missing=1.0)
    crop = short_crop(stages=(8, 12, 17, 9))
    alone = whole[["tmax", "tmin"]]
    result, full = (assess(each, crop, options=options) for each in (alone, whole))
    for name, measure in MEASURES.items():
        if not measure.gas_exchange:
            np.testing.assert_array_equal(result[name], full[name], err_msg=name)
        elif name == "leading_cause":
            assert (result[name] == -1).all()
        else:
            assert np.isnan(result[name].values).all() and not np.isnan(full[name].values).all(), name
    for name in SERIES_OF_GAS:
        assert np.isnan(result[f"{name}_by_stage"].values).all()
        assert np.isnan(result[f"{name}_by_ten_days"].values).all()
    assert (result["cell_status"] == CELL_STATUS["computed"]).all()
    said = " ".join(read_weather(temperature_file(alone, tmp_path)).not_computed)
    for words in ("assimilation", "losses", "causes", "leaf temperatures", "hot-leaf days", "dry-air days", "deficit"):
        assert words in said


def temperature_file(weather: xr.Dataset, folder, *names: str) -> str:
    """Write temperatures, and further variables of given CF names, to a file."""
    file = weather[["tmax", "tmin"]].drop_vars("spatial_ref")
    for name, method in (("tmax", "maximum"), ("tmin", "minimum")):
        file[name].attrs = {
            "standard_name": "air_temperature", "units": "degC", "cell_methods": f"time: {method}"
        }  # fmt: skip
    if "vapour_pressure" in names:
        file["vapour_pressure"] = weather["vapour_pressure"]
        file["vapour_pressure"].attrs = {
            "standard_name": "water_vapor_partial_pressure_in_air", "units": "kPa", "cell_methods": "time: mean"
        }  # fmt: skip
    path = folder / "temperatures.nc"
    file.to_netcdf(path)
    return str(path)


def test_humidity_without_radiation_gives_dry_air_or_says_that_it_is_missing(tmp_path) -> None:
    """Dry-air days and the mean deficit need no radiation: they are computed, or named among what is not."""
    read = read_weather(temperature_file(random_weather(), tmp_path, "vapour_pressure"))
    assert "vapour_pressure" in read.dataset and "radiation" not in read.dataset
    result = assess(read.dataset, short_crop(), options=Options(allowed_missing=1.0))
    said = " ".join(read.not_computed)
    for name, words in (("dry_air_days", "dry-air days"), ("mean_vapour_pressure_deficit", "vapour pressure deficit")):
        assert np.isfinite(result[name].values).all() or words in said, name


def walk_alone(rows: list[tuple[np.ndarray, np.ndarray, float]], weather: xr.Dataset) -> list[np.ndarray]:
    """Carry one or several sets of parameters through the weather in one call of the kernel; totals and daily."""
    axis = time_axis(weather)
    days, cells = weather["tmax"].shape[0], weather["tmax"].shape[2]
    crop = load_crop("wheat")
    entry, _ = make_entry("wheat", "Wheat", crop, lambda year: np.full(cells, 125.0), axis, co2=co2_of(400.0))
    assert entry is not None
    state = begin_tile(entry, np.arange(cells))
    count = len(rows)
    arrays = [
        np.repeat(state.walk, count, axis=0), state.recent, np.repeat(state.bits, count, axis=0),
        *(np.repeat(each, count, axis=0) for each in (state.totals, state.by_stage, state.by_ten_days)),
    ]  # fmt: skip
    fields = np.empty((6, days, cells))
    for number, name in enumerate(("tmax", "tmin", "vapour_pressure", "radiation")):
        fields[number] = weather[name].values[:, 0]
    fields[4], fields[5] = 2.0, 101.3
    fields[:, np.isnan(fields).any(axis=0)] = np.nan
    by_day = np.full((count, days, at.DAILY, cells), np.nan)
    advance(
        np.concatenate([row[0] for row in rows]), np.concatenate([row[1] for row in rows]),
        np.array([[row[2]] for row in rows]), np.repeat(entry.sowing[None], count, axis=0), axis.sun_day(),
        axis.ten_days, entry.first_ten_days, 0, fields, np.zeros((days, cells), dtype=np.uint8),
        np.full(cells, np.radians(40.0)), np.zeros(cells), True, *arrays, by_day,
    )  # fmt: skip
    return [*arrays, by_day]


def test_rows_of_parameters_do_not_touch_each_other() -> None:
    """Two crops and two CO2 in one call give each, bit for bit, what it gives by itself."""
    rows = []
    for name, co2 in (("wheat", 400.0), ("rice", 560.0), ("wheat", 800.0)):
        crop = short_crop(name, (8, 12, 17, 9))
        rows.append((leaf_record(crop, True), season_record(crop, acclimation=True), co2))
    weather = random_weather(60, 40)
    together = walk_alone(rows, weather)
    for number, row in enumerate(rows):
        for whole, one in zip(together, walk_alone([row], weather), strict=True):
            part = whole if whole.ndim == 2 else whole[number : number + 1]
            np.testing.assert_array_equal(part, one)


@pytest.mark.parametrize("cells", [1, 31, 32, 33, 70])
def test_a_cell_does_not_depend_on_how_many_there_are(cells: int) -> None:
    """Blocks of 32 cells are filled up: the first and the last cell of any number give the same, bit for bit."""
    weather = random_weather(30, 70)
    crop = short_crop("wheat", (4, 6, 8, 5))
    options = Options(allowed_missing=1.0)
    whole = assess(weather, crop, options=options)
    part = assess(weather.isel(lon=slice(70 - cells, None)), crop, options=options)
    for name in [*MEASURES, "lost_to_heat_by_ten_days"]:
        np.testing.assert_array_equal(part[name].values, whole[name].values[..., 70 - cells :], err_msg=name)


def test_a_cell_without_the_crop_is_not_computed() -> None:
    result = assess(make_weather(np.full((30, 3), HOT)), short_crop(), area=np.array([[1.0, 0.0, 1.0]]))
    status = result["cell_status"].values[0, 0].tolist()
    assert status == [CELL_STATUS["computed"], CELL_STATUS["no_crop"], CELL_STATUS["computed"]]
    assert np.isnan(result["hot_days"].values[0, 0]).tolist() == [False, True, False]


@pytest.mark.parametrize(
    ("calendar", "start", "sowing", "day", "before"),
    [
        ("standard", "2020-01-31", "02-29", 60, 29),
        ("noleap", "2020-01-31", "02-28", 59, 28),
        ("360_day", "2020-01-30", "02-30", 60, 30),
    ],
)
def test_seasons_in_other_calendars(calendar: str, start: str, sowing: str, day: int, before: int) -> None:
    """Sown on the last day of February 2020, `before` days after the first of 60 days, of which 35 are hot."""
    weather = make_weather(np.where(np.arange(60) < 35, HOT, COOL))
    time = xr.date_range(start, periods=60, calendar=calendar, use_cftime=calendar != "standard")
    result = assess(weather.assign_coords(time=time), short_crop(), sowing)
    assert first(result, "sowing_day") == day
    assert first(result, "season_days") == 15
    assert first(result, "maturity_day") == day + 14
    assert first(result, "hot_days") == 35 - before
    assert first(result, "last_hot_day") == day + 35 - before - 1


def test_a_season_longer_than_a_year_is_whole_or_refused() -> None:
    """A crop of 400 days sown every year: a season is not cut by the next sowing without a word."""
    weather = make_weather(np.full(1100, HOT), start="2020-01-01")
    result = result_or_refusal(lambda: assess(weather, short_crop(stages=(100, 100, 100, 100))))
    if isinstance(result, str):
        assert "sow" in result
    else:
        assert result["season"].values[:2].tolist() == [2021, 2022]
        assert result["season_days"].values[:2, 0, 0].tolist() == [400, 400]
        assert result["hot_days"].values[:2, 0, 0].tolist() == [400, 400]
