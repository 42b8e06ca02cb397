"""Seasons, sowing, districts, areas and profiles at fault, as the command line tells them."""

from __future__ import annotations

import numpy as np
import pytest
from spoilt_season import AREA, DISTRICTS, SOWING, TABLE, Command, Season, Stops, set_attributes, set_values

from cropstress.job import prepare

BY_DISTRICT = '{ table = "places/sowing_by_district.csv" }'
ROW = "0205,Vándorre,04-03\n"


def test_season_outside_the_data(season: Season, stops: Stops) -> None:
    season.rewrite("[2021]", "[2019, 2021]")
    stops(
        "season.toml: crop maize: the season 2019 (150 days) is sown outside the data, which run from 2021-04-01 to "
        "2021-10-15 (sown by the grid 'maize_sowing_day', day 109 to 128 of the year)",
        "season.toml: crop wheat: the season 2019 (135 days) is sown outside the data",
        "a season carries the year of its harvest",
        count=2,
    )


def test_sowing_outside_the_data(season: Season, stops: Stops) -> None:
    season.rewrite(BY_DISTRICT, '"25 December"')
    stops(
        "season.toml: crop wheat: the season 2021 (135 days) is sown outside the data",
        "(sown on 25 December of the year, everywhere)",
        "Correct `sowing`",
    )


def test_some_cells_sown_before_the_data_stay_blank_and_are_told(season: Season, command: Command) -> None:
    season.change(SOWING, set_values("maize_sowing_day", lambda values: np.where(values < 115, 60.0, values)))
    said = command("check", season.run_file)
    assert said.code == 0
    assert "cells are sown before the data begin (2021-04-01) and are left blank." in said.out


@pytest.mark.parametrize("date", ["2021-02-30", "2020-05-01"])
def test_last_day_to_use_at_fault(season: Season, stops: Stops, date: str) -> None:
    season.rewrite("[seasons]", f'[seasons]\nthrough = "{date}"')
    stops("season.toml: seasons.through: ", date, "Give a date within the data, or leave it out.")


def test_last_day_to_use_after_the_data_is_told(season: Season, command: Command) -> None:
    season.rewrite("[seasons]", '[seasons]\nthrough = "2022-05-01"')
    said = command("check", season.run_file)
    assert said.code == 0
    assert "seasons.through, 2022-05-01, lies after the last day of the data, 2021-10-15" in said.out


def test_a_date_that_cannot_be_read_names_its_crop(season: Season, stops: Stops) -> None:
    season.rewrite(BY_DISTRICT, '"25 Aprill"')
    stops("season.toml: crop wheat: sowing: '25 Aprill' has no month that is known", "Did you mean 'April'?")


@pytest.mark.parametrize("row", ["", "0205,Vándorre,\n"])
def test_a_district_without_a_date_is_blank_and_listed(season: Season, command: Command, row: str) -> None:
    before = prepare(season.run_file)
    season.rewrite(ROW, row, TABLE)
    said = command("check", season.run_file)
    assert said.code == 0
    assert f"wheat: {TABLE}: no sowing date for 0205 Vándorre; their cells stay blank" in said.out
    assert "44 cells; sown by district, 2 April to 16 April, 7 of 8 districts" in said.out
    # never filled with a neighbour's: its cells have none, and all others what they had
    number = before.districts.codes.index("0205")
    inside = (before.districts.index == number).ravel()
    sown, sown_before = (job.entries[1].sowing[0] for job in (prepare(season.run_file), before))
    assert inside.sum() == 2
    assert (sown[inside] == -1).all() and (sown_before[inside] >= 0).all()
    assert (sown[~inside] == sown_before[~inside]).all()


def test_a_code_that_lost_its_leading_zero(season: Season, stops: Stops) -> None:
    season.rewrite(ROW, ROW[1:], TABLE)
    stops(
        f"{TABLE}: the code 205 has lost its leading zero: in {DISTRICTS} it is 0205",
        "Write codes as text: a spreadsheet turns them into numbers and drops the zeros.",
    )


@pytest.mark.parametrize(
    ("content", "what"),
    [
        (b"PK\x03\x04\x14\x00\xff", "this is a workbook or another packed file, not CSV text"),
        ("code,date\n0205,8 März\n".encode("latin-1"), "the table is not UTF-8 text"),
        (b"", "the table is empty"),
        (b"code;sown\n0205;04-03\n", "the table has no column 'date'"),
    ],
)
def test_a_table_that_is_none(season: Season, command: Command, content: bytes, what: str) -> None:
    (season.folder / TABLE).write_bytes(content)
    said = command("check", season.run_file)
    assert said.code == 2
    assert f"{TABLE}: {what}" in said.err


def test_districts_that_cannot_be_read_are_one_fault(season: Season, stops: Stops) -> None:
    """Not a second one that the sowing table has no districts."""
    (season.folder / DISTRICTS).write_text('{"type": ')
    stops(f"{DISTRICTS}: the districts cannot be read", "Give polygons as GeoPackage, GeoJSON")


def test_one_file_is_needed_where_a_pattern_fits_several(season: Season, stops: Stops) -> None:
    season.rewrite('"places/elevation.nc"', '"places/*.nc"')
    stops("places/*.nc: one file is needed here, and 3 fit: places/crop_area.nc", "Name one of them.")


def test_more_crop_than_the_cell_holds(season: Season, stops: Stops) -> None:
    season.change(AREA, set_values("maize", lambda values: 100.0 * values))
    stops(
        f"{AREA}: maize: the crop area is more than the whole cell",
        "in the unit '1'",
        'Check the unit ("1", "%", "ha")',
    )


def test_a_unit_that_is_none_at_all(season: Season, stops: Stops) -> None:
    season.change(AREA, set_attributes("maize", units="/"))
    stops(f"{AREA}: maize: the unit '/' cannot be read", 'unit = "1" } for a share, "%", "ha" or "km2"')


def test_a_crop_without_area_is_told(season: Season, command: Command) -> None:
    season.change(AREA, set_values("maize", np.zeros_like))
    said = command("check", season.run_file)
    assert said.code == 0
    assert "maize: no cell is computed, for where it is sown its crop area is zero" in said.out


def test_unknown_crop(season: Season, stops: Stops) -> None:
    season.rewrite('name = "wheat"', 'name = "weat"')
    stops(
        "season.toml: crop weat: profile: there is no crop profile named 'weat'",
        "Did you mean 'wheat'? Known crops: barley, ",
    )


def test_profile_value_outside_its_physical_range(season: Season, stops: Stops) -> None:
    """Once, although the range that was widened to hold the value is outside, too."""
    season.rewrite("[output]", '[crops.changes]\nheat_onset = { value = 330, source = "our trial" }\n[output]')
    stops(
        "season.toml: crop wheat: changes: heat_onset: value = 330 degC is outside the physical range 10 to 50 degC",
        "Check the number and its unit: Momentary air temperature",
    )


def test_profile_of_ones_own_outside_its_physical_range(season: Season, stops: Stops) -> None:
    profile = 'name = "mine"\nbased_on = "wheat"\n[values.hot_day_limit]\nvalue = -90\nsource = "our trial"\n'
    (season.folder / "mine.toml").write_text(profile)
    season.rewrite('name = "wheat"', 'name = "wheat"\nprofile = "mine.toml"')
    stops("profile mine.toml: hot_day_limit: value = -90 degC is outside the physical range", "Check the number")
