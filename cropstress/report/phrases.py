"""The phrase file: every printed sentence in one place."""

from __future__ import annotations

import functools
import tomllib
from importlib import resources
from typing import Any

import numpy as np

from cropstress.season.measures import Measure


@functools.cache
def _phrases() -> dict[str, Any]:
    text = resources.files("cropstress.report").joinpath("phrases.toml").read_text(encoding="utf-8")
    return tomllib.loads(text)


def phrase(key: str, **values: object) -> str:
    """Return a phrase, filled in.

    Parameters
    ----------
    key : str
        Table and name, as in "words.season".
    **values
        What its words in braces stand for.

    Raises
    ------
    KeyError
        When the phrase file has no such phrase.

    Examples
    --------
    >>> phrase("words.season", year=2021)
    'harvest 2021'
    """
    table, _, name = key.partition(".")
    return str(_phrases()[table][name]).format(**values)


def title_of(measure: Measure) -> str:
    """Return the title of a measure in plain words, as maps and tables print it."""
    titles = _phrases()["titles"]
    return str(titles.get(measure.name, measure.long_name))


def unit_of(measure: Measure) -> str:
    """Return the unit of a measure as maps print it; shares are in percent there."""
    units = _phrases()["units"]
    for key in (measure.name, measure.kind, measure.unit):
        if key in units:
            return str(units[key])
    return measure.unit


def months() -> list[str]:
    """Return the twelve names of the months."""
    return list(_phrases()["words"]["months"])


def printed_date(date: Any) -> str:
    """Return a date in words; an empty text where there is none.

    Parameters
    ----------
    date : numpy.datetime64 or cftime.datetime or None

    Examples
    --------
    >>> printed_date(np.datetime64("2021-10-05"))
    '5 October 2021'
    """
    if _is_none(date):
        return ""
    year, month, day = (int(part) for part in iso_date(date).split("-"))
    return phrase("words.month_day_year", day=day, month=months()[month - 1], year=year)


def iso_date(date: Any) -> str:
    """Return a date as YYYY-MM-DD, in its own calendar; an empty text where there is none.

    Examples
    --------
    >>> iso_date(np.datetime64("2021-10-05T12:00"))
    '2021-10-05'
    """
    if _is_none(date):
        return ""
    if isinstance(date, np.datetime64):
        return str(date.astype("datetime64[D]"))
    return f"{date.year:04d}-{date.month:02d}-{date.day:02d}"


def _is_none(date: Any) -> bool:
    # NaT and NaN are the only values that do not equal themselves
    return date is None or bool(date != date)


def number(value: float, digits: int = 3) -> str:
    """Return a number for reading: at most `digits` significant figures, no trailing zeros.

    Examples
    --------
    >>> number(35.0), number(0.0625), number(12000.0), number(3.14159)
    ('35', '0.0625', '12000', '3.14')
    """
    if abs(value) >= 10.0 ** (digits - 1):
        return f"{value:.0f}" if abs(value - round(value)) < 0.05 else f"{value:.1f}"
    return f"{value:.{digits}g}"
