"""What the sample run leaves in its folder."""

from __future__ import annotations

import json
from pathlib import Path

import netCDF4
import numpy as np
import pytest
import rasterio
import xarray as xr
from compliance_checker.runner import CheckSuite, ComplianceChecker
from PIL import Image

from cropstress.job import Outcome

CROPS = ("maize", "wheat")
DRAWN = ("lost_to_heat_share", "hot_days", "hot_days_flowering", "leading_cause")
CARRIED = ("hot_day_limit", "heat_onset", "co2", "acclimation", "water", "last_day_of_data", "credit", "caution")


def test_every_promised_file_is_there_and_nothing_else(sample_run: Outcome) -> None:
    found = {path.relative_to(sample_run.folder).as_posix() for path in sample_run.folder.rglob("*") if path.is_file()}
    expected = {"run.json"}
    for crop in CROPS:
        expected.add(f"grids/{crop}-observed.nc")
        expected |= {f"tables/{crop}-observed-{table}.csv" for table in ("seasons", "stages", "ten_days")}
        expected |= {f"maps/{crop}-2021-observed-{name}.{kind}" for name in DRAWN for kind in ("tif", "png")}
    assert found == expected


@pytest.mark.parametrize("crop", CROPS)
def test_compliance_checker_finds_no_error(sample_run: Outcome, crop: str, tmp_path: Path) -> None:
    """CF Conventions 1.11, by the checker of the IOOS (compliance-checker)."""
    CheckSuite.load_all_available_checkers()
    report = tmp_path / "report.txt"
    path = sample_run.folder / "grids" / f"{crop}-observed.nc"
    passed, broken = ComplianceChecker.run_checker(
        str(path), ["cf:1.11"], 1, "strict", output_filename=str(report), output_format="text"
    )
    assert passed and not broken, report.read_text()


@pytest.mark.parametrize("crop", CROPS)
def test_files_hold_what_was_computed(sample_run: Outcome, results: dict[str, xr.Dataset], crop: str) -> None:
    with netCDF4.Dataset(sample_run.folder / "grids" / f"{crop}-observed.nc") as file:
        for name in ("assimilation", "lost_to_heat", "lost_to_heat_by_enzymes", "hot_hours"):
            written = np.ma.filled(file[name][:].astype(float), np.nan)
            assert file[name].dtype == np.float32
            np.testing.assert_array_equal(written, results[crop][name].values.astype(np.float32).astype(float))
        counted = np.ma.filled(file["hot_days"][:].astype(float), np.nan)
        np.testing.assert_array_equal(counted, results[crop]["hot_days"].values)


@pytest.mark.parametrize("crop", CROPS)
def test_counts_of_hot_days_follow_the_rules_of_cf(sample_run: Outcome, crop: str) -> None:
    """Standard name table: threshold as a coordinate of that name, climatological time, days within and over."""
    with netCDF4.Dataset(sample_run.folder / "grids" / f"{crop}-observed.nc") as file:
        assert file["time"].climatology in file.variables
        hot_days = file["hot_days"]
        assert hot_days.standard_name == "number_of_days_with_air_temperature_above_threshold"
        assert hot_days.units == "1"
        assert hot_days.cell_methods == "time: maximum within days time: sum over days"
        threshold = next(name for name in hot_days.coordinates.split() if name == "hot_day_limit")
        assert file[threshold].standard_name == "air_temperature"


@pytest.mark.parametrize("crop", CROPS)
@pytest.mark.parametrize("measure", DRAWN)
def test_geotiff_read_with_plain_rasterio(sample_run: Outcome, crop: str, measure: str) -> None:
    with (
        rasterio.open(sample_run.folder / "maps" / f"{crop}-2021-observed-{measure}.tif") as tif,
        xr.open_dataset(sample_run.folder / "grids" / f"{crop}-observed.nc", decode_times=False) as grid,
    ):
        assert tif.crs.to_epsg() == 4326
        assert tif.nodata is not None
        values = grid[measure].isel(season=0).values[::-1]  # the grid's rows run north, a picture's south
        if measure == "leading_cause":
            values = np.where(values < 0, np.nan, values)
        band = np.where(tif.read(1) == tif.nodata, np.nan, tif.read(1))
        np.testing.assert_array_equal(np.isnan(band), np.isnan(values))
        np.testing.assert_allclose(band[~np.isnan(band)], values[~np.isnan(band)], rtol=1e-6)
        assert tif.bounds.left == pytest.approx(-36.0) and tif.bounds.top == pytest.approx(44.0)
        tags = tif.tags()
        for name in CARRIED:
            assert tags.get(name) or tags.get(name.upper()), f"{name} in {sorted(tags)}"


@pytest.mark.parametrize("crop", CROPS)
def test_grids_carry_their_assumptions(sample_run: Outcome, crop: str) -> None:
    with netCDF4.Dataset(sample_run.folder / "grids" / f"{crop}-observed.nc") as file:
        for name in CARRIED:
            assert str(file.getncattr(name)), name


@pytest.mark.parametrize("crop", CROPS)
def test_figures_are_pictures_of_print_size_with_their_notes(sample_run: Outcome, crop: str) -> None:
    for measure in DRAWN:
        with Image.open(sample_run.folder / "maps" / f"{crop}-2021-observed-{measure}.png") as picture:
            assert picture.size[0] >= 1000
            assert picture.info["dpi"][0] >= 150
            said = " ".join(str(value) for value in picture.info.values())
            assert "421" in said and "soil water" in said and "extension service" in said


def test_the_record_tells_what_was_done_without_a_path_of_the_machine(sample_run: Outcome) -> None:
    text = (sample_run.folder / "run.json").read_text(encoding="utf-8")
    record = json.loads(text)
    assert record["finished"] is True
    assert record["run_file"]["air"]["co2"] == 421.0  # a default
    read = {file["name"]: file for file in record["inputs"]}
    assert {"airtemperature_2021.nc", "elevation.nc", "sowing_day.nc", "crop_area.nc"} <= set(read)
    assert all(len(file["sha256"]) == 64 and file["size"] > 0 for file in read.values())
    assert {"cropstress", "numpy", "numba", "xarray"} <= set(record["versions"])
    assert record["seconds"] > 0
    for private in (str(Path.home()), str(sample_run.folder.parent), str(Path(__file__).parents[2])):
        assert private not in text


def test_the_summary_tells_what_a_wrong_calendar_would_show(sample_run: Outcome) -> None:
    for word in ("sown", "flowering", "end of season", "hottest day", "hot days", "share lost to heat", "extension"):
        assert word in sample_run.summary
