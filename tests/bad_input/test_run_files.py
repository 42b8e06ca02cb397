"""Run files at fault, as the command line tells them."""

from __future__ import annotations

import pytest
from spoilt_season import Command, Season, Stops


@pytest.mark.parametrize(
    ("old", "new", "what", "remedy"),
    [
        ("id_field", "id_feild", "season.toml: places: unknown key 'id_feild'", "Did you mean 'id_field'?"),
        ("[places]", "[place]", "season.toml: unknown key 'place'", "Did you mean 'places'?"),
        ("[places]", "irrigation = 3\n[places]", "season.toml: weather: unknown key 'irrigation'", "Keys here: files,"),
        ("[seasons]", "years = 2021\n[seasons]", "season.toml: unknown key 'years'", "It belongs in [seasons]."),
    ],
)
def test_unknown_key(season: Season, command: Command, old: str, new: str, what: str, remedy: str) -> None:
    season.rewrite(old, new)
    for name in ("check", "run"):
        said = command(name, season.run_file)
        assert said.code == 2
        assert what in said.err
        assert remedy in said.err
    assert season.final_files() == set()


def test_two_crop_entries_of_one_name(season: Season, stops: Stops) -> None:
    season.rewrite('name = "wheat"', 'name = "Maize"\nprofile = "wheat"')
    stops("season.toml: crops: there are 2 crop entries named", "Give each entry a name of its own")


@pytest.mark.parametrize("path", ["grids\\*.nc", "grids\\new.nc", "C:\\data\\tmax.nc"])
def test_backslash_in_a_path(season: Season, stops: Stops, path: str) -> None:
    season.rewrite('"grids/*_2021.nc"', f'"{path}"')
    stops("season.toml", "backslash", 'Write paths with forward slashes, on Windows too: "grids/tmax.nc"')


def test_unknown_measure(season: Season, stops: Stops) -> None:
    season.rewrite("[output]", '[maps]\nmeasures = ["hot_dais"]\n[output]')
    stops('season.toml: maps.measures: there is no measure "hot_dais"', 'Did you mean "hot_days"?')


def test_no_run_file(season: Season, command: Command) -> None:
    for path, what in ((season.folder / "none.toml", "there is no such file"), (season.folder, "it cannot be read")):
        said = command("check", path)
        assert said.code == 2
        assert f"{path.name}: {what}" in said.err


def test_not_toml(season: Season, stops: Stops) -> None:
    season.rewrite('files = "grids/*_2021.nc"', 'files = "grids/*_2021.nc')
    stops("season.toml, line 5: this is not TOML", "Check quotes, brackets and = of this line.")


def test_only_an_entry_that_is_there(season: Season, command: Command) -> None:
    said = command("run", season.run_file, "--only", "crop=maiz")
    assert said.code == 2
    assert "season.toml: there is no crop entry 'maiz'\n     Did you mean 'maize'?" in said.err
