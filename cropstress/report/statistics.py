"""Numbers read off a finished result: medians, totals over cells, dates."""

from __future__ import annotations

from collections.abc import Iterable
from datetime import timedelta
from typing import Any

import numpy as np
import xarray as xr

from cropstress.errors import fail
from cropstress.report.grid import space_dimensions
from cropstress.season.measures import CELL_STATUS, MEASURES

#: For each share, the loss it is a share of the possible uptake of.
SHARES = {
    "lost_to_heat_share": "lost_to_heat",
    "lost_to_photorespiration_share": "lost_to_photorespiration",
}


def loaded(result: xr.Dataset) -> xr.Dataset:
    """Return the result in memory when it is still to be computed, everything in one go; else as it is."""
    lazy = any(variable.chunks is not None for variable in result.variables.values())
    return result.compute() if lazy else result


def cell_status(result: xr.Dataset, season: int) -> np.ndarray:
    """Return why each cell was computed or left blank; (Y, X), values of `CELL_STATUS`."""
    status = result["cell_status"]
    if "season" in status.dims:
        status = status.sel(season=season)
    return np.asarray(status.transpose(*space_dimensions(result)).values)


def is_computed(result: xr.Dataset, season: int) -> np.ndarray:
    """Return which cells were computed; (Y, X)."""
    return cell_status(result, season) == CELL_STATUS["computed"]


def field(result: xr.Dataset, name: str, season: int, **step: int) -> np.ndarray:
    """Return a measure of one season, NaN where there is no value.

    Parameters
    ----------
    result : xarray.Dataset
        A finished result.
    name : str
        Name of the variable.
    season : int
        Year of harvest.
    **step : int
        Number of the stage or of the ten-day step, for the variables that have one.

    Returns
    -------
    numpy.ndarray (Y, X) float64 [unit of the measure]

    Raises
    ------
    InputError
        When the result does not hold it.
    """
    if name not in result:
        crop = result.attrs.get("crop", "")
        raise fail(f'"{name}" was not computed for {crop}', "result", "Leave it out of [maps] measures.")
    chosen = result[name].sel(season=season).isel(step).transpose(*space_dimensions(result))
    values = np.asarray(chosen.values, dtype=np.float64)
    blank = ~is_computed(result, season)
    if name in MEASURES and MEASURES[name].kind == "flag":
        blank = blank | (values < 0)
    return np.where(blank, np.nan, values)


def median(values: np.ndarray) -> float:
    """Return the median of the values there are; NaN where there is none."""
    values = values[np.isfinite(values)]
    return float(np.median(values)) if values.size else float("nan")


def most(values: np.ndarray) -> float:
    """Return the highest of the values there are; NaN where there is none."""
    values = values[np.isfinite(values)]
    return float(values.max()) if values.size else float("nan")


def weighted_mean(values: np.ndarray, weights: np.ndarray | None) -> float:
    """Return the mean over the cells that have a value.

    Parameters
    ----------
    values : numpy.ndarray (Y, X)
    weights : numpy.ndarray (Y, X) or None
        Crop area of each cell, in any unit; None counts every cell alike.
    """
    weights = np.ones_like(values) if weights is None else weights
    used = np.isfinite(values) & (weights > 0)
    total = weights[used].sum()
    return float((values[used] * weights[used]).sum() / total) if total > 0 else float("nan")


def share_of_possible(assimilation: np.ndarray, lost: np.ndarray, weights: np.ndarray | None) -> float:
    """Return total lost over total possible, never a mean of the cells' shares.

    Parameters
    ----------
    assimilation, lost : numpy.ndarray (Y, X) [mol m-2]
    weights : numpy.ndarray (Y, X) or None
        Crop area of each cell, in any unit.

    Returns
    -------
    float [1]
        NaN where nothing was possible.
    """
    both = np.where(np.isfinite(assimilation) & np.isfinite(lost), 1.0, np.nan)
    possible = weighted_mean((assimilation + lost) * both, weights)
    return weighted_mean(lost * both, weights) / possible if possible > 0 else float("nan")


def missing_measures(result: xr.Dataset, names: Iterable[str]) -> list[str]:
    """Return those of the measures that the result does not hold or holds nowhere."""
    return [name for name in names if name not in result or not _anywhere(result[name])]


def _anywhere(values: xr.DataArray) -> bool:
    if np.issubdtype(values.dtype, np.floating):
        return bool(np.isfinite(values).any())
    return bool((values >= 0).any())


def season_bound(result: xr.Dataset, season: int, which: str) -> Any:
    """Return the first ("season_start") or last ("season_end") day counted, as a date of its calendar."""
    values = result[which].sel(season=season).values
    return values.item() if values.dtype == object else values.astype("datetime64[D]")[()]


def _day_of_year(date: Any) -> int:
    if isinstance(date, np.datetime64):
        return int((date - date.astype("datetime64[Y]").astype("datetime64[D]")).astype(int)) + 1
    return int(date.dayofyr)


def _days_between(first: Any, last: Any) -> int:
    difference = last - first
    return int(
        difference.astype("timedelta64[D]").astype(int)
        if isinstance(first, np.datetime64)
        else difference.days
    )


def _days_in_year(date: Any) -> int:
    if isinstance(date, np.datetime64):
        year = date.astype("datetime64[Y]")
        return int(((year + 1).astype("datetime64[D]") - year.astype("datetime64[D]")).astype(int))
    return int(date.replace(month=12, day=30 if date.calendar == "360_day" else 31).dayofyr)


def season_length(result: xr.Dataset, season: int) -> int:
    """Return the number of days from the first to the last day counted, both included [d]."""
    first, last = (season_bound(result, season, which) for which in ("season_start", "season_end"))
    return _days_between(first, last) + 1


def days_after_start(result: xr.Dataset, season: int, day_of_year: np.ndarray) -> np.ndarray:
    """Return days of the year as days after the first day counted, also over New Year [d].

    Parameters
    ----------
    result : xarray.Dataset
        A finished result.
    season : int
        Year of harvest.
    day_of_year : numpy.ndarray
        1 is 1 January; NaN stays NaN.
    """
    start = season_bound(result, season, "season_start")
    length = season_length(result, season) - 1
    year = _days_in_year(start)
    days = np.mod(day_of_year - _day_of_year(start), year)
    # A day outside the season is put where it is nearer: before its start or after its end
    return np.where(year - days < days - length, days - year, days)


def date_of(result: xr.Dataset, season: int, day_of_year: float) -> Any:
    """Return the date of a day of the year within a season; None where there is none."""
    if not np.isfinite(day_of_year):
        return None
    days = round(float(days_after_start(result, season, np.array(day_of_year))))
    return _plus(season_bound(result, season, "season_start"), days)


def median_date(result: xr.Dataset, season: int, name: str) -> Any:
    """Return the median date of a day-of-year measure over the computed cells; None where there is none."""
    if name not in result:
        return None
    days = median(days_after_start(result, season, field(result, name, season)))
    if not np.isfinite(days):
        return None
    return _plus(season_bound(result, season, "season_start"), int(np.floor(days)))


def _plus(date: Any, days: int) -> Any:
    return date + (np.timedelta64(days, "D") if isinstance(date, np.datetime64) else timedelta(days=days))
