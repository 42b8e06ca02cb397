"""What each cell of a map shows: a class, none at all, or one of several kinds of blank."""

from __future__ import annotations

import numpy as np
import xarray as xr

from cropstress.report import statistics
from cropstress.report.classes import Classes
from cropstress.season.measures import CELL_STATUS

#: Categories beside the classes 0, 1, 2 …
NONE = 20
NO_CROP = 21
NO_DATA = 22
NOT_COMPUTED = 23
NO_VALUE = 24
BLANKS = (NO_CROP, NO_DATA, NOT_COMPUTED, NO_VALUE)
WITHOUT_VALUE = (NO_DATA, NOT_COMPUTED, NO_VALUE)

#: More cells a side than a page shows apart.
MOST_CELLS = 900

_BLANK_OF_STATUS = {
    "no_crop": NO_CROP,
    "no_weather_data": NO_DATA,
    "no_sowing_date": NOT_COMPUTED,
    "too_many_missing_days": NOT_COMPUTED,
}


def categories(result: xr.Dataset, classes: Classes, season: int) -> np.ndarray:
    """Return the category of each cell.

    Parameters
    ----------
    result : xarray.Dataset
        A finished result.
    classes : Classes
        Of the measure to show.
    season : int
        Year of harvest.

    Returns
    -------
    numpy.ndarray (Y, X) of int8
        A class, or one of the categories above; exactly 0 is `NONE` for measures where that means none.
    """
    values = statistics.field(result, classes.measure.name, season)
    known = np.isfinite(values)
    found = np.full(values.shape, NO_VALUE, dtype=np.int8)
    found[known] = classes.index(values[known])
    if classes.measure.zero_is_none:
        found[known & (values == 0.0)] = NONE
    status = statistics.cell_status(result, season)
    for name, category in _BLANK_OF_STATUS.items():
        found[status == CELL_STATUS[name]] = category
    return found


def coarser(found: np.ndarray, most_cells: int = MOST_CELLS) -> np.ndarray:
    """Join cells for drawing: each block shows what most of its cells show.

    Parameters
    ----------
    found : numpy.ndarray (Y, X) of int8
    most_cells : int
        Largest number of cells a side afterwards.

    Returns
    -------
    numpy.ndarray (Y, X) of int8
        The same array where it is small enough. At the far edges a block may hold fewer cells.
    """
    factor = -(-max(found.shape) // most_cells)
    if factor <= 1:
        return found
    rows, columns = (-(-size // factor) for size in found.shape)
    padded = np.full((rows * factor, columns * factor), -1, dtype=np.int8)
    padded[: found.shape[0], : found.shape[1]] = found
    blocks = padded.reshape(rows, factor, columns, factor)
    best = np.zeros((rows, columns), dtype=np.int32)
    joined = np.full((rows, columns), NO_DATA, dtype=np.int8)
    for category in np.unique(found):
        count = (blocks == category).sum(axis=(1, 3), dtype=np.int32)
        joined[count > best] = category
        best = np.maximum(best, count)
    return joined
