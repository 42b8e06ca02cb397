"""NetCDF files: CF-1.11 without an error, own encoding, whole or not at all."""

from __future__ import annotations

import errno
import os
from collections.abc import Callable
from pathlib import Path

import cftime
import netCDF4
import numpy as np
import pytest
import xarray as xr
from compliance_checker.runner import CheckSuite, ComplianceChecker

from cropstress.errors import InputError
from cropstress.report.netcdf import write_netcdf
from cropstress.season.measures import MEASURES, SERIES

Maker = Callable[..., xr.Dataset]


def in_calendar(result: xr.Dataset, calendar: str) -> xr.Dataset:
    """Put the dates of a result into another calendar, day for day."""

    def dates(values: np.ndarray) -> np.ndarray:
        days = [str(day)[:10].split("-") for day in np.ravel(values)]
        found = [cftime.datetime(*map(int, day), calendar=calendar) for day in days]
        return np.array(found, dtype=object).reshape(values.shape)

    steps = dates(result["ten_days_start"].values)
    return result.assign_coords(
        season_start=("season", dates(result["season_start"].values)),
        season_end=("season", dates(result["season_end"].values)),
        ten_days_start=(("season", "ten_days"), steps),
    )


@pytest.mark.parametrize("kind", ["degrees", "projected, two seasons", "360 days, temperature only"])
def test_compliance_checker_finds_no_error(tmp_path: Path, result_maker: Maker, kind: str) -> None:
    result = result_maker(6, 7)
    if kind == "projected, two seasons":
        result = result_maker(6, 7, projected=True, descending=True, seasons=(2020, 2021))
    elif kind == "360 days, temperature only":
        result = in_calendar(result_maker(6, 7, flowering=False), "360_day")
        gone = [name for name in result.data_vars if "lost" in str(name) or "assimilation" in str(name)]
        result = result.drop_vars([*gone, "leading_cause"])
    path = tmp_path / "maize-observed.nc"
    write_netcdf(result, path, "made in a test")
    CheckSuite.load_all_available_checkers()
    report = tmp_path / "report.txt"
    passed, broken = ComplianceChecker.run_checker(
        str(path), ["cf:1.11"], 1, "strict", output_filename=str(report), output_format="text"
    )
    assert passed and not broken, report.read_text()
    assert "All tests passed!" in report.read_text()


def test_values_types_and_names_survive(tmp_path: Path, result_maker: Maker) -> None:
    result = result_maker(6, 7, projected=True, descending=True, seasons=(2020, 2021))
    path = tmp_path / "out" / "maize-observed.nc"
    write_netcdf(result, path, "made in a test")
    with netCDF4.Dataset(path) as file:
        for name, measure in MEASURES.items():
            assert file[name].dtype == np.dtype(measure.dtype), name
            assert file[name].dimensions == ("season", "y", "x")
            assert file[name].filters()["zlib"]
    with xr.open_dataset(path, decode_coords="all") as found:
        for name in MEASURES:
            expected = result[name].values.astype(float)
            expected = np.where(expected == -1, np.nan, expected) if name == "leading_cause" else expected
            np.testing.assert_allclose(found[name].values, expected, rtol=1e-6)
        for name in SERIES:
            for step in ("stage", "ten_days"):
                both = found[f"{name}_by_{step}"].transpose("season", step, "y", "x")
                np.testing.assert_allclose(
                    both.values, result[f"{name}_by_{step}"].values, rtol=0.5, atol=0.5
                )
        np.testing.assert_array_equal(found["y"].values, result["y"].values)
        np.testing.assert_array_equal(found["cell_status"].values, result["cell_status"].values)
        assert found.rio.crs == result.rio.crs
        assert list(found["season"].values) == [2020, 2021]
        assert [name.decode() for name in found["stage_name"].values] == list(result["stage"].values)


def expected_of(result: xr.Dataset, name: str, step: str) -> np.ndarray:
    """Return the values of a series as files hold them: counts are whole."""
    values = result[f"{name}_by_{step}"].values
    return np.rint(values) if MEASURES[name].kind == "count" else values


