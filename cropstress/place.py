"""One place through its season, day by day: the command `trace`."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd
import xarray as xr

from cropstress.day import block
from cropstress.errors import fail
from cropstress.job import Job, prepare
from cropstress.region import Entry, TimeAxis, make_plan
from cropstress.region.compute import VARIABLES, compute, ground_of, has_gas_exchange, load_block
from cropstress.region.plan import Plan
from cropstress.region.results import gather, make_result
from cropstress.report import notes as travelling
from cropstress.report.curves import trace_figure
from cropstress.report.phrases import phrase
from cropstress.report.summary import place_words
from cropstress.report.writing import written_aside
from cropstress.run_faults import weather_told
from cropstress.season import layout as at
from cropstress.season.measures import STAGES
from cropstress.weather import cell_latitude_longitude

_COLUMNS = {
    "assimilation": block.ASSIMILATION,
    "lost_to_heat": block.LOST_TO_HEAT,
    "lost_to_heat_by_photorespiration": block.BY_PHOTORESPIRATION,
    "lost_to_heat_by_stomata": block.BY_STOMATA,
    "lost_to_heat_by_enzymes": block.BY_ENZYMES,
    "lost_to_heat_by_respiration": block.BY_RESPIRATION,
    "lost_to_photorespiration": block.LOST_TO_PHOTORESPIRATION,
    "photorespired_co2": block.PHOTORESPIRED_CO2,
    "highest_leaf_temperature": block.HIGHEST_LEAF,
    "mean_vapour_pressure_deficit": block.DAYTIME_DEFICIT,
    "leaf_area": at.DAILY_LEAF_AREA,
    "hot_hours": at.DAILY_HOT_HOURS,
    "growth_temperature": at.DAILY_GROWTH_TEMPERATURE,
}
_NO_LEAF = 1e29  # the kernel's highest and lowest of nothing are 1e30


def nearest_cell(latitude: np.ndarray, longitude: np.ndarray, wanted: tuple[float, float]) -> tuple[int, float]:
    """Return the number of the nearest cell centre and its distance [km] on a sphere of 6371 km."""
    phi, lam = np.radians(latitude.ravel()), np.radians(longitude.ravel())
    phi0, lam0 = np.radians(wanted[0]), np.radians(wanted[1])
    half = np.sin((phi - phi0) / 2) ** 2 + np.cos(phi) * np.cos(phi0) * np.sin((lam - lam0) / 2) ** 2
    distance = 2.0 * 6371.0 * np.arcsin(np.sqrt(np.clip(half, 0.0, 1.0)))
    cell = int(np.argmin(distance))
    return cell, float(distance[cell])


def trace(path: str | Path, place: tuple[float, float], out: str | Path | None = None) -> list[Path]:
    """Write what every day of a season gave at one place, as CSV and figure, for each crop entry.

    Parameters
    ----------
    path : path
        The run file.
    place : tuple of float
        Latitude and longitude [degrees]; the nearest cell is taken.
    out : path, optional
        Folder; by default `trace` in the run's output folder.

    Returns
    -------
    list of pathlib.Path
        The files written.

    Raises
    ------
    InputError
        When the place lies outside the grid, or anything of the run file is at fault.
    """
    job = prepare(path)
    latitude, longitude = cell_latitude_longitude(job.dataset)
    cell, distance = nearest_cell(latitude, longitude, place)
    row, column = divmod(cell, latitude.shape[1])
    reach = _cell_size(latitude, longitude, row, column)
    if distance > reach:
        raise fail(
            f"the nearest cell centre is {distance:.0f} km away",
            f"place {place[0]:g}, {place[1]:g}",
            f"Give a place within the grid: latitude {latitude.min():.2f} to {latitude.max():.2f}, "
            f"longitude {longitude.min():.2f} to {longitude.max():.2f}.",
        )
    space = zip(job.dataset["tmax"].dims[1:], (row, column), strict=True)
    one = job.dataset.isel({name: slice(number, number + 1) for name, number in space})
    folder = Path(out) if out is not None else job.run_file.output_folder / "trace"
    stem = f"{abs(place[0]):g}{'N' if place[0] >= 0 else 'S'}-{abs(place[1]):g}{'E' if place[1] >= 0 else 'W'}"
    written: list[Path] = []
    for entry in job.entries:
        single = _at_cell(entry, cell)
        if (single.grown & (single.sowing >= 0).any(axis=0)).any():
            written += _trace_entry(job, single, one, folder / f"{entry.name}-{stem}")
    if not written:
        raise fail(
            "no crop entry grows in this cell", f"place {place[0]:g}, {place[1]:g}",
            "Choose a place inside the crop areas of the run file.",
        )  # fmt: skip
    return written


def _trace_entry(job: Job, entry: Entry, one: xr.Dataset, stem: Path) -> list[Path]:
    """Compute a crop entry on one cell and write its days."""
    plan = Plan(make_plan(one).blocks, [(0, 1, 0, 1)])
    with weather_told(job.weather, job.run_file.base):
        computed = compute(one, [entry], plan, job.axis, threads=1, keep_daily=True)
    state = computed.tiles[entry.name][0]
    result = make_result(
        entry, gather(entry, [state], 1, computed.observed), one, job.axis, job.options, has_gas_exchange(one),
        job.attributes(),
    )  # fmt: skip
    totals = state.totals[0, :, :, 0]
    table = _table(np.concatenate(state.daily, axis=1)[0, :, :, 0], totals, entry, one, job.axis)
    notes = [travelling.assumptions(result)]
    credit = travelling.attribute(result, "credit")
    if credit is not None:
        notes.append(phrase("assumptions.credit", value=travelling.as_text(credit)))
    written = [stem.with_name(f"{stem.name}.csv"), stem.with_name(f"{stem.name}.png")]
    with written_aside(written[0]) as aside:
        # The notes once: a column of them would bury the numbers
        first = pd.Series([" ".join([*notes, travelling.caution(result)])], name="notes")
        pd.concat([table, first], axis=1).to_csv(aside, index=False)
    trace_figure(
        table, written[1], label=entry.label, place=place_words(result, 0, 0),
        heat_onset=float(entry.season["heat_onset"][0]), hot_day_limit=float(entry.season["hot_day_limit"][0]),
        flowering_window=_flowering_rows(totals, entry, table), notes=notes,
    )  # fmt: skip
    return written


def _cell_size(latitude: np.ndarray, longitude: np.ndarray, row: int, column: int) -> float:
    """Return the distance to the farthest neighbour of a cell, at least 25 km [km]."""
    rows, columns = latitude.shape
    largest = 25.0
    here = (latitude[row, column], longitude[row, column])
    for r, c in ((row + 1, column), (row - 1, column), (row, column + 1), (row, column - 1)):
        if 0 <= r < rows and 0 <= c < columns:
            _, step = nearest_cell(latitude[r : r + 1, c], longitude[r : r + 1, c], here)
            largest = max(largest, step)
    return largest


def _at_cell(entry: Entry, cell: int) -> Entry:
    """Return a crop entry on one cell of the map."""
    return replace(entry, sowing=entry.sowing[:, cell : cell + 1], grown=entry.grown[cell : cell + 1])


def _table(daily: np.ndarray, totals: np.ndarray, entry: Entry, one: xr.Dataset, axis: TimeAxis) -> pd.DataFrame:
    """Return the days of the seasons, a row a day: the weather as it was used, and what the day gave."""
    days = np.nonzero(np.isfinite(daily[:, at.DAILY_STAGE]))[0]
    sown = totals[np.isfinite(totals[:, at.SOWING]), at.SOWING]
    years = np.array(entry.years)[np.isfinite(totals[:, at.SOWING])]
    columns: dict[str, object] = {
        "date": [axis.iso(int(day)) for day in days],
        "season": years[np.searchsorted(sown, days, side="right") - 1],
        "stage": [STAGES[int(stage)] for stage in daily[days, at.DAILY_STAGE]],
    }
    weather = load_block(one, axis, ground_of(one), 0, axis.length).weather[:, :, 0]
    gas = has_gas_exchange(one)
    for number, name in enumerate(VARIABLES):
        if name in one or (gas and name in ("wind", "pressure")):
            columns[name] = weather[number, days]
    for name, row in _COLUMNS.items():
        if name == "growth_temperature" and entry.profile.pathway != "C3":
            continue
        values = daily[days, row]
        # A day without leaves has no leaf temperature
        columns[name] = np.where(np.abs(values) < _NO_LEAF, values, np.nan)
    return pd.DataFrame(columns)


def _flowering_rows(totals: np.ndarray, entry: Entry, table: pd.DataFrame) -> tuple[int, int] | None:
    """Return the first and last row of the last season's flowering window."""
    flowering, sowing = totals[-1, at.FLOWERING], totals[-1, at.SOWING]
    if not entry.season["flowers"][0] or not flowering >= 0:
        return None
    before = len(table) - int(totals[-1, at.SEASON_DAYS])
    first = before + int(flowering - sowing + entry.season["window_start"][0])
    last = before + int(flowering - sowing + entry.season["window_end"][0])
    return (max(first, 0), min(last, len(table) - 1)) if first < len(table) else None
