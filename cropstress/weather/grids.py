"""Horizontal grids: rows and columns, where the cells lie, and whether two grids are one."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
import pyproj
import xarray as xr

from cropstress.errors import Fault
from cropstress.weather.units import UnitError, to_unit

#: Two grids are the same where no cell centre differs by more than this share of the cell's size: enough for
#: coordinates in float32 or with few decimals, far from any real shift.
TOLERANCE = 0.01

_NORTH_UNITS = ("degrees_north", "degree_north", "degree_n", "degrees_n", "degreen", "degreesn")
_EAST_UNITS = ("degrees_east", "degree_east", "degree_e", "degrees_e", "degreee", "degreese")
_ROW_NAMES = ("projection_y_coordinate", "grid_latitude", "latitude")
_COLUMN_NAMES = ("projection_x_coordinate", "grid_longitude", "longitude")
_PLAIN_LATITUDE, _PLAIN_LONGITUDE = ("lat", "latitude"), ("lon", "longitude")
WGS84 = "EPSG:4326"


@dataclass(frozen=True)
class Grid:
    """A horizontal grid.

    Attributes
    ----------
    row, column : str
        Names of the dimensions.
    rows, columns : numpy.ndarray of float64
        Coordinates of the cell centres, strictly rising or falling [unit of the CRS].
    coordinates : dict of str to xarray.Variable
        Everything to carry through to the output: row and column coordinates, their bounds, latitude and
        longitude.
    crs : pyproj.CRS
        Coordinate reference system.
    label : str
        The file it was read from.
    remarks : tuple of str
        What was assumed.
    """

    row: str
    column: str
    rows: np.ndarray
    columns: np.ndarray
    coordinates: dict[str, xr.Variable]
    crs: pyproj.CRS
    label: str
    remarks: tuple[str, ...] = field(default=())

    @property
    def shape(self) -> tuple[int, int]:
        """Number of rows and columns."""
        return len(self.rows), len(self.columns)

    def words(self) -> str:
        """Return its size and extent in words."""
        rows, columns = (
            f"{name} {values[0]:.6g} to {values[-1]:.6g}"
            for name, values in ((self.row, self.rows), (self.column, self.columns))
        )
        return f"{self.shape[0]} x {self.shape[1]} cells, {rows}, {columns}"


def is_north(units: object) -> bool:
    """Tell whether a unit means degrees of latitude."""
    return _plain(units) in _NORTH_UNITS


def is_east(units: object) -> bool:
    """Tell whether a unit means degrees of longitude."""
    return _plain(units) in _EAST_UNITS


def bounds_name(coordinate: xr.Variable) -> str:
    """Return the name of a coordinate's bounds, empty if it has none; xarray moves it to the encoding."""
    return str(coordinate.attrs.get("bounds") or coordinate.encoding.get("bounds") or "")


def _plain(text: object) -> str:
    return str(text).strip().lower().replace(" ", "_")


def horizontal_dimensions(dataset: xr.Dataset, dimensions: tuple[str, ...]) -> tuple[str, str] | None:
    """Return the row and the column dimension among some, or None where it cannot be told.

    A dimension is known by its coordinate's axis, standard name, unit or plain name.
    """
    kinds = {dimension: _kind(dataset, dimension) for dimension in dimensions}
    rows = [name for name, kind in kinds.items() if kind == "Y"]
    columns = [name for name, kind in kinds.items() if kind == "X"]
    if len(rows) == 1 and len(columns) == 1:
        return rows[0], columns[0]
    return None


def _kind(dataset: xr.Dataset, dimension: str) -> str | None:
    variable = dataset.variables.get(dimension)
    if variable is None:
        return None
    axis, name, units = (variable.attrs.get(key) for key in ("axis", "standard_name", "units"))
    lower = dimension.lower()
    if axis == "Y" or name in _ROW_NAMES or is_north(units) or lower in (*_PLAIN_LATITUDE, "y", "rlat"):
        return "Y"
    if axis == "X" or name in _COLUMN_NAMES or is_east(units) or lower in (*_PLAIN_LONGITUDE, "x", "rlon"):
        return "X"
    return None


