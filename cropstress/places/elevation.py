"""Height of the ground."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import numpy as np
import xarray as xr

from cropstress.errors import Fault, InputError
from cropstress.places.grid_file import read_grid_file
from cropstress.weather.quantities import QUANTITIES
from cropstress.weather.units import UnitError, conversion


def read_elevation(
    spec: str | Mapping[str, str], dataset: xr.Dataset, base: str | Path | None = None
) -> np.ndarray:
    """Read the height of the ground above the sea.

    Parameters
    ----------
    spec : str or mapping
        A NetCDF file, or its `file` and the variable's `name`.
    dataset : xarray.Dataset
        The canonical weather.
    base : str or Path, optional
        The folder a relative name starts from.

    Returns
    -------
    numpy.ndarray (Y, X) of float64
        Elevation [m]; NaN where missing.

    Raises
    ------
    InputError
        File, variable, unit, grid or values at fault.
    """
    quantity = QUANTITIES["elevation"]
    said = {"file": spec} if isinstance(spec, str) else dict(spec)
    read = read_grid_file(
        said["file"], said.get("name"), dataset, base, quantity.meaning, quantity.standard_names[0]
    )
    if not read.unit:
        raise InputError(
            [Fault("it has no unit", read.where, 'Write the attribute units = "m" into the file.')]
        )
    try:
        values = np.asarray(conversion(read.unit, quantity).apply(read.values))
    except UnitError as error:
        remedy = 'Name another variable, or write the attribute units = "m" into the file.'
        raise InputError([Fault(str(error), read.where, remedy)]) from error
    beyond = (values < quantity.low) | (values > quantity.high)
    if beyond.any():
        what = (
            f"{int(beyond.sum())} cells are outside {quantity.low:g} to {quantity.high:g} m, "
            f"for example {values[beyond][0]:g} m"
        )
        raise InputError([Fault(what, read.where, "Check the unit and the fill value.")])
    return values
