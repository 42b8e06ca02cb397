"""The run files shipped with the sample grids."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest
import xarray as xr

from cropstress.runfile import RunFile, load_runfile

CONFIGS = Path(__file__).resolve().parents[2] / "configs"
LAST_DAY = 288  # day of the year of 15 October, the last day of the sample grids


def test_season_has_twelve_lines() -> None:
    assert len((CONFIGS / "season.toml").read_text("utf-8").splitlines()) <= 12


@pytest.mark.parametrize("name", ["season.toml", "full.toml"])
def test_run_file_is_right_and_its_files_exist(name: str) -> None:
    run = load_runfile(CONFIGS / name)
    run.profiles()
    grids = [path for pattern in run.weather.files for path in run.base.glob(pattern)]
    assert len(grids) == 4
    for crop in run.crops:
        area = crop.area_spec()
        assert isinstance(area, dict)
        with xr.open_dataset(run.resolve(area["file"])) as dataset:
            assert area["name"] in dataset
    elevation = run.places.elevation_spec()
    assert run.resolve(elevation if isinstance(elevation, str) else elevation["file"]).is_file()


def test_full_run_file_has_two_entries_of_one_crop_and_a_sourced_change() -> None:
    run = load_runfile(CONFIGS / "full.toml")
    profiles = [crop.profile for crop in run.crops]
    assert len(profiles) >= 4
    assert profiles.count("maize") == 2
    assert all(change.source for crop in run.crops for change in crop.changes.values())
    assert any(crop.changes for crop in run.crops)
    assert run.places.districts is not None and run.resolve(run.places.districts).is_file()


def test_full_run_file_names_every_table() -> None:
    written = tomllib.loads((CONFIGS / "full.toml").read_text("utf-8"))
    assert set(RunFile.model_fields) - set(written) == {"same_as"}


def test_every_crop_sown_on_one_date_matures_within_the_grids() -> None:
    run = load_runfile(CONFIGS / "full.toml")
    profiles = run.profiles()
    sown = {"maize-late": 145, "soybean": 125, "cotton": 93, "potato": 105}
    assert set(sown) < {crop.name for crop in run.crops}
    for name, day in sown.items():
        assert day + sum(profiles[name].days) - 1 <= LAST_DAY