def test_season_is_a_climatological_time(tmp_path: Path, result_maker: Maker) -> None:
    write_netcdf(result_maker(3, 3), tmp_path / "a.nc", "")
    with netCDF4.Dataset(tmp_path / "a.nc") as file:
        time = file["time"]
        assert time.climatology == "climatology_bounds" and not hasattr(time, "bounds")
        first, last = netCDF4.num2date(file["climatology_bounds"][0], time.units, time.calendar)
        assert (str(first)[:10], str(last)[:10]) == ("2021-04-20", "2021-06-21")
        assert str(netCDF4.num2date(time[0], time.units, time.calendar))[:10] == "2021-06-20"
        ends = netCDF4.num2date(file["ten_days_end"][:, 0], time.units, time.calendar)
        expected = ["2021-04-30", "2021-05-10", "2021-05-20", "2021-05-31", "2021-06-10", "2021-06-20"]
        assert [str(day)[:10] for day in ends] == expected


def test_hot_days_carry_their_threshold(tmp_path: Path, result_maker: Maker) -> None:
    write_netcdf(result_maker(3, 3), tmp_path / "a.nc", "")
    with netCDF4.Dataset(tmp_path / "a.nc") as file:
        hot = file["hot_days"]
        assert hot.standard_name == "number_of_days_with_air_temperature_above_threshold"
        assert hot.cell_methods == "time: maximum within days time: sum over days"
        assert {"hot_day_limit", "time"} <= set(hot.coordinates.split())
        assert file["hot_day_limit"].standard_name == "air_temperature" and file["hot_day_limit"][()] == 35.0
        # Air 1 K cooler against the limit is the air as it is against the limit + 1 K
        assert file["hot_day_limit_if_cooler"][()] == 36.0 and file["hot_day_limit_if_warmer"][()] == 34.0
        degree_days = file["degree_days_above_limit"]
        threshold = file["degree_day_threshold"]
        assert "degree_day_threshold" in degree_days.coordinates
        assert threshold.standard_name == "air_temperature_threshold" and threshold[()] == 35.0
        assert degree_days.units_metadata == "temperature: difference"
        spell = file["longest_hot_spell"]
        assert spell.cell_methods == "time: maximum within days time: maximum over days"
        flag = file["leading_cause"]
        assert flag.flag_meanings.split() == ["none", "photorespiration", "stomata", "enzymes", "respiration"]
        assert list(flag.flag_values) == [0, 1, 2, 3, 4]
        for text in ("assumptions", "caution", "credit", "last_day_of_data", "water", "co2", "heat_onset"):
            assert file.getncattr(text)


def test_dates_keep_their_calendar(tmp_path: Path, result_maker: Maker) -> None:
    write_netcdf(in_calendar(result_maker(2, 2), "360_day"), tmp_path / "a.nc", "")
    with xr.open_dataset(tmp_path / "a.nc") as found:
        assert found["time"].values[0] == cftime.Datetime360Day(2021, 6, 20)


def test_a_lazy_result_is_written_all_the_same(tmp_path: Path, result_maker: Maker) -> None:
    result = result_maker(4, 5)
    write_netcdf(result.chunk({"lat": 2}), tmp_path / "a.nc", "")
    with xr.open_dataset(tmp_path / "a.nc") as found:
        np.testing.assert_allclose(found["lost_to_heat"].values, result["lost_to_heat"].values, rtol=1e-6)


@pytest.mark.parametrize(
    ("number", "exists", "words"),
    [
        (errno.EACCES, True, "open in another program"),
        (errno.EACCES, False, "no permission"),
        (errno.ENOSPC, False, "no room"),
        (errno.EIO, False, "could not be written"),
    ],
)
def test_a_failed_write_says_why_and_leaves_nothing_half_written(
    tmp_path: Path,
    result_maker: Maker,
    monkeypatch: pytest.MonkeyPatch,
    number: int,
    exists: bool,
    words: str,
) -> None:
    path = tmp_path / "maize.nc"
    if exists:
        path.write_bytes(b"earlier")

    def refuse(*_: object) -> None:
        raise OSError(number, os.strerror(number))

    monkeypatch.setattr(os, "replace", refuse)
    with pytest.raises(InputError, match=words):
        write_netcdf(result_maker(2, 2), path, "")
    assert [entry.name for entry in tmp_path.iterdir()] == (["maize.nc"] if exists else [])


def test_a_folder_in_the_place_of_the_file(tmp_path: Path, result_maker: Maker) -> None:
    (tmp_path / "maize.nc").mkdir()
    with pytest.raises(InputError, match="a folder has the name"):
        write_netcdf(result_maker(2, 2), tmp_path / "maize.nc", "")


def test_a_file_in_the_place_of_the_folder(tmp_path: Path, result_maker: Maker) -> None:
    (tmp_path / "grids").write_text("not a folder")
    with pytest.raises(InputError, match="a file has its name"):
        write_netcdf(result_maker(2, 2), tmp_path / "grids" / "maize.nc", "")
