"""Sowing day: one date, a grid, or a table by district."""

from __future__ import annotations

import csv
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np
import xarray as xr

from cropstress.errors import Fault, InputError, nearest
from cropstress.places.dates import Date, DateError, day_of_year, days_in_year, read_date
from cropstress.places.districts import Districts
from cropstress.places.grid_file import grid_file_faults, read_grid_file
from cropstress.weather.location import grid_of
from cropstress.weather.open import find_one_file, label_of

FIRST_DAY, LAST_DAY = 1.0, 366.0  # day of year
_WORKBOOK = (b"PK\x03\x04", b"\xd0\xcf\x11\xe0")  # first bytes of .xlsx and .ods, and of .xls (common knowledge)


@dataclass(frozen=True)
class Sowing:
    """When a crop is sown.

    Attributes
    ----------
    words : str
        How the run file was understood.
    calendar : str
        Calendar of the weather.
    days : numpy.ndarray (Y, X) or None
        Day of the year, where a grid gives it; NaN where there is none [d].
    which : numpy.ndarray (Y, X) or None
        Number of the date in `choices` of every cell, -1 for none; None where a grid gives the days.
    choices : list of Date
        The dates.
    year : int or None
        The only year the dates are for, where they name one.
    remarks : list of str
        What was left out or rounded.
    missing_districts : list of str
        Codes of districts on the grid without a date: their cells have none.
    """

    words: str
    calendar: str
    days: np.ndarray | None = None
    which: np.ndarray | None = None
    choices: list[Date] = field(default_factory=list)
    year: int | None = None
    remarks: list[str] = field(default_factory=list)
    missing_districts: list[str] = field(default_factory=list)

    def dates(self, year: int) -> np.ndarray:
        """Return the sowing days of a calendar year.

        Parameters
        ----------
        year : int
            The year of sowing.

        Returns
        -------
        numpy.ndarray (Y, X) of float64
            Day of the year in the calendar of the weather [d]; NaN where nothing is sown, also in any other
            year than the one the dates name.
        """
        if self.days is not None:
            return np.minimum(self.days, float(days_in_year(year, self.calendar)))
        assert self.which is not None
        if self.year is not None and year != self.year:
            return np.full(self.which.shape, np.nan)
        days = [float(day_of_year(date, year, self.calendar)) for date in self.choices]
        return np.array([*days, np.nan])[self.which]


def read_sowing(
    spec: str | Mapping[str, str],
    dataset: xr.Dataset,
    districts: Districts | None = None,
    base: str | Path | None = None,
) -> Sowing:
    """Read when a crop is sown.

    Parameters
    ----------
    spec : str or mapping
        A date ("25 April", "04-25", "2021-04-25"); a `grid` file of days of the year with the variable's
        `name`; or a `table` (CSV) with the columns `code` and `date`.
    dataset : xarray.Dataset
        The canonical weather.
    districts : Districts, optional
        Needed for a table.
    base : str or Path, optional
        The folder a relative name starts from.

    Returns
    -------
    Sowing

    Raises
    ------
    InputError
        A date that cannot be read; a grid or table at fault; codes that lost their leading zeros.
    """
    calendar = str(dataset["time"].dt.calendar)
    if isinstance(spec, str):
        return _one_date(spec, dataset, calendar)
    if "grid" in spec:
        return _from_grid(spec, dataset, calendar, base)
    if "table" in spec:
        return _from_table(spec, calendar, districts, base)
    what = f"the sowing has the keys {', '.join(spec) or 'none'}"
    remedy = 'Give a date, { grid = "FILE" } or { table = "FILE", code = "...", date = "..." }.'
    raise InputError([Fault(what, "sowing", remedy)])


def _one_date(spec: str, dataset: xr.Dataset, calendar: str) -> Sowing:
    try:
        date = read_date(spec, calendar)
    except DateError as error:
        raise InputError([Fault(str(error), "sowing", error.remedy)]) from error
    which = np.zeros(grid_of(dataset).shape, dtype=np.int64)
    when = f"{date.words()}, in {date.year} only" if date.year is not None else f"{date.words()} of the year"
    return Sowing(f"sown on {when}, everywhere", calendar, which=which, choices=[date], year=date.year)


