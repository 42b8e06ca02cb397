"""Make the sample grids: one growing season of the invented region of Tessavar.

    python sample_grids/make_sample_grids.py [FOLDER]

Tessavar does not exist. Its grid lies in the open North Atlantic, far from land, so that no value can be
mistaken for that of a real place; its coast, hills, weather, crops and districts are all invented.

Place: 60 rows x 80 columns of 0.05 degree, 41 to 44 degrees north, 36 to 32 degrees west. Sea in the west
(no data there) with a bay and an island; a plain behind the coast; hills in the north-east; a ridge; behind
the ridge, in the south-east, a dry basin.
Time: 198 days, 1 April to 15 October 2021: room for maize, spring wheat, soybean and cotton to mature.
Heat: one wave from 25 June to 4 July over the dry basin and the south, about when maize flowers, and one
from 30 July to 9 August over the plain and the hills.

=========================  ==============================================================================
airtemperature_2021.nc     tasmax, tasmin: daily highest and lowest air temperature at 2 m [K]
humidity_2021.nc           hurs: daily mean relative humidity [%], vapour pressure through FAO-56 Eq. 19
radiation_2021.nc          rsds: daily mean shortwave radiation [W m-2], below the clear sky of FAO-56 Eq. 37
wind_2021.nc               sfcWind: daily mean wind speed at 10 m [m s-1]
elevation.nc               orog: height of the ground [m]
sowing_day.nc              maize_sowing_day: day of the year
crop_area.nc               maize, wheat, soybean, cotton, potato: share of each cell
sowing_by_district.csv     code, district, date: day on which spring wheat is sown
districts.geojson          eight districts: code (text with leading zeros) and name, longitude and latitude
=========================  ==============================================================================

The same seed gives the same values: they come from the raw output of numpy's PCG64 and are rounded to the
step in which they are stored.
"""

from __future__ import annotations

import csv
import json
import sys
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
import xarray as xr
from invented_land import (
    CELL,
    DISTRICTS,
    LATITUDE,
    LONGITUDE,
    WHEAT_SOWING,
    crop_shares,
    district_shapes,
    maize_sowing_day,
    make_land,
)
from invented_weather import DAYS, FIRST_DAY_OF_YEAR, SEED, RandomFields, make_weather

YEAR = 2021
DAYS_PER_CHUNK = 33
MISSING = -32768
WGS84 = (
    'GEOGCS["WGS 84",DATUM["WGS_1984",SPHEROID["WGS 84",6378137,298.257223563,AUTHORITY["EPSG","7030"]],'
    'AUTHORITY["EPSG","6326"]],PRIMEM["Greenwich",0,AUTHORITY["EPSG","8901"]],'
    'UNIT["degree",0.0174532925199433,AUTHORITY["EPSG","9122"]],AUTHORITY["EPSG","4326"]]'
)


class Packing(NamedTuple):
    """How values become whole numbers: (value - offset) / step, with the offset between the units."""

    step: float
    offset: float = 0.0


WEATHER = {
    "tasmax": (
        {"standard_name": "air_temperature", "long_name": "daily highest air temperature", "units": "K",
         "cell_methods": "time: maximum", "coordinates": "height"}, Packing(0.1, 273.15),
    ),
    "tasmin": (
        {"standard_name": "air_temperature", "long_name": "daily lowest air temperature", "units": "K",
         "cell_methods": "time: minimum", "coordinates": "height"}, Packing(0.1, 273.15),
    ),
    "hurs": (
        {"standard_name": "relative_humidity", "long_name": "daily mean relative humidity", "units": "%",
         "cell_methods": "time: mean", "coordinates": "height"}, Packing(0.5),
    ),
    "rsds": (
        {"standard_name": "surface_downwelling_shortwave_flux_in_air", "units": "W m-2",
         "long_name": "daily mean shortwave radiation", "cell_methods": "time: mean"}, Packing(1.0),
    ),
    "sfcWind": (
        {"standard_name": "wind_speed", "long_name": "daily mean wind speed at 10 m", "units": "m s-1",
         "cell_methods": "time: mean", "coordinates": "height"}, Packing(0.1),
    ),
}  # fmt: skip
WEATHER_FILES = {
    f"airtemperature_{YEAR}.nc": ("Air temperature", ("tasmax", "tasmin"), 2.0),
    f"humidity_{YEAR}.nc": ("Relative humidity", ("hurs",), 2.0),
    f"radiation_{YEAR}.nc": ("Shortwave radiation", ("rsds",), None),
    f"wind_{YEAR}.nc": ("Wind speed", ("sfcWind",), 10.0),
}


def frame(title: str) -> xr.Dataset:
    """Empty dataset with coordinates, bounds, CRS and the attributes every file carries."""
    edges = {"lat": LATITUDE, "lon": LONGITUDE}
    bounds = {
        f"{name}_bnds": ((name, "bnds"), np.round(centre[:, None] + CELL * np.array([-0.5, 0.5]), 3))
        for name, centre in edges.items()
    }
    dataset = xr.Dataset(bounds, coords={name: (name, centre) for name, centre in edges.items()})
    dataset["lat"].attrs = {
        "standard_name": "latitude", "long_name": "latitude", "units": "degrees_north", "axis": "Y",
        "bounds": "lat_bnds",
    }  # fmt: skip
    dataset["lon"].attrs = {
        "standard_name": "longitude", "long_name": "longitude", "units": "degrees_east", "axis": "X",
        "bounds": "lon_bnds",
    }  # fmt: skip
    dataset["crs"] = (
        (),
        np.int32(0),
        {
            "grid_mapping_name": "latitude_longitude",
            "long_name": "WGS 84",
            "semi_major_axis": 6378137.0,
            "inverse_flattening": 298.257223563,
            "longitude_of_prime_meridian": 0.0,
            "crs_wkt": WGS84,
        },
    )
    dataset.attrs = {
        "Conventions": "CF-1.8",
        "title": f"{title}, Tessavar (an invented region)",
        "institution": "invented",
        "source": f"invented by sample_grids/make_sample_grids.py of cropstress, seed {SEED}",
        "history": "made in one step, nothing changed since",
        "references": "none: no value is measured or modelled",
        "comment": "Tessavar does not exist; its grid lies in the open North Atlantic, far from any land.",
    }
    return dataset


