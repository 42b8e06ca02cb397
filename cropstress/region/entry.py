"""One crop entry on a grid: which cells, sown when, with which numbers."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from cropstress.crops import CropProfile
from cropstress.errors import Fault
from cropstress.leaf.parameters import leaf_record
from cropstress.region.calendar import TimeAxis
from cropstress.season.layout import REMEMBERED_DAYS
from cropstress.season.parameters import season_record


@dataclass(frozen=True)
class Options:
    """Choices of the science, the same for all crops of a run.

    Attributes
    ----------
    canopy : str
        "sunlit_shaded" or "leaf".
    acclimation : bool
    least_potential : float
        [mol m-2]; shares of less are left blank.
    allowed_missing : float
        Share of missing days above which a cell is left blank.
    """

    canopy: str = "sunlit_shaded"
    acclimation: bool = False
    least_potential: float = 1.0
    allowed_missing: float = 0.1


@dataclass(frozen=True)
class Entry:
    """A crop entry, ready to be computed.

    Attributes
    ----------
    name, label : str
    profile : CropProfile
    stages : str
        "days" or "thermal_time".
    years : list of int
        Years of harvest, in order.
    sowing : int64 array (seasons, cells)
        Day of sowing on the time axis, -1 for none; cells are rows x columns.
    grown : bool array (cells,)
        False where the crop's area is zero.
    co2 : float64 array (seasons,)
        [umol mol-1]
    leaf, season : record arrays (1,)
    first_ten_days : int64 array (seasons,)
    steps : int
        Calendar ten days of the longest season.
    remarks : list of str
    """

    name: str
    label: str
    profile: CropProfile
    stages: str
    years: list[int]
    sowing: np.ndarray
    grown: np.ndarray
    co2: np.ndarray
    leaf: np.ndarray
    season: np.ndarray
    first_ten_days: np.ndarray
    steps: int
    remarks: list[str] = field(default_factory=list)


def season_sowing(dates: Callable[[int], np.ndarray], year: int, length: int, axis: TimeAxis) -> np.ndarray:
    """Return the day numbers of sowing of a season that is harvested in a year.

    Parameters
    ----------
    dates : callable
        Sowing day of the year of every cell in a calendar year, NaN for none.
    year : int
        Year of harvest.
    length : int
        Expected length of the season [d].
    axis : TimeAxis

    Returns
    -------
    numpy.ndarray of int64
        Day numbers, below 0 before the data; -10**6 where nothing is sown.
    """
    result = np.full(dates(year).shape, -(10**6), dtype=np.int64)
    end_of_year = axis.first_of_year(year + 1)
    for sown_in in (year - 1, year):
        days = dates(sown_in)
        number = axis.first_of_year(sown_in) + np.where(np.isnan(days), 0.0, days).astype(np.int64) - 1
        last = number + length - 1
        harvested = (last >= axis.first_of_year(year)) & (last < end_of_year) & ~np.isnan(days)
        result = np.where(harvested, number, result)
    return result


def make_entry(
    name: str,
    label: str,
    profile: CropProfile,
    dates: Callable[[int], np.ndarray],
    axis: TimeAxis,
    years: Sequence[int] | None = None,
    *,
    area: np.ndarray | None = None,
    co2: Callable[[int], float],
    stages: str = "days",
    options: Options | None = None,
) -> tuple[Entry | None, list[Fault]]:
    """Lay a crop's seasons on the days of the weather.

    Returns
    -------
    tuple
        The entry, or None and the faults: no season within the data, sowing outside of it.
    """
    options = options or Options()
    length = int(sum(profile.days))
    where = f"crop {name}"
    first_year, last_year = axis.years_spanned()
    wanted = sorted(years) if years else list(range(first_year, last_year + 2))
    sowings, kept, remarks = [], [], []
    faults: list[Fault] = []
    for year in wanted:
        numbers = season_sowing(dates, year, length, axis).ravel()
        sown = numbers > -(10**6)
        inside = (numbers >= 0) & (numbers < axis.length)
        if not inside.any():
            if years:
                faults.append(_outside(where, year, numbers[sown], axis, length))
            continue
        early = int((sown & (numbers < 0)).sum())
        if early:
            remarks.append(
                f"{label}, {year}: {early} cells are sown before the data begin ({axis.iso(0)}) and are left blank."
            )
        sowings.append(np.where(inside, numbers, -1))
        kept.append(year)
    if faults:
        return None, faults
    if not kept:
        return None, [
            Fault(
                f"no sowing day lies within the data, {axis.iso(0)} to {axis.iso(axis.length - 1)}",
                where,
                "Give grids that hold the growing season, or correct `sowing`.",
            )
        ]
    sowing = np.array(sowings, dtype=np.int64)
    faults = _overlapping(where, kept, sowing, length) if stages == "days" else _forgotten(where, profile)
    if faults:
        return None, faults
    starts = [int(row[row >= 0].min()) for row in sowing]
    if stages == "thermal_time":
        ends = [int(row.max()) for row in sowing[1:]] + [axis.length - 1]
    else:
        ends = [min(int(row.max()) + length - 1, axis.length - 1) for row in sowing]
    first = np.array([axis.ten_days[start] for start in starts], dtype=np.int64)
    steps = max(int(axis.ten_days[end] - begin) + 1 for end, begin in zip(ends, first, strict=True))
    grown = np.ones(sowing.shape[1], bool) if area is None else (np.nan_to_num(area.ravel()) > 0.0)
    return (
        Entry(
            name, label, profile, stages, kept, sowing, grown, np.array([co2(year) for year in kept], dtype=float),
            leaf_record(profile, options.acclimation),
            season_record(profile, stages, options.canopy, options.acclimation), first, steps, remarks,
        ),
        [],
    )  # fmt: skip


def _overlapping(where: str, years: Sequence[int], sowing: np.ndarray, length: int) -> list[Fault]:
    """Tell the seasons that are sown before the season before them has ended."""
    faults = []
    for year, before, after in zip(years[1:], sowing[:-1], sowing[1:], strict=True):
        if ((before >= 0) & (after >= 0) & (after < before + length)).any():
            faults.append(
                Fault(
                    f"the season {year} is sown before the season before it, of {length} days, has ended",
                    where,
                    "Name every second year in [seasons] years, or shorten the stages of the profile.",
                )
            )
    return faults


def _forgotten(where: str, profile: CropProfile) -> list[Fault]:
    """Tell a flowering window that opens earlier than is remembered until thermal time tells the flowering."""
    offset, window = profile.flowering_offset, profile.flowering_window
    if offset is None or window is None or offset + window[0] >= -REMEMBERED_DAYS:
        return []
    return [
        Fault(
            f"the flowering window opens {-(offset + window[0])} days before mid-season, but under thermal time only "
            f"{REMEMBERED_DAYS} days are remembered",
            where,
            "Let the window open later, or give the stages in days.",
        )
    ]


def _outside(where: str, year: int, numbers: np.ndarray, axis: TimeAxis, length: int) -> Fault:
    data = f"{axis.iso(0)} to {axis.iso(axis.length - 1)}"
    if numbers.size == 0:
        return Fault(f"no cell has a sowing day for the season {year}", where, "Correct `sowing` or [seasons] years.")
    return Fault(
        f"the season {year} ({length} days) is sown outside the data, which run from {data}",
        where,
        "Correct `sowing` or [seasons] years, or give the grids of that season; "
        "a season carries the year of its harvest.",
    )


def co2_of(value: float | Mapping[int, float]) -> Callable[[int], float]:
    """Return a function that gives the CO2 of a year [umol mol-1]."""
    if isinstance(value, Mapping):
        table = dict(value)
        return lambda year: float(table[year])
    return lambda year: float(value)