def read_grid(
    dataset: xr.Dataset, name: str, row: str, column: str, label: str
) -> tuple[Grid | None, list[Fault]]:
    """Read the horizontal grid of a variable.

    Parameters
    ----------
    dataset : xarray.Dataset
        The file.
    name : str
        The variable.
    row, column : str
        Its horizontal dimensions.
    label : str
        How messages name the file.

    Returns
    -------
    Grid or None
    list of Fault
        No coordinates, coordinates out of order, no CRS, or one that cannot be read.
    """
    empty = [each for each in (row, column) if dataset.sizes[each] == 0]
    if empty:
        what = f"the grid has no cell along '{empty[0]}'"
        return None, [Fault(what, f"{label}: {empty[0]}", "Write the file anew: it holds nothing.")]
    words = [each for each in (row, column) if dataset.variables[each].dtype.kind not in "fiu"]
    if words:
        what = f"the coordinate '{words[0]}' holds no numbers"
        return None, [Fault(what, f"{label}: {words[0]}", "Write the coordinates of the grid as numbers.")]
    rows, columns = (dataset.variables[each].values.astype(np.float64) for each in (row, column))
    faults = [
        Fault(
            f"the coordinate '{each}' neither rises nor falls all the way",
            f"{label}: {each}",
            "Put the rows and columns of the grid in order, without repeats or missing values.",
        )
        for each, values in ((row, rows), (column, columns))
        if not _in_order(values)
    ]
    crs, remarks, crs_faults = _read_crs(dataset, name, row, column, label)
    faults += crs_faults
    if faults or crs is None:
        return None, faults
    coordinates = _carried(dataset, row, column, crs)
    return Grid(row, column, rows, columns, coordinates, crs, label, remarks), []


def _in_order(values: np.ndarray) -> bool:
    steps = np.diff(values)
    return bool(np.isfinite(values).all() and ((steps > 0).all() or (steps < 0).all()))


def _read_crs(
    dataset: xr.Dataset, name: str, row: str, column: str, label: str
) -> tuple[pyproj.CRS | None, tuple[str, ...], list[Fault]]:
    """Return the CRS of a variable, what was assumed about it, and what is wrong with it."""
    variable, where = dataset[name], f"{label}: {row}, {column}"
    mapping = variable.encoding.get("grid_mapping", variable.attrs.get("grid_mapping"))
    if mapping is None and "spatial_ref" in dataset.variables:
        mapping = "spatial_ref"
    units = {each: dataset.variables[each].attrs.get("units") for each in (row, column)}
    if mapping is not None:
        mapping = str(mapping).split(":")[0].split()[0]
        if mapping not in dataset.variables:
            remedy = f"Write the grid mapping variable '{mapping}' into the file, or take the attribute off."
            return None, (), [Fault(f"the grid mapping '{mapping}' is not in the file", f"{label}: {name}", remedy)]
        try:
            crs = pyproj.CRS.from_cf(dataset.variables[mapping].attrs)
        except (pyproj.exceptions.CRSError, KeyError, ValueError) as error:
            remedy = "Write a CF grid mapping or a crs_wkt that PROJ can read."
            return None, (), [Fault(f"the grid mapping cannot be read ({error})", f"{label}: {mapping}", remedy)]
        return crs, (), _scale_faults(crs, units, label)
    if is_north(units[row]) and is_east(units[column]):
        return pyproj.CRS(WGS84), (f"{label}: no CRS is given; degrees are taken as WGS 84 (EPSG:4326)",), []
    values = {each: dataset.variables[each].values for each in (row, column)}
    named = row.lower() in _PLAIN_LATITUDE and column.lower() in _PLAIN_LONGITUDE
    if named and units == {row: None, column: None} and _are_degrees(values[row], values[column]):
        taken = "taken as degrees of WGS 84 (EPSG:4326) by their names and range"
        remark = f"{label}: '{row}' and '{column}' have no units; {taken}"
        return pyproj.CRS(WGS84), (remark,), []
    what = f"no coordinate reference system is given for the coordinates '{row}' and '{column}'"
    remedy = (
        "Write a CF grid mapping into the file, or, for latitude and longitude, the units "
        '"degrees_north" and "degrees_east".'
    )
    return None, (), [Fault(what, where, remedy)]


