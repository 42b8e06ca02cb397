"""GeoTIFF files read back with plain rasterio."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import rasterio
import xarray as xr

from cropstress.errors import InputError
from cropstress.report.geotiff import georeferenced, write_geotiff
from cropstress.report.grid import map_grid

Maker = Callable[..., xr.Dataset]


@pytest.mark.parametrize("projected", [False, True])
@pytest.mark.parametrize("descending", [False, True])
@pytest.mark.parametrize(
    ("measure", "dtype", "nodata"),
    [
        ("lost_to_heat_share", "float32", -9999.0),
        ("hot_days", "int16", -9999.0),
        ("first_hot_day", "int16", -9999.0),
        ("leading_cause", "uint8", 255.0),
    ],
)
def test_read_back(
    tmp_path: Path,
    result_maker: Maker,
    projected: bool,
    descending: bool,
    measure: str,
    dtype: str,
    nodata: float,
) -> None:
    result = result_maker(6, 9, projected=projected, descending=descending, seasons=(2020, 2021))
    path = tmp_path / "map.tif"
    write_geotiff(result, measure, 2021, path, {"run": "number 7"})
    y_name, x_name = ("y", "x") if projected else ("lat", "lon")
    with rasterio.open(path) as file:
        values, tags = file.read(1), file.tags()
        assert file.crs == rasterio.CRS.from_epsg(32632 if projected else 4326)
        assert file.nodata == nodata and file.dtypes == (dtype,) and file.shape == (6, 9)
        assert file.transform.e < 0 < file.transform.a
        for row, y in enumerate(sorted(result[y_name].values, reverse=True)):
            for column, x in enumerate(result[x_name].values):
                assert file.index(x, y) == (row, column)
                expected = float(result[measure].sel({"season": 2021, y_name: y, x_name: x}))
                blank = np.isnan(expected) or (measure == "leading_cause" and expected < 0)
                assert values[row, column] == (nodata if blank else np.float32(expected))
    assert tags["run"] == "number 7" and tags["season"] == "2021"
    assert "not yield" in tags["caution"] and "35 °C" in tags["assumptions"]
    assert tags["credit"] == "invented for tests" and tags["heat_onset"] == "33 degC"


def test_zero_is_a_value_and_not_nodata(tmp_path: Path, result_maker: Maker) -> None:
    result = result_maker(6, 9)
    write_geotiff(result, "hot_days", 2021, tmp_path / "map.tif")
    with rasterio.open(tmp_path / "map.tif") as file:
        masked = file.read(1, masked=True)
    assert (masked == 0).sum() == int((result["hot_days"] == 0).sum()) > 0


def test_a_row_takes_the_cell_size_of_the_other_axis(tmp_path: Path, result_maker: Maker) -> None:
    write_geotiff(result_maker(1, 5), "hot_days", 2021, tmp_path / "row.tif")
    with rasterio.open(tmp_path / "row.tif") as file:
        assert file.res == pytest.approx((0.05, 0.05)) and "cell_size" not in file.tags()


def test_one_cell_says_that_its_size_is_not_known(tmp_path: Path, result_maker: Maker) -> None:
    result = result_maker(1, 1, projected=True)
    write_geotiff(result, "hot_days", 2021, tmp_path / "cell.tif")
    with rasterio.open(tmp_path / "cell.tif") as file:
        assert file.res == (1000.0, 1000.0) and "not known" in file.tags()["cell_size"]
        assert file.index(float(result["x"][0]), float(result["y"][0])) == (0, 0)


def test_uneven_cells_and_no_system_are_told(tmp_path: Path, result_maker: Maker) -> None:
    result = result_maker(5, 5)
    uneven = result.assign_coords(lat=("lat", np.array([44.0, 44.1, 44.3, 44.6, 45.0]), result["lat"].attrs))
    assert georeferenced(result) is None
    assert "not evenly spaced" in str(georeferenced(uneven))
    with pytest.raises(InputError, match="not evenly spaced"):
        write_geotiff(uneven, "hot_days", 2021, tmp_path / "map.tif")
    placeless = result_maker(5, 5, projected=True).drop_vars("spatial_ref")
    assert "no coordinate reference system" in str(georeferenced(placeless))


def test_a_rotated_pole_is_told_and_its_places_are_true(tmp_path: Path, result_maker: Maker) -> None:
    result = result_maker(5, 5, projected=True).drop_vars("spatial_ref").rename(y="rlat", x="rlon")
    result = result.assign_coords(
        rlat=("rlat", 0.1 * np.arange(5), {"standard_name": "grid_latitude", "units": "degrees"}),
        rlon=("rlon", 0.1 * np.arange(5), {"standard_name": "grid_longitude", "units": "degrees"}),
        rotated_pole=(
            (),
            0,
            {
                "grid_mapping_name": "rotated_latitude_longitude",
                "grid_north_pole_latitude": 39.25,
                "grid_north_pole_longitude": -162.0,
            },
        ),
    )
    # The equator of the rotated grid meets its first meridian at 90 - 39.25 N, 180 - 162 E
    assert map_grid(result).latitude_longitude(0.0, 0.0) == pytest.approx((50.75, 18.0))
    assert "rotated pole" in str(georeferenced(result))
    with pytest.raises(InputError, match="rotated pole"):
        write_geotiff(result, "hot_days", 2021, tmp_path / "map.tif")


def test_unknown_measure_names_the_nearest(tmp_path: Path, result_maker: Maker) -> None:
    with pytest.raises(InputError, match='Did you mean "hot_days"'):
        write_geotiff(result_maker(2, 2), "hot_dayz", 2021, tmp_path / "map.tif")
