"""Errors a user can act on: what is wrong, where, and what to do."""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True)
class Fault:
    """One thing that is wrong with the run file, the grids or a profile.

    Attributes
    ----------
    what : str
        What is wrong, with the offending value.
    where : str
        File, variable, place or key.
    remedy : str
        What to do about it.
    """

    what: str
    where: str
    remedy: str

    def __str__(self) -> str:
        return f"{self.where}: {self.what}\n    {self.remedy}"


class CropstressError(Exception):
    """Base of every error this package raises on purpose."""


class InputError(CropstressError):
    """The run file, a profile, the grids or the output folder are at fault.

    Parameters
    ----------
    faults : iterable of Fault
        All faults that were found, never only the first; each is told once.
    kept : str, optional
        What a run that stopped on the way has left whole.
    """

    def __init__(self, faults: Iterable[Fault], kept: str = "") -> None:
        self.faults = list(dict.fromkeys(faults))
        self.kept = kept
        super().__init__(self.faults)

    def __str__(self) -> str:
        count = len(self.faults)
        heading = "1 fault found:" if count == 1 else f"{count} faults found:"
        width = len(str(count))
        blocks = [
            f"  {number:>{width}}. {fault.where}: {fault.what}\n{'':{width}}    {fault.remedy}"
            for number, fault in enumerate(self.faults, 1)
        ]
        return "\n".join([heading, *blocks, *([self.kept] if self.kept else [])])


def fail(what: str, where: str, remedy: str) -> InputError:
    """Make an error with a single fault, to be raised by the caller."""
    return InputError([Fault(what, where, remedy)])


def count_of(number: int, one: str, several: str = "") -> str:
    """Return a number with its noun.

    >>> count_of(1, "cell"), count_of(3, "cell"), count_of(2, "day has", "days have")
    ('1 cell', '3 cells', '2 days have')
    """
    return f"{number} {one if number == 1 else several or one + 's'}"


def nearest(word: str, choices: Iterable[str]) -> str | None:
    """Return the choice most like a misspelt word, or None when nothing is close.

    >>> nearest("maze", ["maize", "rice"])
    'maize'
    """
    known = {choice.lower(): choice for choice in choices}
    found = difflib.get_close_matches(word.lower(), list(known), n=1, cutoff=0.6)
    return known[found[0]] if found else None