def _from_grid(
    spec: Mapping[str, str], dataset: xr.Dataset, calendar: str, base: str | Path | None
) -> Sowing:
    read = read_grid_file(spec["grid"], spec.get("name"), dataset, base, "the sowing day")
    if read.unit and read.unit.lower() not in ("1", "d", "day", "days", "day of year", "day_of_year"):
        what = f"a sowing grid holds days of the year, 1 to 366, but its unit is '{read.unit}'"
        raise InputError([Fault(what, read.where, 'Write days of the year, with the unit "1".')])
    there = np.isfinite(read.values)
    beyond = there & ((read.values < FIRST_DAY) | (read.values > LAST_DAY))
    if beyond.any():
        row, column = np.argwhere(beyond)[0]
        grid = grid_of(dataset)
        what = (
            f"{int(beyond.sum())} cells have a sowing day outside 1 to 366, for example "
            f"{read.values[row, column]:g} "
            f"at {grid.row} {grid.rows[row]:.6g}, {grid.column} {grid.columns[column]:.6g}"
        )
        remedy = "Days of the year run from 1 (1 January); leave cells without sowing missing, not 0."
        raise InputError([Fault(what, read.where, remedy)])
    if not there.any():
        raise InputError([Fault("no cell has a sowing day", read.where, "Name another variable.")])
    days = np.rint(read.values)
    remarks = []
    uneven = int((there & (days != read.values)).sum())
    if uneven:
        remarks.append(f"{read.where}: {uneven} sowing days are not whole; rounded")
    first, last = np.nanmin(days), np.nanmax(days)
    span = f"day {first:.0f}{'' if first == last else f' to {last:.0f}'} of the year"
    return Sowing(f"sown by the grid '{read.name}', {span}", calendar, days=days, remarks=remarks)


def _from_table(
    spec: Mapping[str, str], calendar: str, districts: Districts | None, base: str | Path | None
) -> Sowing:
    if districts is None:
        remedy = 'Add [places] districts = "FILE" and id_field = "FIELD".'
        raise InputError([Fault("a sowing table needs districts, and none are given", spec["table"], remedy)])
    rows, label = _table(spec, base)
    dates, faults = _dates(rows, calendar, label)
    faults += _code_faults([code for _, code, _ in rows], districts.codes, districts.label, label)
    years = {date.year for date in dates.values()}
    if len(years) > 1:
        named = ", ".join("none" if year is None else str(year) for year in sorted(years, key=str))
        remedy = "Write all dates without a year (MM-DD), or all in the same year."
        faults.append(Fault(f"the dates are of different years ({named})", label, remedy))
    if faults:
        raise InputError(faults)
    return _by_district(dates, districts, calendar, label, next(iter(years), None))


def sowing_faults(
    spec: str | Mapping[str, str], base: str | Path | None = None, districts: tuple[list[str], str] | None = None
) -> list[Fault]:
    """Return what is wrong with a sowing by itself, where there is no weather to lay it on.

    Parameters
    ----------
    spec : str or mapping
        As in `read_sowing`.
    base : str or Path, optional
        The folder a relative name starts from.
    districts : (list of str, str), optional
        The codes of the districts and how messages name their file.
    """
    try:
        if isinstance(spec, str):
            read_date(spec)
        elif "grid" in spec:
            return grid_file_faults(spec["grid"], base)
        elif "table" in spec:
            rows, label = _table(spec, base)
            faults = _dates(rows, "standard", label)[1]
            return faults + (_code_faults([code for _, code, _ in rows], *districts, label) if districts else [])
    except DateError as error:
        return [Fault(str(error), "sowing", error.remedy)]
    except InputError as error:
        return error.faults
    return []


def _table(spec: Mapping[str, str], base: str | Path | None) -> tuple[list[tuple[int, str, str]], str]:
    """Return the rows of a sowing table and how messages name it."""
    folder = None if base is None else Path(base)
    path, faults = find_one_file(spec["table"], folder)
    if path is None:
        raise InputError(faults)
    label = label_of(path, folder)
    return _rows(path, spec.get("code", "code"), spec.get("date", "date"), label), label


def _rows(path: Path, code: str, date: str, label: str) -> list[tuple[int, str, str]]:
    """Return line number, code and date of every row of a table."""
    text = _text(path, label)
    if not text.strip():
        raise InputError([Fault("the table is empty", label, "Give each district's code and date.")])
    first = text.partition("\n")[0]
    separator = max(",;\t", key=first.count)
    table = csv.DictReader(text.splitlines(), delimiter=separator, skipinitialspace=True)
    columns = [column.strip() for column in table.fieldnames or []]
    table.fieldnames = columns
    faults = []
    for key, column in (("code", code), ("date", date)):
        if column not in columns:
            alike = nearest(column, columns)
            remedy = f"Did you mean '{alike}'?" if alike else f"The columns are {', '.join(columns)}."
            remedy += f' Say it in the sowing: {key} = "...".'
            faults.append(Fault(f"the table has no column '{column}'", label, remedy))
    if faults:
        raise InputError(faults)
    try:
        rows = [
            (table.line_num, (row[code] or "").strip(), (row[date] or "").strip())
            for row in table
            if any((value or "").strip() for value in row.values() if not isinstance(value, list))
        ]
    except csv.Error as error:
        what = f"the table cannot be read as CSV ({error})"
        raise InputError([Fault(what, f"{label}: line {table.line_num}", "Check the quotes there.")]) from error
    if not rows:
        raise InputError([Fault("the table has no rows", label, "Give each district's code and date.")])
    return rows


