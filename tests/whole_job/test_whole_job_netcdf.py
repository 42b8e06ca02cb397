"""The NetCDF files: CF by the compliance checker and by its own rules for counts of days, and what they carry."""

import json
import shutil
from pathlib import Path

import netCDF4
import numpy as np
import pytest
import xarray as xr
from compliance_checker.runner import CheckSuite, ComplianceChecker
from finished_run import CROPS, Run

import cropstress as cs
from cropstress.region import Options

DAYS_ABOVE = "number_of_days_with_air_temperature_above_threshold"


def newest_cf() -> str:
    """The newest version of the conventions that the installed compliance checker knows, 1.8 or later."""
    CheckSuite.load_all_available_checkers()
    versions = [tuple(map(int, name[3:].split("."))) for name in CheckSuite.checkers if name.startswith("cf:")]
    assert max(versions) >= (1, 8)
    return "cf:" + ".".join(map(str, max(versions)))


def complaints(path: Path, folder: Path) -> list[str]:
    """All that the compliance checker (IOOS, general purpose) finds wrong, of every priority.

    A check that is passed may still have a remark, as that climatological bounds "might be" cell bounds.
    """
    report, checker = folder / "report.json", newest_cf()
    passed, errors = ComplianceChecker.run_checker(
        str(path), [checker], verbose=0, criteria="strict", output_filename=str(report), output_format="json"
    )
    assert not errors
    found = json.loads(report.read_text("utf-8"))[checker]
    wrong = [
        f"{check['name']}: {message}"
        for priority in ("high_priorities", "medium_priorities", "low_priorities")
        for check in found[priority]
        if check["value"][0] < check["value"][1]
        for message in check["msgs"]
    ]
    assert passed == (not wrong)
    return wrong


@pytest.mark.parametrize(
    "crop", [pytest.param(crop, marks=[] if crop == "wheat" else pytest.mark.slow) for crop in CROPS]
)
def test_compliance_checker_finds_nothing_wrong(thinned_run: Run, tmp_path: Path, crop: str) -> None:
    assert complaints(thinned_run.grid(crop), tmp_path) == []


@pytest.mark.slow
def test_compliance_checker_finds_nothing_wrong_in_the_sample_run(sample_run: Run, tmp_path: Path) -> None:
    for crop in sample_run.crops:
        assert complaints(sample_run.grid(crop), tmp_path) == []


def test_compliance_checker_would_find_what_is_wrong(thinned_run: Run, tmp_path: Path) -> None:
    spoilt = tmp_path / "spoilt.nc"
    shutil.copy(thinned_run.grid("wheat"), spoilt)
    with netCDF4.Dataset(spoilt, "a") as file:
        file["hot_days"].standard_name = "number_of_hot_days"
        file["lost_to_heat"].cell_methods = "tiem: sum"
    found = "; ".join(complaints(spoilt, tmp_path))
    assert "number_of_hot_days" in found and "tiem" in found


@pytest.mark.parametrize("crop", CROPS)
def test_counts_of_days_follow_the_rules_of_the_conventions(thinned_run: Run, crop: str) -> None:
    """CF standard name table, number_of_days_with_air_temperature_above_threshold; CF-1.11 section 7.4.

    The threshold is a coordinate of the standard name air_temperature; the statistic is within and over days,
    so the time has climatological bounds: the first day counted at 0 h to the last one at 24 h.
    """
    result = thinned_run.unwritten(crop)
    with netCDF4.Dataset(thinned_run.grid(crop)) as file:
        assert file.Conventions == "CF-1.11"
        named = [name for name, each in file.variables.items() if getattr(each, "standard_name", "") == DAYS_ABOVE]
        assert {"hot_days", "hot_days_if_cooler", "hot_days_if_warmer", "warm_nights"} <= set(named)
        # Without a limit at flowering there is no threshold, and so no standard name
        assert ("hot_days_flowering" in named) == (crop != "potato")
        for name in named:
            variable = file[name]
            extreme = "minimum" if name.startswith("warm_nights") else "maximum"
            assert variable.cell_methods == f"time: {extreme} within days time: sum over days"
            assert variable.units == "1" and variable.dtype == np.int16
            coordinates = [file[each] for each in variable.coordinates.split()]
            (threshold,) = [each for each in coordinates if getattr(each, "standard_name", "") == "air_temperature"]
            assert threshold.dimensions == () and threshold.units == "degC"
            base = "warm_night_limit" if name.startswith("warm") else "hot_day_limit"
            base = "flowering_limit" if name.startswith("hot_days_flowering") else base
            shift = 1.0 if "if_cooler" in name else -1.0 if "if_warmer" in name else 0.0
            assert float(threshold[...]) == float(result[base]) + shift
        time = file["time"]
        assert time.standard_name == "time" and time.climatology == "climatology_bounds"
        bounds = netCDF4.num2date(file[time.climatology][0], time.units, time.calendar)
        first, after = (np.datetime64(each.isoformat()) for each in bounds)
        assert first == result["season_start"].values[0].astype("datetime64[D]")
        assert after == result["season_end"].values[0].astype("datetime64[D]") + 1
        sown = result["sowing_day"].min().item()
        assert (first - np.datetime64("2021-01-01")) / np.timedelta64(1, "D") + 1 == sown


