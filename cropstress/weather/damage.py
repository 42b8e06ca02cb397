"""Files that open and then cannot be read: damaged or cut short, or gone while they were read."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path

import dask
import numpy as np
import xarray as xr

from cropstress.errors import Fault
from cropstress.weather.open import OpenFile, open_files

#: What the NetCDF library raises when values cannot be read.
READING = (OSError, RuntimeError)


def damage_faults(variables: Iterable[tuple[OpenFile, str]]) -> list[Fault]:
    """Read variables whole and return which of them cannot be; called once something could not be read.

    Parameters
    ----------
    variables : iterable of (OpenFile, str)
        Files and the names of their variables.

    Returns
    -------
    list of Fault
        One for each variable that cannot be read, with the first step where it fails.
    """
    faults = []
    for file, name in variables:
        found = _first_failure(file.dataset.variables[name])
        if found is not None:
            step, reason = found
            along = file.dataset.variables[name].dims[:1]
            place = f" from step {step + 1} of its dimension '{along[0]}' on" if step else ""
            what = f"its values cannot be read{place} ({reason})"
            remedy = "The file is damaged or was cut short: copy or download it again."
            faults.append(Fault(what, f"{file.label}: {name}", remedy))
    return faults


def damage_in_files(paths: Iterable[Path], base: Path | None, names: Iterable[str]) -> list[Fault]:
    """Open files anew, read the variables of some names, and return what cannot be read.

    Parameters
    ----------
    paths : iterable of Path
        The files.
    base : Path or None
        The folder their labels are relative to.
    names : iterable of str
        Names of variables; those a file does not hold are passed over.
    """
    opened, faults = open_files(paths, base)
    wanted = set(names)
    for file in opened:
        with file.dataset:
            held = [str(name) for name in file.dataset.variables if name in wanted]
            faults += damage_faults((file, name) for name in held)
    return faults


def _first_failure(variable: xr.Variable) -> tuple[int, str] | None:
    """Return the first step along the first dimension that cannot be read, and why."""
    ends = np.cumsum(variable.chunks[0]) if variable.chunks else np.array(variable.shape[:1] or [0])
    for first, after in zip([0, *ends[:-1]], ends, strict=True):
        try:
            with dask.config.set(scheduler="synchronous"):
                _ = variable[first:after].values if variable.ndim else variable.values
        except READING as error:
            return int(first), str(getattr(error, "strerror", None) or error)
    return None
