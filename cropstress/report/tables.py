"""Tables of a result as CSV: per season, per growth stage and per ten days."""

from __future__ import annotations

import csv
from collections.abc import Iterable, Mapping
from datetime import timedelta
from pathlib import Path
from typing import Any

import numpy as np
import xarray as xr

from cropstress.report import notes as travelling
from cropstress.report import statistics
from cropstress.report.phrases import iso_date
from cropstress.report.writing import written_aside
from cropstress.season.measures import CAUSES, MEASURES, SERIES

Row = dict[str, object]

#: The leading cause is none where a smaller share of the possible uptake was lost [1]: too small to tell.
LEAST_SHARE_OF_A_CAUSE = 0.01


def write_ten_day_table(result: xr.Dataset, path: Path | str, area: np.ndarray | None = None) -> None:
    """Write the sums per ten days, as means over the computed cells.

    Parameters
    ----------
    result : xarray.Dataset
        A finished result.
    path : path
        Its final name.
    area : numpy.ndarray (Y, X), optional
        Crop area of each cell, as a share or in hectares; cells count alike without it.

    Raises
    ------
    InputError
        When the file cannot be written.
    """
    rows: list[Row] = []
    for season in _seasons(result):
        starts = np.ravel(result["ten_days_start"].sel(season=season).values)
        last = statistics.season_bound(result, season, "season_end")
        steps = [(step, start) for step, start in enumerate(starts) if iso_date(start)]
        for position, (step, start) in enumerate(steps):
            following = steps[position + 1][1] if position + 1 < len(steps) else None
            place: Row = {
                "first_day": iso_date(start),
                "last_day": _day_before(following, last),
            }
            rows.append(
                _beginning(result, season)
                | place
                | _sums(result, season, area, "ten_days", step)
                | _end(result)
            )
    _write(path, rows)


def write_stage_table(result: xr.Dataset, path: Path | str, area: np.ndarray | None = None) -> None:
    """Write the sums per growth stage, as means over the computed cells.

    Parameters and errors as `write_ten_day_table`.
    """
    rows: list[Row] = []
    for season in _seasons(result):
        for step, stage in enumerate(result["stage"].values):
            sums = _sums(result, season, area, "stage", step)
            rows.append(_beginning(result, season) | {"stage": str(stage)} | sums | _end(result))
    _write(path, rows)


def write_season_table(result: xr.Dataset, path: Path | str, area: np.ndarray | None = None) -> None:
    """Write one row a season: every measure as mean, median and highest over the computed cells.

    Shares are total lost over total possible; days of the year are median dates. Parameters and errors as
    `write_ten_day_table`.
    """
    rows: list[Row] = []
    for season in _seasons(result):
        row = _beginning(result, season)
        row["first_day"] = iso_date(statistics.season_bound(result, season, "season_start"))
        row["last_day"] = iso_date(statistics.season_bound(result, season, "season_end"))
        row["cells_computed [1]"] = int(statistics.is_computed(result, season).sum())
        row["cells_blank [1]"] = int((~statistics.is_computed(result, season)).sum())
        rows.append(row | _season_values(result, season, area) | _end(result))
    _write(path, rows)


def largest_cause(causes: Mapping[str, float], share: float) -> str:
    """Return the largest of the four causes of a total loss to heat.

    Parameters
    ----------
    causes : mapping
        Loss by each cause, in any one unit.
    share : float [1]
        Share of the possible uptake that was lost.

    Returns
    -------
    str
        "none" where less than 1 % was lost, empty where nothing is known.
    """
    if not np.isfinite(share) or not all(np.isfinite(value) for value in causes.values()):
        return ""
    if share < LEAST_SHARE_OF_A_CAUSE:
        return "none"
    return max(causes, key=lambda cause: causes[cause])


def _seasons(result: xr.Dataset) -> list[int]:
    return [int(season) for season in result["season"].values]


def _beginning(result: xr.Dataset, season: int) -> Row:
    return {
        "crop": result.attrs.get("crop", ""),
        "label": travelling.crop_label(result),
        "scenario": result.attrs.get("scenario", "observed"),
        "season": season,
    }


