"""One crop and scenario as a CF-1.11 NetCDF file, with an encoding of its own."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

import cftime
import netCDF4
import numpy as np
import xarray as xr

from cropstress.report.cf_attributes import (
    axis_attributes,
    global_attributes,
    label_of,
    measure_attributes,
    measures_in,
    place_attributes,
    plain,
    thresholds,
)
from cropstress.report.grid import MapGrid, grid_mapping_name, map_grid
from cropstress.report.statistics import loaded
from cropstress.report.writing import written_aside
from cropstress.season.measures import CELL_STATUS, STAGES, Measure

EPOCH = "1900-01-01"
FILL: dict[str, float | int] = {"float32": np.nan, "int16": -9999, "int8": -1}

#: Chunks of at most this many cells a side, one season and step each; small variables are one chunk.
CHUNK = 256


def write_netcdf(result: xr.Dataset, path: Path | str, history: str) -> None:
    """Write a finished result as CF-1.11 NetCDF.

    The dimension `season` holds the year of harvest; beside it stands a climatological `time`, whose bounds
    are the first and the last day counted and whose value is the last day. Amounts are float32, counts
    int16, flags int8, all compressed; one map after the other is written, so that a large result needs
    little memory beside itself.

    Parameters
    ----------
    result : xarray.Dataset
        All measures of one crop and scenario.
    path : path
        Its final name.
    history : str
        What was run and when; no path of this machine.

    Raises
    ------
    InputError
        When the file cannot be written.
    """
    result = loaded(result)
    with written_aside(path) as aside:
        writer = _Writer(result, map_grid(result))
        with netCDF4.Dataset(aside, "w", format="NETCDF4") as file:
            writer.write(file, history)


class _Writer:
    """Writes one result into an open file."""

    def __init__(self, result: xr.Dataset, grid: MapGrid) -> None:
        self.result = result
        self.grid = grid
        self.mapping = grid_mapping_name(result)
        self.places = [
            str(name)
            for name, coordinate in result.coords.items()
            if coordinate.ndim == 2 and set(coordinate.dims) == {grid.y_name, grid.x_name}
        ]
        self.thresholds = thresholds(result)
        self.time = _Time(result)

    def write(self, file: netCDF4.Dataset, history: str) -> None:
        file.setncatts(global_attributes(self.result, history))
        file.createDimension("season", self.result.sizes["season"])
        file.createDimension("bounds", 2)
        file.createDimension(self.grid.y_name, self.grid.y.size)
        file.createDimension(self.grid.x_name, self.grid.x.size)
        self._seasons(file)
        if "stage" in self.result.dims:
            self._stages(file)
        if "ten_days" in self.result.dims:
            self._ten_days(file)
        self._space(file)
        for name, (value, attributes) in self.thresholds.items():
            _put(file, name, (), np.float64(value), attributes)
        for name, measure, words in measures_in(self.result):
            self._measure(file, name, measure, words)
        if "cell_status" in self.result:
            self._flags(file, "cell_status", "whether the cell was computed, or why not", CELL_STATUS, "status_flag")
        if "last_stage" in self.result:
            stages = {name: number for number, name in enumerate(STAGES)}
            self._flags(file, "last_stage", "growth stage of the last day of the season that lies in the data", stages)

    def _seasons(self, file: netCDF4.Dataset) -> None:
        years = np.asarray(self.result["season"].values, dtype=np.int32)
        _put(file, "season", ("season",), years, {"long_name": "year of harvest", "units": "1"})
        starts, ends = self.time.numbers("season_start"), self.time.numbers("season_end")
        words = {"standard_name": "time", "long_name": "last day counted", "axis": "T"}
        attributes = words | self.time.attributes | {"climatology": "climatology_bounds"}
        _put(file, "time", ("season",), ends, attributes)
        # From the start of the first day to the end of the last
        _put(file, "climatology_bounds", ("season", "bounds"), np.stack([starts, ends + 1.0], axis=-1), {})

    def _stages(self, file: netCDF4.Dataset) -> None:
        names = [str(name) for name in self.result["stage"].values]
        length = max(len(name) for name in names)
        file.createDimension("stage", len(names))
        file.createDimension("name_length", length)
        letters = netCDF4.stringtochar(np.array(names, dtype=f"S{length}"))
        _put(file, "stage_name", ("stage", "name_length"), letters, {"long_name": "growth stage, FAO-56"})

    def _ten_days(self, file: netCDF4.Dataset) -> None:
        count = self.result.sizes["ten_days"]
        file.createDimension("ten_days", count)
        words = {"long_name": "number of the ten-day step within the season", "units": "1"}
        _put(file, "ten_days", ("ten_days",), np.arange(count, dtype=np.int32), words)
        if "ten_days_start" not in self.result.coords:
            return
        starts = self.time.numbers("ten_days_start")
        last_counted = self.time.numbers("season_end")[:, None]
        following = np.concatenate([starts[:, 1:], np.full_like(last_counted, np.nan)], axis=1)
        ends = np.where(np.isnan(starts), np.nan, np.fmin(following - 1.0, last_counted))
        for name, numbers, which in (("ten_days_start", starts, "first"), ("ten_days_end", ends, "last")):
            words = {"standard_name": "time", "long_name": f"{which} day of the ten-day step"}
            attributes = words | self.time.attributes
            _put(file, name, ("ten_days", "season"), numbers.T, attributes, fill=np.nan)

    def _space(self, file: netCDF4.Dataset) -> None:
        for name, values, letter in (
            (self.grid.y_name, self.grid.y, "Y"),
            (self.grid.x_name, self.grid.x, "X"),
        ):
            attributes = (
                axis_attributes(self.grid, letter) | plain(self.result[name].attrs) | {"axis": letter}
            )
            attributes.pop("bounds", None)
            _put(file, name, (name,), values, attributes)
        for name in self.places:
            coordinate = self.result[name].transpose(self.grid.y_name, self.grid.x_name)
            attributes = place_attributes(name) | plain(coordinate.attrs)
            attributes.pop("bounds", None)
            _put(file, name, coordinate.dims, np.asarray(coordinate.values, dtype=np.float64), attributes)
        if self.mapping is not None:
            attributes = plain(self.result[self.mapping].attrs)
            if self.grid.crs is not None:
                attributes = plain(self.grid.crs.to_cf()) | attributes
            _put(file, self.mapping, (), np.int32(0), attributes)

    def _measure(self, file: netCDF4.Dataset, name: str, measure: Measure, words: str) -> None:
        # CF section 2.4: other dimensions stand to the left of time and space
        dims: tuple[str, ...] = ("season", self.grid.y_name, self.grid.x_name)
        coordinates = ["time", *self.places]
        for step, label in (("stage", "stage_name"), ("ten_days", "ten_days_start ten_days_end")):
            if step in self.result[name].dims:
                dims = (step, *dims)
                coordinates.append(label)
        if label_of(measure) in self.thresholds:
            coordinates.append(str(label_of(measure)))
        attributes = measure_attributes(measure, words, measure.threshold in self.thresholds)
        if "cell_status" in self.result:
            attributes["ancillary_variables"] = "cell_status"
        self._grid_variable(file, name, measure.dtype, dims, attributes, coordinates)

    def _flags(
        self,
        file: netCDF4.Dataset,
        name: str,
        long_name: str,
        meanings: Mapping[str, int],
        standard_name: str | None = None,
    ) -> None:
        dims: tuple[str, ...] = (self.grid.y_name, self.grid.x_name)
        if "season" in self.result[name].dims:
            dims = ("season", *dims)
        attributes = {
            **({"standard_name": standard_name} if standard_name else {}),
            "long_name": long_name,
            "flag_values": np.array(list(meanings.values()), dtype=np.int8),
            "flag_meanings": " ".join(meanings),
        }
        coordinates = [*(["time"] if "season" in dims else []), *self.places]
        self._grid_variable(file, name, "int8", dims, attributes, coordinates)

    def _grid_variable(
        self,
        file: netCDF4.Dataset,
        name: str,
        dtype: str,
        dims: tuple[str, ...],
        attributes: dict[str, Any],
        coordinates: list[str],
    ) -> None:
        shape = tuple(file.dimensions[dim].size for dim in dims)
        chunks = (1,) * (len(dims) - 2) + tuple(min(size, CHUNK) for size in shape[-2:])
        if int(np.prod(shape)) <= CHUNK**2:
            chunks = shape
        variable = file.createVariable(
            name, dtype, dims, fill_value=FILL[dtype], zlib=True, complevel=4, shuffle=True, chunksizes=chunks
        )
        if coordinates:
            attributes["coordinates"] = " ".join(coordinates)
        if self.mapping is not None:
            attributes["grid_mapping"] = self.mapping
        variable.setncatts(attributes)
        variable.set_auto_mask(False)
        values = self.result[name].transpose(*dims)
        for place in np.ndindex(shape[:-2]):
            variable[place] = as_stored(values[place].values, dtype)


class _Time:
    """Days since the epoch, in the calendar of the weather."""

    def __init__(self, result: xr.Dataset) -> None:
        self.result = result
        first = np.ravel(result["season_start"].values)[0]
        self.calendar = "standard" if isinstance(first, np.datetime64) else str(first.calendar)
        self.attributes = {"units": f"days since {EPOCH}", "calendar": self.calendar}
        if self.calendar == "standard":
            self.attributes["units_metadata"] = "leap_seconds: none"

    def numbers(self, name: str) -> np.ndarray:
        """Days since the epoch of a coordinate of dates, NaN where there is none [d]."""
        values = self.result[name].values
        if np.issubdtype(values.dtype, np.datetime64):
            days = (values.astype("datetime64[D]") - np.datetime64(EPOCH, "D")).astype(np.float64)
            days[np.isnat(values)] = np.nan
            return days
        units = self.attributes["units"]
        numbers = [
            cftime.date2num(date, units, calendar=self.calendar) if hasattr(date, "calendar") else np.nan
            for date in np.ravel(values)
        ]
        return np.floor(np.array(numbers, dtype=np.float64)).reshape(values.shape)


def as_stored(values: np.ndarray, dtype: str, fill: float | int | None = None) -> np.ndarray:
    """Return values in the type of the files, missing ones filled.

    Parameters
    ----------
    values : numpy.ndarray
        float64 with NaN, or whole numbers.
    dtype : str
        "float32", "int16" or "int8".
    fill : number, optional
        What stands for missing; that of the NetCDF files by default.
    """
    fill = FILL[dtype] if fill is None else fill
    values = np.asarray(values)
    if dtype == "float32":
        stored = values.astype(np.float32)
        return stored if np.isnan(fill) else np.where(np.isnan(stored), np.float32(fill), stored)
    if np.issubdtype(values.dtype, np.floating):
        values = np.where(np.isnan(values), fill, np.rint(values))
    return values.astype(dtype)


def _put(
    file: netCDF4.Dataset,
    name: str,
    dims: tuple[Any, ...],
    values: Any,
    attributes: dict[str, Any],
    fill: float | bool = False,
) -> None:
    values = np.asarray(values)
    variable = file.createVariable(name, values.dtype, dims, fill_value=fill)
    variable.setncatts(attributes)
    variable.set_auto_mask(False)
    variable[...] = values
