"""The sample grids: reproduced exactly, CF-compliant, small, and like weather."""

from __future__ import annotations

import csv
import subprocess
import sys
from pathlib import Path

import geopandas
import numpy as np
import pytest
import shapely
import xarray as xr

SAMPLE = Path(__file__).resolve().parents[2] / "sample_grids"
GRIDS = sorted(path.name for path in SAMPLE.glob("*.nc"))
WEATHER = {
    "airtemperature_2021.nc": ("tasmax", "tasmin"),
    "humidity_2021.nc": ("hurs",),
    "radiation_2021.nc": ("rsds",),
    "wind_2021.nc": ("sfcWind",),
}
HOT_DAY = 35.0 + 1e-3  # degC, the maize profile's hot-day limit; a thousandth for rounding in float32


def saturation_pressure(temperature: np.ndarray) -> np.ndarray:
    """FAO-56 Eq. 11, [degC] to [kPa]."""
    return 0.6108 * np.exp(17.27 * temperature / (temperature + 237.3))


def extraterrestrial(day_of_year: np.ndarray, latitude: np.ndarray) -> np.ndarray:
    """FAO-56 Eq. 21 by a sum over the day's minutes, so not the generator's formula; [W m-2]."""
    hour_angle = np.deg2rad((np.arange(1440) + 0.5) / 4.0 - 180.0)
    turn = 2 * np.pi * day_of_year[:, None] / 365.0
    declination, latitude = 0.409 * np.sin(turn - 1.39), np.deg2rad(latitude)[None, :]
    height = (
        np.sin(latitude) * np.sin(declination)[..., None]
        + np.cos(latitude) * np.cos(declination)[..., None] * np.cos(hour_angle)[:, None]
    )
    solar_constant = 0.0820e6 / 60.0  # W m-2
    return solar_constant * (1 + 0.033 * np.cos(turn)) * np.maximum(height, 0.0).mean(axis=1)


@pytest.fixture(scope="module")
def weather() -> xr.Dataset:
    """All weather variables; temperatures in degC."""
    parts = []
    for file, names in WEATHER.items():
        with xr.open_dataset(SAMPLE / file) as dataset:
            parts.append(dataset[list(names)].drop_vars("height", errors="ignore").load())
    merged = xr.merge(parts, join="exact", compat="no_conflicts", combine_attrs="drop")
    for name in ("tasmax", "tasmin"):
        merged[name] = merged[name] - 273.15
    return merged


@pytest.fixture(scope="module")
def static() -> xr.Dataset:
    """Elevation, sowing day and crop area."""
    parts = []
    for file in ("elevation.nc", "sowing_day.nc", "crop_area.nc"):
        with xr.open_dataset(SAMPLE / file) as dataset:
            parts.append(dataset.drop_vars(["lat_bnds", "lon_bnds"]).load())
    return xr.merge(parts, join="exact", compat="no_conflicts", combine_attrs="drop")


@pytest.fixture(scope="module")
def districts() -> geopandas.GeoDataFrame:
    """District outlines."""
    return geopandas.read_file(SAMPLE / "districts.geojson")


@pytest.fixture(scope="module")
def district_of_cell(districts: geopandas.GeoDataFrame, static: xr.Dataset) -> np.ndarray:
    """Code of the district of each cell centre, '' outside."""
    longitude, latitude = np.meshgrid(static["lon"], static["lat"])
    codes = np.full(longitude.shape, "", dtype="<U4")
    for code, shape in zip(districts["code"], districts.geometry, strict=True):
        inside = shapely.contains_xy(shape, longitude, latitude)
        assert not codes[inside].any()
        codes[inside] = code
    return codes