def _end(result: xr.Dataset) -> Row:
    """The notes every file carries, so that a row cut out of the table keeps them."""
    credit = travelling.attribute(result, "credit")
    parts = [
        travelling.assumptions(result),
        travelling.caution(result),
        travelling.as_text(credit) if credit else "",
    ]
    return {"notes": " ".join(part for part in parts if part)}


def _sums(result: xr.Dataset, season: int, area: np.ndarray | None, dimension: str, step: int) -> Row:
    fields = {
        name: statistics.field(result, f"{name}_by_{dimension}", season, **{dimension: step})
        for name in SERIES
        if f"{name}_by_{dimension}" in result
    }
    row: Row = {}
    for name, values in fields.items():
        row[_header(name)] = _rounded(statistics.weighted_mean(values, area))
        share = next((share for share, lost in statistics.SHARES.items() if lost == name), None)
        if share is not None and "assimilation" in fields:
            total = statistics.share_of_possible(fields["assimilation"], values, area)
            row[_header(share)] = _rounded(total)
    return row


def _season_values(result: xr.Dataset, season: int, area: np.ndarray | None) -> Row:
    row: Row = {}
    for name, measure in MEASURES.items():
        if name not in result:
            continue
        if measure.kind == "flag":
            row[name] = total_cause(result, season, area)
        elif measure.kind == "day_of_year":
            row[f"{name} median [date]"] = iso_date(statistics.median_date(result, season, name))
        else:
            values = statistics.field(result, name, season)
            if name in statistics.SHARES:
                row[f"{name} total [1]"] = _rounded(total_share(result, season, name, area))
            else:
                row[f"{name} mean [{measure.unit}]"] = _rounded(statistics.weighted_mean(values, area))
            row[f"{name} median [{measure.unit}]"] = _rounded(statistics.median(values))
            row[f"{name} highest [{measure.unit}]"] = _rounded(statistics.most(values))
    return row


def total_share(result: xr.Dataset, season: int, share: str, area: np.ndarray | None = None) -> float:
    """Return a share over all computed cells, total lost over total possible [1].

    Parameters
    ----------
    result : xarray.Dataset
        A finished result.
    season : int
        Year of harvest.
    share : str
        Name of the share.
    area : numpy.ndarray (Y, X), optional
        Crop area of each cell, in any unit.
    """
    lost = statistics.SHARES[share]
    if "assimilation" not in result or lost not in result:
        return float("nan")
    assimilation = statistics.field(result, "assimilation", season)
    return statistics.share_of_possible(assimilation, statistics.field(result, lost, season), area)


def total_cause(result: xr.Dataset, season: int, area: np.ndarray | None = None) -> str:
    """Return the leading cause of the loss to heat of all computed cells together; as `largest_cause`."""
    names = {cause: f"lost_to_heat_by_{cause}" for cause in CAUSES}
    if any(name not in result for name in names.values()):
        return ""
    causes = {
        cause: statistics.weighted_mean(statistics.field(result, name, season), area)
        for cause, name in names.items()
    }
    return largest_cause(causes, total_share(result, season, "lost_to_heat_share", area))


def _header(name: str) -> str:
    return f"{name} [{MEASURES[name].unit}]"


def _rounded(value: float) -> object:
    """Seven figures, as many as the grids hold; an empty cell where there is no number."""
    return float(f"{value:.7g}") if np.isfinite(value) else ""


def _day_before(following: Any, last: Any) -> str:
    """The day before the next step, or the last day counted."""
    if following is None:
        return iso_date(last)
    if isinstance(following, np.datetime64):
        return iso_date(min(following.astype("datetime64[D]") - np.timedelta64(1, "D"), last))
    return iso_date(min(following - timedelta(days=1), last))


def _write(path: Path | str, rows: Iterable[Row]) -> None:
    rows = list(rows)
    headers = list(dict.fromkeys(header for row in rows for header in row))
    with written_aside(path) as aside, aside.open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, headers, restval="")
        writer.writeheader()
        writer.writerows(rows)
