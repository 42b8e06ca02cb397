"""All faults of all files come in one list, and a fault does not bring others that follow from it."""

from __future__ import annotations

from spoilt_season import AREA, DISTRICTS, HUMIDITY, RADIATION, SOWING, TABLE, Season, Stops, set_attributes


def test_run_file_profile_folder_grids_and_table(season: Season, stops: Stops) -> None:
    season.rewrite('"grids/*_2021.nc"', '["grids/*_2021.nc", "gone.nc"]')
    season.rewrite('name = "wheat"', 'name = "weat"')
    season.rewrite("[output]", '[maps]\nmeasure = ["hot_days"]\n[output]')
    season.rewrite("0205,", "205,", TABLE)
    season.change(RADIATION, set_attributes("rsds", units="K"))
    (season.folder / HUMIDITY).write_bytes(b"GRIB")
    (season.folder / AREA).unlink()
    season.results.write_text("a file in its place")
    text = stops(
        "season.toml: maps: unknown key 'measure'",
        "season.toml: crop weat: profile: there is no crop profile named 'weat'",
        "results: results is a file, not a folder",
        "gone.nc: there is no such file",
        f"{HUMIDITY}: this is not a NetCDF file but a GRIB file",
        f"{RADIATION}: rsds: the unit 'K' does not fit",
        f"{AREA}: there is no such file",
        f"{TABLE}: the code 205 has lost its leading zero: in {DISTRICTS} it is 0205",
        count=8,
    )
    assert "no variable" not in text


def test_places_with_sound_weather(season: Season, stops: Stops) -> None:
    season.rewrite("0205,", "205,", TABLE)
    season.rewrite("0306,Torvel Hills,04-16", "0306,Torvel Hills,16/04", TABLE)
    season.change(SOWING, set_attributes("maize_sowing_day", units="kg"))
    season.change(AREA, set_attributes("maize", units="kg"))
    stops(
        f"{SOWING}: maize_sowing_day: a sowing grid holds days of the year, 1 to 366, but its unit is 'kg'",
        f"{AREA}: maize: the unit 'kg' is neither that of a share nor that of an area",
        f"{TABLE}: line 7: '16/04' cannot be read as a date",
        f"{TABLE}: the code 205 has lost its leading zero",
        count=4,
    )


def test_a_fault_in_seasons_does_not_hide_those_of_the_grids(season: Season, stops: Stops) -> None:
    season.rewrite("years = [2021]", "yeers = [2021]")
    season.change(RADIATION, set_attributes("rsds", units="K"))
    stops(
        "season.toml: seasons: the key 'years' is missing",
        "season.toml: seasons: unknown key 'yeers'",
        f"{RADIATION}: rsds: the unit 'K' does not fit",
        count=3,
    )


def test_a_fault_of_one_file_is_told_once(season: Season, stops: Stops) -> None:
    """Two crop entries use the same grid of areas, and two variables share their times."""
    season.rewrite('sowing = { table = "places/sowing_by_district.csv" }', 'sowing = "5 April"\narea = "places/no.nc"')
    season.rewrite('{ file = "places/crop_area.nc", name = "maize" }', '"places/no.nc"')
    season.change("grids/airtemperature_2021.nc", lambda dataset: dataset.isel(time=[1, 0, 2, 3]))
    stops("places/no.nc: there is no such file", "grids/airtemperature_2021.nc: time: times are out of order", count=2)


def test_a_fault_in_the_places_table_brings_no_others(season: Season, stops: Stops) -> None:
    season.rewrite("id_field", "id_feild")
    text = stops("season.toml: places: unknown key 'id_feild'")
    assert "districts" not in text
