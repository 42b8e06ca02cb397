"""Counts of a season on small weather, by hand and against a plain count."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import xarray as xr
from plain_season import plain_counts
from small_season import COOL, HOT, assess, day_of_year, first, make_weather, saturation, short_crop, thermal_crop

import cropstress as cs
from cropstress.region import Options
from cropstress.season.measures import MEASURES, STAGES

DATES = ("longest_hot_spell_start", "first_hot_day", "last_hot_day", "hottest_day", "sowing_day", "maturity_day")
MAY_FIRST = day_of_year("2021-05-01")


def pattern(letters: str, hot: float = HOT, cool: float = COOL) -> np.ndarray:
    """Highest temperatures of days written as letters: h for hot, anything else for cool."""
    return np.array([hot if letter == "h" else cool for letter in letters])


def test_a_season_by_hand() -> None:
    """15 days from 3 May, stages 3 4 5 3; day by day, with hot days before sowing and after maturity.

    Flowering on the 8th day (day 7 after sowing), its window from the 7th to the 9th.
    """
    days = pattern("hh" + "h..h" + "hhh." + "h.hhh.." + "hh")
    result = assess(make_weather(days), short_crop(), "05-03")
    hot = [0, 3, 4, 5, 6, 8, 10, 11, 12]
    sown = day_of_year("2021-05-03")
    expected = {
        "hot_days": len(hot),
        "longest_hot_spell": 4,
        "longest_hot_spell_start": sown + 3,
        "first_hot_day": sown,
        "last_hot_day": sown + 12,
        "hottest_day": sown,
        "hottest_temperature": HOT,
        "hot_days_flowering": 2,  # days 6, 7, 8 of which 6 and 8 are hot
        "warm_nights": len(hot),  # 40 - 12 degC
        "warm_nights_flowering": 2,
        "sowing_day": sown,
        "flowering_day": sown + 7,
        "maturity_day": sown + 14,
        "season_days": 15,
        "missing_days": 0,
        "growing_degree_days": len(hot) * (34.0 - 8.0) + (15 - len(hot)) * (19.0 - 8.0),
    }
    # The mean of a hot day is 34 degC, the ceiling; of a cool one 19 degC; the base is 8 degC.
    assert {name: first(result, name) for name in expected} == expected
    by_stage = dict(zip(STAGES, result["hot_days_by_stage"].values[0, :, 0, 0], strict=True))
    assert by_stage == {"initial": 1, "development": 4, "mid": 3, "late": 1}
    by_ten_days = result["hot_days_by_ten_days"].values[0, :, 0, 0]
    assert by_ten_days.tolist() == [5, 4]  # 3-10 May: days 0 to 7; 11-17 May: days 8 to 14
    starts = result["ten_days_start"].values[0].astype("datetime64[D]").astype(str).tolist()
    assert starts == ["2021-05-01", "2021-05-11"]


@pytest.mark.parametrize(
    ("letters", "length", "start"),
    [
        ("...............", 0, None),
        ("h..............", 1, 0),
        ("..............h", 1, 14),
        ("hh..hh..hhh.hhh", 3, 8),
        ("hhhhhhhhhhhhhhh", 15, 0),
        (".hhhhh..hhhhh..", 5, 1),
    ],
)
@pytest.mark.parametrize("block_days", [None, 1, 4])
def test_longest_spell(letters: str, length: int, start: int | None, block_days: int | None) -> None:
    """The first of equal spells counts; a spell goes on over the boundary of two blocks of days."""
    result = assess(make_weather(pattern(letters)), short_crop(), block_days=block_days)
    assert first(result, "longest_hot_spell") == length
    begins = first(result, "longest_hot_spell_start")
    assert np.isnan(begins) if start is None else begins == MAY_FIRST + start
    first_hot, last_hot = first(result, "first_hot_day"), first(result, "last_hot_day")
    if start is None:
        assert np.isnan(first_hot) and np.isnan(last_hot)
    else:
        assert first_hot == MAY_FIRST + letters.index("h")
        assert last_hot == MAY_FIRST + letters.rindex("h")


def test_a_missing_day_breaks_a_spell() -> None:
    result = assess(make_weather(pattern("hhhhhhh........"), missing=[4]), short_crop())
    assert first(result, "longest_hot_spell") == 4
    assert first(result, "hot_days") == 6


def test_the_hottest_day_is_the_first_of_equals() -> None:
    days = pattern("...............") + np.array([0, 1, 9, 3, 9, 2, 9, 0, 0, 0, 0, 0, 0, 0, 0])
    result = assess(make_weather(days), short_crop())
    assert first(result, "hottest_day") == MAY_FIRST + 2
    assert first(result, "hottest_temperature") == COOL + 9.0


@pytest.mark.parametrize(
    ("highest", "hot", "cooler", "warmer"),
    [
        (35.0, 0, 0, 1),
        (35.0005, 0, 0, 1),
        (35.002, 1, 0, 1),
        (34.0005, 0, 0, 0),
        (34.002, 0, 0, 1),
        (36.0, 1, 0, 1),
        (36.0005, 1, 0, 1),
        (36.002, 1, 1, 1),
    ],
)
def test_limits_with_a_thousandth_of_a_kelvin(highest: float, hot: int, cooler: int, warmer: int) -> None:
    """35 degC is not above 35 degC; nor are 36 degC if the air were cooler by 1 degC, 34 if it were warmer."""
    result = assess(make_weather(np.full(15, highest)), short_crop())
    found = [first(result, f"hot_days{ending}") / 15 for ending in ("", "_if_cooler", "_if_warmer")]
    assert found == [hot, cooler, warmer]
    window = [first(result, f"hot_days_flowering{ending}") / 3 for ending in ("", "_if_cooler", "_if_warmer")]
    assert window == [hot, cooler, warmer]


def test_warm_nights_with_a_thousandth_of_a_kelvin() -> None:
    lowest = np.array([20.0] * 5 + [20.0005] * 5 + [20.002] * 5)
    result = assess(make_weather(np.full(15, 30.0), lowest), short_crop())
    assert first(result, "warm_nights") == 5


@pytest.mark.parametrize("limit", [30.0, 34.0, 35.0, 36.0, 38.0, 41.0])
def test_float32_kelvin_counts_like_degrees(limit: float, tmp_path: Path) -> None:
    """Files hold float32 kelvin, where 35 degC is 34.999994: days at a limit are never hot, those 0.01 K above are."""
    kelvin = (np.arange(2000.0, 4500.0, 1.0) / 100.0 + 273.15).astype(np.float32)
    days = kelvin.size // 15 * 15
    shape = (15, 1, days // 15)
    step = np.arange(2000.0, 4500.0, 1.0)[:days].reshape(shape)
    dataset = xr.Dataset(
        {
            name: (
                ("time", "lat", "lon"),
                (values.reshape(shape) - shift).astype(np.float32),
                {"standard_name": "air_temperature", "units": "K", "cell_methods": f"time: {method}"},
            )
            for name, values, method, shift in (
                ("tasmax", kelvin[:days], "maximum", 0.0),
                ("tasmin", kelvin[:days], "minimum", 10.0),
            )
        },
        coords={
            "time": ("time", np.arange(15.0), {"units": "days since 2021-05-01", "calendar": "standard"}),
            "lat": ("lat", [40.0], {"units": "degrees_north", "standard_name": "latitude"}),
            "lon": (
                "lon", 0.1 * np.arange(shape[2]), {"units": "degrees_east", "standard_name": "longitude"}
            ),
        },
    )  # fmt: skip
    dataset.to_netcdf(tmp_path / "kelvin.nc")
    result = assess(cs.open_weather(tmp_path / "kelvin.nc"), short_crop(hot_day_limit=limit))
    for ending, shift in (("", 0), ("_if_cooler", 100), ("_if_warmer", -100)):
        expected = (step > 100.0 * limit + shift).sum(axis=0)
        np.testing.assert_array_equal(result[f"hot_days{ending}"].values[0], expected)


def test_hot_hours_and_degree_days_by_hand() -> None:
    """Highest and lowest alike, so each day and its night before stay at one temperature: 37 degC against 35 degC."""
    result = assess(make_weather(np.full(15, 37.0), np.full(15, 37.0)), short_crop())
    assert first(result, "hot_hours") == pytest.approx(15 * 24.0)
    assert first(result, "degree_days_above_limit") == pytest.approx(15 * 2.0)


def night_hours(number: int, latitude: float = 40.0) -> float:
    """Length of the night of a day of the year, FAO-56 Eqs. 24, 25 and 34."""
    declination = 0.409 * np.sin(2.0 * np.pi / 365.0 * number - 1.39)
    sunset = np.arccos(-np.tan(np.radians(latitude)) * np.tan(declination))
    return float(24.0 - 24.0 / np.pi * sunset)


@pytest.mark.parametrize("block_days", [None, 1])
@pytest.mark.parametrize("gap", [False, True])
def test_a_night_begins_where_the_day_before_ended(gap: bool, block_days: int | None) -> None:
    """A day at 40 degC, then days at 30 degC: the night between them passes 35 degC at ln 2 / 2.2 of its length.

    So it does when the hot day was before sowing; after a missing day the night begins at today's own evening.
    """
    highest = np.array([40.0] + [30.0] * 16)
    weather = make_weather(highest, highest, missing=[1] if gap else [])
    result = assess(weather, short_crop(), "05-03" if gap else "05-02", block_days=block_days)
    expected = 0.0 if gap else np.log(2.0) / 2.2 * night_hours(MAY_FIRST + 1)
    assert first(result, "hot_hours") == pytest.approx(expected, rel=1e-9)


def test_dry_air_by_hand() -> None:
    """Days at one temperature, 30 degC (4.243 kPa, FAO-56 Table 2.3), at 30 % and at 60 % of saturation."""
    temperature = np.full(15, 30.0)
    weather = make_weather(temperature, temperature, light=True, dryness=1.0)
    share = np.array([0.3] * 5 + [0.6] * 10)
    weather["vapour_pressure"] = weather["vapour_pressure"] * share[:, None, None]
    result = assess(weather, short_crop())
    assert first(result, "dry_air_days") == 5  # 2.97 kPa, then 1.70 kPa, against 2 kPa
    assert first(result, "mean_vapour_pressure_deficit") == pytest.approx(4.243 * (5 * 0.7 + 10 * 0.4) / 15, abs=1e-3)


def test_dry_air_is_of_the_day_not_of_the_night() -> None:
    """Saturated at the lowest temperature: the mean deficit of the daylight hours is above the mean of both ends."""
    weather = make_weather(np.full(15, 35.0), np.full(15, 20.0), light=True, dryness=1.0)
    found = first(assess(weather, short_crop()), "mean_vapour_pressure_deficit")
    ends = 0.5 * (saturation(35.0) + saturation(20.0)) - saturation(20.0)
    assert ends < found < saturation(35.0) - saturation(20.0)


@pytest.mark.parametrize("thermal", [False, True], ids=["days", "thermal time"])
def test_counts_equal_a_plain_count(thermal: bool) -> None:
    """40 cells of random weather with gaps, three crops, sown in the middle of the data."""
    draw = np.random.default_rng(3)
    highest = np.round(draw.uniform(24.0, 42.0, (60, 40)), 1)
    lowest = np.round(highest - draw.uniform(2.0, 16.0, highest.shape), 1)
    highest[draw.random(highest.shape) < 0.04] = np.nan
    crops = [
        thermal_crop(),
        thermal_crop(flowering_offset=4, flowering_window_start=-12, flowering_window_end=3, flowering_limit=33.0),
        thermal_crop("wheat", (60, 50, 130, 40), flowering_offset=-3, flowering_window_start=2, flowering_window_end=9),
    ]
    weather = make_weather(highest, lowest)
    for crop in crops:
        result = assess(
            weather, crop, "05-11", stages="thermal_time" if thermal else "days", block_days=7,
            options=Options(allowed_missing=1.0),
        )  # fmt: skip
        for cell in range(highest.shape[1]):
            for name, value in plain_counts(crop, highest[:, cell], lowest[:, cell], 10, thermal).items():
                measure, _, stage = name.partition(" ")
                place = (0, int(stage), 0, cell) if stage else (0, 0, cell)
                expected = value + MAY_FIRST if measure in DATES else value
                np.testing.assert_allclose(result[measure].values[place], expected, rtol=1e-12, err_msg=name)
        windows = [
            plain_counts(crop, highest[:, c], lowest[:, c], 10, thermal)["hot_days_flowering"] for c in range(40)
        ]
        assert len(set(windows)) > 1


def test_counts_are_whole_and_in_range() -> None:
    """Each count lies between 0 and the days of its season; the window's counts within the season's."""
    draw = np.random.default_rng(5)
    highest = draw.uniform(24.0, 42.0, (15, 60))
    result = assess(make_weather(highest), short_crop())
    for name, measure in MEASURES.items():
        if measure.kind == "count" and not measure.gas_exchange:
            values = result[name].values
            assert (values == np.round(values)).all() and (values >= 0).all() and (values <= 15).all(), name
    assert (result["hot_days_if_cooler"] <= result["hot_days"]).all()
    assert (result["hot_days"] <= result["hot_days_if_warmer"]).all()
    assert (result["hot_days_flowering"] <= result["hot_days"]).all()
    assert (result["longest_hot_spell"] <= result["hot_days"]).all()
