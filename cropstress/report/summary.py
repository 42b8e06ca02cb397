"""The summary at the end of a run: enough to notice a wrong calendar or a wrong limit at once."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import xarray as xr

from cropstress.report import notes as travelling
from cropstress.report import statistics
from cropstress.report.grid import map_grid
from cropstress.report.phrases import iso_date, number, phrase, printed_date
from cropstress.report.tables import total_cause, total_share
from cropstress.season.measures import CELL_STATUS

_NONE = float("nan")


@dataclass(frozen=True)
class SeasonSummary:
    """One crop, scenario and season in a few numbers; NaN, None and empty texts where there is none.

    Attributes
    ----------
    crop, label, scenario : str
    pathway : str
        "C3" or "C4".
    season : int
        Year of harvest.
    sowing, flowering, maturity : date or None
        Medians over the computed cells, in the calendar of the weather; modelled.
    last_day : date
        Last day counted.
    cut_short : bool
        Whether the weather data end before the season does.
    hottest_temperature : float [degC]
    hottest_date : date or None
    hottest_place : str
    hot_days, hot_days_flowering : tuple of float
        Median and most of the computed cells [1].
    limits : dict of float
        The crop's limits by name.
    lost_share, most_lost_share : float [1]
        Total lost to heat over total possible, and the highest of a cell.
    leading_cause : str
        Of the total; "none" under 1 %, "unclear" where photorespiration leads in a C4 crop.
    missing_days : tuple of float
        Median and most of the computed cells [d].
    cells : dict of int
        Number of cells by `CELL_STATUS`.
    """

    crop: str
    label: str
    scenario: str
    pathway: str
    season: int
    sowing: Any
    flowering: Any
    maturity: Any
    last_day: Any
    cut_short: bool
    hottest_temperature: float = _NONE
    hottest_date: Any = None
    hottest_place: str = ""
    hot_days: tuple[float, float] = (_NONE, _NONE)
    hot_days_flowering: tuple[float, float] = (_NONE, _NONE)
    limits: dict[str, float] = field(default_factory=dict)
    lost_share: float = _NONE
    most_lost_share: float = _NONE
    leading_cause: str = ""
    missing_days: tuple[float, float] = (_NONE, _NONE)
    cells: dict[str, int] = field(default_factory=dict)


def summarise(
    results: Sequence[xr.Dataset], areas: Mapping[str, np.ndarray] | None = None
) -> list[SeasonSummary]:
    """Return a summary of every crop, scenario and season.

    Parameters
    ----------
    results : sequence of xarray.Dataset
        Finished results.
    areas : mapping of numpy.ndarray (Y, X), optional
        Crop area of each cell by crop entry, in any unit, to weigh totals with.
    """
    areas = areas or {}
    return [
        _summary(result, int(season), areas.get(str(result.attrs.get("crop", ""))))
        for result in results
        for season in result["season"].values
    ]


def summary_text(summaries: Sequence[SeasonSummary]) -> str:
    """Return the summary as plain text for the screen, the caution line last.

    Parameters
    ----------
    summaries : sequence of SeasonSummary
    """
    blocks = [
        "\n".join([heading, *(f"  {line}" for line in lines)]) for heading, lines in map(_lines, summaries)
    ]
    return "\n\n".join([*blocks, phrase("summary.caution")])


def _summary(result: xr.Dataset, season: int, area: np.ndarray | None) -> SeasonSummary:
    status = statistics.cell_status(result, season)
    last_day = statistics.season_bound(result, season, "season_end")
    hottest = _hottest(result, season)
    return SeasonSummary(
        crop=str(result.attrs.get("crop", "")),
        label=travelling.crop_label(result),
        scenario=travelling.scenario_words(result),
        pathway=str(result.attrs.get("pathway", "")),
        season=season,
        sowing=statistics.median_date(result, season, "sowing_day"),
        flowering=statistics.median_date(result, season, "flowering_day"),
        maturity=statistics.median_date(result, season, "maturity_day"),
        last_day=last_day,
        cut_short=_cut_short(result, season),
        **hottest,
        hot_days=_median_and_most(result, season, "hot_days"),
        hot_days_flowering=_median_and_most(result, season, "hot_days_flowering"),
        limits={
            name: value
            for name in travelling.LIMIT_COORDINATES
            if (value := travelling.limit(result, name)) is not None
        },
        lost_share=total_share(result, season, "lost_to_heat_share", area),
        most_lost_share=_median_and_most(result, season, "lost_to_heat_share")[1],
        leading_cause=_cause(result, season, area),
        missing_days=_median_and_most(result, season, "missing_days"),
        cells={name: int((status == value).sum()) for name, value in CELL_STATUS.items()},
    )


def _cut_short(result: xr.Dataset, season: int) -> bool:
    """Whether the data end before a computed cell's season does: its end is missing or later."""
    computed = statistics.is_computed(result, season)
    last_day = result.attrs.get("last_day_of_data")
    if "maturity_day" not in result or last_day is None or not computed.any():
        return False
    last_day = last_day[:10] if isinstance(last_day, str) else iso_date(last_day)
    if iso_date(statistics.season_bound(result, season, "season_end")) != last_day:
        return False
    maturity = statistics.field(result, "maturity_day", season)[computed]
    days = statistics.days_after_start(result, season, maturity)
    return bool((np.isnan(days) | (days > statistics.season_length(result, season) - 1)).any())