def _are_degrees(latitude: np.ndarray, longitude: np.ndarray) -> bool:
    return bool(np.abs(latitude).max() <= 90.0 and longitude.min() >= -180.0 and longitude.max() <= 360.0)


def _scale_faults(crs: pyproj.CRS, units: dict[str, Any], label: str) -> list[Fault]:
    """Return a fault where the CRS counts metres or degrees and the coordinates something else."""
    if not crs.axis_info:
        return []
    axis = crs.axis_info[0]
    base, wanted = ("degree", 1.0) if crs.is_geographic else ("m", axis.unit_conversion_factor)
    faults = []
    for name, unit in units.items():
        if unit is None or (crs.is_geographic and (is_north(unit) or is_east(unit))):
            continue
        try:
            factor = to_unit(str(unit), base).factor
        except UnitError:
            factor = float("nan")
        if factor != wanted:
            what = f"the coordinate '{name}' is in '{unit}', but its CRS counts in {axis.unit_name}s"
            faults.append(Fault(what, f"{label}: {name}", "Write the coordinates in the unit of the CRS."))
    return faults


def _carried(dataset: xr.Dataset, row: str, column: str, crs: pyproj.CRS) -> dict[str, xr.Variable]:
    """Return the coordinates that travel with the grid, loaded, without the file's encoding."""
    chosen = {row: dataset.variables[row], column: dataset.variables[column]}
    for name in (row, column):
        bounds = bounds_name(dataset.variables[name])
        if bounds in dataset.variables and dataset.variables[bounds].shape == (dataset.sizes[name], 2):
            chosen[bounds] = dataset.variables[bounds]
    for key, variable in dataset.variables.items():
        is_place = is_north(variable.attrs.get("units")) or is_east(variable.attrs.get("units"))
        if variable.dims == (row, column) and is_place and "standard_name" in variable.attrs:
            chosen[str(key)] = variable
    carried = {
        name: xr.Variable(variable.dims, np.asarray(variable.values), dict(variable.attrs))
        for name, variable in chosen.items()
    }
    plain = crs.is_geographic and not crs.is_derived
    words = (
        (("Y", "latitude", "degrees_north"), ("X", "longitude", "degrees_east"))
        if plain
        else (("Y", "projection_y_coordinate", None), ("X", "projection_x_coordinate", None))
    )
    for name, (axis, standard_name, unit) in zip((row, column), words, strict=True):
        attributes = carried[name].attrs
        attributes.setdefault("axis", axis)
        attributes.setdefault("standard_name", standard_name)
        if unit is not None:
            attributes.setdefault("units", unit)
        attributes.pop("bounds", None)
        if bounds_name(dataset.variables[name]) in carried:
            attributes["bounds"] = bounds_name(dataset.variables[name])
    return carried


def compare(one: Grid, other: Grid) -> tuple[slice, slice] | None:
    """Return the slices of rows and columns that lay the other grid on the first, or None if none can.

    The same cells within `TOLERANCE` of a cell, in the same or the opposite order.
    """
    slices = []
    for first, second in ((one.rows, other.rows), (one.columns, other.columns)):
        if len(first) != len(second):
            return None
        limit = TOLERANCE * (np.abs(np.diff(first)).min() if len(first) > 1 else 1.0)
        if np.abs(first - second).max() <= limit:
            slices.append(slice(None))
        elif np.abs(first - second[::-1]).max() <= limit:
            slices.append(slice(None, None, -1))
        else:
            return None
    return slices[0], slices[1]


def difference(one: Grid, other: Grid, where: str) -> Fault:
    """Return the fault that two grids differ, showing both."""
    what = f"the grids differ: {one.label} has {one.words()}; {other.label} has {other.words()}"
    remedy = f"Bring both to one grid first: the same cell centres to {100.0 * TOLERANCE:g} % of a cell."
    if one.shape == other.shape and np.allclose(np.abs(one.columns - other.columns), 360.0):
        remedy = "Longitudes differ by 360 degrees: write both as -180 to 180, or both as 0 to 360."
    return Fault(what, where, remedy)
