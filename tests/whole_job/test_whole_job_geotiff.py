"""The GeoTIFF files, read back with plain rasterio: place, nodata, values, and the notes they carry."""

import numpy as np
import pytest
import rasterio
import rasterio.transform
import xarray as xr
from finished_run import Run

from cropstress.season.measures import CAUSES, MEASURES

TYPES = {"float32": ("float32", -9999.0), "int16": ("int16", -9999.0), "int8": ("uint8", 255.0)}


def test_geotiff_holds_the_values_of_the_netcdf_north_up(finished: Run) -> None:
    read = 0
    for crop in finished.crops:
        with xr.open_dataset(finished.grid(crop), decode_times=False, mask_and_scale=False) as grid:
            for path in sorted((finished.folder / "maps").glob(f"{crop}-2021-observed-*.tif")):
                measure = MEASURES[path.stem.removeprefix(f"{crop}-2021-observed-")]
                with rasterio.open(path) as file:
                    assert file.crs.to_epsg() == 4326
                    assert file.count == 1
                    assert (file.dtypes[0], file.nodata) == TYPES[measure.dtype]
                    values, transform = file.read(1), file.transform
                lat, lon = grid["lat"].values, grid["lon"].values
                assert lat[0] < lat[-1], "the sample grids run south to north"
                rows, columns = np.indices(values.shape)
                x, y = rasterio.transform.xy(transform, rows.ravel(), columns.ravel())
                np.testing.assert_allclose(np.reshape(x, values.shape), np.broadcast_to(lon, values.shape), atol=1e-9)
                np.testing.assert_allclose(
                    np.reshape(y, values.shape), np.broadcast_to(lat[::-1, None], values.shape), atol=1e-9
                )
                expected = grid[measure.name].values[0][::-1]
                missing = np.isnan(expected) if measure.dtype == "float32" else expected < 0
                assert missing.any() and not missing.all()
                assert (values[missing] == TYPES[measure.dtype][1]).all()
                assert np.array_equal(values[~missing], expected[~missing])
                read += 1
    assert read >= 4 * len(finished.crops) - 1


@pytest.mark.parametrize("measure", ["hot_days", "lost_to_heat_share", "leading_cause"])
def test_geotiff_carries_the_notes(thinned_run: Run, measure: str) -> None:
    with rasterio.open(thinned_run.folder / "maps" / f"wheat-2021-observed-{measure}.tif") as file:
        tags, band = file.tags(), file.tags(1)
        assert file.descriptions == (measure,)
    assert tags["heat_onset"] == "26 degC" and tags["hot_day_limit"] == "32 degC"
    assert tags["flowering_limit"] == "30 degC"
    assert tags["co2"] == "416.4" and tags["acclimation"] == "none" and tags["growth_temperature"] == "15"
    assert tags["water"] == "assumes enough soil water"
    assert tags["last_day_of_data"] == "2021-10-10"
    assert tags["credit"] == "Invented for tests"
    assert "not yield" in tags["caution"]
    assert tags["season"] == "2021" and tags["crop"] == "wheat" and tags["scenario"] == "observed"
    assert band["units"] == MEASURES[measure].unit
    if measure == "leading_cause":
        assert tags["flag_meanings"] == "0 none, " + ", ".join(f"{n} {cause}" for n, cause in enumerate(CAUSES, 1))
