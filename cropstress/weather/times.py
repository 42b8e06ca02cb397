"""Time axes: from what files say to whole days of a calendar, and everything that can be wrong with them."""

from __future__ import annotations

from dataclasses import dataclass

import cftime
import numpy as np
import xarray as xr

from cropstress.errors import Fault, count_of
from cropstress.weather.grids import bounds_name

EPOCH = "days since 1970-01-01"
#: Names of the calendar the world uses; they differ only before 15 October 1582.
_STANDARD = ("standard", "gregorian", "proleptic_gregorian")
_FIRST_GREGORIAN_DAY = -141427  # 15 October 1582, in days since 1970-01-01
_MINUTE = 1.0 / 1440.0  # d; stamps closer than this are the same (files count time in float32 or minutes)


@dataclass(frozen=True)
class Days:
    """Days of a calendar.

    Attributes
    ----------
    numbers : numpy.ndarray (time,) of int64
        Days since 1970-01-01 in the calendar [d].
    calendar : str
        CF name of the calendar.
    """

    numbers: np.ndarray
    calendar: str

    @property
    def first(self) -> int:
        """The first day."""
        return int(self.numbers[0])

    @property
    def last(self) -> int:
        """The last day."""
        return int(self.numbers[-1])

    def words(self, number: int) -> str:
        """Return a day as YYYY-MM-DD."""
        date = cftime.num2date(int(number), EPOCH, self.calendar)
        return f"{date.year:04}-{date.month:02}-{date.day:02}"

    def period(self) -> str:
        """Return the first and last day in words."""
        return f"{self.words(self.first)} to {self.words(self.last)}"


def same_calendar(one: str, other: str) -> bool:
    """Tell whether two calendars count days alike (since 1582)."""
    return one == other or (one in _STANDARD and other in _STANDARD)


def time_name(dataset: xr.Dataset, dimensions: tuple[str, ...]) -> str | None:
    """Return the name of the time coordinate that runs along one of the dimensions, or None."""
    for dimension in dimensions:
        along = [
            str(name)
            for name, variable in dataset.variables.items()
            if variable.dims == (dimension,) and _is_time(variable)
        ]
        # the dimension's own coordinate first, then one called time: others may be reference times
        along.sort(
            key=lambda name: (name != dimension, dataset.variables[name].attrs.get("standard_name") != "time")
        )
        if along:
            return along[0]
    return None


def scalar_time_name(dataset: xr.Dataset) -> str | None:
    """Return the name of a time coordinate without dimension (one day a file), or None."""
    alone = [
        str(name) for name, variable in dataset.variables.items() if variable.ndim == 0 and _is_time(variable)
    ]
    chosen = [name for name in alone if "reference" not in str(dataset[name].attrs.get("standard_name", ""))]
    return chosen[0] if len(chosen) == 1 else None


def _is_time(variable: xr.Variable) -> bool:
    return " since " in str(variable.attrs.get("units", ""))


def read_days(dataset: xr.Dataset, name: str, where: str) -> tuple[Days | None, list[Fault]]:
    """Read a file's time coordinate as whole days.

    Where the file gives bounds a day wide, a stamp belongs to the day in their middle; else to the day of the
    stamp itself, so that 00:00 is the day which begins.

    Parameters
    ----------
    dataset : xarray.Dataset
        A file with times not decoded.
    name : str
        The time coordinate.
    where : str
        How messages name the place.

    Returns
    -------
    Days or None
    list of Fault
        A unit or calendar that cannot be read, stamps missing, out of order, doubled, or not daily.
    """
    variable = dataset.variables[name]
    units, calendar = (
        str(variable.attrs.get("units", "")),
        str(variable.attrs.get("calendar", "standard")).lower(),
    )
    bounds = dataset.variables.get(bounds_name(variable))
    try:
        stamps = _numbers(np.atleast_1d(variable.values), units, calendar)
        edges = None if bounds is None else _numbers(np.atleast_2d(bounds.values), units, calendar)
    except (ValueError, TypeError, OverflowError) as error:
        remedy = 'Write CF times, for example "days since 2021-01-01" with the calendar "standard".'
        return None, [
            Fault(f"times in '{units}', calendar '{calendar}', cannot be read ({error})", where, remedy)
        ]
    if not len(stamps):
        return None, [Fault("there is not a single time step", where, "Take the file out of [weather] files.")]
    if not np.isfinite(stamps).all():
        step = int(np.flatnonzero(~np.isfinite(stamps))[0])
        return None, [Fault(f"time step {step + 1} has no time", where, "Every time step needs its date.")]
    axis = Days(np.floor(stamps + _MINUTE).astype(np.int64), calendar)
    faults = _order_faults(stamps, axis, where)
    if faults:
        return None, faults
    if edges is not None and edges.shape == (len(stamps), 2) and (edges[:, 1] > edges[:, 0]).all():
        width = edges[:, 1] - edges[:, 0]
        odd = np.flatnonzero(np.abs(width - 1.0) > _MINUTE)
        if len(odd):
            step = int(odd[0])
            what = f"the step at {axis.words(axis.numbers[step])} is {_duration(width[step])} long, not a day"
            return None, [Fault(what, where, _REDUCE)]
        axis = Days(np.floor(edges.mean(axis=1)).astype(np.int64), calendar)
    return axis, []


