"""Real files with traps of every kind: each is read rightly, or told in words; none ends in a traceback.

The files are open data and test files of other projects; what each holds that trips a reader stands beside it.
"""

from __future__ import annotations

from pathlib import Path

import netCDF4
import numpy as np
import pytest
from spoilt_season import Command

import cropstress
from cropstress.errors import InputError

#: Beginning of the file's name: the variable to take for both temperatures, first day, number of days.
READ = {
    # rotated pole
    "cordex_eur11_cclm": ("tasmin", "1950-01-01", 365),
    # 360-day calendar on a rotated pole
    "cordex_eur11_hadgem": ("tasmin", "1949-12-01", 390),
    # unsigned integers with scale and offset, the day a scalar
    "gridmet_tmmx": ("air_temperature", "2019-01-21", 1),
    # longitudes in two dimensions from 0 to 360
    "tas_AFR-22": ("tas", "1996-01-01", 1827),
    # stamps at the end of the day, by their bounds; no leap years, since year 1
    "tas_day_CESM2": ("tas", "1999-12-31", 3650),
    # 360-day calendar, longitudes from 0 to 334
    "tasmin_day_HadGEM3": ("tasmin", "1960-11-01", 60),
}
#: Beginning of the file's name: the variable, what is said of it.
TOLD = {
    "era5land_monthly": ("t2m", "it has more dimensions than time, rows and columns: expver"),
    "era_interim": ("t2m", "the data are not daily: a step every 6 hours"),
    "gridmet_pr": ("precipitation_amount", "the unit 'mm' does not fit daily highest air temperature"),
    "iris_rotated": ("air_pressure_at_sea_level", "the unit 'Pa' does not fit daily highest air temperature"),
    "per_unit_vector": ("maxtemp", "rows and columns cannot be told from its dimensions (time, hru)"),
    "wrf_cropped": ("T2", "rows and columns cannot be told from its dimensions"),
    "wrf_tasmax": ("tasmax", "rows and columns cannot be told from its dimensions"),
}
#: End of the file's name: what is said of it.
NOT_NETCDF = {
    "empty_file.grib": "the file is empty",
    "era5-levels-corrupted.grib": "a GRIB file",
    "ll_sn_scanning_mode.grib": "a GRIB file",
    "era5_zip_named_nc_telangana.nc": "a ZIP archive",
    "na.tif": "a TIFF image",
    "tmax_monavg_1980_ncss.tif": "a TIFF image",
    "zarr2_small_store": "a Zarr store",
}


def _file(real_data: Path, beginning: str) -> Path:
    (path,) = (real_data / "hostile").glob(f"{beginning}*")
    return path


def _named(name: str) -> dict[str, dict[str, str]]:
    return {
        "tmax": {"name": name, "cell_method": "maximum"},
        "tmin": {"name": name, "cell_method": "minimum"},
    }


@pytest.mark.filterwarnings("ignore:WARNING. missing_value not used")  # of the NetCDF library, about CESM2's file
@pytest.mark.parametrize("beginning", READ)
def test_read_rightly(real_data: Path, beginning: str) -> None:
    """The numbers are those that the NetCDF library gives for the same variable."""
    name, first, days = READ[beginning]
    path = _file(real_data, beginning)
    weather = cropstress.open_weather(path, _named(name))
    with netCDF4.Dataset(path) as file:
        expected = np.ma.filled(file[name][...].astype(float), np.nan) - 273.15
    assert str(weather["time"].values[0])[:10] == first
    assert weather.sizes["time"] == days
    for step in (0, days - 1):
        there = expected.reshape(days, *expected.shape[-2:])[step]
        np.testing.assert_allclose(weather["tmax"][step].values, there, rtol=0.0, atol=1e-4)


@pytest.mark.parametrize("beginning", TOLD)
def test_told_in_words(real_data: Path, beginning: str) -> None:
    name, words = TOLD[beginning]
    with pytest.raises(InputError) as caught:
        cropstress.open_weather(_file(real_data, beginning), _named(name))
    assert any(words in fault.what for fault in caught.value.faults), str(caught.value)


@pytest.mark.parametrize("ending", NOT_NETCDF)
def test_not_netcdf(real_data: Path, ending: str) -> None:
    with pytest.raises(InputError) as caught:
        cropstress.open_weather(real_data / "hostile" / ending)
    (fault,) = caught.value.faults
    assert NOT_NETCDF[ending] in fault.what


def test_every_file_is_in_one_of_the_lists(real_data: Path) -> None:
    for path in (real_data / "hostile").iterdir():
        assert path.name.startswith((*READ, *TOLD)) or path.name in NOT_NETCDF, path.name


def test_a_run_file_that_names_each(real_data: Path, tmp_path: Path, command: Command) -> None:
    """As they are, none of them holds a season; the command says so of each, and never ends in a traceback."""
    for path in sorted((real_data / "hostile").iterdir()):
        run_file = tmp_path / "season.toml"
        run_file.write_text(
            f"seasons.years = 2000\nweather.files = '{path.as_posix()}'\n"
            '[[crops]]\nname = "maize"\nsowing = "20 April"\n',
            encoding="utf-8",
        )
        said = command("check", run_file)
        assert said.code == 2, path.name
        assert said.err.splitlines()[0].endswith("found:")
        assert path.name in said.err
        assert "Traceback" not in said.err
