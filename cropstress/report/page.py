"""A printed page: a figure whose places are in inches, with letters of one size and lines that are broken."""

from __future__ import annotations

import functools
import re
from pathlib import Path
from typing import Any

from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.font_manager import FontProperties
from matplotlib.lines import Line2D
from matplotlib.patches import Rectangle

from cropstress.report import colours
from cropstress.report.writing import written_aside

#: Width of a page between the margins of A4 [inch]; print at this width, and letters have their size.
WIDTH = 6.7
MARGIN = 0.15
DPI = 200

#: Letters [point].
SMALL = 9.0
MIDDLE = 10.5
LARGE = 13.0
LINE = 1.3


def line_height(size: float) -> float:
    """Return the height of a line of letters [inch]."""
    return size * LINE / 72.0


class Page:
    """A figure on which texts and axes are placed in inches from the top left corner.

    Parameters
    ----------
    height : float [inch]
    """

    def __init__(self, height: float) -> None:
        self.height = height
        self.figure = Figure(figsize=(WIDTH, height), dpi=DPI, facecolor="white")
        FigureCanvasAgg(self.figure)
        self.paper: Axes = self.figure.add_axes((0.0, 0.0, 1.0, 1.0))
        self.paper.set_xlim(0.0, WIDTH)
        self.paper.set_ylim(height, 0.0)
        self.paper.axis("off")
        self.paper.set_zorder(5)
        self.paper.patch.set_alpha(0.0)

    def axes(self, left: float, top: float, width: float, height: float) -> Axes:
        """Return axes at a place of the page [inch]."""
        return self.figure.add_axes(
            (left / WIDTH, 1.0 - (top + height) / self.height, width / WIDTH, height / self.height)
        )

    def text(self, left: float, top: float, text: str, size: float = SMALL, **changes: Any) -> None:
        """Write one line; its top left corner is given [inch]."""
        style: dict[str, Any] = {
            "va": "top",
            "ha": "left",
            "color": colours.INK,
            "parse_math": False,
        } | changes
        self.paper.text(left, top, text, fontsize=size, **style)

    def lines(self, left: float, top: float, lines: list[str], size: float = SMALL, **style: Any) -> float:
        """Write lines below each other and return where they end [inch]."""
        for line in lines:
            self.text(left, top, line, size, **style)
            top += line_height(size)
        return top

    def rectangle(self, left: float, top: float, width: float, height: float, **style: Any) -> None:
        """Draw a rectangle [inch]."""
        hatch_width = style.pop("hatch_linewidth", None)
        patch = Rectangle((left, top), width, height, **style)
        if hatch_width is not None:
            patch.set_hatch_linewidth(hatch_width)
        self.paper.add_patch(patch)

    def line(self, lefts: list[float], tops: list[float], **style: Any) -> None:
        """Draw a line through points [inch]."""
        kind: dict[str, Any] = {"color": colours.INK, "linewidth": 0.8} | style
        self.paper.add_line(Line2D(lefts, tops, **kind))

    def save(self, path: Path | str, words: dict[str, str]) -> None:
        """Write the page as PNG.

        Parameters
        ----------
        path : path
            Its final name.
        words : dict of str
            Title, description and so on, kept inside the file.

        Raises
        ------
        InputError
            When the file cannot be written.
        """
        with written_aside(path) as aside:
            self.figure.savefig(aside, format="png", dpi=DPI, metadata={"Software": "cropstress"} | words)


#: Measures the width of letters; it is never drawn.
_RULER = FigureCanvasAgg(Figure(figsize=(1.0, 1.0), dpi=DPI))

#: A space between a number and what belongs to it, where a line is never broken.
_BOUND_SPACE = re.compile(r"(?<=\d) (?=°|%|ppm|kPa|m\b|km\b|[^\W\d]+ \d{4})|(?<=[^\W\d]) (?=\d{4}\b)")


@functools.lru_cache(maxsize=4096)
def text_width(text: str, size: float = SMALL, weight: str = "normal") -> float:
    """Return the width of a line of letters [inch]."""
    font = FontProperties(size=size, weight=weight)
    return float(_RULER.get_renderer().get_text_width_height_descent(text, font, False)[0]) / DPI


def broken(text: str, width: float, size: float = SMALL, weight: str = "normal") -> list[str]:
    """Break a text into lines that fit a width.

    Parameters
    ----------
    text : str
    width : float [inch]
    size : float [point]
    weight : str

    Returns
    -------
    list of str
        A word wider than the line is cut.
    """
    lines: list[str] = []
    line = ""
    for word in _BOUND_SPACE.sub("\N{NO-BREAK SPACE}", text).split(" "):
        longer = f"{line} {word}" if line else word
        if text_width(longer, size, weight) <= width:
            line = longer
            continue
        if line:
            lines.append(line)
        while text_width(word, size, weight) > width and len(word) > 1:
            fitting = next(
                count
                for count in range(len(word) - 1, 0, -1)
                if count == 1 or text_width(word[:count], size, weight) <= width
            )
            lines.append(word[:fitting])
            word = word[fitting:]
        line = word
    return [*lines, line] if line else lines