@pytest.mark.parametrize("crop", CROPS)
def test_file_alone_says_what_was_assumed(thinned_run: Run, crop: str) -> None:
    profile = cs.load_crop(crop)
    with netCDF4.Dataset(thinned_run.grid(crop)) as file:
        for name in ("heat_onset", "hot_day_limit", "hot_leaf_limit", "warm_night_limit", "dry_air_limit"):
            assert float(file[name][...]) == profile.number(name)
            assert getattr(file, name).startswith(f"{profile.number(name):g} ")
        assert file.co2 == "416.4"
        assert file.acclimation == "none"
        assert file.water == "assumes enough soil water"
        assert file.last_day_of_data == "2021-10-10"
        assert file.credit == "Invented for tests"
        assert "screening only" in file.caution and "not yield" in file.caution
        assert "cropstress run season.toml" in file.history
        if profile.pathway == "C3":
            assert float(file.growth_temperature) == profile.number("growth_temperature")
        assert {"lat", "lon", "season", "stage", "ten_days"} <= set(file.dimensions)
        assert file["lat"].units == "degrees_north" and file["lon"].units == "degrees_east"
        assert file[file["hot_days"].grid_mapping].grid_mapping_name == "latitude_longitude"


def test_encoding_is_the_programs_own(thinned_run: Run) -> None:
    """Not the packed int16 of the input files; compressed."""
    with netCDF4.Dataset(thinned_run.grid("wheat")) as file:
        for name in ("lost_to_heat", "hottest_temperature"):
            assert file[name].dtype == np.float32
            assert not {"scale_factor", "add_offset"} & set(file[name].ncattrs())
            assert file[name].filters()["zlib"]


def test_assess_gives_what_run_writes(thinned_run: Run) -> None:
    """From Python, with nothing of the run file but what it says; float32, bit for bit."""
    grids = thinned_run.run_file.parent / "grids"
    names = ("airtemperature_2021", "humidity_2021", "radiation_2021", "wind_2021", "elevation")
    weather = cs.open_weather([grids / f"{name}.nc" for name in names]).sel(time=slice(None, "2021-10-10"))
    with xr.open_dataset(grids / "crop_area.nc") as dataset:
        area = dataset["maize"].values
    sowing = {"grid": str(grids / "sowing_day.nc"), "name": "maize_sowing_day"}
    result = cs.assess(weather, "maize", sowing, 416.4, years=[2021], area=area, options=Options()).compute()
    with xr.open_dataset(thinned_run.grid("maize"), decode_times=False, mask_and_scale=False) as written:
        names_written = [str(name) for name in result.data_vars if written[str(name)].dtype == np.float32]
        assert len(names_written) > 20
        for name in names_written:
            expected = result[name].transpose(*written[name].dims).values.astype(np.float32)
            assert expected.tobytes() == written[name].values.tobytes() or np.array_equal(
                expected, written[name].values, equal_nan=True
            ), name
        for name in ("hot_days", "sowing_day", "season_days"):
            there = np.isfinite(result[name].values)
            assert np.array_equal(written[name].values[there], result[name].values[there])
