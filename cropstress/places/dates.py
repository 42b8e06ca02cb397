"""Dates as people write them in a run file or a table."""

from __future__ import annotations

import re
from dataclasses import dataclass

import cftime

from cropstress.errors import nearest

MONTHS = (
    "January", "February", "March", "April", "May", "June",
    "July", "August", "September", "October", "November", "December",
)  # fmt: skip
_HOW = 'Write it as "25 April", "04-25" (month, day) or "2021-04-25".'
_LEAP_YEAR = 2000  # has a 29 February in every calendar that knows one


class DateError(ValueError):
    """A date that cannot be read.

    Parameters
    ----------
    what : str
        What is wrong with it.
    remedy : str
        What to do.
    """

    def __init__(self, what: str, remedy: str = _HOW) -> None:
        super().__init__(what)
        self.remedy = remedy


@dataclass(frozen=True)
class Date:
    """A day of the year, or of one year.

    Attributes
    ----------
    month, day : int
    year : int or None
        None for every year.
    """

    month: int
    day: int
    year: int | None = None

    def words(self) -> str:
        """Return day and month in words."""
        words = f"{self.day} {MONTHS[self.month - 1]}"
        return f"{words} (1 March in years without it)" if (self.month, self.day) == (2, 29) else words


def read_date(text: str, calendar: str = "standard") -> Date:
    """Read a date.

    Parameters
    ----------
    text : str
        "25 April", "April 25", "04-25" (month, day) or "2021-04-25".
    calendar : str
        CF name of the calendar it must exist in.

    Returns
    -------
    Date

    Raises
    ------
    DateError
        If it cannot be read, or there is no such day.
    """
    stripped = text.strip()
    year: int | None = None
    if match := re.fullmatch(r"(?:(\d{4})-)?(\d{1,2})-(\d{1,2})", stripped):
        year = int(match[1]) if match[1] else None
        month, day = int(match[2]), int(match[3])
    elif match := re.fullmatch(r"(\d{1,2})\.?\s+([^\W\d_]+)\.?|([^\W\d_]+)\.?\s+(\d{1,2})", stripped):
        month, day = _month(match[2] or match[3], text), int(match[1] or match[4])
    else:
        raise DateError(f"'{text}' cannot be read as a date")
    if not 1 <= month <= 12:
        raise DateError(f"'{text}' has no month {month}", 'Month first, then day: "04-25" is 25 April.')
    longest = month_length(year or _LEAP_YEAR, month, calendar)
    # a day that a calendar of 360 days does not have is the last of its month there
    ordinary = month_length(year or _LEAP_YEAR, month, "standard")
    if not 1 <= day <= max(longest, ordinary):
        raise DateError(f"there is no {day} {MONTHS[month - 1]}{f' {year}' if year else ''}")
    return Date(month, day, year)


def _month(word: str, text: str) -> int:
    fitting = [number for number, name in enumerate(MONTHS, 1) if name.lower().startswith(word.lower())]
    if len(word) >= 3 and len(fitting) == 1:
        return fitting[0]
    alike = nearest(word, MONTHS) if len(word) >= 3 else None
    if alike:
        raise DateError(f"'{text}' has no month that is known", f"Did you mean '{alike}'?")
    raise DateError(f"'{text}' has no month that is known")


def month_length(year: int, month: int, calendar: str) -> int:
    """Return the number of days of a month in a CF calendar [d]."""
    return int(cftime.datetime(year, month, 1, calendar=calendar).daysinmonth)


def days_in_year(year: int, calendar: str) -> int:
    """Return the number of days of a year in a CF calendar [d]."""
    last = cftime.datetime(year, 12, month_length(year, 12, calendar), calendar=calendar)
    return int(last.dayofyr)


def day_of_year(date: Date, year: int, calendar: str) -> int:
    """Return the day of the year of a date in a CF calendar.

    Where the year has no 29 February it is 1 March; a 31st in months of 30 days is the 30th.
    """
    length = month_length(year, date.month, calendar)
    if (date.month, date.day) == (2, 29) and length < 29:
        return int(cftime.datetime(year, 3, 1, calendar=calendar).dayofyr)
    return int(cftime.datetime(year, date.month, min(date.day, length), calendar=calendar).dayofyr)
