"""One grid from one file, laid on the weather grid."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np
import xarray as xr

from cropstress.errors import Fault, InputError, nearest
from cropstress.weather.damage import READING, damage_faults
from cropstress.weather.grids import compare, difference, horizontal_dimensions, read_grid
from cropstress.weather.location import grid_of
from cropstress.weather.open import OpenFile, find_one_file, open_files


@dataclass(frozen=True)
class PlacedGrid:
    """A grid that does not change in time, on the weather grid.

    Attributes
    ----------
    values : numpy.ndarray (Y, X) of float64
        NaN where missing [unit].
    unit : str
        As the file says; empty where it says none.
    name : str
        The variable's name.
    where : str
        How messages name it: file and variable.
    """

    values: np.ndarray
    unit: str
    name: str
    where: str


def read_grid_file(
    path: str,
    name: str | None,
    dataset: xr.Dataset,
    base: str | Path | None,
    meaning: str,
    standard_name: str = "",
) -> PlacedGrid:
    """Read one grid from a NetCDF file.

    Parameters
    ----------
    path : str
        The file.
    name : str or None
        The variable; where None, the one with the standard name, or else the only grid of the file.
    dataset : xarray.Dataset
        The canonical weather, whose grid it must be on (rows or columns may run the other way).
    base : str or Path or None
        The folder a relative name starts from.
    meaning : str
        What the grid is, for messages.
    standard_name : str, optional
        CF standard name.

    Returns
    -------
    PlacedGrid

    Raises
    ------
    InputError
        Missing file, not NetCDF, no such variable, several that fit, time steps, another grid.
    """
    opened, faults = _opened(path, base)
    if faults:
        raise InputError(faults)
    (file,) = opened
    with file.dataset:
        try:
            return _read(file, name, dataset, meaning, standard_name)
        except READING as error:
            damage = damage_faults((file, str(each)) for each in file.dataset.variables)
            if damage:
                raise InputError(damage) from error
            raise


def grid_file_faults(path: str, base: str | Path | None) -> list[Fault]:
    """Return why a file cannot be opened as NetCDF, before there is a grid to lay it on."""
    opened, faults = _opened(path, base)
    for file in opened:
        file.dataset.close()
    return faults


def _opened(path: str, base: str | Path | None) -> tuple[list[OpenFile], list[Fault]]:
    folder = None if base is None else Path(base)
    found, faults = find_one_file(path, folder)
    opened, more = open_files([found] if found else [], folder)
    return opened, [*faults, *more]


def _read(
    file: OpenFile, name: str | None, dataset: xr.Dataset, meaning: str, standard_name: str
) -> PlacedGrid:
    chosen = _chosen(file, name, meaning, standard_name)
    where = f"{file.label}: {chosen}"
    variable = file.dataset[chosen]
    dimensions = tuple(str(each) for each in variable.dims)
    horizontal = horizontal_dimensions(file.dataset, dimensions)
    if horizontal is None:
        what = f"rows and columns cannot be told from its dimensions ({', '.join(dimensions)})"
        raise InputError([Fault(what, where, "Give its coordinates CF standard names and units.")])
    other = [each for each in dimensions if each not in horizontal]
    long = [each for each in other if file.dataset.sizes[each] > 1]
    if long:
        what = f"{meaning} is one grid, but this has several along {', '.join(long)}"
        raise InputError([Fault(what, where, "Write the one that is meant to a file of its own.")])
    grid, faults = read_grid(file.dataset, chosen, *horizontal, file.label)
    if grid is None:
        raise InputError(faults)
    weather = grid_of(dataset)
    slices = compare(weather, grid)
    if slices is None:
        raise InputError([difference(weather, grid, where)])
    flat = variable.isel(dict.fromkeys(other, 0)).transpose(*horizontal)
    values = np.asarray(flat.values, dtype=np.float64)[slices]
    return PlacedGrid(values, str(variable.attrs.get("units", "")).strip(), chosen, where)


def _chosen(file: OpenFile, name: str | None, meaning: str, standard_name: str) -> str:
    variables = file.dataset.variables
    if name is not None:
        if name in variables:
            return name
        alike = nearest(name, (str(each) for each in variables))
        held = ", ".join(str(each) for each in file.dataset.data_vars)
        remedy = f"Did you mean '{alike}'?" if alike else f"The file holds: {held}."
        raise InputError([Fault(f"there is no variable '{name}' in this file", file.label, remedy)])
    grids = [str(each) for each in file.dataset.data_vars if file.dataset[each].ndim >= 2]
    named = [each for each in variables if variables[each].attrs.get("standard_name") == standard_name]
    fitting = [str(each) for each in named] if standard_name and named else grids
    if len(fitting) == 1:
        return fitting[0]
    held = ", ".join(f"'{each}'" for each in fitting or list(map(str, file.dataset.data_vars)))
    what = f"which variable is {meaning}? The file holds {held or 'no grid'}"
    raise InputError([Fault(what, file.label, 'Say it: { file = "...", name = "..." }.')])
