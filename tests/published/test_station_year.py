"""A typical year of the US south-east, real hours: against published losses, and the daily run against the hours.

Greensboro, North Carolina, 400 umol/mol, nights included. Sowing days are usual ones there (common practice);
wheat is the profile's spring wheat, sown so that it grows from March to May. `-s` prints what was measured.
"""

from __future__ import annotations

import datetime

import pytest
import xarray as xr

from cropstress import assess
from cropstress.crops import load_crop

import hourly_season
from station_year import YEAR, Station, centred, daily_weather, made_again, read_station

SOWING = {"soybean": "05-15", "wheat": "02-01", "maize": "04-15"}


@pytest.fixture(scope="module")
def station() -> Station:
    """Return the station."""
    return read_station()


@pytest.fixture(scope="module")
def runs(station: Station, tmp_path_factory: pytest.TempPathFactory) -> dict[str, xr.Dataset]:
    """Return the season of each crop from the daily run."""
    weather = daily_weather(station, tmp_path_factory.mktemp("station"))
    return {
        crop: assess(weather, crop, sowing, hourly_season.CO2).load().isel(season=0, lat=0, lon=0)
        for crop, sowing in SOWING.items()
    }


def by_the_hour(station: Station, crop: str) -> dict[str, float]:
    """Return the same season from the steps of a station."""
    month, day = (int(part) for part in SOWING[crop].split("-"))
    sowing_day = datetime.date(YEAR, month, day).timetuple().tm_yday
    return hourly_season.season(station, load_crop(crop), sowing_day)


def biases(run: xr.Dataset, hours: dict[str, float], title: str) -> dict[str, float]:
    """Return how far the daily run is above the hours, and print it."""
    found = {name: float(run[name]) / value - 1.0 for name, value in hours.items() if value}
    print(f"\n{title}: " + ", ".join(f"{name} {100.0 * bias:+.2f} %" for name, bias in found.items()))
    return found


@pytest.mark.parametrize(
    ("crop", "low", "high"),
    [
        # Walker, VanLoocke, Bernacchi & Ort 2016, Annu Rev Plant Biol 67:107-129 (read in abstract): US soybean
        # loses 36 % of its yield to photorespiration, US wheat 20 %; bounds chosen here.
        ("soybean", 0.30, 0.42),
        ("wheat", 0.15, 0.31),
        ("maize", 0.04, 0.13),  # no such figure was found: bounds chosen here
    ],
)
def test_share_lost_to_photorespiration(runs: dict[str, xr.Dataset], crop: str, low: float, high: float) -> None:
    share = float(runs[crop]["lost_to_photorespiration_share"])
    print(f"\n{crop}: {share:.3f} lost to photorespiration")
    assert low <= share <= high


def test_maize_photorespires_little(runs: dict[str, xr.Dataset]) -> None:
    """A C4 crop gives back little of what it fixes (common practice); bounds chosen here."""
    shares = {crop: float(run["lost_to_photorespiration_share"]) for crop, run in runs.items()}
    assert shares["maize"] < 0.4 * shares["soybean"]
    assert float(runs["maize"]["photorespired_co2"] / runs["maize"]["assimilation"]) < 0.05


@pytest.mark.parametrize("crop", SOWING)
def test_daily_run_against_short_steps_of_its_own_courses(
    runs: dict[str, xr.Dataset], station: Station, crop: str
) -> None:
    """Quarters of an hour made from the days by the same courses, with everything but the leaf written again.

    Eight moments a day are taken to cost 0.1 % of assimilation and 1.5 % of the loss to heat (derived here).
    """
    steps = made_again(station, 96)
    found = biases(runs[crop], by_the_hour(steps, crop), f"{crop}, daily against its own courses")
    assert abs(found["assimilation"]) <= 1e-3
    assert abs(found["lost_to_photorespiration"]) <= 2e-3
    assert abs(found["photorespired_co2"]) <= 3e-3
    assert abs(found["lost_to_heat"]) <= 1.5e-2
    assert abs(found["hot_hours"]) <= 5e-3
    assert found["hot_days"] == 0.0


@pytest.mark.parametrize("crop", SOWING)
def test_daily_run_against_the_hours_of_the_file(runs: dict[str, xr.Dataset], station: Station, crop: str) -> None:
    """Each row of the file as it stands: its temperature and dew point with the radiation of the hour before."""
    found = biases(runs[crop], by_the_hour(station, crop), f"{crop}, daily against the file's hours")
    assert abs(found["assimilation"]) <= 0.07
    assert abs(found["hot_hours"]) <= 0.40
    assert found["hot_days"] == 0.0
    # Where less than 1 % is lost (maize, 0.05 %) the program names no cause, and a ratio says nothing.
    if float(runs[crop]["lost_to_heat_share"]) >= 0.01:
        assert abs(found["lost_to_heat"]) <= 0.15


@pytest.mark.parametrize("crop", ["soybean", "wheat"])
def test_daily_run_against_the_middle_of_each_hour(runs: dict[str, xr.Dataset], station: Station, crop: str) -> None:
    """Temperature and dew point brought to the middle of the hour that the radiation is of.

    Seen so, the usual temperature course is too warm through the middle of the day here, and the loss to heat is
    overstated by 23 %: regression only, so that a better course shows.
    """
    found = biases(runs[crop], by_the_hour(centred(station), crop), f"{crop}, daily against the middles of hours")
    assert abs(found["assimilation"]) <= 0.07
    assert abs(found["hot_hours"]) <= 0.40
    assert found["lost_to_heat"] == pytest.approx(0.23, abs=0.03)


def test_every_loss_of_the_year_is_a_loss(runs: dict[str, xr.Dataset]) -> None:
    """Warmth above the onset, and oxygen, cost something over a season (common practice)."""
    for run in runs.values():
        assert float(run["lost_to_heat"]) > 0.0
        assert float(run["lost_to_photorespiration"]) > float(run["photorespired_co2"]) > 0.0
