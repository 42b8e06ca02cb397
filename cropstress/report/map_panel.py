"""One map with its legend, scale bar and north arrow, at a place of a page."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.colors import to_rgb
from matplotlib.patches import PathPatch, Polygon
from matplotlib.path import Path as Outline
from matplotlib.ticker import MaxNLocator

from cropstress.report import categories as kinds
from cropstress.report import colours
from cropstress.report.classes import Classes
from cropstress.report.grid import MapGrid
from cropstress.report.page import MARGIN, SMALL, WIDTH, Page, broken, line_height, text_width
from cropstress.report.phrases import number, phrase, unit_of

#: Width of the legend and of the gap before it [inch].
LEGEND = 2.1
GAP = 0.3
SWATCH = (0.34, 0.17)

#: Shortest side of a map and longest side of one cell [inch].
LEAST_SIDE = 0.45
LARGEST_CELL = 2.0

#: Longest scale bar [inch].
LONGEST_BAR = 1.25

_TICK = 0.05
_BLANK_STYLE: dict[int, tuple[str, str]] = {
    kinds.NO_CROP: (colours.NO_CROP, "...."),
    kinds.NO_DATA: (colours.BLANK, "/////"),
    kinds.NOT_COMPUTED: (colours.BLANK, "xxxx"),
    kinds.NO_VALUE: (colours.BLANK, "----"),
}
_HATCH_WIDTH = 0.5
_BORDER_WIDTH = 0.5


@dataclass(frozen=True)
class Row:
    """A row of the legend: its swatch and its broken text."""

    colour: str
    hatch: str
    hatch_colour: str
    lines: list[str]
    gap_before: float


class MapPanel:
    """A map and its legend.

    Parameters
    ----------
    grid : MapGrid
    found : numpy.ndarray (Y, X) of int8
        Category of each cell.
    classes : Classes
    reasons : str
        Why cells were not computed, for the legend.
    most_height : float [inch]
        Of the map.
    scaled : bool
        Whether to draw the scale bar and the north arrow.
    """

    def __init__(
        self,
        grid: MapGrid,
        found: np.ndarray,
        classes: Classes,
        reasons: str,
        most_height: float,
        scaled: bool = True,
    ) -> None:
        self.grid = grid
        self.classes = classes
        self.shown = kinds.coarser(found)
        self.present = {int(category) for category in np.unique(found)}
        self.legend = self._rows(reasons)
        self.y_ticks = _ticks(grid.y_edges, grid, "Y")
        self.x_ticks = _ticks(grid.x_edges, grid, "X")
        self.left = MARGIN + 0.1 + max(text_width(label) for _, label in self.y_ticks)
        self.width, self.map_height = self._map_size(most_height)
        self.scaled = scaled and (
            grid.north_is_up or scale_bar(grid, self.inches_per_unit, LONGEST_BAR) is not None
        )
        scale = 0.62 if self.scaled else 0.0
        self.height = max(self.map_height + 0.35, self._legend_height() + scale)

    def _map_size(self, most_height: float) -> tuple[float, float]:
        most_width = WIDTH - MARGIN - LEGEND - GAP - self.left
        narrowing = 1.0
        if self.grid.geographic:
            narrowing = float(np.cos(np.radians(np.clip(self.grid.centre[0], -85.0, 85.0))))
        across, down = narrowing * np.ptp(self.grid.x_edges), np.ptp(self.grid.y_edges)
        largest = LARGEST_CELL * max(self.grid.x.size, self.grid.y.size)
        scale = min(most_width / across, most_height / down, largest / max(across, down))
        # Of the true scale: the short side of a single row or column is drawn wider than it is
        self.inches_per_unit = float(narrowing * scale)
        return (
            float(np.clip(scale * across, LEAST_SIDE, most_width)),
            float(np.clip(scale * down, LEAST_SIDE, most_height)),
        )

    def _rows(self, reasons: str) -> list[Row]:
        rows: list[tuple[str, str, str, str, float]] = []
        classes = self.classes
        if classes.measure.zero_is_none:
            rows.append((colours.NONE, "", colours.INK, phrase("blanks.none"), 0.0))
        for colour, hatch, label in zip(classes.colours, classes.hatches, classes.labels, strict=True):
            rows.append((colour, hatch, colours.INK, label, 0.0))
        gap = 0.12
        for blank, words in (
            (kinds.NO_CROP, phrase("blanks.no_crop")),
            (kinds.NO_DATA, phrase("blanks.no_data")),
            (kinds.NOT_COMPUTED, phrase("blanks.not_computed", reasons=reasons)),
            (kinds.NO_VALUE, phrase("blanks.no_value")),
        ):
            if blank in self.present or blank in (kinds.NO_CROP, kinds.NO_DATA):
                rows.append((*_BLANK_STYLE[blank], colours.PALE_INK, words, gap))
                gap = 0.0
        width = LEGEND - SWATCH[0] - 0.1
        return [Row(colour, hatch, ink, broken(words, width), gap) for colour, hatch, ink, words, gap in rows]

    def _legend_height(self) -> float:
        heading = len(broken(unit_of(self.classes.measure), LEGEND, weight="bold"))
        texts = sum(len(row.lines) for row in self.legend) + heading
        return texts * line_height(SMALL) + sum(0.06 + row.gap_before for row in self.legend) + 0.05

    def draw(self, page: Page, top: float) -> None:
        """Draw the panel with its upper edge at a height of the page [inch]."""
        axes = page.axes(self.left, top, self.width, self.map_height)
        self._draw_cells(axes)
        self._draw_ticks(axes)
        left = self.left + self.width + GAP
        bottom = self._draw_legend(page, left, top)
        if self.scaled:
            self._draw_scale(page, left + 0.02, bottom + 0.16)

    def _draw_cells(self, axes: Axes) -> None:
        y_edges, x_edges = (
            _joined(self.grid.y_edges, self.shown.shape[0]),
            _joined(self.grid.x_edges, self.shown.shape[1]),
        )
        shown = self.shown
        if y_edges[0] > y_edges[-1]:
            y_edges, shown = y_edges[::-1], shown[::-1]
        if x_edges[0] > x_edges[-1]:
            x_edges, shown = x_edges[::-1], shown[:, ::-1]
        table = np.ones((128, 3))
        for category, colour in self._colours().items():
            table[category] = to_rgb(colour)
        axes.pcolorfast(x_edges, y_edges, table[shown])
        for category, (hatch, ink) in self._hatches().items():
            if category in self.present:
                axes.add_patch(_hatched(shown == category, y_edges, x_edges, hatch, ink))
        # White hatched cells beside white ones that are exactly 0: without a line a coast would be ragged
        axes.add_patch(_border(np.isin(shown, kinds.WITHOUT_VALUE), y_edges, x_edges))
        axes.set_xlim(x_edges[0], x_edges[-1])
        axes.set_ylim(y_edges[0], y_edges[-1])
        axes.set_aspect("auto")

    def _colours(self) -> dict[int, str]:
        found = {kinds.NONE: colours.NONE} | {blank: style[0] for blank, style in _BLANK_STYLE.items()}
        return found | dict(enumerate(self.classes.colours))

    def _hatches(self) -> dict[int, tuple[str, str]]:
        found = {blank: (style[1], colours.PALE_INK) for blank, style in _BLANK_STYLE.items()}
        return found | {
            number: (hatch, _ink_on(self.classes.colours[number]))
            for number, hatch in enumerate(self.classes.hatches)
            if hatch
        }

    def _draw_ticks(self, axes: Axes) -> None:
        axes.set_xticks([place for place, _ in self.x_ticks], [label for _, label in self.x_ticks])
        axes.set_yticks([place for place, _ in self.y_ticks], [label for _, label in self.y_ticks])
        axes.tick_params(
            labelsize=SMALL, labelcolor=colours.INK, color=colours.INK, length=72 * _TICK, width=0.6
        )
        for side in axes.spines.values():
            side.set_linewidth(0.6)
            side.set_color(colours.INK)

    def _draw_legend(self, page: Page, left: float, top: float) -> float:
        heading = broken(unit_of(self.classes.measure), LEGEND, weight="bold")
        top = page.lines(left, top - 0.02, heading, weight="bold") + 0.05
        for row in self.legend:
            top += row.gap_before
            hatch_colour = row.hatch_colour if row.hatch_colour != colours.INK else _ink_on(row.colour)
            page.rectangle(
                left,
                top,
                *SWATCH,
                facecolor=row.colour,
                edgecolor=hatch_colour,
                hatch=row.hatch or None,
                hatch_linewidth=_HATCH_WIDTH,
                linewidth=0.0,
            )
            page.rectangle(left, top, *SWATCH, fill=False, edgecolor=colours.INK, linewidth=0.5)
            top = page.lines(left + SWATCH[0] + 0.1, top + 0.01, row.lines) + 0.05
        return top

    def _draw_scale(self, page: Page, left: float, top: float) -> None:
        bar = scale_bar(self.grid, self.inches_per_unit, LONGEST_BAR)
        if bar is not None:
            length, label = bar
            style = {"edgecolor": colours.INK, "linewidth": 0.6}
            page.rectangle(left, top, 0.5 * length, 0.06, facecolor=colours.INK, **style)
            page.rectangle(left + 0.5 * length, top, 0.5 * length, 0.06, facecolor="white", **style)
            page.text(left, top + 0.1, label)
        if self.grid.north_is_up:
            middle = left + LEGEND - 0.3
            page.paper.add_patch(
                Polygon(
                    [
                        (middle, top - 0.1),
                        (middle - 0.08, top + 0.14),
                        (middle, top + 0.09),
                        (middle + 0.08, top + 0.14),
                    ],
                    facecolor=colours.INK,
                    edgecolor=colours.INK,
                    linewidth=0.5,
                )
            )
            page.text(middle, top + 0.17, phrase("words.north"), ha="center", weight="bold")


def scale_bar(grid: MapGrid, inches_per_unit: float, most: float) -> tuple[float, str] | None:
    """Return the length of a scale bar on paper [inch] and its label.

    Parameters
    ----------
    grid : MapGrid
    inches_per_unit : float [inch]
        Length on paper of one unit of X.
    most : float [inch]
        Longest bar.

    Returns
    -------
    tuple or None
        A round true length, measured across the middle of the map; where the scale changes by more than
        5 % over the map, the label says at which latitude it holds. None without a reference
        system or where the size of the only cell is not known.
    """
    metres = grid.metres_per_unit_across()
    if metres is None or grid.size_assumed:
        return None
    metres_per_inch = metres / inches_per_unit
    length = round_below(most * metres_per_inch)
    key, shown = ("words.kilometres", length / 1000.0) if length >= 1000.0 else ("words.metres", length)
    label = phrase(key, length=number(shown))
    ends = [grid.metres_per_unit_across(float(edge)) or metres for edge in grid.y_edges[[0, -1]]]
    if length >= 1000.0 and max(abs(end / metres - 1.0) for end in ends) > 0.05:
        latitude = grid.latitude_longitude(*grid.centre)[0]
        label = phrase(
            "words.kilometres_at", length=number(shown), latitude=_degrees(round(latitude), 0, "Y")
        )
    return length / metres_per_inch, label


def round_below(length: float) -> float:
    """Return the largest of 1, 2 and 5 times a power of ten that is not above a length."""
    power = 10.0 ** np.floor(np.log10(length))
    return float(max(step for step in (1.0, 2.0, 5.0) if step * power <= length * (1.0 + 1e-9)) * power)


def _ink_on(colour: str) -> str:
    """Dark lines on pale colours, pale lines on dark ones."""
    red, green, blue = to_rgb(colour)
    return colours.INK if 0.2126 * red + 0.7152 * green + 0.0722 * blue > 0.45 else "#F2F2F2"


def _joined(edges: np.ndarray, cells: int) -> np.ndarray:
    """Edges of the blocks that `coarser` made of the cells."""
    factor = -(-(edges.size - 1) // cells)
    return np.append(edges[:-1:factor], edges[-1])


def _hatched(where: np.ndarray, y_edges: np.ndarray, x_edges: np.ndarray, hatch: str, ink: str) -> PathPatch:
    """One patch over all cells of a kind, made of the runs of cells in each row."""
    changes = np.diff(np.pad(where.astype(np.int8), ((0, 0), (1, 1))), axis=1)
    rows, starts = np.nonzero(changes == 1)
    _, ends = np.nonzero(changes == -1)
    low, high = y_edges[rows], y_edges[rows + 1]
    left, right = x_edges[starts], x_edges[ends]
    corners = np.stack([left, low, right, low, right, high, left, high, left, low], axis=-1).reshape(-1, 2)
    codes = np.tile([Outline.MOVETO, *[Outline.LINETO] * 3, Outline.CLOSEPOLY], rows.size)
    patch = PathPatch(
        Outline(corners, codes), facecolor="none", edgecolor=ink, hatch=hatch, linewidth=0.0, zorder=2
    )
    patch.set_hatch_linewidth(_HATCH_WIDTH)
    return patch


def _border(where: np.ndarray, y_edges: np.ndarray, x_edges: np.ndarray) -> PathPatch:
    """A thin line wherever cells of a kind meet others."""
    row, column = np.nonzero(where[:, 1:] != where[:, :-1])
    upright = np.stack([x_edges[column + 1], y_edges[row], x_edges[column + 1], y_edges[row + 1]], axis=-1)
    row, column = np.nonzero(where[1:] != where[:-1])
    level = np.stack([x_edges[column], y_edges[row + 1], x_edges[column + 1], y_edges[row + 1]], axis=-1)
    ends = np.concatenate([upright, level]).reshape(-1, 2)
    codes = np.tile([Outline.MOVETO, Outline.LINETO], len(ends) // 2)
    return PathPatch(Outline(ends, codes), fill=False, edgecolor=colours.PALE_INK, linewidth=_BORDER_WIDTH, zorder=3)


def _ticks(edges: np.ndarray, grid: MapGrid, letter: str) -> list[tuple[float, str]]:
    low, high = float(min(edges[0], edges[-1])), float(max(edges[0], edges[-1]))
    wanted = 3 if letter == "X" else 5
    places = np.asarray(MaxNLocator(nbins=wanted, steps=[1, 2, 5, 10]).tick_values(low, high))
    places = places[(places >= low) & (places <= high)]
    if edges.size == 2 or places.size == 0:
        places = np.array([0.5 * (low + high)])
    step = places[1] - places[0] if places.size > 1 else 10.0 ** np.floor(np.log10(high - low) - 2.0)
    decimals = max(0, -int(np.floor(np.log10(step) + 1e-9)))
    return [(float(place), _tick_label(float(place), decimals, grid, letter)) for place in places]


def _tick_label(place: float, decimals: int, grid: MapGrid, letter: str) -> str:
    if grid.geographic:
        return _degrees(place, decimals, letter)
    text = f"{place:,.{decimals}f}".replace(",", "\N{NARROW NO-BREAK SPACE}").replace("-", "−")
    return text + ("°" if grid.in_degrees else "")


def _degrees(place: float, decimals: int, letter: str) -> str:
    if letter == "X":
        place = (place + 180.0) % 360.0 - 180.0
    ends = (
        ("words.degrees_south", "words.degrees_north")
        if letter == "Y"
        else ("words.degrees_west", "words.degrees_east")
    )
    return phrase(ends[int(place >= 0.0)], value=f"{abs(place):.{decimals}f}")


def axis_words(grid: MapGrid) -> dict[str, Any]:
    """Return the name and the unit of the coordinates of a map, for its foot."""
    if grid.crs is None:
        return {"name": "", "unit": ""}
    unit = grid.crs.axis_info[0].unit_name if grid.crs.axis_info else ""
    named = grid.crs.name.lower() not in ("undefined", "unknown", "unnamed")
    return {"name": grid.crs.name if named else phrase("assumptions.coordinates_as_found"), "unit": unit}
