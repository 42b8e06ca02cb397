"""Crop area: the share of every cell under a crop."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import numpy as np
import pyproj
import xarray as xr

from cropstress.errors import Fault, InputError, count_of
from cropstress.places.grid_file import PlacedGrid, read_grid_file
from cropstress.weather.grids import Grid
from cropstress.weather.location import grid_of
from cropstress.weather.units import UnitError, linear, read_unit

SQUARE_METRES_PER_HECTARE = 10_000.0
#: Hectares may exceed the cell by this share: cells on a sphere and on the ellipsoid differ by up to 0.7 %.
LARGEST_EXCESS = 0.01  # 1
ROUNDING = 1e-6  # 1; a share in float32
_STEPS_ALONG_PARALLEL = 16  # parallels are curved on the ellipsoid; an edge is followed in so many steps


def read_area(
    spec: str | Mapping[str, str], dataset: xr.Dataset, base: str | Path | None = None
) -> np.ndarray:
    """Read the share of every cell under a crop.

    Parameters
    ----------
    spec : str or mapping
        A NetCDF file, or its `file`, the variable's `name` and `unit` (a share, "%", or an area like "ha").
    dataset : xarray.Dataset
        The canonical weather.
    base : str or Path, optional
        The folder a relative name starts from.

    Returns
    -------
    numpy.ndarray (Y, X) of float64
        Share, 0 to 1 [1]; 0 where the file has no value.

    Raises
    ------
    InputError
        File, variable, unit or grid at fault; shares below 0 or above 1, more hectares than the cell has.
    """
    said = {"file": spec} if isinstance(spec, str) else dict(spec)
    read = read_grid_file(said["file"], said.get("name"), dataset, base, "the crop area", "area_fraction")
    share, allowed = _as_share(read, said.get("unit"), dataset)
    share = np.where(np.isnan(share), 0.0, share)
    faults = []
    for beyond, words in (
        (share < -ROUNDING, "below 0"),
        (share > 1.0 + allowed, "more than the whole cell"),
    ):
        if beyond.any():
            row, column = np.argwhere(beyond)[0]
            grid = grid_of(dataset)
            what = (
                f"the crop area is {words} in {count_of(int(beyond.sum()), 'cell')}, for example "
                f"{read.values[row, column]:g} in the unit '{said.get('unit') or read.unit}', "
                f"{share[row, column]:.4g} of the cell, at {grid.row} {grid.rows[row]:.6g}, "
                f"{grid.column} {grid.columns[column]:.6g}"
            )
            remedy = 'Check the unit ("1", "%", "ha") and the fill value.'
            faults.append(Fault(what, read.where, remedy))
    if faults:
        raise InputError(faults)
    return np.clip(share, 0.0, 1.0)


def _as_share(read: PlacedGrid, said: str | None, dataset: xr.Dataset) -> tuple[np.ndarray, float]:
    """Return the shares [1] and by how much they may exceed 1."""
    text = said or read.unit
    if not text:
        remedy = 'Say it: { file = "...", unit = "1" } for a share, "%" or "ha".'
        raise InputError([Fault("the crop area has no unit", read.where, remedy)])
    remedy = 'Say it: { file = "...", unit = "1" } for a share, "%", "ha" or "km2".'
    try:
        unit = read_unit(text)
    except UnitError as error:
        raise InputError([Fault(str(error), read.where, remedy)]) from error
    try:
        if unit.dimensionless:
            return read.values * linear(unit, read_unit("1"))[0], ROUNDING
        hectares = read.values * (linear(unit, read_unit("m2"))[0] / SQUARE_METRES_PER_HECTARE)
    except UnitError as error:
        what = f"the unit '{text}' is neither that of a share nor that of an area"
        raise InputError([Fault(what, read.where, remedy)]) from error
    return hectares / cell_area_hectares(dataset), LARGEST_EXCESS


def cell_area_hectares(dataset: xr.Dataset) -> np.ndarray:
    """Compute the true area of every cell.

    Parameters
    ----------
    dataset : xarray.Dataset
        The canonical weather.

    Returns
    -------
    numpy.ndarray (Y, X) of float64
        Area [ha]: on the ellipsoid for latitude and longitude (also rotated), in the plane of the map for a
        projected grid. Cells reach half way to their neighbours, or to their bounds where the files have
        them.

    Raises
    ------
    InputError
        For a grid of one row or column without bounds: the size of its cells is not known.
    """
    grid = grid_of(dataset)
    rows, columns = (_edges(grid, name, values) for name, values in _both(grid))
    if grid.crs.is_geographic:
        return _on_ellipsoid(rows, columns, grid.crs) / SQUARE_METRES_PER_HECTARE
    metres = grid.crs.axis_info[0].unit_conversion_factor
    height, width = (np.abs(np.diff(edges, axis=1))[:, 0] * metres for edges in (rows, columns))
    return height[:, None] * width[None, :] / SQUARE_METRES_PER_HECTARE


def _both(grid: Grid) -> tuple[tuple[str, np.ndarray], tuple[str, np.ndarray]]:
    return (grid.row, grid.rows), (grid.column, grid.columns)


def _edges(grid: Grid, name: str, centres: np.ndarray) -> np.ndarray:
    """Return the two edges of every row or column, (size, 2)."""
    bounds = grid.coordinates.get(str(grid.coordinates[name].attrs.get("bounds", "")))
    if bounds is not None and bounds.shape == (len(centres), 2):
        return np.asarray(bounds.values, dtype=np.float64)
    if len(centres) == 1:
        what = f"the size of the cells is not known: there is one value of '{name}' and no bounds"
        raise InputError(
            [Fault(what, grid.label, "Write CF bounds into the file, or give the crop area as a share.")]
        )
    middle = 0.5 * (centres[1:] + centres[:-1])
    low = np.concatenate([[2.0 * centres[0] - middle[0]], middle])
    high = np.concatenate([middle, [2.0 * centres[-1] - middle[-1]]])
    return np.column_stack([low, high])


def _on_ellipsoid(rows: np.ndarray, columns: np.ndarray, crs: pyproj.CRS) -> np.ndarray:
    """Return the area of cells between meridians and parallels [m2]; equally wide cells of a row are one."""
    ellipsoid = crs.get_geod() or pyproj.Geod(ellps="WGS84")
    rows = np.clip(rows, -90.0, 90.0)
    widths = np.round(np.abs(np.diff(columns, axis=1))[:, 0], 9)
    distinct, place = np.unique(widths, return_inverse=True)
    areas = np.empty((len(rows), len(distinct)))
    for number, (south, north) in enumerate(np.sort(rows, axis=1)):
        for kind, width in enumerate(distinct):
            along = np.linspace(0.0, width, _STEPS_ALONG_PARALLEL + 1)
            longitude = np.concatenate([along, along[::-1]])
            latitude = np.repeat([south, north], len(along))
            areas[number, kind] = abs(ellipsoid.polygon_area_perimeter(longitude, latitude)[0])
    return areas[:, place]