_REDUCE = "This program reads daily grids: reduce the data to days first (highest, lowest, mean, sum)."


def _numbers(values: np.ndarray, units: str, calendar: str) -> np.ndarray:
    """Return times as days since 1970-01-01 in their calendar [d], NaN where missing."""
    plain = np.asarray(values, dtype=np.float64)
    there = np.isfinite(plain)
    numbers = np.full(plain.shape, np.nan)
    dates = cftime.num2date(plain[there], units, calendar, only_use_cftime_datetimes=True)
    numbers[there] = cftime.date2num(dates, EPOCH, calendar)
    return numbers


def _order_faults(stamps: np.ndarray, axis: Days, where: str) -> list[Fault]:
    """Return what is wrong with the order and spacing of one file's stamps [d]."""
    steps = np.diff(stamps)
    if not len(steps):
        return []
    backward = np.flatnonzero(steps < -_MINUTE)
    if len(backward):
        at = int(backward[0])
        what = (
            f"times are out of order at {count_of(len(backward), 'place')}: {axis.words(axis.numbers[at + 1])} "
            f"comes after {axis.words(axis.numbers[at])}"
        )
        return [Fault(what, where, "Sort the file by time.")]
    doubled = np.flatnonzero(np.abs(steps) <= _MINUTE)
    if len(doubled):
        day = axis.words(axis.numbers[int(doubled[0])])
        what = f"the time step at {day} is there twice"
        if len(doubled) > 1:
            what = f"{len(doubled)} time steps are there twice, the first at {day}"
        return [Fault(what, where, "Keep one of each.")]
    if np.median(steps) < 1.0 - _MINUTE:
        return [
            Fault(
                f"the data are not daily: a step every {_duration(float(np.median(steps)))}", where, _REDUCE
            )
        ]
    uneven = np.flatnonzero(np.abs(steps - np.round(steps)) > _MINUTE)
    if len(uneven):
        at = int(uneven[0])
        what = f"the data are not daily: {_duration(steps[at])} after {axis.words(axis.numbers[at])}"
        return [Fault(what, where, _REDUCE)]
    return []


def _duration(days: float) -> str:
    hours = days * 24.0
    return f"{days:.4g} days" if hours >= 48.0 else f"{hours:.4g} hours"


def joined_faults(days: Days, files: list[str], sizes: list[int], where: str) -> list[Fault]:
    """Return what is wrong with a variable's days when its files, sorted by time, are put one after another.

    Parameters
    ----------
    days : Days
        The days of all files in a row.
    files : list of str
        Labels of the files.
    sizes : list of int
        Time steps in each.
    where : str
        How messages name the time of these files.

    Returns
    -------
    list of Fault
        Days that two files share; steps longer than a day.
    """
    owner = np.repeat(np.arange(len(files)), sizes)
    steps = np.diff(days.numbers)
    if not len(steps):
        return []
    doubled = np.flatnonzero(steps <= 0)
    if len(doubled):
        pairs = dict.fromkeys((files[owner[at]], files[owner[at + 1]]) for at in doubled)
        one, other = next(iter(pairs))
        more = f" (and so for {count_of(len(pairs) - 1, 'more pair')} of files)" if len(pairs) > 1 else ""
        what = f"the day {days.words(days.numbers[doubled[0] + 1])} is in both {one} and {other}{more}"
        return [Fault(what, where, "Each day may be in one file only: take one of them out of [weather] files.")]
    if np.median(steps) > 1:
        what = f"the data are not daily: a step every {int(np.median(steps))} days"
        return [Fault(what, where, "This program reads daily grids: name files with a value for each day.")]
    return []


def gap_words(days: Days) -> str:
    """Return the days missing between the first and the last one, in words; empty if there are none."""
    missing = np.setdiff1d(np.arange(days.first, days.last + 1), days.numbers)
    if not len(missing):
        return ""
    runs = np.split(missing, np.flatnonzero(np.diff(missing) > 1) + 1)
    shown = [
        days.words(run[0]) if len(run) == 1 else f"{days.words(run[0])} to {days.words(run[-1])}"
        for run in runs[:5]
    ]
    more = f" and {count_of(len(runs) - 5, 'more gap')}" if len(runs) > 5 else ""
    return f"{count_of(len(missing), 'day is', 'days are')} missing: {', '.join(shown)}{more}"


def time_coordinate(first: int, last: int, calendar: str) -> xr.Variable:
    """Make the time coordinate of all days from a first to a last one.

    Parameters
    ----------
    first, last : int
        Days since 1970-01-01, both included [d].
    calendar : str
        CF name of the calendar.

    Returns
    -------
    xarray.Variable (time,)
        numpy datetime64 for the calendar the world uses, cftime dates for any other; the calendar is kept in
        the encoding, so that files written from it carry it.
    """
    numbers = np.arange(first, last + 1)
    if calendar in _STANDARD and first >= _FIRST_GREGORIAN_DAY:
        dates = np.datetime64("1970-01-01", "D") + numbers
        values = dates.astype("datetime64[s]")
    else:
        values = cftime.num2date(numbers, EPOCH, calendar, only_use_cftime_datetimes=True)
    attributes = {"standard_name": "time", "long_name": "day", "axis": "T"}
    return xr.Variable(("time",), values, attributes, encoding={"calendar": calendar})
