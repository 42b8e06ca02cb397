"""How a run is cut up: time blocks that hold whole chunks of the files, tiles of rows and columns."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

CELLS_PER_TILE = 2048  # enough work that a task's overhead does not count, little enough to share out
DAYS_PER_BLOCK = 31  # at least, where the files' own chunks are shorter


@dataclass(frozen=True)
class Plan:
    """Time blocks and tiles.

    Attributes
    ----------
    blocks : list of tuple
        First day and the day after the last.
    tiles : list of tuple
        First row, row after the last, first column, column after the last.
    """

    blocks: list[tuple[int, int]]
    tiles: list[tuple[int, int, int, int]]


def plan_blocks(days: int, chunks: Sequence[Sequence[int]], block_days: int | None = None) -> list[tuple[int, int]]:
    """Cut the days into blocks that end where the chunks of every variable end.

    Parameters
    ----------
    days : int
    chunks : sequence of sequences of int
        Lengths of the chunks in time, of each variable.
    block_days : int, optional
        Days of a block, whatever the chunks.

    Examples
    --------
    >>> plan_blocks(100, [(40, 40, 20), (20, 20, 20, 20, 20)])
    [(0, 40), (40, 80), (80, 100)]
    """
    if block_days is not None:
        return [(first, min(first + block_days, days)) for first in range(0, days, block_days)]
    common: set[int] | None = None
    for lengths in chunks:
        ends, total = set(), 0
        for length in lengths:
            total += length
            ends.add(total)
        common = ends if common is None else common & ends
    blocks, first = [], 0
    for end in sorted((common or set()) | {days}):
        if end - first >= DAYS_PER_BLOCK or end == days:
            blocks.append((first, end))
            first = end
    return blocks


def plan_tiles(rows: int, columns: int, tile: tuple[int, int] | None = None) -> list[tuple[int, int, int, int]]:
    """Cut the map into tiles: bands of whole rows, or rectangles of a given size.

    Examples
    --------
    >>> plan_tiles(3, 2, (2, 2))
    [(0, 2, 0, 2), (2, 3, 0, 2)]
    """
    height, width = tile or (max(CELLS_PER_TILE // columns, 1), columns)
    return [
        (top, min(top + height, rows), left, min(left + width, columns))
        for top in range(0, rows, height)
        for left in range(0, columns, width)
    ]
