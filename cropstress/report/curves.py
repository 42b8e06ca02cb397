"""Figures of one place through a season and of one leaf over temperature."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
from matplotlib.axes import Axes
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from cropstress.report import colours
from cropstress.report.page import LARGE, MARGIN, SMALL, WIDTH, Page, broken, line_height, text_width
from cropstress.report.phrases import months, number, phrase
from cropstress.season.measures import CAUSES

_LEFT = 0.85
_LEGEND = 1.75
_GAP = 0.22
_PANEL_WIDTH = WIDTH - _LEFT - _LEGEND - MARGIN
_FLOWERING = "#E9E9E9"


def trace_figure(
    table: pd.DataFrame,
    path: Path | str,
    *,
    label: str = "",
    place: str = "",
    heat_onset: float | None = None,
    hot_day_limit: float | None = None,
    flowering_window: tuple[int, int] | None = None,
    notes: Sequence[str] = (),
) -> None:
    """Draw one place day by day and write it as PNG.

    Parameters
    ----------
    table : pandas.DataFrame
        A row a day. Columns: date (ISO text or a date of any calendar), tmax, tmin [degC]; where computed
        highest_leaf_temperature [degC], assimilation, lost_to_heat, lost_to_heat_by_CAUSE [mol m-2 d-1].
    path : path
        Its final name.
    label, place : str
        The crop and the place in words.
    heat_onset, hot_day_limit : float, optional [degC]
    flowering_window : tuple of int, optional
        First and last row of the flowering window.
    notes : sequence of str
        Printed at the foot, as the assumptions; the caution line follows.

    Raises
    ------
    InputError
        When the file cannot be written.
    """
    title = phrase("trace.title", label=label, place=place) if label else phrase("trace.title_plain")
    with_uptake = "assimilation" in table and bool(table["assimilation"].notna().any())
    heights = [2.2, 1.5, 1.5] if with_uptake else [2.6]
    page, panels = _page(title, heights, notes, axis_words=True)
    days = np.arange(len(table))
    for axes, _ in panels:
        axes.set_xlim(-0.5, len(table) - 0.5)
        if flowering_window is not None:
            axes.axvspan(
                flowering_window[0] - 0.5, flowering_window[1] + 0.5, color=_FLOWERING, zorder=0, lw=0
            )
    _temperatures(page, *panels[0], table, days, heat_onset, hot_day_limit, flowering_window is not None)
    if with_uptake:
        _uptake(page, *panels[1], table, days)
        _losses(page, *panels[2], table, days)
    for axes, _ in panels[:-1]:
        axes.tick_params(labelbottom=False)
    _month_ticks([axes for axes, _ in panels], [str(date)[:10] for date in table["date"]])
    page.save(path, {"Title": title, "Description": " ".join((*notes, phrase("caution.line")))})


def leaf_figure(
    table: pd.DataFrame,
    path: Path | str,
    *,
    label: str = "",
    heat_onset: float | None = None,
    notes: Sequence[str] = (),
) -> None:
    """Draw the response curves of one leaf and write them as PNG.

    Parameters
    ----------
    table : pandas.DataFrame
        Columns: air_temperature or leaf_temperature [degC], co2 [umol mol-1], assimilation and
        assimilation_without_oxygenation [umol m-2 s-1]; at most five values of co2.
    path : path
        Its final name.
    label : str
        The crop in words.
    heat_onset : float, optional
        Drawn where the curves stand over air temperature [degC].
    notes : sequence of str
        Printed at the foot, as the light and the humidity; the caution line follows.

    Raises
    ------
    InputError
        When the file cannot be written.
    """
    title = phrase("leaf.title", label=label) if label else phrase("leaf.title_plain")
    page, panels = _page(title, [2.8, 1.9], notes, axis_words=True)
    over = "air_temperature" if "air_temperature" in table else "leaf_temperature"
    (uptake, top), (share, _) = panels
    rows: list[tuple[Any, str]] = []
    groups = list(table.groupby("co2"))
    least = 0.0
    for (co2, curve), colour in zip(groups, colours.LINES, strict=False):
        curve = curve.sort_values(over)
        temperature = curve[over].to_numpy()
        actual = curve["assimilation"].to_numpy()
        without = curve["assimilation_without_oxygenation"].to_numpy()
        uptake.plot(temperature, actual, color=colour, linewidth=1.8)
        uptake.plot(temperature, without, color=colour, linewidth=1.2, linestyle=(0, (4, 2)))
        possible = np.where(without > 0.0, without, np.nan)
        lost = np.where(actual > 0.0, 100.0 * (without - actual) / possible, np.nan)
        share.plot(temperature, lost, color=colour, linewidth=1.8)
        least = min(least, float(np.nanmin(lost, initial=0.0)))
        rows.append(
            (Line2D([], [], color=colour, linewidth=1.8), phrase("leaf.co2", value=number(float(co2))))
        )
    rows.append((Line2D([], [], color=colours.INK, linewidth=1.8), phrase("leaf.actual")))
    dashed = Line2D([], [], color=colours.INK, linewidth=1.2, linestyle=(0, (4, 2)))
    rows.append((dashed, phrase("leaf.without_oxygenation")))
    if heat_onset is not None and over == "air_temperature":
        for axes in (uptake, share):
            axes.axvline(heat_onset, color=colours.PALE_INK, linewidth=1.0, linestyle=":")
        dotted = Line2D([], [], color=colours.PALE_INK, linewidth=1.0, linestyle=":")
        rows.append((dotted, phrase("leaf.onset", value=number(heat_onset))))
    _legend(page, top, rows)
    _name(uptake, phrase("leaf.assimilation"))
    _name(share, phrase("leaf.share"))
    for axes in (uptake, share):
        axes.set_xlim(float(table[over].min()), float(table[over].max()))
        axes.axhline(0.0, color=colours.INK, linewidth=0.5)
    # A leaf that cannot use more sugar gains a little from photorespiration in the cold: shown, never cut off
    share.set_ylim(bottom=1.05 * least)
    uptake.tick_params(labelbottom=False)
    share.set_xlabel(phrase(f"leaf.{over}"), fontsize=SMALL, color=colours.INK)
    page.save(path, {"Title": title, "Description": " ".join((*notes, phrase("caution.line")))})


def _page(
    title: str, heights: list[float], notes: Sequence[str], axis_words: bool = False
) -> tuple[Page, list[tuple[Axes, float]]]:
    """A page with panels below each other and notes at its foot; the panels come with their upper edge."""
    width = WIDTH - 2 * MARGIN
    heading = broken(title, width, LARGE, "bold")
    foot = [broken(text, width) for text in (*notes, phrase("caution.line"))]
    top = MARGIN + len(heading) * line_height(LARGE) + 0.15
    below = 0.35 + (0.2 if axis_words else 0.0)
    page = Page(
        top
        + sum(heights)
        + _GAP * (len(heights) - 1)
        + below
        + sum(len(lines) for lines in foot) * line_height(SMALL)
        + 0.05 * len(foot)
        + MARGIN
    )
    page.lines(MARGIN, MARGIN, heading, LARGE, weight="bold")
    panels = []
    for height in heights:
        axes = page.axes(_LEFT, top, _PANEL_WIDTH, height)
        axes.tick_params(labelsize=SMALL, labelcolor=colours.INK, color=colours.INK, width=0.6)
        axes.spines[["top", "right"]].set_visible(False)
        panels.append((axes, top))
        top += height + _GAP
    top += below - _GAP
    for lines in foot:
        top = page.lines(MARGIN, top, lines) + 0.05
    return page, panels


def _temperatures(
    page: Page,
    axes: Axes,
    top: float,
    table: pd.DataFrame,
    days: np.ndarray,
    onset: float | None,
    hot_day_limit: float | None,
    flowering: bool,
) -> None:
    red, blue, brown = colours.LOSS[3], colours.NEUTRAL[2], colours.LOSS[1]
    rows: list[tuple[Any, str]] = []
    lines: list[tuple[str, str, dict[str, Any], str]] = [
        ("tmax", "trace.tmax", {"linewidth": 1.5}, red),
        ("highest_leaf_temperature", "trace.leaf", {"linewidth": 1.0, "linestyle": (0, (3, 1.5))}, brown),
        ("tmin", "trace.tmin", {"linewidth": 1.2}, blue),
    ]
    for column, key, style, colour in lines:
        if column in table and table[column].notna().any():
            axes.plot(days, table[column], color=colour, **style)
            rows.append((Line2D([], [], color=colour, **style), phrase(key)))
    for value, key, dashes in ((hot_day_limit, "hot_day_limit", "-"), (onset, "onset", ":")):
        if value is not None:
            style = {"color": colours.INK, "linewidth": 0.9, "linestyle": dashes}
            axes.axhline(value, **style)
            rows.append((Line2D([], [], **style), phrase(f"trace.{key}", value=number(value))))
    if flowering:
        rows.append((Patch(facecolor=_FLOWERING), phrase("trace.flowering")))
    missing = table["tmax"].isna().to_numpy()
    if missing.any():
        axes.plot(
            days[missing],
            np.full(missing.sum(), 0.02),
            "|",
            color=colours.INK,
            transform=axes.get_xaxis_transform(),
        )
        rows.append((Line2D([], [], color=colours.INK, marker="|", linestyle=""), phrase("trace.missing")))
    _name(axes, phrase("trace.temperature"))
    _legend(page, top, rows)


def _uptake(page: Page, axes: Axes, top: float, table: pd.DataFrame, days: np.ndarray) -> None:
    actual = table["assimilation"].to_numpy(dtype=float)
    possible = actual + table["lost_to_heat"].to_numpy(dtype=float)
    axes.fill_between(days, actual, possible, step="mid", color=colours.LOSS[0], linewidth=0)
    axes.step(days, possible, where="mid", color=colours.LOSS[2], linewidth=1.0)
    axes.step(days, actual, where="mid", color=colours.NEUTRAL[3], linewidth=1.4)
    axes.axhline(0.0, color=colours.INK, linewidth=0.5)
    rows = [
        (Line2D([], [], color=colours.LOSS[2], linewidth=1.0), phrase("trace.without_heat")),
        (Line2D([], [], color=colours.NEUTRAL[3], linewidth=1.4), phrase("trace.uptake")),
    ]
    _name(axes, phrase("trace.assimilation"))
    _legend(page, top, rows)


def _losses(page: Page, axes: Axes, top: float, table: pd.DataFrame, days: np.ndarray) -> None:
    upper, lower = np.zeros(len(table)), np.zeros(len(table))
    rows: list[tuple[Any, str]] = []
    for cause, colour in zip(CAUSES, colours.CAUSE, strict=True):
        part = np.nan_to_num(table[f"lost_to_heat_by_{cause}"].to_numpy(dtype=float))
        # A cause that warmth makes smaller stands below zero
        start = np.where(part >= 0.0, upper, lower)
        axes.bar(days, part, bottom=start, width=1.0, color=colour, linewidth=0)
        upper += np.maximum(part, 0.0)
        lower += np.minimum(part, 0.0)
        rows.append((Patch(facecolor=colour), phrase(f"causes.short_{cause}")))
    axes.axhline(0.0, color=colours.INK, linewidth=0.5)
    if not upper.any() and not lower.any():
        axes.set_ylim(0.0, 0.1)
    _name(axes, phrase("trace.lost"))
    _legend(page, top, rows)


def _name(axes: Axes, words: str) -> None:
    axes.set_ylabel(words, fontsize=SMALL, color=colours.INK)
    axes.yaxis.set_label_coords(-0.118, 0.5)


def _legend(page: Page, top: float, rows: list[tuple[Any, str]]) -> None:
    left = _LEFT + _PANEL_WIDTH + 0.12
    for handle, words in rows:
        lines = broken(words, _LEGEND - 0.42)
        middle = top + 0.08
        if isinstance(handle, Patch):
            page.rectangle(left, middle - 0.06, 0.26, 0.12, facecolor=handle.get_facecolor(), linewidth=0.0)
        else:
            handle.set_data(
                *([left, left + 0.26], [middle, middle])
                if handle.get_linestyle() != "None"
                else ([left + 0.13], [middle])
            )
            page.paper.add_line(handle)
        top = page.lines(left + 0.34, top, lines) + 0.04


def _month_ticks(panels: list[Axes], dates: list[str]) -> None:
    firsts = [(day, date) for day, date in enumerate(dates) if date[8:10] == "01" or day == 0]
    if len(firsts) > 1 and firsts[1][0] - firsts[0][0] < 15:
        firsts = firsts[1:]
    names = [months()[int(date[5:7]) - 1] for _, date in firsts]
    room = _PANEL_WIDTH / max(len(dates), 1) * 28.0
    if max(text_width(name) for name in names) * 1.2 > room:
        names = [name[:3] for name in names]
    every = 1 + int(max(text_width(name) for name in names) * 1.2 // room)
    days, names, years = [day for day, _ in firsts][::every], names[::every], [date[:4] for _, date in firsts][::every]
    # The year under the first month of each
    new = [number == 0 or year != years[number - 1] for number, year in enumerate(years)]
    words = [f"{name}\n{year}" if first else name for name, year, first in zip(names, years, new, strict=True)]
    for axes in panels:
        axes.set_xticks(days, words)