def _text(path: Path, label: str) -> str:
    try:
        content = path.read_bytes()
        return content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        what, remedy = "the table is not UTF-8 text", "Save it as CSV in UTF-8."
        if content.startswith(_WORKBOOK):
            what, remedy = "this is a workbook or another packed file, not CSV text", "Save its sheet as CSV in UTF-8."
        raise InputError([Fault(what, label, remedy)]) from error
    except OSError as error:
        what = f"the table cannot be read ({error.strerror or type(error).__name__})"
        raise InputError([Fault(what, label, "Name a file you may read.")]) from error


def _dates(
    rows: list[tuple[int, str, str]], calendar: str, label: str
) -> tuple[dict[str, Date], list[Fault]]:
    """Return the date of each code; an empty one is none."""
    dates: dict[str, Date] = {}
    faults = []
    lines: dict[str, int] = {}
    for line, code, text in rows:
        where = f"{label}: line {line}"
        if code in lines:
            what = f"the code '{code}' is there twice, also in line {lines[code]}"
            faults.append(Fault(what, where, "Keep one of them."))
            continue
        lines[code] = line
        if not text:
            continue
        try:
            dates[code] = read_date(text, calendar)
        except DateError as error:
            faults.append(Fault(str(error), where, error.remedy))
    return dates, faults


def _code_faults(codes: list[str], district_codes: list[str], districts_label: str, label: str) -> list[Fault]:
    """Return faults for codes that lost their leading zeros, or for a table of other districts altogether."""
    known = set(district_codes)
    unknown = [code for code in codes if code not in known]
    by_bare = {code.lstrip("0"): code for code in district_codes}
    pairs = [(code, by_bare[code.lstrip("0")]) for code in unknown if code.lstrip("0") in by_bare]
    faults = []
    for lost, here, there in (
        ([(mine, full) for mine, full in pairs if len(mine) < len(full)], label, districts_label),
        ([(theirs, full) for full, theirs in pairs if len(theirs) < len(full)], districts_label, label),
    ):
        if lost:
            short, full = lost[0]
            more = f", and {len(lost) - 1} more" if len(lost) > 1 else ""
            what = f"the code {short} has lost its leading zero: in {there} it is {full}{more}"
            remedy = "Write codes as text: a spreadsheet turns them into numbers and drops the zeros."
            faults.append(Fault(what, here, remedy))
    if not faults and len(unknown) == len(codes):
        mine, theirs = (", ".join(each[:3]) for each in (codes, district_codes))
        what = f"no code of the table ({mine} ...) is one of the districts' ({theirs} ...)"
        remedy = f"Check the column of codes and the id_field of {districts_label}."
        faults.append(Fault(what, label, remedy))
    return faults


def _by_district(
    dates: dict[str, Date], districts: Districts, calendar: str, label: str, year: int | None
) -> Sowing:
    choices = list(dict.fromkeys(dates.values()))
    number = {date: place for place, date in enumerate(choices)}
    by_district = [number[dates[code]] if code in dates else -1 for code in districts.codes]
    which = np.array([*by_district, -1])[districts.index]
    missing = [districts.codes[each] for each in districts.with_cells() if districts.codes[each] not in dates]
    remarks = []
    if missing:
        listed = ", ".join(f"{code} {districts.names[districts.codes.index(code)]}" for code in missing)
        remarks.append(f"{label}: no sowing date for {listed}; their cells stay blank")
    unknown = [code for code in dates if code not in districts.codes]
    if unknown:
        remarks.append(f"{label}: not used, as {districts.label} has no such district: {', '.join(unknown)}")
    outside = int((districts.index < 0).sum())
    if outside:
        remarks.append(f"{outside} cells lie in no district of {districts.label} and have no sowing date")
    first, last = (extreme(choices, key=lambda date: (date.month, date.day)) for extreme in (min, max))
    span = first.words() if first == last else f"{first.words()} to {last.words()}"
    when = f"{span}, in {year} only" if year is not None else span
    dated = len(by_district) - by_district.count(-1)
    words = f"sown by district, {when}, {dated} of {len(by_district)} districts"
    return Sowing(words, calendar, None, which, choices, year, remarks, missing)
