"""Where the cells of the canonical dataset lie."""

from __future__ import annotations

import numpy as np
import pyproj
import xarray as xr

from cropstress.weather.grids import WGS84, Grid, horizontal_dimensions, is_east, is_north


def grid_of(dataset: xr.Dataset, label: str = "the weather grid") -> Grid:
    """Return the horizontal grid of a canonical dataset.

    Parameters
    ----------
    dataset : xarray.Dataset
        As `open_weather` gives it.
    label : str
        How messages name it.

    Returns
    -------
    Grid

    Raises
    ------
    ValueError
        If the dataset has no rows and columns or no CRS: it is not a canonical one.
    """
    names = tuple(str(name) for name in dataset.dims)
    found = horizontal_dimensions(dataset, names)
    if found is None or "spatial_ref" not in dataset.coords:
        raise ValueError("the dataset has no horizontal grid with a CRS; take one from open_weather")
    row, column = found
    rows, columns = (dataset[name].values.astype(np.float64) for name in found)
    coordinates = {
        str(name): coordinate.variable
        for name, coordinate in dataset.coords.items()
        if coordinate.dims
        and set(coordinate.dims) <= {row, column, *_bounds_dimensions(dataset, row, column)}
    }
    return Grid(row, column, rows, columns, coordinates, crs_of(dataset), label)


def _bounds_dimensions(dataset: xr.Dataset, row: str, column: str) -> set[str]:
    bounds = [dataset[name].attrs.get("bounds") for name in (row, column)]
    return {str(dataset[name].dims[-1]) for name in bounds if name in dataset.variables}


def crs_of(dataset: xr.Dataset) -> pyproj.CRS:
    """Return the CRS of a canonical dataset."""
    return pyproj.CRS.from_cf(dataset["spatial_ref"].attrs)


def cell_latitude_longitude(dataset: xr.Dataset) -> tuple[np.ndarray, np.ndarray]:
    """Return where every cell centre lies.

    Parameters
    ----------
    dataset : xarray.Dataset
        As `open_weather` gives it.

    Returns
    -------
    latitude, longitude : numpy.ndarray (Y, X) of float64
        Degrees north, and degrees east from -180 to 180 [degree]: from two-dimensional coordinates where the
        files have them, else from the CRS (WGS 84).
    """
    grid = grid_of(dataset)
    given = _given(grid)
    if given is not None:
        latitude, longitude = given
    elif grid.crs.is_geographic and not grid.crs.is_derived:
        latitude, longitude = np.meshgrid(grid.rows, grid.columns, indexing="ij")
    else:
        rows, columns = np.meshgrid(grid.rows, grid.columns, indexing="ij")
        transformer = pyproj.Transformer.from_crs(grid.crs, WGS84, always_xy=True)
        longitude, latitude = transformer.transform(columns, rows)
    return np.asarray(latitude, dtype=np.float64), wrapped(np.asarray(longitude, dtype=np.float64))


def wrapped(longitude: np.ndarray) -> np.ndarray:
    """Return longitudes as -180 to 180 [degree]; those already there keep every bit."""
    inside = (longitude >= -180.0) & (longitude <= 180.0)
    return np.where(inside, longitude, (longitude + 180.0) % 360.0 - 180.0)


def _given(grid: Grid) -> tuple[np.ndarray, np.ndarray] | None:
    flat = [each for each in grid.coordinates.values() if each.dims == (grid.row, grid.column)]
    latitudes = [each.values for each in flat if is_north(each.attrs.get("units"))]
    longitudes = [each.values for each in flat if is_east(each.attrs.get("units"))]
    if len(latitudes) == 1 and len(longitudes) == 1:
        return latitudes[0], longitudes[0]
    return None
