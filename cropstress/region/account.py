"""What reading the weather brought to light, over all blocks of days: mended values, cells with data."""

from __future__ import annotations

import threading
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from cropstress.errors import Fault, InputError
from cropstress.weather import judge_mends


@dataclass(frozen=True)
class BlockAccount:
    """What one block of days adds.

    Attributes
    ----------
    counts : dict of str to int
        Mended and masked cell-days by kind.
    worst : dict of str to tuple
        By kind, how far the worst value lies beyond its limit, and the value, its day and place in words.
    present : int
        Cell-days that have data.
    observed : bool array (cells,)
        Cells that have data on any day of the block.
    """

    counts: dict[str, int]
    worst: dict[str, tuple[float, str]]
    present: int
    observed: np.ndarray


class Account:
    """Adds up the blocks of a run, which several threads may load at once.

    Whether faults are systematic is judged over the whole run, never over one block, so that it does not
    depend on how the days were cut up.

    Parameters
    ----------
    cells, days : int
        Size of the run.
    """

    def __init__(self, cells: int, days: int) -> None:
        self.counts: dict[str, int] = {}
        self.observed = np.zeros(cells, dtype=bool)
        self._worst: dict[str, tuple[float, str]] = {}
        self._present = 0
        self._cell_days = cells * days
        self._lock = threading.Lock()

    def add(self, block: BlockAccount) -> None:
        """Add a block.

        Raises
        ------
        InputError
            When a kind of fault is systematic already, whatever the blocks to come hold.
        """
        with self._lock:
            for kind, number in block.counts.items():
                self.counts[kind] = self.counts.get(kind, 0) + number
            for kind, example in block.worst.items():
                self._worst[kind] = max(example, self._worst.get(kind, example))
            self._present += block.present
            self.observed |= block.observed
            faults = self._judge(self._cell_days)
        if faults:
            raise InputError(faults)

    def close(self) -> None:
        """Judge the whole run.

        Raises
        ------
        InputError
            When a kind of fault is systematic.
        """
        faults = self._judge(self._present)
        if faults:
            raise InputError(faults)

    def _judge(self, cell_days: int) -> list[Fault]:
        examples: Mapping[str, str] = {kind: words for kind, (_, words) in self._worst.items()}
        return judge_mends(self.counts, cell_days, examples)
