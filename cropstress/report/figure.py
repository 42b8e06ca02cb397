"""The printed map of one measure of one season."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import xarray as xr

from cropstress.report import categories as kinds
from cropstress.report import notes as travelling
from cropstress.report import statistics
from cropstress.report.classes import classes_for
from cropstress.report.grid import MapGrid, map_grid
from cropstress.report.map_panel import MapPanel, axis_words
from cropstress.report.page import LARGE, MARGIN, MIDDLE, SMALL, WIDTH, Page, broken, line_height
from cropstress.report.phrases import number, phrase, printed_date, title_of
from cropstress.report.version import package_version
from cropstress.season.measures import CAUSES, CELL_STATUS, MEASURES

#: Tallest map alone and beside a second one [inch].
MOST_HEIGHT = 5.4
MOST_HEIGHT_OF_TWO = 2.8

#: A map that must not be shown alone, and the one shown under it.
COMPANIONS = {"leading_cause": "lost_to_heat_share"}

_GAP = 0.16


def map_figure(result: xr.Dataset, measure: str, season: int, path: Path | str) -> None:
    """Draw the map of a measure and write it as PNG.

    Parameters
    ----------
    result : xarray.Dataset
        A finished result.
    measure : str
        Name of the measure. The leading cause is drawn with the share lost under it.
    season : int
        Year of harvest.
    path : path
        Its final name.

    Raises
    ------
    InputError
        When there is no such measure or the file cannot be written.
    """
    page = map_page(result, measure, season)
    notes = travelling.notes(result)
    page.save(
        path,
        {
            "Title": _title(result, measure),
            "Description": f"{_subtitle(result, season)}. {notes['assumptions']} {notes['caution']}",
            "Copyright": notes.get("credit", ""),
        },
    )


def map_page(result: xr.Dataset, measure: str, season: int) -> Page:
    """Return the page of `map_figure`, drawn but not written."""
    grid = map_grid(result)
    names = [measure]
    companion = COMPANIONS.get(measure)
    if companion is not None and companion in result:
        names.append(companion)
    most_height = MOST_HEIGHT if len(names) == 1 else MOST_HEIGHT_OF_TWO
    panels = [_panel(result, name, season, grid, most_height, name == measure) for name in names]
    width = WIDTH - 2 * MARGIN
    title = broken(_title(result, measure), width, LARGE, "bold")
    subtitle = broken(_subtitle(result, season), width, MIDDLE)
    foot = [broken(text, width) for text in _foot(result, measure, season, grid)]

    height = MARGIN + len(title) * line_height(LARGE) + len(subtitle) * line_height(MIDDLE)
    height += sum(panel.height + _GAP for panel in panels) + (len(panels) - 1) * 0.3
    height += 2 * _GAP + sum(len(lines) for lines in foot) * line_height(SMALL) + 0.05 * len(foot) + MARGIN
    page = Page(height)
    top = page.lines(MARGIN, MARGIN, title, LARGE, weight="bold")
    top = page.lines(MARGIN, top, subtitle, MIDDLE) + _GAP
    for name, panel in zip(names, panels, strict=True):
        if name != measure:
            page.text(
                MARGIN,
                top,
                title_of(MEASURES[name])[:1].upper() + title_of(MEASURES[name])[1:],
                weight="bold",
            )
            top += 0.3
        panel.draw(page, top)
        top += panel.height + _GAP
    page.line([MARGIN, WIDTH - MARGIN], [top, top], linewidth=0.5)
    top += 0.07
    for lines in foot:
        top = page.lines(MARGIN, top, lines) + 0.05
    return page


def _panel(result: xr.Dataset, name: str, season: int, grid: MapGrid, most_height: float, scaled: bool) -> MapPanel:
    classes = classes_for(name)
    if classes.measure.kind == "flag" and result.attrs.get("pathway") == "C4":
        # In C4 leaves photorespiration is small, and no sentence may blame it, as in the summary
        place = 1 + CAUSES.index("photorespiration")
        labels = (*classes.labels[:place], phrase("causes.unclear"), *classes.labels[place + 1 :])
        classes = replace(classes, labels=labels)
    found = kinds.categories(result, classes, season)
    return MapPanel(grid, found, classes, _reasons(result, season), most_height, scaled)


def _reasons(result: xr.Dataset, season: int) -> str:
    present = {int(status) for status in np.unique(statistics.cell_status(result, season))}
    names = [name for name in ("no_sowing_date", "too_many_missing_days") if CELL_STATUS[name] in present]
    return ", ".join(phrase(f"blanks.{name}") for name in names)


def _title(result: xr.Dataset, measure: str) -> str:
    return f"{travelling.crop_label(result)}: {title_of(MEASURES[measure])}"


def _subtitle(result: xr.Dataset, season: int) -> str:
    first, last = (
        printed_date(statistics.season_bound(result, season, which)) for which in ("season_start", "season_end")
    )
    period = phrase("words.period", first=first, last=last)
    return f"{phrase('words.season', year=season)} ({period}), {travelling.scenario_words(result)}"


def _foot(result: xr.Dataset, measure: str, season: int, grid: MapGrid) -> list[str]:
    known = MEASURES[measure]
    more = tuple(name for name in (known.threshold,) if name in ("hot_leaf_limit", "warm_night_limit", "dry_air_limit"))
    texts = [
        _beside(result, measure, season),
        travelling.assumptions(result, tuple(str(name) for name in more)),
    ]
    if grid.size_assumed:
        size = f"{number(abs(grid.steps[0]))} {axis_words(grid)['unit']}"
        texts.append(phrase("assumptions.cell_size", value=size))
    texts.append(phrase("caution.line"))
    credit = travelling.attribute(result, "credit")
    last = [phrase("assumptions.credit", value=travelling.as_text(credit))] if credit is not None else []
    if grid.crs is not None:
        last.append(phrase("assumptions.coordinates", **axis_words(grid)))
    last.append(phrase("assumptions.made_by", version=package_version()))
    texts.append(" · ".join(last))
    return [text for text in texts if text]


def _beside(result: xr.Dataset, measure: str, season: int) -> str:
    """What must stand beside a loss: hot days at flowering; what must stand beside a cause: the loss."""
    if not measure.startswith(("lost_", "leading_")):
        return ""
    if not statistics.is_computed(result, season).any():
        return phrase("assumptions.no_fields")
    for name, key in (("hot_days_flowering", "beside_loss"), ("hot_days", "beside_loss_none")):
        if not statistics.missing_measures(result, [name]):
            values = statistics.field(result, name, season)
            return phrase(
                f"assumptions.{key}",
                median=number(statistics.median(values)),
                most=number(statistics.most(values)),
            )
    return ""