def _median_and_most(result: xr.Dataset, season: int, name: str) -> tuple[float, float]:
    if name not in result:
        return _NONE, _NONE
    values = statistics.field(result, name, season)
    return statistics.median(values), statistics.most(values)


def _hottest(result: xr.Dataset, season: int) -> dict[str, Any]:
    if "hottest_temperature" not in result:
        return {}
    values = statistics.field(result, "hottest_temperature", season)
    if not np.isfinite(values).any():
        return {}
    row, column = np.unravel_index(np.nanargmax(values), values.shape)
    day = statistics.field(result, "hottest_day", season)[row, column] if "hottest_day" in result else _NONE
    return {
        "hottest_temperature": float(values[row, column]),
        "hottest_date": statistics.date_of(result, season, float(day)),
        "hottest_place": place_words(result, int(row), int(column)),
    }


def place_words(result: xr.Dataset, row: int, column: int) -> str:
    """Return the place of a cell in words: latitude and longitude, or its coordinates without a system."""
    grid = map_grid(result)
    y, x = float(grid.y[row]), float(grid.x[column])
    if grid.crs is None:
        return f"{grid.y_name} {number(y, 6)}, {grid.x_name} {number(x, 6)}"
    latitude, longitude = grid.latitude_longitude(y, x)
    north = "words.degrees_north" if latitude >= 0 else "words.degrees_south"
    east = "words.degrees_east" if longitude >= 0 else "words.degrees_west"
    return f"{phrase(north, value=f'{abs(latitude):.3f}')}, {phrase(east, value=f'{abs(longitude):.3f}')}"


def _cause(result: xr.Dataset, season: int, area: np.ndarray | None) -> str:
    cause = total_cause(result, season, area)
    # In C4 leaves photorespiration is small, and no sentence may blame it
    return "unclear" if cause == "photorespiration" and result.attrs.get("pathway") == "C4" else cause


def _lines(summary: SeasonSummary) -> tuple[str, list[str]]:
    season = phrase("words.season", year=summary.season)
    heading = phrase("summary.heading", label=summary.label, season=season, scenario=summary.scenario)
    reasons = _reasons(summary)
    if not summary.cells.get("computed", 0):
        return heading, [phrase("summary.no_cells", reasons=reasons)]
    lines = [
        phrase(
            "summary.dates",
            sowing=printed_date(summary.sowing) or phrase("summary.unknown"),
            flowering=printed_date(summary.flowering) or phrase("summary.no_flowering"),
            maturity=printed_date(summary.maturity) or phrase("summary.not_reached"),
        )
    ]
    if summary.cut_short:
        lines.append(phrase("summary.cut_short", last_day=printed_date(summary.last_day)))
    if np.isfinite(summary.hottest_temperature):
        lines.append(
            phrase(
                "summary.hottest",
                value=f"{summary.hottest_temperature:.1f}",
                date=printed_date(summary.hottest_date) or phrase("summary.unknown"),
                place=summary.hottest_place,
            )
        )
    lines += [
        _days(summary, "hot_days", "hot_day_limit"),
        _days(summary, "hot_days_flowering", "flowering_limit"),
    ]
    lines.append(_lost(summary))
    if summary.missing_days[1] > 0:
        median, most = (number(value) for value in summary.missing_days)
        lines.append(phrase("summary.missing", median=median, most=most))
    blank = sum(summary.cells.values()) - summary.cells["computed"]
    key = "summary.cells_why" if blank else "summary.cells"
    lines.append(phrase(key, computed=summary.cells["computed"], blank=blank, reasons=reasons))
    return heading, lines


def _reasons(summary: SeasonSummary) -> str:
    return ", ".join(
        phrase(f"summary.reason_{name}", count=count)
        for name, count in summary.cells.items()
        if name != "computed" and count
    )


def _days(summary: SeasonSummary, name: str, limit: str) -> str:
    median, most = getattr(summary, name)
    if not np.isfinite(median):
        return phrase(f"summary.{name}_none")
    return phrase(
        f"summary.{name}",
        limit=number(summary.limits.get(limit, _NONE)),
        median=number(median),
        most=number(most),
    )


def _lost(summary: SeasonSummary) -> str:
    if not np.isfinite(summary.lost_share):
        return phrase("summary.lost_unknown")
    if summary.most_lost_share == 0.0:
        return phrase("summary.lost_nothing", onset=number(summary.limits.get("heat_onset", _NONE)))
    most = f"{100.0 * summary.most_lost_share:.1f}"
    if summary.leading_cause == "none":
        return phrase("summary.lost_small", most=most)
    key = "causes.unclear" if summary.leading_cause == "unclear" else f"causes.short_{summary.leading_cause}"
    return phrase("summary.lost", share=f"{100.0 * summary.lost_share:.1f}", most=most, cause=phrase(key))
