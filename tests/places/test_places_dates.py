"""Dates as people write them."""

from __future__ import annotations

import pytest

from cropstress.places.dates import Date, DateError, day_of_year, days_in_year, read_date


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("25 April", Date(4, 25)),
        ("April 25", Date(4, 25)),
        ("25 apr", Date(4, 25)),
        ("25. April", Date(4, 25)),
        (" 04-25 ", Date(4, 25)),
        ("4-25", Date(4, 25)),
        ("2021-04-25", Date(4, 25, 2021)),
        ("29 February", Date(2, 29)),
    ],
)
def test_read(text: str, expected: Date) -> None:
    assert read_date(text) == expected


@pytest.mark.parametrize(
    ("text", "remedy"),
    [
        ("25 Aprl", "'April'"),
        ("25-04", "Month first"),
        ("31 April", "25 April"),
        ("2021-02-29", "25 April"),
        ("25/04", "25 April"),
        ("early May", "25 April"),
        ("1 Ju", "25 April"),
        ("", "25 April"),
    ],
)
def test_cannot_be_read(text: str, remedy: str) -> None:
    with pytest.raises(DateError) as caught:
        read_date(text)
    assert remedy in caught.value.remedy


@pytest.mark.parametrize(
    ("date", "year", "calendar", "expected"),
    [
        (Date(4, 25), 2021, "standard", 115),
        (Date(4, 25), 2020, "standard", 116),
        (Date(4, 25), 2020, "noleap", 115),
        (Date(4, 25), 2020, "360_day", 115),
        (Date(5, 31), 2020, "360_day", 150),
        (Date(2, 29), 2021, "standard", 60),
        (Date(12, 31), 2020, "standard", 366),
    ],
)
def test_day_of_year(date: Date, year: int, calendar: str, expected: int) -> None:
    """Counted by hand."""
    assert day_of_year(date, year, calendar) == expected


def test_days_in_year() -> None:
    assert [days_in_year(2020, calendar) for calendar in ("standard", "noleap", "360_day")] == [366, 365, 360]