@pytest.fixture(scope="module")
def made_again(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Make everything anew and return the folder."""
    folder = tmp_path_factory.mktemp("sample_grids")
    subprocess.run([sys.executable, str(SAMPLE / "make_sample_grids.py"), str(folder)], check=True)
    return folder


def test_generator_makes_these_files_and_no_others(made_again: Path) -> None:
    committed = {path.name for path in SAMPLE.iterdir() if path.suffix in {".nc", ".csv", ".geojson"}}
    assert {path.name for path in made_again.iterdir()} == committed


@pytest.mark.parametrize("name", GRIDS)
def test_generator_reproduces_every_stored_value(name: str, made_again: Path) -> None:
    with (
        xr.open_dataset(SAMPLE / name, decode_cf=False) as committed,
        xr.open_dataset(made_again / name, decode_cf=False) as again,
    ):
        xr.testing.assert_identical(again, committed)
        assert {name: str(again[name].dtype) for name in again.variables} == {
            name: str(committed[name].dtype) for name in committed.variables
        }


@pytest.mark.parametrize("name", ["districts.geojson", "sowing_by_district.csv"])
def test_generator_reproduces_districts_and_table(name: str, made_again: Path) -> None:
    # read as text: some systems check files out with other line ends
    assert (made_again / name).read_text("utf-8") == (SAMPLE / name).read_text("utf-8")


def test_folder_is_small() -> None:
    assert sum(path.stat().st_size for path in SAMPLE.glob("*.*")) < 8e6


@pytest.mark.filterwarnings("ignore::DeprecationWarning")  # the checker's own
@pytest.mark.parametrize("name", GRIDS)
def test_cf_compliant(name: str, tmp_path: Path) -> None:
    from compliance_checker.runner import CheckSuite, ComplianceChecker

    CheckSuite.load_all_available_checkers()
    report = tmp_path / "report.txt"
    passed, errors = ComplianceChecker.run_checker(
        str(SAMPLE / name), ["cf:1.8"], 0, "strict", output_filename=str(report), output_format="text"
    )
    assert passed and not errors, report.read_text()


@pytest.mark.parametrize("name", GRIDS)
def test_crs_is_found(name: str) -> None:
    pytest.importorskip("rioxarray")
    with xr.open_dataset(SAMPLE / name, decode_coords="all") as dataset:
        assert dataset.rio.crs.to_epsg() == 4326


def test_days_and_grid(weather: xr.Dataset) -> None:
    assert dict(weather.sizes) == {"time": 198, "lat": 60, "lon": 80}
    days = weather["time"].values.astype("datetime64[D]")
    assert days[0] == np.datetime64("2021-04-01") and days[-1] == np.datetime64("2021-10-15")
    assert (np.diff(days) == np.timedelta64(1, "D")).all()
    np.testing.assert_allclose(np.diff(weather["lat"]), 0.05, atol=1e-9)
    np.testing.assert_allclose(np.diff(weather["lon"]), 0.05, atol=1e-9)


def test_same_sea_in_every_grid(weather: xr.Dataset, static: xr.Dataset) -> None:
    is_land = static["orog"].notnull()
    assert 0.1 < 1.0 - float(is_land.mean()) < 0.3
    for variable in (*weather.data_vars.values(), *static.drop_vars("crs").data_vars.values()):
        assert (variable.notnull() == is_land).all(), variable.name


def test_temperatures(weather: xr.Dataset) -> None:
    daily_range = (weather["tasmax"] - weather["tasmin"]).values
    assert np.nanmin(daily_range) > 0.5
    assert np.nanmax(daily_range) < 22.0
    assert -10.0 < float(weather["tasmin"].min()) < 5.0
    assert 38.0 < float(weather["tasmax"].max()) < 44.0


def test_radiation_is_below_the_clear_sky(weather: xr.Dataset, static: xr.Dataset) -> None:
    day_of_year = weather["time"].dt.dayofyear.values.astype(float)
    top = extraterrestrial(day_of_year, weather["lat"].values)[:, :, None]
    clear_sky = (0.75 + 2e-5 * static["orog"].values) * top  # FAO-56 Eq. 37
    share = weather["rsds"].values / clear_sky
    assert np.nanmax(share) < 0.99
    assert np.nanmin(share) > 0.15
    assert np.nanmax(share) > 0.95  # there are clear days
    assert np.nanquantile(share, 0.05) < 0.6  # and dull ones


def test_humidity_fits_the_nights(weather: xr.Dataset) -> None:
    assert float(weather["hurs"].min()) > 15.0
    assert float(weather["hurs"].max()) < 100.0
    lowest, highest = saturation_pressure(weather["tasmin"]), saturation_pressure(weather["tasmax"])
    vapour_pressure = weather["hurs"] / 100.0 * (lowest + highest) / 2.0  # FAO-56 Eq. 19
    assert float((vapour_pressure / lowest).max()) < 1.01


def test_wind(weather: xr.Dataset) -> None:
    assert float(weather["sfcWind"].min()) > 0.5
    assert float(weather["sfcWind"].max()) < 18.0
    with xr.open_dataset(SAMPLE / "wind_2021.nc") as dataset:
        assert float(dataset["height"]) == 10.0


def test_inland_days_range_wider_and_clear_days_too(
    weather: xr.Dataset, district_of_cell: np.ndarray
) -> None:
    daily_range = weather["tasmax"] - weather["tasmin"]
    bay = daily_range.values[:, district_of_cell == "0102"]
    basin = daily_range.values[:, district_of_cell == "0408"]
    assert basin.mean() > bay.mean() + 3.0
    summer = weather.sel(time=slice("2021-06-01", "2021-08-31"))
    radiation, wide = summer["rsds"].values[:, 40, 50], daily_range.sel(time=summer["time"]).values[:, 40, 50]
    assert np.corrcoef(radiation, wide)[0, 1] > 0.6


def test_weather_lasts_and_has_no_stripes(weather: xr.Dataset) -> None:
    tmax = weather["tasmax"]
    departure = (tmax - tmax.rolling(time=31, center=True, min_periods=10).mean()).values[:, :, 45:]
    yesterday, today = departure[:-1].ravel(), departure[1:].ravel()
    assert 0.4 < np.corrcoef(yesterday, today)[0, 1] < 0.85
    to_the_north = np.sqrt(np.nanmean(np.diff(departure, axis=1) ** 2))
    to_the_east = np.sqrt(np.nanmean(np.diff(departure, axis=2) ** 2))
    assert 0.7 < to_the_north / to_the_east < 1.4
    assert max(to_the_north, to_the_east) < 0.8


def test_two_heat_waves_with_different_footprints(weather: xr.Dataset, district_of_cell: np.ndarray) -> None:
    hot = weather["tasmax"] > HOT_DAY
    first = hot.sel(time=slice("2021-06-25", "2021-07-04")).sum("time").values
    second = hot.sel(time=slice("2021-07-30", "2021-08-09")).sum("time").values
    basin, plain, coast = (district_of_cell == code for code in ("0408", "0204", "0102"))
    assert first[basin].mean() > 4 * first[plain].mean() + 2
    assert second[plain].mean() > 2 * second[basin].mean() + 1
    assert first[coast].max() == 0
    season = hot.sum("time").values
    assert season[coast].max() <= 2
    assert 18 <= season[basin].max() <= 25
    assert (season[basin] >= 10).mean() > 0.4


def test_crop_area(static: xr.Dataset) -> None:
    shares = static[["maize", "wheat", "soybean", "cotton", "potato"]]
    total = sum(shares.data_vars.values())
    assert float(total.max()) <= 1.0
    for share in shares.data_vars.values():
        assert float(share.min()) == 0.0
        assert 0.05 < float((share > 0).sum() / share.notnull().sum()) < 0.97
    assert float(static["orog"].where(static["wheat"] > 0).mean()) > float(
        static["orog"].where(static["maize"] > 0).mean()
    )


def test_maize_sowing_leaves_room_for_the_season(static: xr.Dataset) -> None:
    day = static["maize_sowing_day"]
    assert (day.dropna("lat", how="all") % 1).max() == 0
    assert 100 <= float(day.min()) < float(day.max()) <= 130
    # FAO-56 Table 11, maize (grain), April, Spain and California: 150 days; 288 is 15 October
    assert float(day.max()) + 150 - 1 <= 288


def test_districts_cover_the_land_once(
    districts: geopandas.GeoDataFrame, district_of_cell: np.ndarray, static: xr.Dataset
) -> None:
    assert len(districts) == 8
    assert districts.crs.to_epsg() == 4326
    assert districts.geometry.is_valid.all()
    assert (districts.geometry.geom_type == "MultiPolygon").any()  # the island
    codes = districts["code"]
    assert codes.is_unique and codes.str.fullmatch(r"0\d{3}").all()
    assert not districts["name"].map(str.isascii).all()
    is_land = static["orog"].notnull().values
    assert ((district_of_cell != "") == is_land).all()
    whole = shapely.union_all(districts.geometry.values)
    assert abs(shapely.area(districts.geometry.values).sum() - whole.area) < 1e-6
    assert (np.unique(district_of_cell[is_land], return_counts=True)[1] > 100).all()


def test_sowing_table_names_every_district(districts: geopandas.GeoDataFrame) -> None:
    with (SAMPLE / "sowing_by_district.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    assert [(row["code"], row["district"]) for row in rows] == list(
        zip(districts["code"], districts["name"], strict=True)
    )
    # FAO-56 Table 11, spring wheat, March and April, 35-45 degrees: 135 days
    last = max(np.datetime64(f"2021-{row['date']}") for row in rows)
    assert last + np.timedelta64(134, "D") <= np.datetime64("2021-10-15")