def add_time(dataset: xr.Dataset) -> None:
    """Add the days: stamps at noon, bounds from midnight to midnight."""
    start = FIRST_DAY_OF_YEAR - 1.0 + np.arange(DAYS)
    units = {"units": f"days since {YEAR}-01-01 00:00:00", "calendar": "standard"}
    dataset["time"] = (
        "time",
        start + 0.5,
        {"standard_name": "time", "long_name": "time", "axis": "T", "bounds": "time_bnds", **units},
    )
    dataset["time_bnds"] = (("time", "bnds"), start[:, None] + np.array([0.0, 1.0]))


def add_height(dataset: xr.Dataset, height: float) -> None:
    """Add the height above the ground [m] as a scalar coordinate."""
    dataset["height"] = (
        (),
        height,
        {"standard_name": "height", "long_name": "height above the ground", "units": "m", "positive": "up",
         "axis": "Z"},
    )  # fmt: skip


def add_variable(
    dataset: xr.Dataset, name: str, values: np.ndarray, packing: Packing, attributes: dict[str, str]
) -> None:
    """Add values as packed whole numbers; the packing's offset is only added when the file is read."""
    dimensions = ("time", "lat", "lon")[-values.ndim :]
    unpacking: dict[str, object] = {"_FillValue": np.int16(MISSING)}
    if packing != Packing(1.0):
        unpacking |= {"scale_factor": packing.step, "add_offset": packing.offset}
    packed = np.where(np.isnan(values), MISSING, np.rint(values / packing.step)).astype(np.int16)
    dataset[name] = (dimensions, packed, {**attributes, "grid_mapping": "crs", **unpacking})


def write(dataset: xr.Dataset, path: Path) -> None:
    """Write as NetCDF-4, compressed; the data are packed already, so nothing is encoded on the way."""
    encoding: dict[str, dict[str, Any]] = {str(name): {"_FillValue": None} for name in dataset.variables}
    for name, variable in dataset.data_vars.items():
        if variable.dtype == np.int16:
            chunks = tuple(
                min(DAYS_PER_CHUNK, size) if dimension == "time" else size
                for dimension, size in zip(variable.dims, variable.shape, strict=True)
            )
            encoding[str(name)] = {"zlib": True, "complevel": 9, "shuffle": True, "chunksizes": chunks}
    dataset.to_netcdf(path, engine="netcdf4", format="NETCDF4", encoding=encoding)


def write_districts(folder: Path) -> None:
    """Write the district outlines and the sowing table."""
    shapes = district_shapes()
    features = [
        {"type": "Feature", "properties": {"code": code, "name": name}, "geometry": shapes[code]}
        for code, name, *_ in DISTRICTS
    ]
    lines = ",\n".join(json.dumps(feature, ensure_ascii=False) for feature in features)
    text = f'{{"type": "FeatureCollection", "name": "districts", "features": [\n{lines}\n]}}\n'
    (folder / "districts.geojson").write_text(text, encoding="utf-8", newline="\n")
    with (folder / "sowing_by_district.csv").open("w", encoding="utf-8", newline="") as file:
        table = csv.writer(file, lineterminator="\n")
        table.writerow(["code", "district", "date"])
        table.writerows([code, name, WHEAT_SOWING[code]] for code, name, *_ in DISTRICTS)


def make_sample_grids(folder: Path) -> None:
    """Write all files of the sample region into a folder, made if it is missing."""
    folder.mkdir(parents=True, exist_ok=True)
    fields = RandomFields(SEED)
    land = make_land(fields.still(reach=2.2))
    fields_of_farms, sowing_habits = fields.still(reach=1.5), fields.still(reach=3.0)
    weather = make_weather(land, fields)

    for file_name, (title, names, height) in WEATHER_FILES.items():
        dataset = frame(title)
        add_time(dataset)
        if height is not None:
            add_height(dataset, height)
        for name in names:
            attributes, packing = WEATHER[name]
            add_variable(dataset, name, np.where(land.is_land, weather[name], np.nan), packing, attributes)
        write(dataset, folder / file_name)

    dataset = frame("Elevation")
    elevation = np.where(land.is_land, land.elevation, np.nan)
    attributes = {"standard_name": "surface_altitude", "long_name": "height of the ground", "units": "m"}
    add_variable(dataset, "orog", elevation, Packing(1.0), attributes)
    write(dataset, folder / "elevation.nc")

    dataset = frame("Sowing day of maize")
    attributes = {"long_name": "day of the year on which maize is sown, 1 is 1 January", "units": "1"}
    sowing_day = maize_sowing_day(land, sowing_habits)
    add_variable(dataset, "maize_sowing_day", sowing_day, Packing(1.0), attributes)
    write(dataset, folder / "sowing_day.nc")

    dataset = frame("Crop area")
    for crop, share in crop_shares(land, fields_of_farms).items():
        words = f"share of the cell under {crop}"
        attributes = {"standard_name": "area_fraction", "long_name": words, "units": "1"}
        add_variable(dataset, crop, share, Packing(0.01), attributes)
    write(dataset, folder / "crop_area.nc")

    write_districts(folder)


if __name__ == "__main__":
    make_sample_grids(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).resolve().parent)
