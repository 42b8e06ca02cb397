"""Days of a run as numbers on its time axis, whatever the calendar."""

from __future__ import annotations

from dataclasses import dataclass

import cftime
import numpy as np
import xarray as xr


@dataclass(frozen=True)
class TimeAxis:
    """The days of the weather.

    Attributes
    ----------
    values : numpy.ndarray (days,)
        Dates, datetime64 or cftime.
    calendar : str
        CF name of the calendar.
    day_of_year : numpy.ndarray (days,)
    ten_days : numpy.ndarray (days,)
        Number of the calendar ten days: the 1st to 10th, 11th to 20th and the rest of each month.
    """

    values: np.ndarray
    calendar: str
    day_of_year: np.ndarray
    ten_days: np.ndarray

    @property
    def length(self) -> int:
        """Number of days."""
        return int(self.values.size)

    def first_of_year(self, year: int) -> int:
        """Return the number of 1 January of a year; it may lie outside the axis."""
        if self.values.dtype.kind == "M":
            return int((np.datetime64(f"{year:04d}-01-01", "D") - self.values[0].astype("datetime64[D]")).astype(int))
        first = cftime.datetime(year, 1, 1, calendar=self.calendar)
        return int((first - self.values[0].replace(hour=0)).days)

    def sun_day(self) -> np.ndarray:
        """Return the day of the year for the sun, stretched where a year has 360 days."""
        days = self.day_of_year.astype(float)
        return days * 365.0 / 360.0 if self.calendar == "360_day" else days

    def years_spanned(self) -> tuple[int, int]:
        """Return the first and the last calendar year."""
        return int(_part(self.values[0], "Y")), int(_part(self.values[-1], "Y"))

    def iso(self, number: int) -> str:
        """Return a day's date as YYYY-MM-DD."""
        value = self.values[number]
        return str(value.astype("datetime64[D]")) if self.values.dtype.kind == "M" else value.strftime("%Y-%m-%d")

    def number_of(self, date: str) -> int:
        """Return the number of a date YYYY-MM-DD; it may lie outside the axis."""
        year, month, day = (int(part) for part in date.split("-"))
        if self.values.dtype.kind == "M":
            return int((np.datetime64(date, "D") - self.values[0].astype("datetime64[D]")).astype(int))
        wanted = cftime.datetime(year, month, day, calendar=self.calendar)
        return int((wanted - self.values[0].replace(hour=0)).days)

    def day_of_year_of(self, numbers: np.ndarray) -> np.ndarray:
        """Return the day of the year of day numbers; NaN where negative or beyond the axis."""
        known = (numbers >= 0) & (numbers < self.length)
        safe = np.where(known, numbers, 0).astype(int)
        return np.where(known, self.day_of_year[safe].astype(float), np.nan)

    def start_of_ten_days(self, number: int) -> object:
        """Return the first date of a calendar ten days by its number."""
        year, rest = divmod(number, 36)
        month, third = divmod(rest, 3)
        if self.values.dtype.kind == "M":
            return np.datetime64(f"{year:04d}-{month + 1:02d}-{1 + 10 * third:02d}", "s")
        return cftime.datetime(year, month + 1, 1 + 10 * third, calendar=self.calendar)


def _part(value: object, part: str) -> int:
    if isinstance(value, np.datetime64):
        return int(str(value.astype("datetime64[D]"))[:4])
    return int(value.year)  # type: ignore[attr-defined]


def time_axis(dataset: xr.Dataset) -> TimeAxis:
    """Read the days of a canonical weather dataset."""
    time = dataset["time"]
    ten_days = time.dt.year * 36 + (time.dt.month - 1) * 3 + np.minimum((time.dt.day - 1) // 10, 2)
    return TimeAxis(
        time.values, str(time.dt.calendar), time.dt.dayofyear.values.astype(int), ten_days.values.astype(np.int64)
    )
